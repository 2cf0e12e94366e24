//! Random radial networks as drafts: one to four wires, earthed neutrals, every winding, every load.
//!
//! The same seed gives the same network. Only combinations that make sense electrically are made:
//! no load from phase to earth on a side that nothing earths.

use fourwire::math::{Complex64, PhaseMatrix};
use fourwire::network::{
    Across, CapacitorRecord, Conductor, Conductors, Connection, Construction, Draft, FaultLevel, LineRecord,
    LoadModel, LoadRecord, LoadSite, NodeRecord, RegulatorControl, RegulatorRecord, SupplyRecord,
    SwitchRecord, SwitchState, TransformerRecord, VectorGroup, Winding,
};
use rand::rngs::StdRng;
use rand::{RngExt, SeedableRng};

/// A node while the network grows.
#[derive(Clone)]
struct Spot {
    name: String,
    conductors: Conductors,
    /// Nominal line-to-line voltage, volts.
    volts: f64,
    /// Whether something earths the phases of its side firmly, and unbalanced current has a way back.
    held: bool,
    /// Rating of what feeds its side, volt-amperes.
    rating: f64,
    /// Whether the neutral of its side is a wire earthed by electrodes only: a load from phase to
    /// earth would return through these, which nobody builds.
    wired_return: bool,
    /// Number of its galvanic side.
    side: usize,
}

struct Grower {
    rng: StdRng,
    draft: Draft,
    spots: Vec<Spot>,
    charging: bool,
    /// Share of a side's rating that all loads together may reach.
    loading: f64,
}

/// A random network of 2 to 40 nodes.
#[allow(dead_code)] // tests of rings use the other
pub fn random_draft(seed: u64) -> Draft {
    let mut rng = StdRng::seed_from_u64(seed);
    let nodes = rng.random_range(2..=40);
    let charging = rng.random_bool(0.5);
    // One network in eight is so heavy that some loads fall below the floor of constant power.
    let loading = if rng.random_bool(0.125) { 1.5 } else { rng.random_range(0.1..0.8) };
    let mut grower = Grower { rng, draft: Draft::default(), spots: Vec::new(), charging, loading };
    grower.supply();
    while grower.spots.len() < nodes {
        grower.extend();
    }
    grower.loads(nodes);
    grower.draft
}

/// The same with up to `loops` rings: lines and switches between nodes of one side, and transformers in parallel.
#[allow(dead_code)] // only tests of rings use it
pub fn random_ringed_draft(seed: u64, loops: usize) -> Draft {
    let mut rng = StdRng::seed_from_u64(seed);
    let nodes = rng.random_range(5..=40);
    let charging = rng.random_bool(0.5);
    let loading = rng.random_range(0.1..0.6);
    let mut grower = Grower { rng, draft: Draft::default(), spots: Vec::new(), charging, loading };
    grower.supply();
    while grower.spots.len() < nodes {
        grower.extend();
    }
    grower.loads(nodes);
    for tie in 0..loops {
        grower.tie(tie);
    }
    grower.draft
}

impl Grower {
    fn tie(&mut self, tie: usize) {
        if self.chance(0.15) && !self.draft.transformers.is_empty() {
            let i = self.rng.random_range(0..self.draft.transformers.len());
            let mut twin = self.draft.transformers[i].clone();
            twin.transformer = format!("{} twin {tie}", twin.transformer).into();
            twin.x_pu *= self.between(0.8, 1.3);
            self.draft.transformers.push(twin);
            return;
        }
        let (i, j) = (self.rng.random_range(0..self.spots.len()), self.rng.random_range(0..self.spots.len()));
        let (one, two) = (self.spots[i].clone(), self.spots[j].clone());
        let common = one.conductors.intersection(two.conductors);
        if i == j || one.side != two.side || common.phases().is_empty() {
            return;
        }
        let spot = Spot { name: one.name.clone(), conductors: common, ..one };
        // The helpers draw a branch to a new node; its end is then put to the other one.
        let name = format!("tie {tie}");
        if self.chance(0.2) {
            self.switch(&spot, name.clone());
        } else {
            self.line(&spot, name.clone());
        }
        let ends = self.draft.lines.iter_mut().map(|l| (&mut l.from, &mut l.to));
        let switches = self.draft.switches.iter_mut().map(|q| (&mut q.from, &mut q.to));
        for end in ends.chain(switches).flat_map(|(from, to)| [from, to]) {
            if **end == *name {
                *end = two.name.as_str().into();
            }
        }
        self.draft.nodes.retain(|n| *n.node != *name);
    }

