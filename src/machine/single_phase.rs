//! Single-phase motors: impedance while running and at standstill, no more.

use super::nameplate::{NameplateFault, Rated};
use crate::catalog::motors;
use crate::math::Complex64;
use crate::units::{KILO, WATTS_PER_HORSEPOWER};

/// What stands on the plate of a single-phase motor. Voltage and a power, or amperes, are needed.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SinglePhasePlate {
    /// Shaft power, mechanical horsepower.
    pub hp: Option<f64>,
    /// Shaft power, watts.
    pub shaft_w: Option<f64>,
    /// Rated voltage, volts.
    pub volts: Option<f64>,
    /// Full-load current, amperes.
    pub amps: Option<f64>,
    /// Full-load efficiency, a fraction.
    pub efficiency: Option<f64>,
    /// Full-load power factor, a fraction.
    pub pf: Option<f64>,
    /// NEMA code letter.
    pub code: Option<char>,
    /// Locked-rotor current, amperes.
    pub locked_rotor_amps: Option<f64>,
    /// Locked-rotor power factor, a fraction.
    pub locked_rotor_pf: Option<f64>,
}

/// A single-phase motor as two impedances.
#[derive(Debug, Clone, PartialEq)]
pub struct SinglePhaseMotor {
    /// Impedance at full load, ohms.
    pub running_ohm: Complex64,
    /// Impedance at standstill, ohms.
    pub locked_rotor_ohm: Complex64,
    /// Full-load current, amperes.
    pub amps: Rated,
    /// Full-load power factor.
    pub pf: Rated,
    /// Locked-rotor current, amperes.
    pub locked_rotor_amps: Rated,
    /// Locked-rotor power factor.
    pub locked_rotor_pf: Rated,
}

const COMMON: &str = "common practice, no source";

impl SinglePhasePlate {
    /// The two impedances, with the origin of what they were made from.
    ///
    /// # Errors
    /// Every reason why the plate is incomplete, out of range or contradicts itself.
    pub fn resolve(&self) -> Result<SinglePhaseMotor, Vec<NameplateFault>> {
        let mut faults = Vec::new();
        let mut fault = |column: &'static str, message: String, mend: &str| {
            faults.push(NameplateFault { column, message, mend: mend.to_string() });
        };
        for (column, value, most) in [
            ("hp", self.hp, 1e3),
            ("kw", self.shaft_w.map(|w| w / KILO), 1e3),
            ("volts", self.volts, 5e4),
            ("amps", self.amps, 1e4),
            ("efficiency_percent", self.efficiency.map(|e| 100.0 * e), 99.5),
            ("pf", self.pf, 1.0),
            ("locked_rotor_amps", self.locked_rotor_amps, 1e5),
            ("locked_rotor_pf", self.locked_rotor_pf, 1.0),
        ] {
            if value.is_some_and(|v| !(0.0..=most).contains(&v) || v == 0.0) {
                fault(
                    column,
                    format!("{} makes no sense here", value.unwrap_or(0.0)),
                    "give a value above 0 in the unit of the column, or leave it blank",
                );
            }
        }
        let code = self.code.map(|letter| (letter, motors::code_letter(letter)));
        if let Some((letter, None)) = code {
            fault(
                "code",
                format!("`{letter}` is not a code letter"),
                "give a letter A to V of NEMA MG 1 10.37.2",
            );
        }
        let Some(volts) = self.volts else {
            fault("volts", "the rated voltage is missing".to_string(), "give the volts of the nameplate");
            return Err(faults);
        };
        let shaft_w = self.shaft_w.or(self.hp.map(|hp| hp * WATTS_PER_HORSEPOWER));
        let pf = self.pf.map_or_else(|| Rated::filled(0.70, COMMON), Rated::given);
        let amps = match (self.amps, shaft_w) {
            (Some(a), _) => Rated::given(a),
            (None, Some(w)) => {
                let value = w / (volts * self.efficiency.unwrap_or(0.65) * pf.value);
                match (self.efficiency, self.pf) {
                    (Some(_), Some(_)) => Rated::derived(value, "power, volts, efficiency and power factor"),
                    _ => Rated::filled(
                        value,
                        format!("power with efficiency 0.65 or power factor 0.70, {COMMON}"),
                    ),
                }
            }
            (None, None) => {
                fault("amps", "neither power nor amperes are given".to_string(), "give hp, kw or amps");
                return Err(faults);
            }
        };
        if let Some(w) = shaft_w.filter(|w| *w > 1.001 * volts * amps.value) {
            let message = format!("{:.2} A at {volts} V cannot give {w:.0} W at the shaft", amps.value);
            fault("amps", message, "check amps, volts and power; one of them is wrong");
        }
        let hp = shaft_w.unwrap_or(volts * amps.value * pf.value * 0.65) / WATTS_PER_HORSEPOWER;
        let locked_rotor_amps = match (self.locked_rotor_amps, code.and_then(|c| c.1)) {
            (Some(a), _) => Rated::given(a),
            (None, Some(row)) => Rated::derived(
                row.middle() * KILO * hp / volts,
                &format!("middle of the code letter ({})", row.source),
            ),
            (None, None) => Rated::filled(
                6.0 * amps.value,
                "about 6 times full load, IEEE Std 399-1997 9.5.2 (from memory)",
            ),
        };
        if locked_rotor_amps.value <= amps.value {
            let message = format!(
                "{:.1} A at standstill is not above {:.1} A at full load",
                locked_rotor_amps.value, amps.value
            );
            fault(
                "locked_rotor_amps",
                message,
                "check amps, volts and the locked-rotor value or code letter",
            );
        }
        let locked_rotor_pf = match (self.locked_rotor_pf, motors::locked_rotor_pf(hp)) {
            (Some(p), _) => Rated::given(p),
            (None, Some(row)) => Rated::filled(row.value, format!("{} (of three-phase motors)", row.source)),
            (None, None) => Rated::filled(0.7, COMMON),
        };
        if !faults.is_empty() {
            return Err(faults);
        }
        Ok(SinglePhaseMotor {
            running_ohm: impedance(volts / amps.value, pf.value),
            locked_rotor_ohm: impedance(volts / locked_rotor_amps.value, locked_rotor_pf.value),
            amps,
            pf,
            locked_rotor_amps,
            locked_rotor_pf,
        })
    }
}

