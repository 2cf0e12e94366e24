//! Equivalent circuit of a three-phase cage motor, with positive and negative sequence.

use crate::math::{Complex64, ONE, SequenceVoltages, ZERO, sequence_components};
use crate::units::SQRT_3;

/// Three phasors in the order a, b, c.
pub type Phases = [Complex64; 3];

/// Phase-by-phase matrix, rows and columns in the order a, b, c.
pub type Matrix3 = nalgebra::Matrix3<Complex64>;

/// One squirrel cage, ohms a phase seen from the stator.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Cage {
    /// Resistance, ohms.
    pub r_ohm: f64,
    /// Leakage reactance of its own, ohms at rated frequency.
    pub x_ohm: f64,
}

/// Friction and windage: a torque proportional to speed, given by its power at one speed.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct MechanicalLoss {
    /// Power lost at that speed, watts.
    pub watts: f64,
    /// The speed, radians per second, above zero.
    pub at_rad_s: f64,
}

impl MechanicalLoss {
    /// Torque against rotation at a speed, newton metres.
    pub fn torque_nm(&self, speed_rad_s: f64) -> f64 {
        self.watts * speed_rad_s / (self.at_rad_s * self.at_rad_s)
    }
}

/// Equivalent circuit of a three-phase cage motor, one phase of a star, all ohms seen from the stator.
///
/// ```text
///  o--R1--jX1--+-------+------jXr--+------+
///              |       |           |      |
///              Gc     jXm        Ri/s   Ro/s
///              |       |          jXi    jXo
///  o-----------+-------+-----------+------+
/// ```
///
/// Heavy currents saturate the leakage paths: `X1` and `Xr` fall from their running values to a part `k` of
/// them at standstill, `1 - (1 - k) g(s)` with `g = s^2 (1 + a^2) / (s^2 + a^2)` and `a` 0.3, so that the circuit
/// stays linear at a given slip (common practice is to let leakage change with slip; the curve is our own). It
/// belongs to full voltage: on less, a motor draws a little less and turns a little less strongly than computed.
///
/// The positive sequence sees slip `s`, the negative sequence `2 - s`; the star point floats (or the windings
/// stand in delta), so no zero-sequence current flows. One cage: leave the outer cage out.
/// Formulae: any text on induction machines, e.g. Chapman, Electric Machinery Fundamentals, chapter on
/// induction motors; double cage as two rotor branches in parallel.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Circuit {
    /// Stator resistance `R1`, ohms.
    pub r1_ohm: f64,
    /// Stator leakage reactance `X1`, ohms.
    pub x1_ohm: f64,
    /// Magnetising reactance `Xm`, ohms.
    pub xm_ohm: f64,
    /// Core-loss conductance `Gc` across it, siemens; zero leaves core loss out.
    pub core_siemens: f64,
    /// Leakage reactance `Xr` common to both cages, ohms.
    pub rotor_x_ohm: f64,
    /// Part of `X1` and `Xr` left at standstill by saturation; 1 for none.
    pub standstill_leakage: f64,
    /// The cage that carries the running current.
    pub inner: Cage,
    /// The cage that carries the starting current, for a double cage or deep bars.
    pub outer: Option<Cage>,
    /// Friction and windage.
    pub mechanical: MechanicalLoss,
    /// Synchronous speed at rated frequency, radians per second.
    pub sync_rad_s: f64,
}

/// What one sequence does.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SequencePart {
    /// Current in phase a of that sequence, amperes.
    pub amps: Complex64,
    /// Power across the air gap, watts, all phases.
    pub gap_w: f64,
    /// Loss in the stator winding, watts, all phases.
    pub stator_w: f64,
    /// Loss in the rotor, watts, all phases.
    pub rotor_w: f64,
    /// Loss in the core, watts, all phases.
    pub core_w: f64,
}

/// What the motor does at a slip under given terminal voltages.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Operation {
    /// Line currents into the motor, amperes, order a, b, c.
    pub amps: Phases,
    /// Positive sequence.
    pub positive: SequencePart,
    /// Negative sequence.
    pub negative: SequencePart,
    /// Torque of the air gap, newton metres: positive less negative sequence.
    pub torque_nm: f64,
    /// Power in at the terminals, watts.
    pub input_w: f64,
    /// Reactive power in at the terminals, vars.
    pub input_var: f64,
}

