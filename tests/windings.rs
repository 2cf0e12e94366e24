//! Every vector group, fed from either end: against the nodal method under unbalanced load, and
//! against the definition of the clock number.

#[path = "support/compare.rs"]
mod compare;
#[path = "support/nodal.rs"]
mod nodal;

use compare::compare;
use fourwire::math::{Complex64, PhaseMatrix};
use fourwire::network::{
    Conductor, Conductors, Connection, Construction, Draft, FaultLevel, LineRecord, LoadModel, LoadRecord,
    LoadSite, Network, NodeRecord, SupplyRecord, SwitchState, TransformerRecord, VectorGroup, Winding, build,
};
use fourwire::solver::{Settings, Status, solve};

const HIGH_VOLTS: f64 = 12_470.0;
const LOW_VOLTS: f64 = 480.0;
const TAP_PU: f64 = 0.025;

/// One transformer and how it stands in its feeder.
#[derive(Clone, Copy, Debug)]
struct Case {
    group: VectorGroup,
    /// `None` for a bank.
    terminals: Option<Connection>,
    /// Whether the from end is towards the source.
    forward: bool,
    /// Whether star points are joined to a neutral conductor, where they have one.
    wired: bool,
    no_load_shunt: bool,
    loaded: bool,
}

impl Case {
    /// Windings towards the source and away from it; `None` for a single-phase unit.
    fn near_and_far(&self) -> Option<(Winding, Winding)> {
        match self.group {
            VectorGroup::Three { from, to, .. } => Some(if self.forward { (from, to) } else { (to, from) }),
            _ => None,
        }
    }

    fn near_conductors(&self) -> Conductors {
        if self.wired { Conductors::ABCN } else { Conductors::ABC }
    }

    fn far_conductors(&self) -> Conductors {
        let star = match (self.near_and_far(), self.terminals) {
            (Some((_, far)), _) => far.has_neutral(),
            (None, Some(Connection::Star(_))) => true,
            _ => false,
        };
        let phases = self.terminals.map_or(Conductors::ABC, Connection::phases);
        if star && self.wired { phases.with(Conductor::N) } else { phases }
    }

    /// Whether a load from phase to neutral has a way back on the far side.
    fn takes_star_loads(&self) -> bool {
        match (self.near_and_far(), self.terminals) {
            (Some((near, far)), _) => {
                far == Winding::ZigzagNeutral
                    || far == Winding::StarNeutral && near != Winding::Star && !near.is_zigzag()
            }
            (None, Some(Connection::Star(_))) => true,
            _ => false,
        }
    }

    fn draft(&self) -> Draft {
        let mut draft = Draft::default();
        let level = |volt_amperes, x_over_r| Some(FaultLevel { volt_amperes, x_over_r });
        draft.supplies.push(SupplyRecord {
            node: "S".into(),
            nominal_volts: HIGH_VOLTS,
            held_pu: if self.loaded { [1.03, 1.0, 1.02] } else { [1.0; 3] },
            angle_rad: 0.2,
            three_phase: if self.loaded { level(150e6, 6.0) } else { None },
            single_phase: if self.loaded { level(100e6, 4.0) } else { None },
            earth_ohm: 0.4,
            origin: None,
        });
        let (near, far) = (self.near_conductors(), self.far_conductors());
        line(&mut draft, "high", ["S", "A"], near, 900.0);
        line(&mut draft, "low", ["B", "C"], far, 40.0);
        self.transformer(&mut draft);
        if self.wired {
            electrode(&mut draft, "S", 2.0);
            electrode(&mut draft, "A", 20.0);
        }
        if far.has_neutral() {
            electrode(&mut draft, "B", 5.0);
            electrode(&mut draft, "C", 30.0);
        }
        if self.loaded {
            self.loads(&mut draft);
        }
        draft
    }

