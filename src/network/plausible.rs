//! Remarks on values that can be solved but are hardly meant: sizes far from any in use, and star
//! points earthed so weakly that single-phase loads would shift them.

use super::draft::{Draft, TransformerRecord};
use super::graph::place;
use super::load::{Load, LoadPlace};
use super::model::{BranchKind, Network};
use super::star_point::weak_star_points;
use crate::diagnostic::{Code, Diagnostics};
use crate::units::SQRT_3;

/// Longest line below 1 kV that is not remarked on, metres.
const LONGEST_LOW_VOLTAGE_M: f64 = 5_000.0;
/// Longest line from 1 kV to 52 kV, metres.
const LONGEST_MEDIUM_VOLTAGE_M: f64 = 200_000.0;
/// Nominal line-to-line voltages up to this are low voltage, volts (IEC 60038).
const LOW_VOLTAGE: f64 = 1_000.0;
/// Up to this a network is one of distribution, volts.
const MEDIUM_VOLTAGE: f64 = 52_000.0;
/// Smallest transformer that is not remarked on, volt-amperes.
const SMALLEST_RATING_VA: f64 = 500.0;
/// Loads behind a transformer may be this many times its rating.
const LOAD_OF_RATING: f64 = 4.0;
/// Rated current of one load that is not remarked on, amperes.
const LARGEST_LOAD_AMPS: f64 = 5_000.0;
/// Impedance of a transformer below this is a fraction written for a percentage, per unit.
const SMALLEST_IMPEDANCE_PU: f64 = 0.002;

/// Adds a remark for every unlikely size.
pub(super) fn sizes(draft: &Draft, network: &Network, diagnostics: &mut Diagnostics) {
    lengths(draft, network, diagnostics);
    transformers(draft, network, diagnostics);
    loads(draft, network, diagnostics);
    for record in draft.regulators.iter().filter(|r| r.step_pu < 0.001) {
        diagnostics.warning(
            Code::SuspectUnit,
            place(draft, record.origin, "step_percent", ""),
            format!("regulator {} has steps of only {} percent", record.regulator, 100.0 * record.step_pu),
            "write 0.625 for steps of 0.00625 per unit",
        );
    }
}

fn lengths(draft: &Draft, network: &Network, diagnostics: &mut Diagnostics) {
    let mut records = draft.lines.iter();
    // Lines of the network stand in the order of the draft; open ones are left out.
    for branch in &network.branches {
        let BranchKind::Line(line) = &branch.kind else { continue };
        let volts = network.node(branch.from).nominal_volts;
        let longest = match volts {
            v if v <= LOW_VOLTAGE => LONGEST_LOW_VOLTAGE_M,
            v if v <= MEDIUM_VOLTAGE => LONGEST_MEDIUM_VOLTAGE_M,
            _ => f64::INFINITY,
        };
        let record = records.find(|r| r.line == branch.name);
        if line.length_m <= longest {
            continue;
        }
        diagnostics.warning(
            Code::SuspectUnit,
            record.and_then(|r| place(draft, r.origin, "line", &r.line)),
            format!(
                "line {} is {} km long at {} kV, far more than any line of that voltage",
                branch.name,
                line.length_m / 1e3,
                volts / 1e3
            ),
            "check the unit of the length column",
        );
    }
}

fn transformers(draft: &Draft, network: &Network, diagnostics: &mut Diagnostics) {
    for record in &draft.transformers {
        one_transformer(draft, record, diagnostics);
    }
    let behind = loads_behind(network);
    for (b, branch) in network.branches.iter().enumerate() {
        let BranchKind::Transformer(t) = &branch.kind else { continue };
        let rated_va = t.rated_va + t.mates.iter().map(|m| m.rated_va).sum::<f64>();
        let (va, largest) = behind[b];
        let Some(load) = largest.map(|l| &network.loads[l]) else { continue };
        if va <= LOAD_OF_RATING * rated_va {
            continue;
        }
        let own = load.watts.hypot(load.vars);
        let record = draft.loads.iter().find(|r| r.load == load.name);
        diagnostics.warning(
            Code::SuspectUnit,
            record.and_then(|r| place(draft, r.origin, "kw", "")),
            format!(
                "loads of {:.0} kVA stand behind transformer {}, which is rated {} kVA; the largest is {} with {:.0} kVA",
                va / 1e3,
                branch.name,
                rated_va / 1e3,
                load.name,
                own / 1e3
            ),
            "check whether a load in W was written in kW, and the kva of the transformer",
        );
    }
}

