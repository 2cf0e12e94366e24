//! Regulators and capacitors with their state, and why they are in it.

use serde::Serialize;

use crate::network::{
    BranchKind, CapacitorBank, CapacitorSwitch, Name, Network, Regulator, RegulatorUnit, ReverseFlow,
    SwitchState, TapMode,
};
use crate::solver::{CapacitorState, Controls, PowerFlow, RegulatedUnit, SwitchedCapacitor, TapState};

/// Tap of one regulator phase.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct RegulatorTap {
    /// Regulator.
    pub regulator: Name,
    /// Phase letter.
    pub phase: &'static str,
    /// Tap, steps.
    pub tap: i32,
    /// True where the control set it.
    pub automatic: bool,
    /// True where it stands at the end of its range, outside its band.
    pub at_limit: bool,
    /// `held`, `settled`, `end of range`, `voltage limit`, `hunting`, `held in reverse flow` or
    /// `neutral in reverse flow`.
    pub state: &'static str,
    /// Why it stands there, in words with numbers.
    pub why: String,
}

/// One capacitor: in service or not, and why.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct CapacitorStatus {
    /// Capacitor.
    pub capacitor: Name,
    /// Node.
    pub node: Name,
    /// `closed` or `open`.
    pub state: &'static str,
    /// `fixed`, `voltage`, `kvar`, `current` or `profile`.
    pub control: &'static str,
    /// True where it switched on and off without end: its state is not to be relied on.
    pub hunting: bool,
    /// Why it is in that state, in words with numbers.
    pub why: String,
}

/// True where no control hunts.
pub(super) fn settled(controls: &Controls) -> bool {
    controls.units.iter().all(|u| u.state != TapState::Hunting)
        && controls.capacitors.iter().all(|c| c.state != CapacitorState::Hunting)
}

/// Every regulated phase.
pub(super) fn regulators(network: &Network, units: &[RegulatedUnit]) -> Vec<RegulatorTap> {
    let mut rows = Vec::new();
    for (b, branch) in network.branches.iter().enumerate() {
        let BranchKind::Regulator(bank) = &branch.kind else { continue };
        for (u, unit) in bank.units.iter().enumerate() {
            let leader = leader(bank, u, unit);
            let ended = units.iter().find(|r| r.branch.index() == b && r.unit == leader);
            let (state, mut why) = match ended {
                Some(ended) => (state_word(ended.state), why(unit, ended)),
                None if unit.mode == TapMode::Held => ("held", "its tap is given".to_owned()),
                None => ("held", "its control was not run".to_owned()),
            };
            if let TapMode::Follows(phase) = unit.mode {
                why = format!("follows phase {phase}: {why}");
            }
            rows.push(RegulatorTap {
                regulator: unit.name.clone(),
                phase: unit.phase.letter(),
                tap: unit.tap,
                automatic: unit.mode != TapMode::Held,
                at_limit: ended.is_some_and(|r| r.state == TapState::AtLimit),
                state,
                why,
            });
        }
    }
    rows
}

/// Index of the unit whose control moves this one.
fn leader(bank: &Regulator, own: usize, unit: &RegulatorUnit) -> usize {
    match unit.mode {
        TapMode::Follows(phase) => bank.units.iter().position(|u| u.phase == phase).unwrap_or(own),
        TapMode::Held | TapMode::Automatic => own,
    }
}

fn state_word(state: TapState) -> &'static str {
    match state {
        TapState::Settled => "settled",
        TapState::AtLimit => "end of range",
        TapState::VoltageLimit => "voltage limit",
        TapState::Hunting => "hunting",
        TapState::Reversed => "held in reverse flow",
        TapState::ReversedNeutral => "neutral in reverse flow",
    }
}

