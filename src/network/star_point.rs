//! Star points earthed through an impedance that single-phase loads to earth return through.

use super::load::LoadPlace;
use super::model::{BranchId, BranchKind, End, Network};
use super::transformer::{NeutralPoint, VectorGroup};

use super::conductor::Connection;
use super::draft::Name;

/// An earthing above this counts as weak whatever the loads are, ohms: it is of the kind that limits
/// earth-fault current (common practice, no source).
const WEAK_OHM: f64 = 5.0;
/// So does one over which the loads would drop this share of the nominal phase voltage.
const WEAK_SHARE: f64 = 0.05;

/// A star point that its loads would shift.
#[derive(Debug, Clone, PartialEq)]
pub struct WeakStarPoint {
    /// The transformer.
    pub branch: BranchId,
    /// True where the star point is that of the from side.
    pub at_from: bool,
    /// Magnitude of the impedance that earths it, ohms.
    pub ohm: f64,
    /// Number of single-phase loads behind it that return through earth.
    pub loads: usize,
    /// The first of them.
    pub first: Name,
}

/// Transformers whose fed side is earthed through a large impedance while single-phase loads from a
/// phase to earth hang behind it. In the order of the branches.
///
/// Such a load draws its current through the earthing, and the whole side shifts by their product;
/// three-wire systems earthed so are meant for loads between phases.
pub fn weak_star_points(network: &Network) -> Vec<WeakStarPoint> {
    let head = sides(network);
    let mut found: Vec<(WeakStarPoint, f64)> = Vec::new();
    for load in &network.loads {
        let node = match load.place {
            LoadPlace::Node(node) => node,
            LoadPlace::Line(line) => network.branch(line).to,
        };
        let Some((branch, at_from, ohm)) = head[node.index()] else { continue };
        let single = matches!(load.connection, Connection::Star(_)) && load.connection.elements() == 1;
        let volts = network.node(node).nominal_phase_volts();
        if !single || network.node(node).conductors.has_neutral() || volts <= 0.0 {
            continue;
        }
        let share = load.watts.hypot(load.vars) / volts * ohm / volts;
        match found.iter_mut().find(|(w, _)| w.branch == branch) {
            Some((weak, most)) => {
                weak.loads += 1;
                *most = most.max(share);
            }
            None => {
                let weak = WeakStarPoint { branch, at_from, ohm, loads: 1, first: load.name.clone() };
                found.push((weak, share));
            }
        }
    }
    found.retain(|(weak, share)| weak.ohm >= WEAK_OHM || *share >= WEAK_SHARE);
    found.sort_by_key(|(weak, _)| weak.branch.index());
    found.into_iter().map(|(weak, _)| weak).collect()
}

/// For each node, the transformer that begins its side, where its star point is earthed through an impedance.
fn sides(network: &Network) -> Vec<Option<(BranchId, bool, f64)>> {
    let mut head = vec![None; network.nodes.len()];
    for &id in &network.order {
        let Some(feed) = network.feeds[id.index()] else { continue };
        head[id.index()] = match &network.branch(feed.branch).kind {
            BranchKind::Transformer(t) if !matches!(t.group, VectorGroup::Auto | VectorGroup::SingleAuto) => {
                let at_from = feed.upstream == End::To;
                match if at_from { t.from_neutral } else { t.to_neutral } {
                    NeutralPoint::Earthed(z) if z.norm() > 0.0 => Some((feed.branch, at_from, z.norm())),
                    _ => None,
                }
            }
            _ => head[feed.parent.index()],
        };
    }
    head
}
