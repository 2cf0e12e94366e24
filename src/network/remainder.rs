//! What meters read against what is known to be drawn behind them, before any flow is solved.

use std::collections::HashMap;

use super::build::Builder;
use super::conductor::Conductor;
use super::draft::Name;
use super::graph::place;
use super::load::{Load, LoadModel};
use super::meter::{Channel, Meter, Reading, ShareRecord};
use super::metering::Metered;
use super::zone::{Zones, phases_at};
use crate::diagnostic::{Code, Origin};

impl Builder<'_> {
    /// What is known to be drawn behind a meter must not exceed what it reads.
    pub(super) fn check_remainders(
        &mut self,
        zones: &Zones,
        network: &Metered<'_>,
        pieces: &[(Load, Name)],
        shares: &HashMap<&str, &ShareRecord>,
        meters: &[Meter],
        origins: &[Vec<Option<Origin>>],
    ) {
        for (index, meter) in meters.iter().enumerate() {
            for (channel, c) in meter.channels.iter().enumerate() {
                let Reading::Watts(watts) = c.reading else { continue };
                let fixed: f64 = pieces
                    .iter()
                    .filter(|(l, owner)| {
                        zones.meter_of(l) == Some(index)
                            && !shares.contains_key(&**owner)
                            && l.model == LoadModel::Power
                    })
                    .map(|(l, _)| {
                        let Some(phase) = c.phase else { return l.watts };
                        let parts = phases_at(network.parts, network.feeds, zones, index, l);
                        parts.iter().filter(|(p, _)| *p == phase).map(|(_, part)| part * l.watts).sum()
                    })
                    .sum();
                let inner: Option<f64> =
                    meters.iter().filter(|m| m.outer == Some(index)).map(|m| read(m, c.phase)).sum();
                // A sum of nothing is -0.
                let (fixed, inner) = (fixed + 0.0, inner.unwrap_or(0.0) + 0.0);
                let known = fixed + inner;
                if known <= watts {
                    continue;
                }
                let origin = origins.get(index).and_then(|o| o.get(channel)).copied().flatten();
                self.diagnostics.error(
                    Code::NegativeRemainder,
                    place(self.draft, origin, "kw", &(watts / 1e3).to_string()),
                    format!(
                        "meter {}{} reads {:.3} kW, but known loads ({:.3} kW) and meters ({:.3} kW) behind it already take {:.3} kW more",
                        meter.name,
                        c.phase.map_or(String::new(), |p| format!(", phase {p},")),
                        watts / 1e3,
                        fixed / 1e3,
                        inner / 1e3,
                        (known - watts) / 1e3
                    ),
                    "check the readings and that they are of the same time, or the kw of the loads without a share",
                );
            }
        }
    }
}

/// Power an inner meter reads of an outer one's channel; `None` where that is not known beforehand.
fn read(inner: &Meter, phase: Option<Conductor>) -> Option<f64> {
    let watts = |c: &Channel| match c.reading {
        Reading::Watts(watts) => Some(watts),
        Reading::Amps(_) => None,
    };
    match phase {
        None => inner.channels.iter().map(watts).sum(),
        // Behind a transformer the phases are others.
        Some(_) => None,
    }
}
