//! Conversion constants between the SI units used inside and the units people write.
//!
//! Everything in the library is SI: volts, amperes, ohms, siemens, watts, metres, radians,
//! hertz, kelvin differences in degrees Celsius. User units exist only where a file or a
//! screen is read or written, and the factors for them are these.

/// Metres in one international foot (exact, 1959 agreement).
pub const METRES_PER_FOOT: f64 = 0.3048;
/// Metres in one thousand feet.
pub const METRES_PER_KILOFOOT: f64 = 304.8;
/// Metres in one statute mile (5280 ft, exact).
pub const METRES_PER_MILE: f64 = 1609.344;
/// Metres in one kilometre.
pub const METRES_PER_KILOMETRE: f64 = 1000.0;
/// Metres in one inch (exact).
pub const METRES_PER_INCH: f64 = 0.0254;
/// Square metres in one circular mil: the area of a circle one thousandth of an inch across.
pub const SQUARE_METRES_PER_CIRCULAR_MIL: f64 =
    std::f64::consts::FRAC_PI_4 * (METRES_PER_INCH / 1000.0) * (METRES_PER_INCH / 1000.0);
/// Watts in one mechanical horsepower (550 ft lbf/s).
pub const WATTS_PER_HORSEPOWER: f64 = 745.699_871_582_270_2;
/// Siemens in one microsiemens.
pub const SIEMENS_PER_MICROSIEMENS: f64 = 1e-6;
/// Volts, watts, volt-amperes or amperes in one kilo-unit.
pub const KILO: f64 = 1e3;
/// Volt-amperes in one MVA.
pub const MEGA: f64 = 1e6;

/// Ratio of line-to-line to phase-to-neutral voltage in a balanced three-phase system.
pub const SQRT_3: f64 = 1.732_050_807_568_877_2;