/// Inductive impedance of a magnitude and power factor.
fn impedance(ohm: f64, pf: f64) -> Complex64 {
    Complex64::new(ohm * pf, ohm * (1.0 - pf * pf).max(0.0).sqrt())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn impedances_give_back_the_plate() {
        let plate = SinglePhasePlate {
            hp: Some(1.0),
            volts: Some(230.0),
            amps: Some(8.0),
            pf: Some(0.7),
            code: Some('K'),
            ..SinglePhasePlate::default()
        };
        let motor = plate.resolve().unwrap();
        assert!((230.0 / motor.running_ohm.norm() - 8.0).abs() < 1e-9);
        // Middle of code K, 8.495 kVA/hp (NEMA MG 1 10.37.2).
        assert!((230.0 / motor.locked_rotor_ohm.norm() - 8495.0 / 230.0).abs() < 1e-6);
        assert!(motor.locked_rotor_pf.is_filled() && !motor.amps.is_filled());
    }

    #[test]
    fn faults_are_told() {
        let of = |plate: SinglePhasePlate| {
            plate.resolve().unwrap_err().into_iter().map(|f| f.column).collect::<Vec<_>>()
        };
        assert_eq!(of(SinglePhasePlate::default()), ["volts"]);
        assert_eq!(of(SinglePhasePlate { volts: Some(230.0), ..SinglePhasePlate::default() }), ["amps"]);
        let weak = SinglePhasePlate {
            volts: Some(230.0),
            hp: Some(5.0),
            amps: Some(8.0),
            ..SinglePhasePlate::default()
        };
        assert_eq!(of(weak), ["amps"]);
        let odd = SinglePhasePlate {
            volts: Some(f64::NAN),
            amps: Some(-1.0),
            code: Some('O'),
            ..SinglePhasePlate::default()
        };
        assert!(of(odd).len() >= 3);
    }
}
