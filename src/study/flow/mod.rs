//! What a solved network says: voltages, currents, losses, totals, and findings against the limits.
//!
//! [`FlowReport`] is the result record of `flow`: its fields and their names are those of the
//! result files. Voltages are to remote earth, currents positive from `from` to `to` at both ends.

mod controls;
mod electrodes;
mod findings;
mod generation;
mod losses;
mod motors;
mod places;

use serde::Serialize;

use crate::math::{Complex64, PhaseVector, degrees, unbalance_factor};
use crate::network::{Conductor, Conductors, LoadPlace, Name, Network, Node, NodeId};
use crate::solver::{Controls, RegulatedUnit, Solution, Status, generator_pu, load_current};
use crate::study::allocation::MeterRead;

pub use controls::{CapacitorStatus, RegulatorTap};
pub use electrodes::Electrode;
pub use findings::{Finding, FindingSeverity, Rule};
pub use generation::GeneratorRun;
pub use losses::Totals;
pub use motors::MotorRun;
pub use places::{Extreme, Glance, lowest_judged};

/// Voltage of one conductor of a node.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct NodeVoltage {
    /// Node.
    pub node: Name,
    /// Conductor letter.
    pub conductor: &'static str,
    /// Voltage to remote earth, volts.
    pub volts: f64,
    /// Its angle, degrees.
    pub degrees: f64,
    /// Per unit of nominal line-to-line over sqrt 3; none for the neutral.
    pub pu: Option<f64>,
}

/// Current of one conductor at both ends of an element.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ElementCurrent {
    /// Line, switch, regulator or transformer; for an electrode the node it stands at, or the transformer it earths.
    pub element: Name,
    /// `line`, `switch`, `regulator`, `transformer` or `electrode`.
    pub kind: &'static str,
    /// Conductor letter.
    pub conductor: &'static str,
    /// Current at the from end, amperes.
    pub from_amps: f64,
    /// Its angle, degrees.
    pub from_degrees: f64,
    /// Current at the to end, amperes.
    pub to_amps: f64,
    /// Its angle, degrees.
    pub to_degrees: f64,
}

/// Loss and loading of one element.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ElementLoss {
    /// Element, as in [`ElementCurrent`].
    pub element: Name,
    /// Kind, as in [`ElementCurrent`].
    pub kind: &'static str,
    /// Active loss, kilowatts.
    pub loss_kw: f64,
    /// Reactive loss, kilovars; charging counts negative.
    pub loss_kvar: f64,
    /// Largest phase current as a share of the rating, percent; none without a rating.
    pub rating_percent: Option<f64>,
}

/// Unbalance and neutral voltage of one node.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct NodeSummary {
    /// Node.
    pub node: Name,
    /// Voltage unbalance factor `|V2|/|V1|`, percent; none where not all three phases are carried.
    pub unbalance_percent: Option<f64>,
    /// Voltage of the neutral to remote earth, volts; none without a neutral.
    pub neutral_volts: Option<f64>,
}

/// Power and current drawn from the supply in one conductor.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SourceConductor {
    /// Conductor letter.
    pub conductor: &'static str,
    /// Active power, kilowatts.
    pub kw: f64,
    /// Reactive power, kilovars.
    pub kvar: f64,
    /// Current, amperes.
    pub amps: f64,
    /// Its angle, degrees.
    pub degrees: f64,
}

/// What one load draws at the solved voltages.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct LoadDraw {
    /// Load.
    pub load: Name,
    /// Node, or line it is spread along.
    pub at: Name,
    /// Active power drawn, kilowatts.
    pub kw: f64,
    /// Reactive power drawn, kilovars.
    pub kvar: f64,
    /// Lowest voltage across its elements, per unit of nominal.
    pub lowest_pu: f64,
    /// True for a constant-power load below the floor, which has turned towards constant impedance.
    pub below_floor: bool,
}