    fn chance(&mut self, probability: f64) -> bool {
        self.rng.random_bool(probability)
    }

    fn between(&mut self, low: f64, high: f64) -> f64 {
        self.rng.random_range(low..high)
    }

    fn pick<T: Copy>(&mut self, from: &[T]) -> T {
        from[self.rng.random_range(0..from.len())]
    }

    fn supply(&mut self) {
        let volts = self.pick(&[12_470.0, 11_000.0]);
        let neutral = self.chance(0.6);
        let stiff = self.chance(0.3);
        let level = FaultLevel { volt_amperes: self.between(50e6, 300e6), x_over_r: self.between(1.0, 10.0) };
        let single = FaultLevel {
            volt_amperes: level.volt_amperes * self.between(0.3, 1.2),
            x_over_r: level.x_over_r * self.between(0.8, 1.0),
        };
        let earth_ohm = if self.chance(0.5) { 0.0 } else { self.between(0.1, 5.0) };
        self.draft.study.frequency_hz = 60.0;
        let held_pu = [self.between(0.98, 1.05), self.between(0.98, 1.05), self.between(0.98, 1.05)];
        let angle_rad = self.between(-1.0, 1.0);
        self.draft.supplies.push(SupplyRecord {
            node: "S".into(),
            nominal_volts: volts,
            held_pu,
            angle_rad,
            three_phase: (!stiff).then_some(level),
            single_phase: (!stiff && self.rng.random_bool(0.5)).then_some(single),
            earth_ohm,
            origin: None,
        });
        let conductors = if neutral { Conductors::ABCN } else { Conductors::ABC };
        if neutral {
            self.electrode("S");
        }
        self.spots.push(Spot {
            name: "S".into(),
            conductors,
            volts,
            held: true,
            rating: 4e6,
            wired_return: false,
            side: 0,
        });
    }

    fn electrode(&mut self, node: &str) {
        let earth_ohm = Some(self.between(1.0, 100.0));
        self.draft.nodes.push(NodeRecord { node: node.into(), xy: None, earth_ohm, origin: None });
    }

    fn extend(&mut self) {
        let at = self.rng.random_range(0..self.spots.len());
        let parent = self.spots[at].clone();
        let name = format!("N{}", self.spots.len());
        let sides = self.draft.transformers.len();
        let mut spot = match self.rng.random_range(0..100) {
            0..8 => self.switch(&parent, name),
            8..16 if !parent.conductors.is_split() => self.regulator(&parent, name),
            16..32 => self.transformer(&parent, name),
            _ => self.line(&parent, name),
        };
        if self.draft.transformers.len() > sides {
            spot.side = self.draft.transformers.len();
        }
        self.spots.push(spot);
    }

    /// Some of the parent's conductors: at least one phase, mostly the neutral too.
    fn subset(&mut self, of: Conductors) -> Conductors {
        let phases: Vec<Conductor> = of.phases().iter().collect();
        let keep_all = self.chance(0.5);
        let mut set: Conductors =
            phases.iter().copied().filter(|_| keep_all || self.rng.random_bool(0.5)).collect();
        if set.is_empty() {
            set = set.with(self.pick(&phases));
        }
        if of.has_neutral() && self.chance(0.8) { set.with(Conductor::N) } else { set }
    }

    fn ends(&mut self, parent: &Spot, name: &str) -> (String, String) {
        if self.chance(0.7) { (parent.name.clone(), name.into()) } else { (name.into(), parent.name.clone()) }
    }

    fn line(&mut self, parent: &Spot, name: String) -> Spot {
        let conductors = self.subset(parent.conductors);
        let construction = format!("c{name}");
        let (z_per_m, y_per_m) = self.matrices(conductors);
        self.draft.constructions.push(Construction {
            name: construction.as_str().into(),
            conductors,
            z_per_m,
            y_per_m,
            rating_amps: None,
            origin: None,
        });
        let high = parent.volts > 2000.0;
        let length_m = if high { self.between(50.0, 1500.0) } else { self.between(5.0, 60.0) };
        let (from, to) = self.ends(parent, &name);
        let sets = self.pick(&[1, 1, 1, 2]);
        self.draft.lines.push(LineRecord {
            line: format!("L{name}").into(),
            from: from.into(),
            to: to.into(),
            conductors,
            length_m,
            construction: construction.into(),
            sets,
            rating_amps: None,
            state: SwitchState::Closed,
            origin: None,
        });
        if conductors.has_neutral() && self.chance(0.4) {
            self.electrode(&name);
        }
        Spot { name, conductors, ..parent.clone() }
    }

