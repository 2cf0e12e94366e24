//! A linear network written as a circuit for a general-purpose circuit simulator (`ngspice`,
//! alternating-current analysis), winding by winding and wire by wire, and what that makes of it.
//!
//! Written from the documentation of `fourwire::network`; uses nothing of the solver.

use std::fmt::Write as _;
use std::process::Command;

use fourwire::math::{Complex64, PhaseMatrix};
use fourwire::network::{
    Across, BOND_OHM, Branch, BranchKind, Conductor, Connection, Network, NeutralPoint, NodeId, Transformer,
    VectorGroup, Winding,
};

/// Leak to earth of every node, ohms, without which the simulator finds no direct-current solution.
const LEAK_OHM: f64 = 1e13;

/// True where the simulator can be run.
pub fn is_installed() -> bool {
    Command::new("ngspice").arg("--version").output().is_ok_and(|o| o.status.success())
}

/// Voltages of every node, slots a, b, c, n, by the simulator.
pub fn simulate(network: &Network) -> Vec<[Complex64; 4]> {
    let mut deck = Deck { text: String::from("network\n"), count: 0, omega: 0.0 };
    deck.omega = 2.0 * std::f64::consts::PI * network.study.frequency_hz;
    deck.supply(network);
    for branch in &network.branches {
        deck.branch(network, branch);
    }
    deck.shunts(network);
    let mut wanted = Vec::new();
    for (i, node) in network.nodes.iter().enumerate() {
        for c in node.conductors.iter() {
            let name = at(NodeId(i as u32), c.slot());
            deck.element("R", &[&name, "0"], &format!("{LEAK_OHM:e}"));
            wanted.push((i, c.slot(), name));
        }
    }
    let folder = tempfile::tempdir().expect("a folder");
    let file = folder.path().join("network.cir");
    let mut control = String::from(".control\nset numdgt=16\nset filetype=ascii\n");
    let f = network.study.frequency_hz;
    let _ = writeln!(control, "ac lin 1 {f} {f}");
    for (.., name) in &wanted {
        let _ = writeln!(control, "print vr({name}) vi({name})");
    }
    control.push_str("quit\n.endc\n.end\n");
    std::fs::write(&file, format!("{}{control}", deck.text)).expect("the circuit can be written");
    let output = Command::new("ngspice").arg("-b").arg(&file).output().expect("the simulator runs");
    let said = String::from_utf8_lossy(&output.stdout);
    let value = |name: &str| -> f64 {
        let line = said.lines().find(|l| l.starts_with(name)).unwrap_or_else(|| {
            panic!("no {name} in\n{said}\n{}\n{}", String::from_utf8_lossy(&output.stderr), deck.text)
        });
        let number = line.split('=').nth(1).map(str::trim).and_then(|t| t.parse().ok());
        number.unwrap_or_else(|| panic!("{line}"))
    };
    let mut volts = vec![[Complex64::default(); 4]; network.nodes.len()];
    for (i, slot, name) in wanted {
        volts[i][slot] = Complex64::new(value(&format!("vr({name})")), value(&format!("vi({name})")));
    }
    volts
}

/// Name of a conductor of a node.
fn at(node: NodeId, slot: usize) -> String {
    format!("n{}x{slot}", node.index())
}

struct Deck {
    text: String,
    count: usize,
    omega: f64,
}

impl Deck {
    fn fresh(&mut self) -> usize {
        self.count += 1;
        self.count
    }

    fn point(&mut self) -> String {
        format!("p{}", self.fresh())
    }

    /// One element; gives its name.
    fn element(&mut self, letter: &str, nodes: &[&str], value: &str) -> String {
        let name = format!("{letter}{}", self.fresh());
        let _ = writeln!(self.text, "{name} {} {value}", nodes.join(" "));
        name
    }

    /// A joint without voltage whose current can be told; gives its name.
    fn sense(&mut self, from: &str, to: &str) -> String {
        self.element("V", &[from, to], "0")
    }