fn one_transformer(draft: &Draft, record: &TransformerRecord, diagnostics: &mut Diagnostics) {
    let name = &record.transformer;
    if record.rated_va < SMALLEST_RATING_VA {
        diagnostics.warning(
            Code::SuspectUnit,
            place(draft, record.origin, "kva", ""),
            format!("transformer {name} is rated only {} VA", record.rated_va),
            format!("write {} if {} MVA is meant", record.rated_va, record.rated_va / 1e3),
        );
    }
    let z = record.r_pu.hypot(record.x_pu);
    if z < SMALLEST_IMPEDANCE_PU {
        diagnostics.warning(
            Code::SuspectUnit,
            place(draft, record.origin, "x_percent", ""),
            format!("transformer {name} has an impedance of only {:.3} percent", 100.0 * z),
            "write r_percent and x_percent in percent, not as fractions",
        );
    }
}

/// For each branch, the loads fed over it in volt-amperes and the largest of them.
fn loads_behind(network: &Network) -> Vec<(f64, Option<usize>)> {
    let mut at_node = vec![(0.0, None); network.nodes.len()];
    let add = |slot: &mut (f64, Option<usize>), va: f64, load: Option<usize>| {
        slot.0 += va;
        let size = |l: &usize| network.loads[*l].watts.hypot(network.loads[*l].vars);
        slot.1 = match (slot.1, load) {
            (Some(a), Some(b)) if size(&b) <= size(&a) => Some(a),
            (a, b) => b.or(a),
        };
    };
    for (l, load) in network.loads.iter().enumerate() {
        let node = match load.place {
            LoadPlace::Node(node) => node,
            LoadPlace::Line(line) => network.branch(line).to,
        };
        add(&mut at_node[node.index()], load.watts.hypot(load.vars), Some(l));
    }
    let mut behind = vec![(0.0, None); network.branches.len()];
    for &id in network.order.iter().rev() {
        let here = at_node[id.index()];
        let Some(feed) = network.feeds[id.index()] else { continue };
        behind[feed.branch.index()] = here;
        add(&mut at_node[feed.parent.index()], here.0, here.1);
    }
    behind
}

fn loads(draft: &Draft, network: &Network, diagnostics: &mut Diagnostics) {
    for load in &network.loads {
        let amps = rated_amps(network, load);
        if amps <= LARGEST_LOAD_AMPS {
            continue;
        }
        let record = draft.loads.iter().find(|r| r.load == load.name);
        diagnostics.warning(
            Code::SuspectUnit,
            record.and_then(|r| place(draft, r.origin, "kw", "")),
            format!("load {} draws {amps:.0} A at nominal voltage", load.name),
            format!("write {} if {} W is meant", load.watts / 1e6, load.watts / 1e3),
        );
    }
}

/// Current of a load at nominal voltage, amperes: by its phases shared equally.
fn rated_amps(network: &Network, load: &Load) -> f64 {
    let node = match load.place {
        LoadPlace::Node(node) => node,
        LoadPlace::Line(line) => network.branch(line).to,
    };
    let volts = network.node(node).nominal_volts;
    let va = load.watts.hypot(load.vars);
    match load.connection.elements() {
        1 => va / (volts / SQRT_3),
        _ => va / (volts * SQRT_3),
    }
}

/// Adds a remark for every star point earthed so weakly that loads to earth behind it would shift it.
pub(super) fn star_points(draft: &Draft, network: &Network, diagnostics: &mut Diagnostics) {
    for weak in weak_star_points(network) {
        let branch = network.branch(weak.branch);
        let column = ["earth_ohm_from", "earth_ohm_to"][usize::from(!weak.at_from)];
        let record = draft.transformers.iter().find(|r| r.transformer == branch.name);
        diagnostics.warning(
            Code::NotEarthed,
            record.and_then(|r| place(draft, r.origin, column, "")),
            format!(
                "the star point of transformer {} is earthed through {:.1} ohm, and {} behind it return{} through earth ({}), which shifts every voltage to earth",
                branch.name,
                weak.ohm,
                if weak.loads == 1 { "a single-phase load".to_string() } else { format!("{} single-phase loads", weak.loads) },
                if weak.loads == 1 { "s" } else { "" },
                weak.first
            ),
            "carry the neutral n to these loads, or check the ohms of the earthing; touch voltage and earthing are for the local code and a licensed engineer",
        );
    }
}