/// All results of one solved network.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct FlowReport {
    /// Version of the program.
    pub fourwire: &'static str,
    /// Name of the network.
    pub network: String,
    /// SHA-256 of the input files.
    pub input_sha256: String,
    /// Time of the profiles that loads and capacitors are taken at; none: as their rows say.
    pub at: Option<Name>,
    /// True where both convergence tests were met.
    pub converged: bool,
    /// Iterations made.
    pub iterations: usize,
    /// Largest current mismatch found by the independent check, amperes.
    pub mismatch_a: f64,
    /// Voltages.
    pub nodes: Vec<NodeVoltage>,
    /// Currents.
    pub currents: Vec<ElementCurrent>,
    /// Losses and loading.
    pub elements: Vec<ElementLoss>,
    /// Unbalance and neutral voltages.
    pub nodes_summary: Vec<NodeSummary>,
    /// Supply by conductor.
    pub source: Vec<SourceConductor>,
    /// Totals.
    pub totals: Totals,
    /// False where a regulator or capacitor hunts: the state shown is one of several it passes through.
    pub controls_settled: bool,
    /// Regulator taps.
    pub regulators: Vec<RegulatorTap>,
    /// Capacitors.
    pub capacitors: Vec<CapacitorStatus>,
    /// Loads as drawn.
    pub loads: Vec<LoadDraw>,
    /// Generators in service.
    pub generators: Vec<GeneratorRun>,
    /// Running motors.
    pub motors: Vec<MotorRun>,
    /// Meters that loads were shared to meet; empty where there are none.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub meters: Vec<MeterRead>,
    /// Earth electrodes, of neutrals and of star points.
    pub electrodes: Vec<Electrode>,
    /// Limits exceeded and other remarks, worst first within a rule.
    pub findings: Vec<Finding>,
    /// Extremes for the summary; the lists above hold the same numbers.
    #[serde(skip)]
    pub glance: Glance,
}

impl FlowReport {
    /// Gathers the results of a converged solution; `None` for one that did not
    /// converge, or in which a generator does not deliver what its curves ask for.
    ///
    /// `units` is how the automatic regulators ended; empty where all taps are held.
    pub fn new(
        network: &Network,
        solution: &Solution,
        units: &[RegulatedUnit],
        input_sha256: &str,
    ) -> Option<FlowReport> {
        let controls = Controls { units: units.to_vec(), capacitors: Vec::new() };
        FlowReport::controlled(network, solution, &controls, input_sha256)
    }

    /// As [`FlowReport::new`], with how the switched capacitors ended too.
    pub fn controlled(
        network: &Network,
        solution: &Solution,
        controls: &Controls,
        input_sha256: &str,
    ) -> Option<FlowReport> {
        if solution.status != Status::Converged || !curves_met(network, solution) {
            return None;
        }
        let loads = loads(network, solution);
        let electrodes = electrodes::electrodes(network, solution);
        let elements = losses::elements(network, solution, &electrodes);
        let motors = motors::motors(network, solution);
        let generators = generation::generators(network, solution);
        let mut totals = losses::totals(network, solution, &elements, &loads, &motors);
        totals.generation_kw = generators.iter().map(|g| g.kw).sum();
        totals.generation_kvar = generators.iter().map(|g| g.kvar).sum();
        let nodes_summary = nodes_summary(network, solution);
        let regulators = controls::regulators(network, &controls.units);
        let glance = places::glance(network, solution, &elements, &nodes_summary);
        let seen = findings::Seen {
            electrodes: &electrodes,
            motors: &motors,
            generators: &generators,
            network,
            solution,
            elements: &elements,
            nodes: &nodes_summary,
            loads: &loads,
            controls,
            totals: &totals,
        };
        let findings = findings::all(&seen);
        Some(FlowReport {
            fourwire: env!("CARGO_PKG_VERSION"),
            network: network.study.name.clone(),
            input_sha256: input_sha256.to_owned(),
            at: network.at.clone(),
            converged: true,
            iterations: solution.iterations,
            mismatch_a: solution.mismatch_amps,
            nodes: nodes(network, solution),
            currents: currents(network, solution),
            elements,
            nodes_summary,
            source: source(network, solution),
            totals,
            controls_settled: controls::settled(controls),
            regulators,
            capacitors: controls::capacitors(network, &controls.capacitors),
            loads,
            generators,
            motors,
            meters: Vec::new(),
            electrodes,
            findings,
            glance,
        })
    }

    /// The report with the meters that the loads were shared to meet.
    #[must_use]
    pub fn with_meters(self, meters: Vec<MeterRead>) -> FlowReport {
        FlowReport { meters, ..self }
    }

    /// True where a limit of the study is exceeded.
    pub fn exceeds_a_limit(&self) -> bool {
        self.findings.iter().any(|f| f.limit.is_some())
    }
}

fn nodes(network: &Network, solution: &Solution) -> Vec<NodeVoltage> {
    let mut rows = Vec::with_capacity(4 * network.nodes.len());
    for (node, volts) in network.nodes.iter().zip(&solution.volts) {
        for c in node.conductors.iter() {
            let v = volts[c.slot()];
            rows.push(NodeVoltage {
                node: node.name.clone(),
                conductor: c.letter(),
                volts: v.norm(),
                degrees: degrees(v),
                pu: (c != Conductor::N).then(|| v.norm() / node.nominal_phase_volts()),
            });
        }
    }
    rows
}