    /// Resistance and inductance in series.
    fn series(&mut self, from: &str, to: &str, ohm: Complex64) {
        let middle = self.point();
        self.element("R", &[from, &middle], &format!("{:.17e}", ohm.re));
        let henry = ohm.im / self.omega;
        self.element("L", &[&middle, to], &format!("{henry:.17e}"));
    }

    /// An admittance: resistance and inductance in series, or resistance and capacitance side by side.
    fn admittance(&mut self, from: &str, to: &str, siemens: Complex64) {
        if siemens.im < 0.0 {
            let mut ohm = siemens.inv();
            // A little resistance keeps loops of inductors apart.
            ohm.re = ohm.re.max(1e-9 * ohm.norm());
            self.series(from, to, ohm);
            return;
        }
        if siemens.re != 0.0 {
            self.element("R", &[from, to], &format!("{:.17e}", 1.0 / siemens.re));
        }
        if siemens.im > 0.0 {
            self.element("C", &[from, to], &format!("{:.17e}", siemens.im / self.omega));
        }
    }

    /// Wires with own and mutual impedance between pairs of points.
    fn coupled(&mut self, ends: &[(String, String)], z: &dyn Fn(usize, usize) -> Complex64) {
        let senses: Vec<(String, String)> = ends
            .iter()
            .map(|(from, _)| {
                let after = self.point();
                (self.sense(from, &after), after)
            })
            .collect();
        let mut coils = Vec::new();
        for (i, (_, to)) in ends.iter().enumerate() {
            let mut here = senses[i].1.clone();
            // Mutual resistance: a voltage in proportion to the other wire's current.
            for (j, (sense, _)) in senses.iter().enumerate() {
                if i != j && z(i, j).re != 0.0 {
                    let next = self.point();
                    self.element("H", &[&here, &next], &format!("{sense} {:.17e}", z(i, j).re));
                    here = next;
                }
            }
            let middle = self.point();
            self.element("R", &[&here, &middle], &format!("{:.17e}", z(i, i).re));
            let henry = z(i, i).im / self.omega;
            coils.push(self.element("L", &[&middle, to], &format!("{henry:.17e}")));
        }
        for i in 0..ends.len() {
            for j in i + 1..ends.len() {
                let k = z(i, j).im / (z(i, i).im * z(j, j).im).sqrt();
                if k != 0.0 {
                    let name = format!("K{}", self.fresh());
                    let _ = writeln!(self.text, "{name} {} {} {k:.17e}", coils[i], coils[j]);
                }
            }
        }
    }

    /// Capacitances of a susceptance matrix at one end.
    fn charging(&mut self, node: NodeId, slots: &[usize], y: &PhaseMatrix, share: f64) {
        for (i, &p) in slots.iter().enumerate() {
            let to_earth: f64 = slots.iter().map(|&q| y[(p, q)].im).sum::<f64>() * share;
            if to_earth != 0.0 {
                let farad = to_earth / self.omega;
                self.element("C", &[&at(node, p), "0"], &format!("{farad:.17e}"));
            }
            for &q in &slots[i + 1..] {
                let farad = -y[(p, q)].im * share / self.omega;
                if farad != 0.0 {
                    self.element("C", &[&at(node, p), &at(node, q)], &format!("{farad:.17e}"));
                }
            }
        }
    }

    fn supply(&mut self, network: &Network) {
        let supply = &network.supply;
        let conductors = network.node(supply.node).conductors;
        let star = if conductors.has_neutral() { at(supply.node, 3) } else { self.point() };
        let earth_ohm = supply.earth_ohm.max(1e-9);
        self.element("R", &[&star, "0"], &format!("{earth_ohm:.17e}"));
        let mut ends = Vec::new();
        for k in 0..3 {
            let held = self.point();
            let (size, turn) = supply.held_volts[k].to_polar();
            self.element("V", &[&held, &star], &format!("AC {size:.17e} {:.17e}", turn.to_degrees()));
            ends.push((held, at(supply.node, k)));
        }
        if supply.impedance.norm() == 0.0 {
            for (held, node) in &ends {
                self.sense(held, node);
            }
        } else {
            self.coupled(&ends, &|i, j| supply.impedance[(i, j)]);
        }
    }