    /// Coupled impedance with positive definite resistance, and charging in half of the networks.
    fn matrices(&mut self, conductors: Conductors) -> (PhaseMatrix, PhaseMatrix) {
        let (mut z, mut y) = (PhaseMatrix::zeros(), PhaseMatrix::zeros());
        for p in conductors.iter() {
            for q in conductors.iter().filter(|q| *q >= p) {
                let (i, j) = (p.slot(), q.slot());
                let own = i == j;
                let ohm_per_km = if own {
                    Complex64::new(self.between(0.15, 0.8), self.between(0.7, 0.95))
                } else {
                    Complex64::new(self.between(0.04, 0.06), self.between(0.25, 0.5))
                };
                let siemens_per_km =
                    if own { self.between(2.5e-6, 5e-6) } else { -self.between(0.2e-6, 0.7e-6) };
                for (row, column) in [(i, j), (j, i)] {
                    z[(row, column)] = ohm_per_km / 1e3;
                    if self.charging {
                        y[(row, column)] = Complex64::new(0.0, siemens_per_km / 1e3);
                    }
                }
            }
        }
        (z, y)
    }

    fn switch(&mut self, parent: &Spot, name: String) -> Spot {
        let conductors = self.subset(parent.conductors);
        let (from, to) = self.ends(parent, &name);
        self.draft.switches.push(SwitchRecord {
            switch: format!("Q{name}").into(),
            from: from.into(),
            to: to.into(),
            conductors,
            state: SwitchState::Closed,
            origin: None,
        });
        Spot { name, conductors, ..parent.clone() }
    }

    fn regulator(&mut self, parent: &Spot, name: String) -> Spot {
        let phases: Vec<Conductor> = parent.conductors.phases().iter().collect();
        let open_delta = phases.len() == 3 && (!parent.held || self.chance(0.3));
        if !open_delta && !parent.held {
            return self.line(parent, name);
        }
        let (from, to) = self.ends(parent, &name);
        let units: Vec<(Conductors, Across)> = if open_delta {
            // Rows a across b and c across b, or another pair in rotation.
            let middle = self.pick(&phases);
            let others = phases.iter().filter(|&&p| p != middle);
            others.map(|&p| (Conductors::NONE.with(p), Across::Phase(middle))).collect()
        } else {
            vec![(phases.iter().copied().collect(), Across::Neutral)]
        };
        for (set, across) in units {
            let taps = [0; 3].map(|_: i32| Some(self.rng.random_range(-16..=16)));
            self.draft.regulators.push(RegulatorRecord {
                regulator: format!("R{name}").into(),
                from: from.as_str().into(),
                to: to.as_str().into(),
                phases: set,
                across,
                taps,
                step_pu: 0.00625,
                steps: 16,
                control: RegulatorControl::default(),
                origin: None,
            });
        }
        Spot { name, ..parent.clone() }
    }

    fn transformer(&mut self, parent: &Spot, name: String) -> Spot {
        let three = Conductors::ABC.is_subset_of(parent.conductors);
        let far_volts = match parent.volts {
            v if v > 8000.0 => self.pick(&[4160.0, 480.0, 400.0]),
            v if v > 2000.0 => 480.0,
            _ => 208.0,
        };
        let rating = match far_volts {
            v if v > 2000.0 => 1.5e6,
            v if v > 300.0 => 300e3,
            _ => 60e3,
        };
        if parent.conductors.is_split() {
            return self.line(parent, name);
        }
        match self.rng.random_range(0..100) {
            0..50 if three => self.bank(parent, name, far_volts, rating),
            50..60 if three && parent.held => self.auto(parent, name, far_volts, rating),
            60..72 if three => self.units(parent, name, far_volts, rating),
            72..86 => self.centre_tap(parent, name),
            _ => self.unit(parent, name, far_volts, rating / 3.0),
        }
    }