    fn transformer(&self, draft: &mut Draft) {
        let single_to_earth = matches!(self.terminals, Some(Connection::Star(_)));
        let winding = |volts: f64| if single_to_earth { volts / 3f64.sqrt() } else { volts };
        let (high, low) = (winding(HIGH_VOLTS), winding(LOW_VOLTS));
        let (from_volts, to_volts) = if self.forward { (high, low) } else { (low, high) };
        let (from, to) = if self.forward { ("A", "B") } else { ("B", "A") };
        // Earthing by ohms only where a star point goes to earth.
        let ohms = |winding: Winding, carried: Conductors, ohm: f64| {
            (winding.has_neutral() && !carried.has_neutral()).then_some(Complex64::from(ohm))
        };
        let (near_ohm, far_ohm) = self.near_and_far().map_or((None, None), |(near, far)| {
            (ohms(near, self.near_conductors(), 3.0), ohms(far, self.far_conductors(), 0.7))
        });
        let (from_earth_ohm, to_earth_ohm) =
            if self.forward { (near_ohm, far_ohm) } else { (far_ohm, near_ohm) };
        draft.transformers.push(TransformerRecord {
            transformer: "T".into(),
            from: from.into(),
            to: to.into(),
            rated_va: if self.terminals.is_some() { 100e3 } else { 300e3 },
            from_volts,
            to_volts,
            group: self.group,
            terminals: self.terminals.map(|t| [t; 2]),
            r_pu: 0.012,
            x_pu: 0.045,
            no_load_watts: if self.no_load_shunt { 700.0 } else { 0.0 },
            magnetizing_pu: if self.no_load_shunt { 0.006 } else { 0.0 },
            tap_pu: TAP_PU,
            from_tap_pu: 0.0,
            from_earth_ohm,
            to_earth_ohm,
            origin: None,
        });
    }

    /// Unequal loads of every model, phase to phase everywhere and phase to neutral where they have a way back.
    fn loads(&self, draft: &mut Draft) {
        let far = self.terminals.map_or(Conductors::ABC, Connection::phases);
        let models = [LoadModel::Power, LoadModel::Current, LoadModel::Impedance];
        for (k, phase) in far.phases().iter().enumerate() {
            let one = Conductors::NONE.with(phase);
            if far.has(phase.next()) && phase.next() != phase {
                load(
                    draft,
                    format!("delta {k}"),
                    "C",
                    Connection::Delta(one),
                    9e3 + 7e3 * k as f64,
                    models[k],
                );
            }
            if self.takes_star_loads() {
                let model = models[(k + 1) % 3];
                load(draft, format!("star {k}"), "C", Connection::Star(one), 14e3 - 5e3 * k as f64, model);
                load(
                    draft,
                    format!("near star {k}"),
                    "B",
                    Connection::Star(one),
                    3e3 * k as f64 + 1e3,
                    models[k],
                );
            }
        }
        let one = Conductors::NONE.with(Conductor::B);
        load(draft, "high".into(), "A", Connection::Delta(one), 60e3, LoadModel::Power);
    }

    fn network(&self) -> Network {
        let built = build(&self.draft());
        built.network.unwrap_or_else(|| panic!("{self:?}: {:?}", built.diagnostics.items()))
    }
}

fn electrode(draft: &mut Draft, node: &str, ohm: f64) {
    draft.nodes.push(NodeRecord { node: node.into(), xy: None, earth_ohm: Some(ohm), origin: None });
}

/// Coupled wires of invented but likely impedance.
fn line(draft: &mut Draft, name: &str, ends: [&str; 2], conductors: Conductors, length_m: f64) {
    let entry =
        |i: usize, j: usize| match (conductors.has(Conductor::ALL[i]), conductors.has(Conductor::ALL[j])) {
            (true, true) if i == j => Complex64::new(0.31 + 0.02 * i as f64, 0.75 + 0.01 * i as f64) / 1e3,
            (true, true) => Complex64::new(0.05, 0.30 + 0.02 * (i + j) as f64) / 1e3,
            _ => Complex64::default(),
        };
    draft.constructions.push(Construction {
        name: name.into(),
        conductors,
        z_per_m: PhaseMatrix::from_fn(entry),
        y_per_m: PhaseMatrix::zeros(),
        rating_amps: None,
        origin: None,
    });
    draft.lines.push(LineRecord {
        line: name.into(),
        from: ends[0].into(),
        to: ends[1].into(),
        conductors,
        length_m,
        construction: name.into(),
        sets: 1,
        rating_amps: None,
        state: SwitchState::Closed,
        origin: None,
    });
}