/// Why a unit ended as it did.
pub(super) fn why(unit: &RegulatorUnit, ended: &RegulatedUnit) -> String {
    let (set, side) = match (ended.flow, unit.control.reverse) {
        (PowerFlow::Backward, ReverseFlow::Regulate { set_volts }) => {
            (Some(set_volts), ", power flows backwards: source side regulated")
        }
        (PowerFlow::Backward, ReverseFlow::Ignore) => {
            (unit.control.set_volts, ", power flows backwards: ignored")
        }
        _ => (unit.control.set_volts, ""),
    };
    let band = unit.control.band_volts.unwrap_or(0.0);
    let relay = ended.relay_volts;
    let wanted = match set {
        Some(set) => format!("{set} V and {} V each way", band / 2.0),
        None => "its set voltage".to_owned(),
    };
    match ended.state {
        TapState::Settled => format!("{relay:.2} V at its relay, within {wanted}{side}"),
        TapState::AtLimit => format!(
            "at the end of its range and still outside its band ({relay:.2} V at its relay, wanted {wanted}{side})"
        ),
        TapState::VoltageLimit => format!(
            "below its band: a step more would lift its own terminals, at {:.2} V, beyond the first customer's limit of {} V ({relay:.2} V at its relay, wanted {wanted})",
            ended.terminal_volts,
            unit.control.limit_volts.unwrap_or(0.0)
        ),
        TapState::Hunting => format!(
            "hunts: no tap holds it within its band ({relay:.2} V at its relay, wanted {wanted}{side})"
        ),
        TapState::Reversed => format!("power flows backwards; its tap was held ({relay:.2} V at its relay)"),
        TapState::ReversedNeutral => {
            format!("power flows backwards; it stands at neutral ({relay:.2} V at its relay)")
        }
    }
}

/// Every capacitor.
pub(super) fn capacitors(network: &Network, switched: &[SwitchedCapacitor]) -> Vec<CapacitorStatus> {
    let row = |(i, bank): (usize, &CapacitorBank)| {
        let ended = switched.iter().find(|c| c.bank == i);
        CapacitorStatus {
            capacitor: bank.capacitor.name.clone(),
            node: network.node(bank.capacitor.node).name.clone(),
            state: if bank.state == SwitchState::Closed { "closed" } else { "open" },
            control: match bank.switch {
                CapacitorSwitch::Fixed => "fixed",
                CapacitorSwitch::Profile => "profile",
                CapacitorSwitch::Voltage { .. } => "voltage",
                CapacitorSwitch::Kvar { .. } => "kvar",
                CapacitorSwitch::Current { .. } => "current",
            },
            hunting: ended.is_some_and(|c| c.state == CapacitorState::Hunting),
            why: why_switched(network, bank, ended),
        }
    };
    network.capacitor_banks.iter().enumerate().map(row).collect()
}

/// Why a capacitor is closed or open.
pub(super) fn why_switched(
    network: &Network,
    bank: &CapacitorBank,
    ended: Option<&SwitchedCapacitor>,
) -> String {
    let (on, off, scale, unit, place) = match bank.switch {
        CapacitorSwitch::Fixed => return "its state is given".to_owned(),
        CapacitorSwitch::Profile => {
            return match &network.at {
                Some(time) => format!("its profile at {time}"),
                None => "no time is given for its profile: its state is as written".to_owned(),
            };
        }
        CapacitorSwitch::Voltage { on_volts, off_volts, across, .. } => {
            (on_volts, off_volts, 1.0, "V", format!("at its relay, {across}"))
        }
        CapacitorSwitch::Kvar { on_vars, off_vars, line, .. } => {
            (on_vars, off_vars, 1e3, "kvar", format!("in line {}", network.branch(line).name))
        }
        CapacitorSwitch::Current { on_amps, off_amps, line, .. } => {
            (on_amps, off_amps, 1.0, "A", format!("in line {}", network.branch(line).name))
        }
    };
    let Some(ended) = ended else { return "its control was not run".to_owned() };
    let (read, on, off) = (ended.reading / scale, on / scale, off / scale);
    let found = format!("{read:.2} {unit} {place}");
    if ended.state == CapacitorState::Hunting {
        let with = match ended.against.as_slice() {
            [] => "with its own effect: its dead band is narrower than the change it makes".to_owned(),
            names => format!("against {}", names.join(", ")),
        };
        return format!("hunts {with} ({found}; on at {on} {unit}, off at {off} {unit})");
    }
    let between = (on.min(off)..=on.max(off)).contains(&read);
    let what = match (between, bank.state) {
        (true, SwitchState::Closed) => format!("in the dead band, stays closed (off at {off} {unit})"),
        (true, SwitchState::Open) => format!("in the dead band, stays open (on at {on} {unit})"),
        (false, SwitchState::Closed) => format!("beyond {on} {unit}, where it closes"),
        (false, SwitchState::Open) => format!("beyond {off} {unit}, where it opens"),
    };
    format!("{found}: {what}")
}