    /// An autotransformer in star.
    fn auto(&mut self, parent: &Spot, name: String, far_volts: f64, rating: f64) -> Spot {
        let carries_neutral = self.chance(0.6);
        let forward = self.chance(0.7);
        let (from, to) =
            if forward { (parent.name.clone(), name.clone()) } else { (name.clone(), parent.name.clone()) };
        let mut record = self.record(&name, from, to, rating);
        record.group = VectorGroup::Auto;
        (record.from_volts, record.to_volts) =
            if forward { (parent.volts, far_volts) } else { (far_volts, parent.volts) };
        if !parent.conductors.has_neutral() && !carries_neutral && self.chance(0.5) {
            record.from_earth_ohm = Some(self.earthing());
        }
        self.draft.transformers.push(record);
        if carries_neutral {
            self.electrode(&name);
        }
        let conductors = if carries_neutral { Conductors::ABCN } else { Conductors::ABC };
        // Without an earth on either side the neutral follows the parent's.
        let wired_return = carries_neutral || parent.conductors.has_neutral();
        Spot { name, conductors, volts: far_volts, held: true, rating, wired_return, side: 0 }
    }

    /// Two or three unequal single-phase units as one bank: open star, open delta and the like.
    fn units(&mut self, parent: &Spot, name: String, far_volts: f64, rating: f64) -> Spot {
        let [near_star, far_star] = [parent.held && self.chance(0.6), self.chance(0.5)];
        let join = |star: bool, phase: Conductor| {
            let set = Conductors::NONE.with(phase);
            if star { Connection::Star(set) } else { Connection::Delta(set) }
        };
        let count = if self.chance(0.7) { 2 } else { 3 };
        let volts = |star: bool, line: f64| if star { line / 3f64.sqrt() } else { line };
        let mut far_phases = Conductors::NONE;
        for (k, phase) in Conductor::PHASES.into_iter().take(count).enumerate() {
            let mut record = self.record(&name, parent.name.clone(), name.clone(), rating / 3.0);
            record.transformer = format!("T{name}{k}").into();
            record.rated_va *= self.between(0.5, 1.0);
            record.group = VectorGroup::Single { clock: 0 };
            record.tap_pu = 0.0;
            record.terminals = Some([join(near_star, phase), join(far_star, phase)]);
            (record.from_volts, record.to_volts) =
                (volts(near_star, parent.volts), volts(far_star, far_volts));
            far_phases = far_phases.union(join(far_star, phase).phases());
            self.draft.transformers.push(record);
        }
        let carries_neutral = far_star && self.chance(0.6);
        if carries_neutral {
            self.electrode(&name);
        }
        let conductors = if carries_neutral { far_phases.with(Conductor::N) } else { far_phases };
        let wired_return = carries_neutral;
        Spot { name, conductors, volts: far_volts, held: far_star, rating, wired_return, side: 0 }
    }

    /// A single-phase unit with two halves and a point between them.
    fn centre_tap(&mut self, parent: &Spot, name: String) -> Spot {
        let phases: Vec<Conductor> = parent.conductors.phases().iter().collect();
        let pairs: Vec<Conductor> =
            phases.iter().copied().filter(|p| parent.conductors.has(p.next())).collect();
        let across = !pairs.is_empty() && (!parent.held || self.chance(0.4));
        if !across && !parent.held {
            return self.line(parent, name);
        }
        let start = if across { self.pick(&pairs) } else { self.pick(&phases) };
        let set = Conductors::NONE.with(start);
        let near = if across { Connection::Delta(set) } else { Connection::Star(set) };
        let mut record = self.record(&name, parent.name.clone(), name.clone(), 30e3);
        record.group = VectorGroup::CentreTap { clock: self.pick(&[0, 0, 6]) };
        record.terminals = Some([near, Connection::Star(Conductors::S1S2)]);
        record.from_volts = if across { parent.volts } else { parent.volts / 3f64.sqrt() };
        let volts = self.pick(&[240.0, 460.0]);
        record.to_volts = volts;
        self.draft.transformers.push(record);
        let earthed = self.chance(0.8);
        if earthed {
            self.electrode(&name);
        }
        let conductors = Conductors::S1S2.with(Conductor::N);
        Spot { name, conductors, volts, held: true, rating: 30e3, wired_return: true, side: 0 }
    }

