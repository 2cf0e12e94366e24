//! Earth electrodes: at the neutrals of nodes, and at the star points of transformers.

use serde::Serialize;

use crate::math::{Complex64, PhaseVector};
use crate::network::{BranchKind, Conductor, Name, Network, NeutralPoint};
use crate::solver::Solution;

/// What one earth electrode carries.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Electrode {
    /// Node it stands at.
    pub node: Name,
    /// Transformer whose neutral point it earths; none for the electrode of a node's neutral.
    pub transformer: Option<Name>,
    /// Its resistance, ohms.
    pub r_ohm: f64,
    /// Its reactance, ohms; zero but for an earthing reactor.
    pub x_ohm: f64,
    /// Current into earth, amperes.
    pub amps: f64,
    /// Voltage to remote earth, volts.
    pub volts: f64,
}

/// Every electrode with an impedance: those of nodes in their order, then those of transformers.
pub(super) fn electrodes(network: &Network, solution: &Solution) -> Vec<Electrode> {
    let at_nodes = network.nodes.iter().zip(&solution.volts).filter_map(|(node, volts)| {
        let ohm = node.earth_ohm?;
        let volts = volts[Conductor::N.slot()].norm();
        Some(Electrode {
            node: node.name.clone(),
            transformer: None,
            r_ohm: ohm,
            x_ohm: 0.0,
            amps: volts / ohm,
            volts,
        })
    });
    let at_transformers = network.branches.iter().enumerate().flat_map(|(b, branch)| {
        let points = match &branch.kind {
            BranchKind::Transformer(t) => [t.from_neutral, t.to_neutral],
            _ => [NeutralPoint::None; 2],
        };
        // What the phases bring to the star point goes to earth; an autotransformer's point is that of both sides.
        let into = |amps: &PhaseVector| amps[0] + amps[1] + amps[2];
        let (from, to) = (into(&solution.from_amps[b]), -into(&solution.to_amps[b]));
        let shared = points.contains(&NeutralPoint::Shared);
        let sides = if shared { [from + to; 2] } else { [from, to] };
        let nodes = [branch.from, branch.to];
        (0..2).filter_map(move |k| {
            let NeutralPoint::Earthed(ohm) = points[k] else { return None };
            (ohm != Complex64::default()).then(|| Electrode {
                node: network.node(nodes[k]).name.clone(),
                transformer: Some(branch.name.clone()),
                r_ohm: ohm.re,
                x_ohm: ohm.im,
                amps: sides[k].norm(),
                volts: (sides[k] * ohm).norm(),
            })
        })
    });
    at_nodes.chain(at_transformers).collect()
}