    fn branch(&mut self, network: &Network, branch: &Branch) {
        let slots: Vec<usize> = branch.from_conductors.iter().map(Conductor::slot).collect();
        match &branch.kind {
            BranchKind::Line(line) => {
                let (z, y) = (network.line_impedance(line), network.line_shunt(line));
                let ends: Vec<_> = slots.iter().map(|&k| (at(branch.from, k), at(branch.to, k))).collect();
                self.coupled(&ends, &|i, j| z[(slots[i], slots[j])]);
                self.charging(branch.from, &slots, &y, 0.5);
                self.charging(branch.to, &slots, &y, 0.5);
            }
            BranchKind::Switch => {
                for &k in &slots {
                    self.sense(&at(branch.from, k), &at(branch.to, k));
                }
            }
            BranchKind::Regulator(bank) => {
                for &k in &slots {
                    let unit = bank.units.iter().find(|u| u.phase.slot() == k);
                    let Some(unit) = unit else {
                        self.sense(&at(branch.from, k), &at(branch.to, k));
                        continue;
                    };
                    let against = match unit.across {
                        Across::Phase(m) => at(branch.from, m.slot()),
                        Across::Neutral if branch.from_conductors.has_neutral() => at(branch.from, 3),
                        Across::Neutral => "0".to_string(),
                    };
                    let raise = unit.step_pu * f64::from(unit.tap);
                    let (from, middle) = (at(branch.from, k), self.point());
                    // The raise in series, and its current back across what it is taken from.
                    self.element("E", &[&middle, &from, &from, &against], &format!("{raise:.17e}"));
                    let sense = self.sense(&middle, &at(branch.to, k));
                    self.element("F", &[&from, &against], &format!("{sense} {raise:.17e}"));
                }
            }
            BranchKind::Transformer(t) => self.transformer(branch, t),
        }
    }

    /// Star point of a side: a conductor, earth behind an impedance, or a point of its own.
    fn star(&mut self, point: NeutralPoint, node: NodeId) -> String {
        match point {
            NeutralPoint::Conductor => at(node, 3),
            NeutralPoint::Earthed(ohm) if ohm.norm() == 0.0 => "0".to_string(),
            NeutralPoint::Earthed(ohm) => {
                let star = self.point();
                let ohm = if ohm.re == 0.0 { ohm + 1e-9 } else { ohm };
                if ohm.im == 0.0 {
                    self.element("R", &[&star, "0"], &format!("{:.17e}", ohm.re));
                } else {
                    self.series(&star, "0", ohm);
                }
                star
            }
            _ => {
                let star = self.point();
                self.element("R", &[&star, "0"], &format!("{LEAK_OHM:e}"));
                star
            }
        }
    }

    fn transformer(&mut self, branch: &Branch, t: &Transformer) {
        let mut stars = [self.star(t.from_neutral, branch.from), self.star(t.to_neutral, branch.to)];
        let auto = matches!(t.group, VectorGroup::Auto | VectorGroup::SingleAuto);
        match (t.from_neutral, t.to_neutral) {
            (NeutralPoint::Shared, _) => stars[0] = stars[1].clone(),
            (_, NeutralPoint::Shared) => stars[1] = stars[0].clone(),
            (NeutralPoint::Conductor, NeutralPoint::Conductor) if auto => {
                self.element("R", &[&stars[0], &stars[1]], &format!("{BOND_OHM:e}"));
            }
            _ => {}
        }
        let nodes = [branch.from, branch.to];
        let place = |side: usize, slot: usize| {
            if slot == 3 { stars[side].clone() } else { at(nodes[side], slot) }
        };
        for unit in t.units() {
            match unit.group {
                VectorGroup::Three { from, to, clock } => self.bank(unit, [from, to], clock, &place),
                VectorGroup::Auto => self.bank(unit, [Winding::StarNeutral; 2], 0, &place),
                _ => self.single(unit, &place),
            }
        }
    }