impl Operation {
    /// Losses inside the motor without friction and windage, watts.
    pub fn electrical_loss_w(&self) -> f64 {
        [&self.positive, &self.negative].iter().map(|p| p.stator_w + p.rotor_w + p.core_w).sum()
    }

    /// Power factor at the terminals; `None` without current.
    pub fn pf(&self) -> Option<f64> {
        let apparent = self.input_w.hypot(self.input_var);
        (apparent > 0.0).then(|| self.input_w / apparent)
    }
}

/// Greatest torque of a circuit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Peak {
    /// Slip at which it stands.
    pub slip: f64,
    /// Torque of the air gap, newton metres.
    pub torque_nm: f64,
}

/// A turn of 120 degrees forward.
fn turn() -> Complex64 {
    Complex64::new(-0.5, SQRT_3 / 2.0)
}

impl Circuit {
    /// A single-cage circuit from per-unit values on the motor's own base: `base_va` and `volts` line to line.
    ///
    /// Order of `pu`: stator resistance, stator reactance, magnetising reactance, rotor resistance, rotor
    /// reactance. No core loss, no friction. `sync_rad_s` is the synchronous speed.
    pub fn from_per_unit(pu: [f64; 5], base_va: f64, volts: f64, sync_rad_s: f64) -> Circuit {
        let [r1, x1, xm, r2, x2] = pu.map(|z| z * volts * volts / base_va);
        Circuit {
            r1_ohm: r1,
            x1_ohm: x1,
            xm_ohm: xm,
            core_siemens: 0.0,
            rotor_x_ohm: x2,
            standstill_leakage: 1.0,
            inner: Cage { r_ohm: r2, x_ohm: 0.0 },
            outer: None,
            mechanical: MechanicalLoss { watts: 0.0, at_rad_s: sync_rad_s },
            sync_rad_s,
        }
    }

    /// What is wrong with values given by hand: one sentence for each; empty where all is well.
    pub fn faults(&self) -> Vec<String> {
        let outer = self.outer.unwrap_or(self.inner);
        let above = [
            ("magnetising reactance", self.xm_ohm),
            ("resistance of the inner cage", self.inner.r_ohm),
            ("resistance of the outer cage", outer.r_ohm),
            ("synchronous speed", self.sync_rad_s),
            ("speed of the mechanical loss", self.mechanical.at_rad_s),
            ("sum of leakage reactances", self.x1_ohm + self.rotor_x_ohm + self.inner.x_ohm.min(outer.x_ohm)),
        ];
        let from = [
            ("stator resistance", self.r1_ohm),
            ("stator reactance", self.x1_ohm),
            ("core-loss conductance", self.core_siemens),
            ("rotor reactance", self.rotor_x_ohm),
            ("reactance of the inner cage", self.inner.x_ohm),
            ("reactance of the outer cage", outer.x_ohm),
            ("mechanical loss", self.mechanical.watts),
        ];
        let low = above.iter().filter(|(_, v)| !(*v > 0.0 && v.is_finite())).map(|(n, _)| (n, "above 0"));
        let negative =
            from.iter().filter(|(_, v)| !(*v >= 0.0 && v.is_finite())).map(|(n, _)| (n, "0 or more"));
        let part = self.standstill_leakage;
        let fine = part > 0.0 && part <= 1.0;
        let outside = (!fine).then_some((&"part of leakage left at standstill", "above 0 and up to 1"));
        low.chain(negative).chain(outside).map(|(name, wanted)| format!("{name} must be {wanted}")).collect()
    }

    /// Speed at a slip, radians per second.
    pub fn speed_rad_s(&self, slip: f64) -> f64 {
        self.sync_rad_s * (1.0 - slip)
    }

    /// Slip at a speed.
    pub fn slip(&self, speed_rad_s: f64) -> f64 {
        1.0 - speed_rad_s / self.sync_rad_s
    }

