//! Capacitors that their controls switch.

use super::relay::{reading, source_end};
use super::solution::Solution;
use crate::network::{CapacitorSwitch, End, Name, Network, SwitchState};

/// Switchings after which a capacitor is taken to hunt.
const SWITCHINGS: usize = 3;

/// How a switched capacitor ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum CapacitorState {
    /// Its control asks for no change.
    Settled,
    /// It switched on and off without end; it stands as it was left and cannot be relied on.
    Hunting,
}

/// A switched capacitor after control.
#[derive(Debug, Clone, PartialEq)]
pub struct SwitchedCapacitor {
    /// Index in [`Network::capacitor_banks`].
    pub bank: usize,
    /// How it ended.
    pub state: CapacitorState,
    /// What its control measures: volts at the relay, vars or amperes.
    pub reading: f64,
    /// Times it switched before it settled.
    pub switchings: usize,
    /// Regulators and other capacitors that moved between its switchings, where it hunts.
    pub against: Vec<Name>,
}

/// A capacitor while the loop runs.
pub(super) struct Switching {
    pub bank: usize,
    /// End of its sense line nearer the source.
    end: End,
    /// Place in the order of nodes from the source.
    depth: usize,
    switchings: usize,
    pub hunts: bool,
    /// What moved since it first switched.
    pub against: Vec<Name>,
}

impl Switching {
    /// Notes that something else moved.
    pub fn note(&mut self, name: &Name) {
        if self.switchings > 0 && !self.hunts && !self.against.contains(name) {
            self.against.push(name.clone());
        }
    }

    fn wish(&self, network: &Network, solution: &Solution) -> Option<SwitchState> {
        let bank = network.capacitor_banks.get(self.bank)?;
        let read = reading(network, solution, bank, self.end)?;
        let (on, off) = match bank.switch {
            CapacitorSwitch::Fixed | CapacitorSwitch::Profile => return None,
            CapacitorSwitch::Voltage { on_volts, off_volts, .. } => (read < on_volts, read > off_volts),
            CapacitorSwitch::Kvar { on_vars, off_vars, .. } => (read > on_vars, read < off_vars),
            CapacitorSwitch::Current { on_amps, off_amps, .. } => (read > on_amps, read < off_amps),
        };
        let wanted = match (on, off) {
            (true, _) => SwitchState::Closed,
            (_, true) => SwitchState::Open,
            _ => return None,
        };
        (wanted != bank.state).then_some(wanted)
    }

    pub fn ended(&self, network: &Network, solution: &Solution) -> SwitchedCapacitor {
        let bank = network.capacitor_banks.get(self.bank);
        let read = bank.and_then(|b| reading(network, solution, b, self.end)).unwrap_or(0.0);
        let settled = !self.hunts && self.wish(network, solution).is_none();
        SwitchedCapacitor {
            bank: self.bank,
            state: if settled { CapacitorState::Settled } else { CapacitorState::Hunting },
            reading: read,
            switchings: self.switchings,
            against: if settled { Vec::new() } else { self.against.clone() },
        }
    }
}

/// The capacitors that have a control.
pub(super) fn switched(network: &Network) -> Vec<Switching> {
    let mut found = Vec::new();
    for (bank, b) in network.capacitor_banks.iter().enumerate() {
        let end = match b.switch {
            CapacitorSwitch::Fixed | CapacitorSwitch::Profile => continue,
            CapacitorSwitch::Voltage { .. } => End::From,
            CapacitorSwitch::Kvar { line, .. } | CapacitorSwitch::Current { line, .. } => {
                source_end(network, line)
            }
        };
        let depth = network.order.iter().position(|n| *n == b.capacitor.node).unwrap_or(usize::MAX);
        found.push(Switching { bank, end, depth, switchings: 0, hunts: false, against: Vec::new() });
    }
    found
}

/// Switches the one capacitor whose turn it is: shortest delay, then nearest the source, then
/// first written. Its name, or `None` where none asks to be switched.
pub(super) fn switch_one(network: &mut Network, solution: &Solution, all: &mut [Switching]) -> Option<Name> {
    loop {
        let asking = all.iter().enumerate().filter(|(_, c)| !c.hunts);
        let asking = asking.filter_map(|(i, c)| Some((i, c.wish(network, solution)?)));
        let delay = |i: usize| network.capacitor_banks.get(all[i].bank).map_or(f64::INFINITY, |b| b.delay_s);
        let before = |a: &usize, b: &usize| {
            delay(*a).total_cmp(&delay(*b)).then(all[*a].depth.cmp(&all[*b].depth)).then(a.cmp(b))
        };
        let (first, state) = asking.min_by(|(a, _), (b, _)| before(a, b))?;
        if all[first].switchings >= SWITCHINGS {
            all[first].hunts = true;
            continue;
        }
        all[first].switchings += 1;
        let bank = all[first].bank;
        network.switch_capacitor(bank, state);
        let name = network.capacitor_banks.get(bank)?.capacitor.name.clone();
        all.iter_mut().enumerate().filter(|(i, _)| *i != first).for_each(|(_, c)| c.note(&name));
        return Some(name);
    }
}