    /// An ideal winding that follows another: `volts(own) = volts(other) / ratio`, current returned.
    /// Between `start` and the point given back lies the winding; what comes in series follows there.
    fn winding(&mut self, other: &[String; 2], ratio: f64, end: &str) -> String {
        let (inner, start) = (self.point(), self.point());
        self.element("E", &[&inner, end, &other[0], &other[1]], &format!("{:.17e}", 1.0 / ratio));
        // Counted out of the winding.
        let sense = self.sense(&inner, &start);
        self.element("F", &[&other[0], &other[1]], &format!("{sense} {:.17e}", 1.0 / ratio));
        start
    }

    fn no_load(&mut self, t: &Transformer, units: f64, volts: f64, across: &[String; 2]) {
        let va = Complex64::new(t.no_load_watts, -t.magnetizing_pu * t.rated_va) / units;
        self.admittance(&across[0], &across[1], va / (volts * volts));
    }

    fn single(&mut self, t: &Transformer, place: &dyn Fn(usize, usize) -> String) {
        let terminals = t.terminals.expect("a single-phase unit has terminals");
        let ends = |side: usize| {
            let (p, q) = terminals[side].pairs().next().expect("one element");
            [place(side, p.slot()), place(side, q.slot())]
        };
        let z = Complex64::new(t.r_pu, t.x_pu);
        let turns = |to: f64| t.from_volts * (1.0 + t.from_tap_pu) / (to * (1.0 + t.tap_pu));
        let from = ends(0);
        self.no_load(t, 1.0, t.from_volts, &from);
        if let VectorGroup::CentreTap { clock } = t.group {
            let behind = self.point();
            let own = Complex64::new(0.5 * z.re, 0.8 * z.im) * t.from_volts * t.from_volts / t.rated_va;
            self.series(&from[0], &behind, own);
            let core = [behind, from[1].clone()];
            let half = t.to_volts / 2.0;
            let leakage = Complex64::new(z.re, 0.4 * z.im) * half * half / t.rated_va;
            let [s1, s2, n] = [place(1, 0), place(1, 1), place(1, 3)];
            for (start, end) in [(s1, n.clone()), (n, s2)] {
                let (start, end) = if clock == 6 { (end, start) } else { (start, end) };
                let inner = self.winding(&core, turns(half), &end);
                self.series(&inner, &start, leakage);
            }
            return;
        }
        let [mut start, mut end] = ends(1);
        if t.group == (VectorGroup::Single { clock: 6 }) {
            std::mem::swap(&mut start, &mut end);
        }
        let inner = self.winding(&from, turns(t.to_volts), &end);
        self.series(&inner, &start, z * t.to_volts * t.to_volts / t.rated_va);
    }