    /// Admittance of the rotor behind the air gap at a slip, siemens. Zero at zero slip.
    pub fn rotor_admittance(&self, slip: f64) -> Complex64 {
        // Written with s over ohms, so that nothing is divided by a slip of zero.
        let of = |c: &Cage| Complex64::from(slip) / Complex64::new(c.r_ohm, slip * c.x_ohm);
        let cages = of(&self.inner) + self.outer.as_ref().map_or(ZERO, of);
        cages / (ONE + Complex64::new(0.0, self.rotor_x_ohm * self.leakage(slip)) * cages)
    }

    /// Admittance at the terminals of one phase at a slip, siemens. Give `2 - s` for the negative sequence.
    pub fn admittance(&self, slip: f64) -> Complex64 {
        let gap = self.gap_admittance(slip);
        gap / (ONE + self.stator(slip) * gap)
    }

    /// Part of leakage left at a slip. Both sequences of one motor, at `s` and `2 - s`, have the same.
    fn leakage(&self, slip: f64) -> f64 {
        const A_SQUARE: f64 = 0.09;
        let near = slip.min(2.0 - slip);
        let square = near * near;
        1.0 - (1.0 - self.standstill_leakage) * square * (1.0 + A_SQUARE) / (square + A_SQUARE)
    }

    fn stator(&self, slip: f64) -> Complex64 {
        Complex64::new(self.r1_ohm, self.x1_ohm * self.leakage(slip))
    }

    fn gap_admittance(&self, slip: f64) -> Complex64 {
        Complex64::new(self.core_siemens, -1.0 / self.xm_ohm) + self.rotor_admittance(slip)
    }

    /// Admittance matrix of the three phases at a slip, siemens: `I = Y V` with `V` to any common point.
    ///
    /// `Y_ij = (Y1 h^(j-i) + Y2 h^(i-j)) / 3`, `h` a turn of 120 degrees: rows and columns add to zero, since
    /// no zero-sequence current flows. Not symmetric: the machine tells the sequences apart.
    pub fn phase_matrix(&self, slip: f64) -> Matrix3 {
        sequence_matrix(self.admittance(slip), self.admittance(2.0 - slip))
    }

    /// Currents, torque and losses at a slip under phase voltages to any common point, volts.
    pub fn operation(&self, slip: f64, volts: &Phases) -> Operation {
        let v = sequence_components(volts[0], volts[1], volts[2]);
        let positive = self.part(slip, v.positive);
        let negative = self.part(2.0 - slip, v.negative);
        self.combine(positive, negative, &v)
    }

    fn combine(&self, positive: SequencePart, negative: SequencePart, v: &SequenceVoltages) -> Operation {
        let power = 3.0 * (v.positive * positive.amps.conj() + v.negative * negative.amps.conj());
        Operation {
            amps: phases(positive.amps, negative.amps),
            torque_nm: (positive.gap_w - negative.gap_w) / self.sync_rad_s,
            input_w: power.re,
            input_var: power.im,
            positive,
            negative,
        }
    }

    /// One sequence at the slip that it sees.
    fn part(&self, slip: f64, volts: Complex64) -> SequencePart {
        let rotor = self.rotor_admittance(slip);
        let gap = Complex64::new(self.core_siemens, -1.0 / self.xm_ohm) + rotor;
        let gap_volts = volts / (ONE + self.stator(slip) * gap);
        let amps = gap_volts * gap;
        let square = gap_volts.norm_sqr();
        let gap_w = 3.0 * square * rotor.re;
        SequencePart {
            amps,
            gap_w,
            stator_w: 3.0 * amps.norm_sqr() * self.r1_ohm,
            rotor_w: slip * gap_w,
            core_w: 3.0 * square * self.core_siemens,
        }
    }

    /// Torque of the air gap at a slip under a balanced line-to-line voltage, newton metres.
    pub fn balanced_torque_nm(&self, slip: f64, volts: f64) -> f64 {
        self.part(slip, Complex64::from(volts / SQRT_3)).gap_w / self.sync_rad_s
    }