fn load(draft: &mut Draft, name: String, node: &str, connection: Connection, watts: f64, model: LoadModel) {
    draft.loads.push(LoadRecord {
        load: name.as_str().into(),
        site: LoadSite::Node(node.into()),
        connection,
        watts,
        vars: 0.4 * watts,
        model,
        profile: None,
        origin: None,
    });
}

/// The 126 groups of a three-phase bank, and a unit of either polarity on every pair of terminals.
fn groups() -> Vec<(VectorGroup, Option<Connection>)> {
    use Winding::{Delta, Star, StarNeutral, Zigzag, ZigzagNeutral};
    let windings = [Star, StarNeutral, Delta, Zigzag, ZigzagNeutral];
    let mut all = Vec::new();
    for from in windings {
        for to in windings.into_iter().filter(|to| !(from.is_zigzag() && to.is_zigzag())) {
            let odd = u8::from(from.is_star() != to.is_star());
            all.extend((0..6).map(|k| (VectorGroup::Three { from, to, clock: 2 * k + odd }, None)));
        }
    }
    for clock in [0, 6] {
        for phase in Conductor::PHASES {
            let one = Conductors::NONE.with(phase);
            let group = VectorGroup::Single { clock };
            all.extend([(group, Some(Connection::Star(one))), (group, Some(Connection::Delta(one)))]);
        }
    }
    all
}

fn cases(loaded: bool) -> Vec<Case> {
    let mut all = Vec::new();
    for (group, terminals) in groups() {
        for bits in 0..8 {
            let (forward, wired, no_load_shunt) = (bits & 1 == 0, bits & 2 == 0, bits & 4 == 0);
            all.push(Case { group, terminals, forward, wired, no_load_shunt, loaded });
        }
    }
    all
}

#[test]
fn every_group_agrees_with_the_nodal_method() {
    let cases = cases(true);
    assert_eq!(cases.len(), 8 * (126 + 12));
    let mut worst = 0.0f64;
    for case in cases {
        let found = compare(&format!("{case:?}"), &case.network());
        worst = worst.max(found.worst_pu);
    }
    println!("worst {worst:.1e} of nominal");
}

/// Unloaded, the to side lags the from side by 30 degrees for each hour of the clock, between
/// phases and where both stars are earthed also from phase to earth, and its voltage is the
/// turns' (IEC 60076-1, clause 7, from memory).
#[test]
fn unloaded_the_clock_number_is_the_lag() {
    for case in cases(false).into_iter().filter(|c| !c.no_load_shunt) {
        let network = case.network();
        let solution = solve(&network, &Settings::default());
        assert_eq!(solution.status, Status::Converged, "{case:?}");
        let bank = network.branches.iter().find(|b| b.kind.word() == "transformer").expect("a transformer");
        let across = |node: fourwire::network::NodeId, p: Conductor, q: Conductor| {
            let v = solution.volts[node.index()];
            v[p.slot()] - v[q.slot()]
        };
        let (VectorGroup::Three { clock, .. } | VectorGroup::Single { clock }) = case.group else { continue };
        let pairs: Vec<(Conductor, Conductor)> = match case.terminals {
            None => Conductor::PHASES.map(|p| (p, p.next())).to_vec(),
            Some(connection) => connection.pairs().collect(),
        };
        let record = &case.draft().transformers[0];
        let turns = record.to_volts * (1.0 + TAP_PU) / record.from_volts;
        for (p, q) in pairs {
            let found = across(bank.to, p, q) / across(bank.from, p, q);
            let expected = Complex64::from_polar(turns, -f64::from(clock) * std::f64::consts::PI / 6.0);
            // A side without earth draws a ten-thousandth of the rating through its reference.
            let off = (found / expected - 1.0).norm();
            assert!(off < 2e-5, "{case:?} {p}{q}: {found} instead of {expected}, {off:e}");
        }
    }
}