    /// Resistance or reactance between a star point and earth.
    fn earthing(&mut self) -> Complex64 {
        let ohm = self.between(0.1, 20.0);
        if self.chance(0.3) { Complex64::new(0.0, ohm) } else { Complex64::from(ohm) }
    }

    fn record(&mut self, name: &str, from: String, to: String, rated_va: f64) -> TransformerRecord {
        let no_load = self.chance(0.5);
        TransformerRecord {
            transformer: format!("T{name}").into(),
            from: from.into(),
            to: to.into(),
            rated_va,
            from_volts: 0.0,
            to_volts: 0.0,
            group: VectorGroup::Single { clock: 0 },
            terminals: None,
            r_pu: self.between(0.005, 0.02),
            x_pu: self.between(0.02, 0.07),
            no_load_watts: if no_load { rated_va * self.between(0.001, 0.003) } else { 0.0 },
            magnetizing_pu: if no_load { self.between(0.002, 0.01) } else { 0.0 },
            tap_pu: self.pick(&[0.0, 0.025, -0.05, 0.05]),
            from_tap_pu: self.pick(&[0.0, 0.0, -0.025, 0.05]),
            from_earth_ohm: None,
            to_earth_ohm: None,
            origin: None,
        }
    }

    fn bank(&mut self, parent: &Spot, name: String, far_volts: f64, rating: f64) -> Spot {
        use Winding::{Delta, Star, StarNeutral, Zigzag, ZigzagNeutral};
        let near =
            self.pick(&[Star, Star, StarNeutral, StarNeutral, Delta, Delta, Delta, Zigzag, ZigzagNeutral]);
        let far = if near.is_zigzag() {
            self.pick(&[Star, StarNeutral, Delta])
        } else {
            self.pick(&[
                Star,
                Star,
                StarNeutral,
                StarNeutral,
                StarNeutral,
                Delta,
                Delta,
                Zigzag,
                ZigzagNeutral,
            ])
        };
        // A star point earthed on a side that nothing else earths would be its only, and a poor, earth.
        let near = if near.has_neutral() && !parent.held { Delta } else { near };
        let alike = near.is_star() == far.is_star();
        let clock = self.pick(if alike { &[0, 2, 4, 6, 8, 10] } else { &[1, 3, 5, 7, 9, 11] });
        let carries_neutral = far.has_neutral() && self.chance(0.6);
        let forward = self.chance(0.7);
        let (from, to) =
            if forward { (parent.name.clone(), name.clone()) } else { (name.clone(), parent.name.clone()) };
        let mut record = self.record(&name, from, to, rating);
        let near_earth = (near.has_neutral() && !parent.conductors.has_neutral() && self.chance(0.5))
            .then(|| self.earthing());
        let far_earth = (far.has_neutral() && !carries_neutral && self.chance(0.5)).then(|| self.earthing());
        (record.from_volts, record.to_volts) =
            if forward { (parent.volts, far_volts) } else { (far_volts, parent.volts) };
        (record.from_earth_ohm, record.to_earth_ohm) =
            if forward { (near_earth, far_earth) } else { (far_earth, near_earth) };
        let (first, second) = if forward { (near, far) } else { (far, near) };
        record.group = VectorGroup::Three { from: first, to: second, clock };
        self.draft.transformers.push(record);
        if carries_neutral {
            self.electrode(&name);
        }
        let conductors = if carries_neutral { Conductors::ABCN } else { Conductors::ABC };
        Spot {
            name,
            conductors,
            volts: far_volts,
            held: far == ZigzagNeutral || far == StarNeutral && near != Star && !near.is_zigzag(),
            rating,
            wired_return: carries_neutral,
            side: 0,
        }
    }

