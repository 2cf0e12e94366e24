//! The loads of a network after allocation, as a table.

use serde::Serialize;

use crate::network::{Load, LoadPlace, Name, Network};

/// A load with the power it was given.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct AllocatedLoad {
    /// Load; under a meter that reads each phase, one a phase of a load on several.
    pub load: Name,
    /// Node, where it is at one.
    pub node: Option<Name>,
    /// Line, where it is spread along one.
    pub line: Option<Name>,
    /// Connection, as in `loads.csv`.
    pub phases: String,
    /// Active power at nominal voltage, kilowatts.
    pub kw: f64,
    /// Reactive power at nominal voltage, kilovars.
    pub kvar: f64,
    /// Load model.
    pub model: &'static str,
    /// Meter whose reading it shares; none for a load whose power is known.
    pub meter: Option<Name>,
    /// Its part of what the loads of that meter get together, percent.
    pub share_percent: Option<f64>,
}

/// Every load of an allocated network, in the order of the network.
pub fn allocated_loads(network: &Network) -> Vec<AllocatedLoad> {
    let mut shares = vec![None; network.loads.len()];
    for meter in &network.meters {
        let total: f64 = shared_watts(network, meter);
        for share in meter.channels.iter().flat_map(|c| &c.shares) {
            if let (Some(slot), Some(load)) = (shares.get_mut(share.load), network.loads.get(share.load)) {
                let percent = if total != 0.0 { 100.0 * load.watts / total } else { 0.0 };
                *slot = Some((meter.name.clone(), percent));
            }
        }
    }
    network.loads.iter().zip(shares).map(|(load, share)| row(network, load, share)).collect()
}

/// Power that all loads sharing a meter get, watts.
fn shared_watts(network: &Network, meter: &crate::network::Meter) -> f64 {
    let mut loads: Vec<usize> = meter.channels.iter().flat_map(|c| &c.shares).map(|s| s.load).collect();
    loads.sort_unstable();
    loads.dedup();
    loads.into_iter().filter_map(|l| network.loads.get(l)).map(|l| l.watts).sum()
}

fn row(network: &Network, load: &Load, share: Option<(Name, f64)>) -> AllocatedLoad {
    let (node, line) = match load.place {
        LoadPlace::Node(id) => (Some(network.node(id).name.clone()), None),
        LoadPlace::Line(id) => (None, Some(network.branch(id).name.clone())),
    };
    let (meter, share_percent) = share.unzip();
    AllocatedLoad {
        load: load.name.clone(),
        node,
        line,
        phases: load.connection.to_string(),
        kw: load.watts / 1e3,
        kvar: load.vars / 1e3,
        model: load.model.word(),
        meter,
        share_percent,
    }
}
