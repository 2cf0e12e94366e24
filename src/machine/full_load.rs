//! What a circuit does at rated voltage: full load, standstill, greatest torque.

use super::circuit::Circuit;
use super::fit::FitItem;
use super::nameplate::{Rated, Ratings};
use crate::math::{Complex64, polar};
use crate::units::SQRT_3;

/// What a circuit does against the ratings at rated voltage; `None` if it cannot carry rated power.
pub fn check(circuit: &Circuit, ratings: &Ratings) -> Option<Vec<FitItem>> {
    let volts = balanced(ratings.volts);
    let slip = full_load_slip(circuit, ratings.volts, ratings.shaft_w.value)?;
    let full = circuit.operation(slip, &volts);
    let locked = circuit.operation(1.0, &volts);
    let torque = ratings.torque_nm();
    let item = |quantity, rated: &Rated, obtained| FitItem {
        quantity,
        wanted: rated.value,
        obtained,
        firm: !rated.is_filled(),
    };
    Some(vec![
        item("slip", &ratings.slip, slip),
        item("efficiency", &ratings.efficiency, ratings.shaft_w.value / full.input_w),
        item("pf", &ratings.pf, full.pf()?),
        item("amps", &ratings.amps, full.amps[0].norm()),
        item("locked_rotor_amps", &ratings.locked_rotor_amps, locked.amps[0].norm()),
        item("locked_rotor_torque", &ratings.locked_rotor_torque, locked.torque_nm / torque),
        item("locked_rotor_pf", &ratings.locked_rotor_pf, locked.pf()?),
        item(
            "breakdown_torque",
            &ratings.breakdown_torque,
            circuit.breakdown(ratings.volts).torque_nm / torque,
        ),
    ])
}

/// Phase voltages of a balanced line-to-line voltage, a at zero.
pub fn balanced(volts: f64) -> [Complex64; 3] {
    let third = 2.0 * std::f64::consts::PI / 3.0;
    [0.0, -third, third].map(|angle| polar(volts / SQRT_3, angle))
}

/// Shaft power at a slip under rated balanced voltage, watts.
pub(super) fn shaft_w(circuit: &Circuit, slip: f64, volts: f64) -> f64 {
    let speed = circuit.speed_rad_s(slip);
    (circuit.balanced_torque_nm(slip, volts) - circuit.mechanical.torque_nm(speed)) * speed
}

/// The slip nearest to synchronous speed at which the shaft gives rated power.
pub(super) fn full_load_slip(circuit: &Circuit, volts: f64, wanted_w: f64) -> Option<f64> {
    let enough = |slip: f64| shaft_w(circuit, slip, volts) >= wanted_w;
    let mut high = (1..=400).map(|i| f64::from(i) * 0.001).find(|&s| enough(s))?;
    let mut low = high - 0.001;
    for _ in 0..60 {
        let middle = 0.5 * (low + high);
        if enough(middle) { high = middle } else { low = middle }
    }
    Some(0.5 * (low + high))
}
