//! Capacitors of the network from the records of the draft, and where their controls measure.

use super::branches::Branches;
use super::build::{Builder, Joined};
use super::conductor::{Conductors, Connection};
use super::draft::{CapacitorControl, CapacitorRecord, Sense};
use super::graph::place;
use super::load::{Capacitor, CapacitorBank, CapacitorSwitch};
use super::model::{BranchId, NodeId, nominal_phase_volts};
use crate::diagnostic::{Code, nearest};

/// Thresholds outside these shares of nominal voltage can only be a slip of ratio or unit.
const PLAUSIBLE: std::ops::RangeInclusive<f64> = 0.5..=1.5;

impl Builder<'_> {
    pub(super) fn capacitors(
        &mut self,
        joined: &Joined,
        new_node: &[Option<NodeId>],
        parts: &Branches,
    ) -> Vec<CapacitorBank> {
        let draft = self.draft;
        let mut banks = Vec::new();
        for record in &draft.capacitors {
            let who = format!("capacitor {} is at", record.capacitor);
            let Some(node) = self.shunt_node(joined, &record.node, &who, record.connection, record.origin)
            else {
                continue;
            };
            let Some(id) = new_node[node] else { continue };
            let nominal = nominal_across(joined, node, record.connection);
            let rated_volts = record.rated_volts.unwrap_or(nominal);
            self.check_rated(record, rated_volts, nominal);
            let Some(switch) = self.capacitor_switch(joined, parts, node, record) else { continue };
            let capacitor = Capacitor {
                name: record.capacitor.clone(),
                node: id,
                connection: record.connection,
                vars: record.vars,
                rated_volts,
            };
            banks.push(CapacitorBank { capacitor, state: record.state, switch, delay_s: record.delay_s });
        }
        banks
    }

    fn check_rated(&mut self, record: &CapacitorRecord, rated_volts: f64, nominal: f64) {
        if (0.75..=1.4).contains(&(rated_volts / nominal)) {
            return;
        }
        self.diagnostics.error(
            Code::VoltageMismatch,
            place(self.draft, record.origin, "kv", &(rated_volts / 1e3).to_string()),
            format!(
                "capacitor {} is rated {} kV across each unit, which is joined at {:.4} kV",
                record.capacitor,
                rated_volts / 1e3,
                nominal / 1e3
            ),
            "give the voltage across one unit: phase-to-neutral for a star, line-to-line for a delta",
        );
    }

    fn capacitor_switch(
        &mut self,
        joined: &Joined,
        parts: &Branches,
        node: usize,
        record: &CapacitorRecord,
    ) -> Option<CapacitorSwitch> {
        Some(match &record.control {
            CapacitorControl::Fixed => CapacitorSwitch::Fixed,
            CapacitorControl::Profile(_) => CapacitorSwitch::Profile,
            &CapacitorControl::Voltage { on_volts, off_volts, pt_ratio, across } => {
                self.check_voltage_sense(joined, node, record, (on_volts, off_volts), pt_ratio, across);
                CapacitorSwitch::Voltage { on_volts, off_volts, pt_ratio, across }
            }
            CapacitorControl::Kvar { on_vars, off_vars, sense } => {
                let line = self.sense_line(joined, parts, record, sense)?;
                let (on_vars, off_vars, phases) = (*on_vars, *off_vars, sense.phases);
                CapacitorSwitch::Kvar { on_vars, off_vars, line, phases }
            }
            CapacitorControl::Current { on_amps, off_amps, sense } => {
                let line = self.sense_line(joined, parts, record, sense)?;
                let (on_amps, off_amps, phases) = (*on_amps, *off_amps, sense.phases);
                CapacitorSwitch::Current { on_amps, off_amps, line, phases }
            }
        })
    }

    fn check_voltage_sense(
        &mut self,
        joined: &Joined,
        node: usize,
        record: &CapacitorRecord,
        (on_volts, off_volts): (f64, f64),
        pt_ratio: f64,
        across: Connection,
    ) {
        let name = &record.capacitor;
        let at_node = joined.carried.conductors[node];
        if !across.phases().is_subset_of(at_node) {
            self.sense_phase_missing(record, across.phases(), &format!("node {}", record.node), at_node);
            return;
        }
        let nominal = nominal_across(joined, node, across);
        for (column, volts) in [("on_v", on_volts), ("off_v", off_volts)] {
            if !PLAUSIBLE.contains(&(volts * pt_ratio / nominal)) {
                self.diagnostics.error(
                    Code::VoltageMismatch,
                    place(self.draft, record.origin, column, &volts.to_string()),
                    format!(
                        "capacitor {name} switches at {volts} V times a ratio of {pt_ratio}, but {across} of node {} is nominally {nominal:.1} V",
                        record.node
                    ),
                    format!("at that voltage the relay sees {:.2} V; check `{column}` and `pt_ratio`", nominal / pt_ratio),
                );
            }
        }
    }

    fn sense_line(
        &mut self,
        joined: &Joined,
        parts: &Branches,
        record: &CapacitorRecord,
        sense: &Sense,
    ) -> Option<BranchId> {
        let name = &record.capacitor;
        let at = |draft| place(draft, record.origin, "sense_line", &sense.line);
        let Some(&b) = parts.lines.get(&sense.line) else {
            let cure = match nearest(&sense.line, parts.lines.keys().map(|n| &**n)) {
                Some(near) => format!("did you mean {near:?}?"),
                None => "give the name of a line in lines.csv".to_string(),
            };
            let message =
                format!("capacitor {name} is switched by line {:?}, which does not exist", sense.line);
            self.diagnostics.error(Code::UnknownLine, at(self.draft), message, cure);
            return None;
        };
        let Some(id) = parts.new_branch[b] else {
            let message =
                format!("capacitor {name} is switched by line {}, which carries nothing", sense.line);
            let cure = "name a line that is closed and fed, or write `fixed` in `control`";
            self.diagnostics.error(Code::SwitchedOff, at(self.draft), message, cure);
            return None;
        };
        let carried = joined.carried.ends[b][0];
        if !sense.phases.is_subset_of(carried) {
            self.sense_phase_missing(record, sense.phases, &format!("line {}", sense.line), carried);
            return None;
        }
        Some(id)
    }

    fn sense_phase_missing(
        &mut self,
        record: &CapacitorRecord,
        wanted: Conductors,
        what: &str,
        carried: Conductors,
    ) {
        self.diagnostics.error(
            Code::PhaseNotCarried,
            place(self.draft, record.origin, "sense_phase", &wanted.to_string()),
            format!(
                "capacitor {} measures phase {wanted} of {what}, which carries only {carried}",
                record.capacitor
            ),
            format!("name one of the phases {} in `sense_phase`", carried.phases()),
        );
    }
}

fn nominal_across(joined: &Joined, node: usize, connection: Connection) -> f64 {
    let line_to_line = joined.carried.nominal_volts[node];
    match connection {
        Connection::Star(_) => nominal_phase_volts(joined.carried.conductors[node], line_to_line),
        Connection::Delta(_) => line_to_line,
    }
}