    fn unit(&mut self, parent: &Spot, name: String, far_volts: f64, rating: f64) -> Spot {
        let phases: Vec<Conductor> = parent.conductors.phases().iter().collect();
        let pairs: Vec<Conductor> =
            phases.iter().copied().filter(|p| parent.conductors.has(p.next())).collect();
        let across = !pairs.is_empty() && (!parent.held || self.chance(0.4));
        if !across && !parent.held {
            return self.line(parent, name);
        }
        let start = if across { self.pick(&pairs) } else { self.pick(&phases) };
        let set = Conductors::NONE.with(start);
        let near = if across { Connection::Delta(set) } else { Connection::Star(set) };
        // One unit in three has other terminals on its far side.
        let far_across = if self.chance(0.3) { !across } else { across };
        let terminals = if far_across { Connection::Delta(set) } else { Connection::Star(set) };
        let (from, to) = (parent.name.clone(), name.clone());
        let mut record = self.record(&name, from, to, rating);
        let auto = !across && !far_across && self.chance(0.2);
        record.group =
            if auto { VectorGroup::SingleAuto } else { VectorGroup::Single { clock: self.pick(&[0, 6]) } };
        record.terminals = Some([near, terminals]);
        let volts = |across: bool, line: f64| if across { line } else { line / 3f64.sqrt() };
        (record.from_volts, record.to_volts) = (volts(across, parent.volts), volts(far_across, far_volts));
        self.draft.transformers.push(record);
        let carries_neutral = !far_across && self.chance(0.6);
        if carries_neutral {
            self.electrode(&name);
        }
        let conductors = match terminals {
            Connection::Star(_) if carries_neutral => set.with(Conductor::N),
            Connection::Star(_) => set,
            Connection::Delta(_) => set.with(start.next()),
        };
        let wired_return = carries_neutral;
        Spot { name, conductors, volts: far_volts, held: !far_across, rating, wired_return, side: 0 }
    }

    fn loads(&mut self, nodes: usize) {
        let spots = self.spots.clone();
        for (i, spot) in spots.iter().enumerate().skip(1) {
            if self.chance(0.75) {
                let share = self.loading * spot.rating / (nodes as f64).max(4.0);
                let site = LoadSite::Node(spot.name.as_str().into());
                self.load(format!("D{i}"), site, spot, spot.conductors, share);
            }
            if self.chance(0.1) {
                self.capacitor(i, spot);
            }
        }
        let lines: Vec<(String, Conductors, String)> =
            self.draft.lines.iter().map(|l| (l.line.to_string(), l.conductors, l.from.to_string())).collect();
        for (line, conductors, from) in lines {
            if !self.chance(0.1) {
                continue;
            }
            let Some(spot) = spots.iter().find(|s| s.name == from) else { continue };
            let share = self.loading * spot.rating / (nodes as f64).max(4.0);
            self.load(format!("D{line}"), LoadSite::Line(line.as_str().into()), spot, conductors, share);
        }
    }

    /// A connection that the conductors allow; none where only a load to earth would be left on a side without earth.
    fn connection(&mut self, spot: &Spot, conductors: Conductors) -> Option<Connection> {
        let phases = conductors.phases();
        let pairs: Conductors =
            phases.iter().filter(|p| phases.has(p.next()) && *p != Conductor::S2).collect();
        let by_earth = !spot.conductors.has_neutral() && !spot.wired_return;
        let star = spot.held && (conductors.has_neutral() || by_earth);
        match (star, pairs.is_empty()) {
            (false, true) => None,
            (true, false) if self.chance(0.3) => Some(Connection::Delta(pairs)),
            (true, _) => Some(Connection::Star(phases)),
            (false, false) => Some(Connection::Delta(pairs)),
        }
    }

    fn load(&mut self, load: String, site: LoadSite, spot: &Spot, conductors: Conductors, share: f64) {
        let Some(connection) = self.connection(spot, conductors) else { return };
        let va = share * self.between(0.3, 1.7);
        let pf: f64 = self.between(0.7, 1.0);
        let sign = if self.chance(0.9) { 1.0 } else { -1.0 };
        let model =
            self.pick(&[LoadModel::Power, LoadModel::Power, LoadModel::Current, LoadModel::Impedance]);
        self.draft.loads.push(LoadRecord {
            load: load.into(),
            site,
            connection,
            watts: va * pf,
            vars: sign * va * (1.0 - pf * pf).sqrt(),
            model,
            profile: None,
            origin: None,
        });
    }

    fn capacitor(&mut self, i: usize, spot: &Spot) {
        let Some(connection) = self.connection(spot, spot.conductors) else { return };
        let vars = spot.rating * self.between(0.005, 0.03);
        self.draft.capacitors.push(CapacitorRecord {
            capacitor: format!("C{i}").into(),
            node: spot.name.as_str().into(),
            connection,
            vars,
            rated_volts: None,
            state: SwitchState::Closed,
            origin: None,
        });
    }
}