    /// The greatest torque between full speed and standstill, under a balanced line-to-line voltage.
    pub fn breakdown(&self, volts: f64) -> Peak {
        let torque = |slip: f64| self.balanced_torque_nm(slip, volts);
        let points = 80;
        let at = |i: i32| 10f64.powf(-4.0 * f64::from(points - i) / f64::from(points));
        let best = (0..=points).max_by(|&i, &j| torque(at(i)).total_cmp(&torque(at(j)))).unwrap_or(points);
        let (mut low, mut high) = (at(best - 1), at((best + 1).min(points)));
        // Golden section: the peak lies between the neighbours of the best point.
        let golden = 0.618_033_988_749_894_9;
        for _ in 0..48 {
            let (left, right) = (high - golden * (high - low), low + golden * (high - low));
            if torque(left) > torque(right) { high = right } else { low = left }
        }
        let middle = 0.5 * (low + high);
        // At the end of the range the end itself may be highest.
        let slip = if torque(high) > torque(middle) { high } else { middle };
        Peak { slip, torque_nm: torque(slip) }
    }
}

/// Phase quantities of a positive and a negative sequence.
pub(super) fn phases(positive: Complex64, negative: Complex64) -> Phases {
    let h = turn();
    [positive + negative, h.conj() * positive + h * negative, h * positive + h.conj() * negative]
}

/// Phase admittance matrix of a positive- and a negative-sequence admittance, siemens, without zero sequence.
pub fn sequence_matrix(positive: Complex64, negative: Complex64) -> Matrix3 {
    let h = turn();
    let powers = [ONE, h, h.conj()];
    let entry = |i: usize, j: usize| {
        let forward = powers[(j + 3 - i) % 3];
        (positive * forward + negative * forward.conj()) / 3.0
    };
    Matrix3::from_fn(entry)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::math::polar;

    /// A deep-bar circuit with all elements.
    fn circuit() -> Circuit {
        Circuit {
            r1_ohm: 0.06,
            x1_ohm: 0.2,
            xm_ohm: 8.0,
            core_siemens: 2e-3,
            rotor_x_ohm: 0.1,
            standstill_leakage: 0.7,
            inner: Cage { r_ohm: 0.05, x_ohm: 0.3 },
            outer: Some(Cage { r_ohm: 0.3, x_ohm: 0.02 }),
            mechanical: MechanicalLoss { watts: 500.0, at_rad_s: 185.0 },
            sync_rad_s: 188.5,
        }
    }

    const VOLTS: [(f64, f64); 3] = [(270.0, 0.1), (255.0, -2.05), (262.0, 2.2)];

    #[test]
    fn matrix_and_operation_agree_and_power_adds_up() {
        let volts = VOLTS.map(|(m, a)| polar(m, a));
        for slip in [0.0, 1e-6, 0.02, 0.4, 1.0, -0.03, 2.0] {
            let done = circuit().operation(slip, &volts);
            let amps = circuit().phase_matrix(slip) * nalgebra::Vector3::from(volts);
            for i in 0..3 {
                assert!((amps[i] - done.amps[i]).norm() < 1e-9 * amps.norm());
            }
            let power: Complex64 = (0..3).map(|i| volts[i] * done.amps[i].conj()).sum();
            assert!((power - Complex64::new(done.input_w, done.input_var)).norm() < 1e-8 * power.norm());
            let shaft = done.torque_nm * circuit().speed_rad_s(slip);
            assert!((done.input_w - done.electrical_loss_w() - shaft).abs() < 1e-8 * power.norm());
        }
    }

    #[test]
    fn breakdown_is_above_every_other_slip() {
        let peak = circuit().breakdown(460.0);
        for i in 1..=2000 {
            let torque = circuit().balanced_torque_nm(f64::from(i) / 2000.0, 460.0);
            assert!(torque <= peak.torque_nm * (1.0 + 1e-12));
        }
        // So much rotor resistance that the peak stands at standstill.
        let stiff = Circuit { outer: None, inner: Cage { r_ohm: 3.0, x_ohm: 0.1 }, ..circuit() };
        assert!((stiff.breakdown(460.0).slip - 1.0).abs() < 1e-6);
    }

    #[test]
    fn faults_are_told() {
        assert!(circuit().faults().is_empty());
        let broken = Circuit { xm_ohm: 0.0, r1_ohm: f64::NAN, ..circuit() };
        assert_eq!(broken.faults().len(), 2);
    }
}
