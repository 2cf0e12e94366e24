//! Step-voltage regulators: banks of units, taps and ratio.

use super::conductor::Conductor;
use super::draft::{Across, Name, RegulatorControl};
use crate::math::{Complex64, ONE, PhaseMatrix};

/// Who sets a tap.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TapMode {
    /// The user: it is held.
    Held,
    /// The unit's control, from its settings.
    Automatic,
    /// The control of this phase's unit: it stands on the same tap.
    Follows(Conductor),
}

/// One regulated phase of a bank.
#[derive(Debug, Clone)]
pub struct RegulatorUnit {
    /// Name of the unit or bank.
    pub name: Name,
    /// Phase whose voltage it raises.
    pub phase: Conductor,
    /// What that phase is regulated against.
    pub across: Across,
    /// Tap position, steps: held, or where the control has moved it.
    pub tap: i32,
    /// Whether the control may move it.
    pub mode: TapMode,
    /// Change of voltage of one step, per unit.
    pub step_pu: f64,
    /// Steps each way.
    pub steps: u32,
    /// Control settings.
    pub control: RegulatorControl,
}

/// A bank of regulator units between two nodes; conductors without a unit go straight through.
#[derive(Debug, Clone)]
pub struct Regulator {
    /// Units, at most one a phase.
    pub units: Vec<RegulatorUnit>,
}

impl RegulatorUnit {
    /// Ratio of regulated to source-side voltage, `1 + step * tap`.
    pub fn ratio(&self) -> f64 {
        1.0 + self.step_pu * f64::from(self.tap)
    }
}

impl Regulator {
    /// Voltage ratio matrix `A` of the ideal bank: `V_to = A V_from`, `I_from = A^T I_to`.
    ///
    /// A unit on phase k against conductor m gives `V_to,k - V_to,m = ratio (V_from,k - V_from,m)`,
    /// and m goes straight through; against earth the terms in m vanish (`neutral_carried` false).
    /// In a closed delta no phase goes straight through: each series winding, fed by the voltage
    /// across k and m on the source side, adds `(ratio - 1)(V_from,k - V_from,m)` to phase k.
    pub fn ratio_matrix(&self, neutral_carried: bool) -> PhaseMatrix {
        let mut matrix = PhaseMatrix::identity();
        for unit in &self.units {
            let ratio = Complex64::from(unit.ratio());
            let k = unit.phase.slot();
            matrix[(k, k)] = ratio;
            let against = match unit.across {
                Across::Phase(m) => Some(m),
                Across::Neutral => neutral_carried.then_some(Conductor::N),
            };
            if let Some(m) = against {
                matrix[(k, m.slot())] = ONE - ratio;
            }
        }
        matrix
    }
}
