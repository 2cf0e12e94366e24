//! Nameplate of a three-phase motor: what people have, and what is filled in from published tables.

use serde::Serialize;

use super::resolve;

/// NEMA or IEC design, which says how torque and current change with speed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub enum Design {
    /// NEMA A: as B, with more locked-rotor current.
    A,
    /// NEMA B: general purpose.
    B,
    /// NEMA C: high starting torque.
    C,
    /// NEMA D: high slip.
    D,
    /// IEC N: general purpose.
    N,
    /// IEC H: high starting torque.
    H,
}

impl Design {
    /// The design of a letter, either case.
    pub fn from_letter(letter: char) -> Option<Design> {
        Some(match letter.to_ascii_uppercase() {
            'A' => Design::A,
            'B' => Design::B,
            'C' => Design::C,
            'D' => Design::D,
            'N' => Design::N,
            'H' => Design::H,
            _ => return None,
        })
    }
}

/// What stands on the plate or in the data sheet. Only voltage, frequency and a power are needed.
///
/// Efficiencies and power factors are fractions, torques parts of full-load torque.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct Nameplate {
    /// Frequency, hertz.
    pub frequency_hz: f64,
    /// Shaft power, mechanical horsepower.
    pub hp: Option<f64>,
    /// Shaft power, watts.
    pub shaft_w: Option<f64>,
    /// Rated line-to-line voltage, volts.
    pub volts: Option<f64>,
    /// Full-load line current, amperes.
    pub amps: Option<f64>,
    /// Full-load efficiency, a fraction.
    pub efficiency: Option<f64>,
    /// Full-load power factor, a fraction.
    pub pf: Option<f64>,
    /// Full-load speed, revolutions per minute.
    pub rpm: Option<f64>,
    /// Number of poles.
    pub poles: Option<u32>,
    /// NEMA code letter of locked-rotor kilovolt-amperes per horsepower.
    pub code: Option<char>,
    /// Locked-rotor line current at rated voltage, amperes.
    pub locked_rotor_amps: Option<f64>,
    /// Locked-rotor line current, multiple of full-load current.
    pub locked_rotor_multiple: Option<f64>,
    /// Power factor at standstill, a fraction.
    pub locked_rotor_pf: Option<f64>,
    /// Torque at standstill.
    pub locked_rotor_torque: Option<f64>,
    /// Least torque while accelerating.
    pub pull_up_torque: Option<f64>,
    /// Greatest torque.
    pub breakdown_torque: Option<f64>,
    /// Design letter.
    pub design: Option<Design>,
    /// Moment of inertia of the rotor, kg m2.
    pub inertia_kgm2: Option<f64>,
    /// Inertia constant of the rotor, seconds: kinetic energy at synchronous speed over rated volt-amperes.
    pub inertia_h_s: Option<f64>,
}

/// Where a rating comes from.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Origin {
    /// It stands on the nameplate.
    Given,
    /// Computed from what stands there; says how.
    Derived(String),
    /// From a published table or common practice; names the source.
    Filled(String),
}

/// A rating with its origin.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Rated {
    /// The value, SI; torques as parts of full-load torque.
    pub value: f64,
    /// Where it comes from.
    pub origin: Origin,
}

impl Rated {
    pub(super) fn given(value: f64) -> Rated {
        Rated { value, origin: Origin::Given }
    }

    pub(super) fn derived(value: f64, how: &str) -> Rated {
        Rated { value, origin: Origin::Derived(how.to_string()) }
    }

    pub(super) fn filled(value: f64, source: impl Into<String>) -> Rated {
        Rated { value, origin: Origin::Filled(source.into()) }
    }

    /// True where the value was not on the nameplate and does not follow from it.
    pub fn is_filled(&self) -> bool {
        matches!(self.origin, Origin::Filled(_))
    }
}

/// A complete nameplate.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Ratings {
    /// Frequency, hertz.
    pub frequency_hz: f64,
    /// Rated line-to-line voltage, volts.
    pub volts: f64,
    /// Shaft power, watts.
    pub shaft_w: Rated,
    /// Full-load line current, amperes.
    pub amps: Rated,
    /// Full-load efficiency, a fraction.
    pub efficiency: Rated,
    /// Full-load power factor, a fraction.
    pub pf: Rated,
    /// Number of poles.
    pub poles: u32,
    /// Where the number of poles comes from.
    pub poles_origin: Origin,
    /// Full-load slip.
    pub slip: Rated,
    /// Locked-rotor line current, amperes.
    pub locked_rotor_amps: Rated,
    /// Locked-rotor power factor, a fraction.
    pub locked_rotor_pf: Rated,
    /// Locked-rotor torque, part of full-load torque.
    pub locked_rotor_torque: Rated,
    /// Least torque while accelerating, part of full-load torque; not known for every design.
    pub pull_up_torque: Option<Rated>,
    /// Greatest torque, part of full-load torque.
    pub breakdown_torque: Rated,
    /// Design.
    pub design: Design,
    /// Where the design letter comes from.
    pub design_origin: Origin,
    /// Moment of inertia of the rotor, kg m2.
    pub inertia_kgm2: Rated,
}

impl Ratings {
    /// Synchronous speed, radians per second.
    pub fn sync_rad_s(&self) -> f64 {
        4.0 * std::f64::consts::PI * self.frequency_hz / f64::from(self.poles)
    }

    /// Full-load speed, radians per second.
    pub fn rated_rad_s(&self) -> f64 {
        self.sync_rad_s() * (1.0 - self.slip.value)
    }

    /// Full-load torque, newton metres.
    pub fn torque_nm(&self) -> f64 {
        self.shaft_w.value / self.rated_rad_s()
    }

    /// Values that the nameplate does not have: name, value, source. The design letter is told apart, by
    /// [`Ratings::design_origin`].
    pub fn filled(&self) -> Vec<(&'static str, f64, &str)> {
        let all = [
            ("amps", Some(&self.amps)),
            ("efficiency", Some(&self.efficiency)),
            ("pf", Some(&self.pf)),
            ("slip", Some(&self.slip)),
            ("locked_rotor_amps", Some(&self.locked_rotor_amps)),
            ("locked_rotor_pf", Some(&self.locked_rotor_pf)),
            ("locked_rotor_torque", Some(&self.locked_rotor_torque)),
            ("pull_up_torque", self.pull_up_torque.as_ref()),
            ("breakdown_torque", Some(&self.breakdown_torque)),
            ("inertia_kgm2", Some(&self.inertia_kgm2)),
        ];
        let poles = match &self.poles_origin {
            Origin::Filled(source) => Some(("poles", f64::from(self.poles), source.as_str())),
            _ => None,
        };
        let rest = all.into_iter().filter_map(|(name, rated)| match rated {
            Some(Rated { value, origin: Origin::Filled(source) }) => Some((name, *value, source.as_str())),
            _ => None,
        });
        poles.into_iter().chain(rest).collect()
    }
}

/// A nameplate that cannot be: which column, why, and what to do.
#[derive(Debug, Clone, PartialEq, Eq, Serialize)]
pub struct NameplateFault {
    /// Column of `motors.csv` that is most likely wrong.
    pub column: &'static str,
    /// What is wrong, with the numbers.
    pub message: String,
    /// How to mend it.
    pub mend: String,
}

impl Nameplate {
    /// The complete ratings, with the source of everything filled in.
    ///
    /// # Errors
    /// Every reason why the nameplate is incomplete, out of range or contradicts itself.
    pub fn resolve(&self) -> Result<Ratings, Vec<NameplateFault>> {
        resolve::resolve(self)
    }
}