    /// Three units, by the table of connections in the documentation of `Transformer`.
    fn bank(
        &mut self,
        t: &Transformer,
        [from, to]: [Winding; 2],
        clock: u8,
        place: &dyn Fn(usize, usize) -> String,
    ) {
        let alike = from.is_star() == to.is_star();
        // Base connection, reversal of the to winding, and moves of its terminals from k to k-1.
        let (base, rest) = match (alike, clock) {
            (true, 0 | 4 | 8) => (0, clock),
            (true, _) => (6, (clock + 6) % 12),
            (false, 1 | 5 | 9) => (1, clock - 1),
            (false, _) => (11, (clock + 1) % 12),
        };
        let moves = usize::from(rest / 4);
        let next = |k: usize| (k + 1) % 3;
        let before = |k: usize| (k + 2) % 3;
        let to_slot = |k: usize| if k == 3 { 3 } else { (k + 3 - moves) % 3 };
        let spot = |side: usize, k: usize| place(side, if side == 1 { to_slot(k) } else { k });
        let volts = [t.from_volts, t.to_volts];
        let taps = [1.0 + t.from_tap_pu, 1.0 + t.tap_pu];
        let winding_volts = |w: Winding, v: f64| if w == Winding::Delta { v } else { v / 3f64.sqrt() };
        let z = Complex64::new(t.r_pu, t.x_pu);
        let flip = |side: usize, pair: [String; 2]| {
            let [a, b] = pair;
            if side == 1 && base == 6 { [b, a] } else { [a, b] }
        };
        let delta_end = |side: usize, k: usize| {
            // (k, k-1) for Dy1, Yd11 and Zd; (k, k+1) otherwise.
            let backward = match (side, base) {
                (0, 1) => !to.is_zigzag(),
                (1, 11) => true,
                (1, _) => from.is_zigzag(),
                _ => false,
            };
            if backward { before(k) } else { next(k) }
        };
        let plain = |side: usize, w: Winding, k: usize| {
            let end = if w == Winding::Delta { spot(side, delta_end(side, k)) } else { spot(side, 3) };
            flip(side, [spot(side, k), end])
        };
        let Some(zigzag) = [from, to].iter().position(|w| w.is_zigzag()) else {
            let (uf, ut) = (winding_volts(from, volts[0]), winding_volts(to, volts[1]));
            for k in 0..3 {
                let (near, [start, end]) = (plain(0, from, k), plain(1, to, k));
                let inner = self.winding(&near, uf * taps[0] / (ut * taps[1]), &end);
                self.series(&inner, &start, z * ut * ut * 3.0 / t.rated_va);
                self.no_load(t, 3.0, uf, &near);
            }
            return;
        };
        let other = 1 - zigzag;
        let other_winding = [from, to][other];
        let own_volts = winding_volts(other_winding, volts[other]);
        let half = volts[zigzag] / 3.0;
        let ratio = own_volts * taps[other] / (half * taps[zigzag]);
        let leakage = z * volts[zigzag] * volts[zigzag] / (2.0 * t.rated_va);
        let middles: Vec<String> = (0..3).map(|_| self.point()).collect();
        let windings: Vec<[String; 2]> = (0..3).map(|k| plain(other, other_winding, k)).collect();
        for k in 0..3 {
            // Terminal k: first half on unit k, second half reversed on unit j.
            let j = match (base, zigzag) {
                (1, 1) | (11, 0) => before(k),
                (11, 1) | (1, 0) => next(k),
                (_, 1) => before(k),
                _ => next(k),
            };
            let [start, end] = flip(zigzag, [spot(zigzag, k), middles[k].clone()]);
            let inner = self.winding(&windings[k], ratio, &end);
            self.series(&inner, &start, leakage);
            let [start, end] = flip(zigzag, [spot(zigzag, 3), middles[k].clone()]);
            let inner = self.winding(&windings[j], ratio, &end);
            self.series(&inner, &start, leakage);
            self.no_load(t, 3.0, own_volts, &windings[k]);
        }
    }

    fn shunts(&mut self, network: &Network) {
        for (i, node) in network.nodes.iter().enumerate() {
            let id = NodeId(i as u32);
            for (slot, y) in node.earth_admittance().into_iter().enumerate() {
                if y != Complex64::default() {
                    self.admittance(&at(id, slot), "0", y);
                }
            }
        }
        for capacitor in &network.capacitors {
            let each = capacitor.vars / capacitor.connection.elements() as f64;
            let y = Complex64::new(0.0, each / capacitor.rated_volts.powi(2));
            self.across(network, capacitor.node, capacitor.connection, y);
        }
        for load in &network.loads {
            assert_eq!(load.model.word(), "impedance", "the simulator is given linear networks");
            for (id, share) in network.load_sites(load) {
                let node = network.node(id);
                let nominal = match load.connection {
                    Connection::Star(set) if set.is_split() => node.nominal_volts / 2.0,
                    Connection::Star(_) => node.nominal_volts / 3f64.sqrt(),
                    Connection::Delta(_) => node.nominal_volts,
                };
                let each = Complex64::new(load.watts, -load.vars) * share / load.connection.elements() as f64;
                self.across(network, id, load.connection, each / (nominal * nominal));
            }
        }
    }

    fn across(&mut self, network: &Network, id: NodeId, connection: Connection, y: Complex64) {
        for (p, q) in connection.pairs() {
            let carried = network.node(id).conductors.has(q);
            let end = if carried { at(id, q.slot()) } else { "0".to_string() };
            self.admittance(&at(id, p.slot()), &end, y);
        }
    }
}