fn currents(network: &Network, solution: &Solution) -> Vec<ElementCurrent> {
    let mut rows = Vec::with_capacity(4 * network.branches.len());
    for (b, branch) in network.branches.iter().enumerate() {
        let (from, to) = (&solution.from_amps[b], &solution.to_amps[b]);
        for c in branch.from_conductors.union(branch.to_conductors).iter() {
            rows.push(current(&branch.name, branch.kind.word(), c, from[c.slot()], to[c.slot()]));
        }
    }
    for (node, volts) in network.nodes.iter().zip(&solution.volts) {
        if let Some(ohm) = node.earth_ohm {
            let amps = volts[Conductor::N.slot()] / ohm;
            rows.push(current(&node.name, "electrode", Conductor::N, amps, amps));
        }
    }
    rows
}

fn current(
    element: &Name,
    kind: &'static str,
    c: Conductor,
    from: Complex64,
    to: Complex64,
) -> ElementCurrent {
    ElementCurrent {
        element: element.clone(),
        kind,
        conductor: c.letter(),
        from_amps: from.norm(),
        from_degrees: degrees(from),
        to_amps: to.norm(),
        to_degrees: degrees(to),
    }
}

/// Voltage of each phase as a load between phase and neutral sees it: to `n` where carried, else to earth.
pub(super) fn phase_volts(node: &Node, volts: &PhaseVector) -> [Complex64; 3] {
    let n = if node.conductors.has_neutral() { volts[Conductor::N.slot()] } else { Complex64::default() };
    [volts[0] - n, volts[1] - n, volts[2] - n]
}

/// Whether every generator delivers what its curves ask for at the voltage it sees.
fn curves_met(network: &Network, solution: &Solution) -> bool {
    network.generators.iter().all(|g| {
        let wanted = g.output(generator_pu(network, solution, g)).power;
        !g.follows_voltage() || (wanted - g.delivering).norm() <= 1e-6 * wanted.norm().max(g.watts)
    })
}

fn nodes_summary(network: &Network, solution: &Solution) -> Vec<NodeSummary> {
    let row = |(node, volts): (&Node, &PhaseVector)| {
        let [a, b, c] = phase_volts(node, volts);
        let three = Conductors::ABC.is_subset_of(node.conductors);
        NodeSummary {
            node: node.name.clone(),
            unbalance_percent: if three { unbalance_factor(a, b, c) } else { None },
            neutral_volts: node.conductors.has_neutral().then(|| volts[Conductor::N.slot()].norm()),
        }
    };
    network.nodes.iter().zip(&solution.volts).map(row).collect()
}

fn source(network: &Network, solution: &Solution) -> Vec<SourceConductor> {
    let id = network.supply.node;
    let volts = &solution.volts[id.index()];
    let row = |c: Conductor| {
        let amps = solution.source_amps[c.slot()];
        let power = volts[c.slot()] * amps.conj() / 1e3;
        SourceConductor {
            conductor: c.letter(),
            kw: power.re,
            kvar: power.im,
            amps: amps.norm(),
            degrees: degrees(amps),
        }
    };
    network.node(id).conductors.iter().map(row).collect()
}

fn loads(network: &Network, solution: &Solution) -> Vec<LoadDraw> {
    let floor = network.study.constant_power_floor_percent / 100.0;
    network
        .loads
        .iter()
        .map(|load| {
            let each = Complex64::new(load.watts, load.vars) / load.connection.elements().max(1) as f64;
            let (mut power, mut lowest_pu) = (Complex64::default(), f64::INFINITY);
            for (id, share) in network.load_sites(load) {
                let nominal = network.node(id).nominal_across(load.connection);
                for u in element_volts(network, solution, id, load.connection) {
                    power += u * load_current(load.model, each * share, nominal, floor, u).conj();
                    lowest_pu = lowest_pu.min(u.norm() / nominal);
                }
            }
            let at = match load.place {
                LoadPlace::Node(id) => network.node(id).name.clone(),
                LoadPlace::Line(id) => network.branch(id).name.clone(),
            };
            let below_floor =
                load.model == crate::network::LoadModel::Power && lowest_pu < floor && each.norm() > 0.0;
            LoadDraw {
                load: load.name.clone(),
                at,
                kw: power.re / 1e3,
                kvar: power.im / 1e3,
                lowest_pu,
                below_floor,
            }
        })
        .collect()
}

/// Voltages across the elements of a load or capacitor at a node.
pub(super) fn element_volts(
    network: &Network,
    solution: &Solution,
    id: NodeId,
    connection: crate::network::Connection,
) -> impl Iterator<Item = Complex64> {
    let (node, volts) = (network.node(id), solution.volts[id.index()]);
    let conductors = node.conductors;
    let at = move |c: Conductor| if conductors.has(c) { volts[c.slot()] } else { Complex64::default() };
    connection.pairs().map(move |(p, q)| at(p) - at(q))
}
