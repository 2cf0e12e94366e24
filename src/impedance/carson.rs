//! Impedance of wires above (or in) an earth of finite resistivity: Carson's equations.
//!
//! J. R. Carson, Wave Propagation in Overhead Wires with Ground Return, Bell System Technical
//! Journal 5 (1926); in the form of Kersting, Distribution System Modeling and Analysis, ch. 4.
//! With `G = 1e-7 H/m`, `S` the distance to the image and `D` that to the other wire (for a wire
//! itself its GMR), `z = r + 4 w P G + j (2 w G ln(S/D) + 4 w Q G)`.

use crate::math::Complex64;

/// Permeability over 4 pi, henries per metre.
const G: f64 = 1e-7;
/// Euler's constant.
const EULER: f64 = 0.577_215_664_901_532_9;

/// Site and frequency.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Conditions {
    /// Frequency, hertz.
    pub frequency_hz: f64,
    /// Earth resistivity, ohm metre.
    pub earth_resistivity_ohm_m: f64,
    /// Permittivity of free space used for shunt admittance, farads per metre.
    pub permittivity_f_per_m: f64,
}

impl Conditions {
    /// Angular frequency, radians per second.
    pub fn omega(&self) -> f64 {
        2.0 * std::f64::consts::PI * self.frequency_hz
    }
}

/// Which terms of Carson's series are taken.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum EarthReturn {
    /// The first term of P and the first two of Q: heights drop out. The usual modified form.
    Modified,
    /// Terms up to the fourth power of `k`. Valid for `k` up to about 1: at 60 Hz and 100 ohm m,
    /// images up to 460 m away; P and Q (0.26 and 0.51 there) are then right within 0.0005.
    Series,
}

/// Equivalent depth of earth return, metres: `De = exp(1/2 - gamma) sqrt(rho/f) 2 / (4 pi sqrt(5) 1e-4)`,
/// about `658.9 sqrt(rho/f)`.
pub fn equivalent_depth_m(conditions: &Conditions) -> f64 {
    let ratio = conditions.earth_resistivity_ohm_m / conditions.frequency_hz;
    2.0 / K * (0.5 - EULER).exp() * ratio.sqrt()
}

/// `k = K S sqrt(f / rho)` with `S` in metres.
const K: f64 = 4.0 * std::f64::consts::PI * 2.236_067_977_499_79e-4;

/// Carson's parameter `k` for an image at `image_m`: the series holds up to about 1.
pub(super) fn series_parameter(image_m: f64, conditions: &Conditions) -> f64 {
    K * image_m * (conditions.frequency_hz / conditions.earth_resistivity_ohm_m).sqrt()
}

/// Earth-return part of an impedance, ohms per metre: everything but the wire's own resistance.
///
/// `distance_m` is the GMR of a wire for itself, the distance between two wires otherwise;
/// `horizontal_m` their horizontal distance, `heights_m` the sum of their heights (negative below earth).
pub fn earth_return_ohm_per_m(
    form: EarthReturn,
    distance_m: f64,
    horizontal_m: f64,
    heights_m: f64,
    conditions: &Conditions,
) -> Complex64 {
    let omega = conditions.omega();
    match form {
        EarthReturn::Modified => {
            let r = std::f64::consts::PI * omega * G / 2.0;
            let x = 2.0 * omega * G * (equivalent_depth_m(conditions) / distance_m).ln();
            Complex64::new(r, x)
        }
        EarthReturn::Series => {
            // A buried wire has its image as far above: the series is taken at the magnitude of the depth.
            let image = horizontal_m.hypot(heights_m).max(distance_m);
            let k = series_parameter(image, conditions);
            let angle = (horizontal_m.abs()).atan2(heights_m.abs());
            let (p, q) = series(k, angle);
            Complex64::new(
                4.0 * omega * p * G,
                2.0 * omega * G * (image / distance_m).ln() + 4.0 * omega * q * G,
            )
        }
    }
}

/// Carson's P and Q up to `k^4`.
fn series(k: f64, angle: f64) -> (f64, f64) {
    use std::f64::consts::{PI, SQRT_2};
    let log = (2.0 / k).ln();
    let cos = |n: f64| (n * angle).cos();
    let p = PI / 8.0 - k * cos(1.0) / (3.0 * SQRT_2)
        + k * k / 16.0 * (cos(2.0) * (0.6728 + log) + angle * (2.0 * angle).sin())
        + k.powi(3) * cos(3.0) / (45.0 * SQRT_2)
        - PI * k.powi(4) * cos(4.0) / 1536.0;
    let q = 0.5 * (0.5 - EULER) + 0.5 * log + k * cos(1.0) / (3.0 * SQRT_2) - PI * k * k * cos(2.0) / 64.0
        + k.powi(3) * cos(3.0) / (45.0 * SQRT_2)
        - k.powi(4) / 384.0 * (angle * (4.0 * angle).sin() + cos(4.0) * (log + 1.0895));
    (p, q)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn at(f: f64, rho: f64) -> Conditions {
        Conditions { frequency_hz: f, earth_resistivity_ohm_m: rho, permittivity_f_per_m: 8.854e-12 }
    }

    /// De = 658.5 sqrt(rho/f) m (handbook constant, from memory), 850 m at 60 Hz and 100 ohm m.
    #[test]
    fn equivalent_depth() {
        assert!((equivalent_depth_m(&at(60.0, 100.0)) - 850.0).abs() < 1.0);
        assert!((equivalent_depth_m(&at(50.0, 100.0)) - 931.0).abs() < 1.5);
    }

    /// The modified form is the series without the terms that vanish with k.
    #[test]
    fn the_series_tends_to_the_modified_form_as_resistivity_grows() {
        let difference = |rho: f64| {
            let c = at(60.0, rho);
            let a = earth_return_ohm_per_m(EarthReturn::Modified, 0.007, 0.0, 18.0, &c);
            let b = earth_return_ohm_per_m(EarthReturn::Series, 0.007, 0.0, 18.0, &c);
            (a - b).norm() / a.norm()
        };
        assert!(difference(100.0) < 0.01 && difference(1e4) < 0.2 * difference(100.0));
        assert!(difference(1e10) < 1e-6);
    }

    /// Carson's integral `P + jQ = int_0^inf (sqrt(u^2 + j) - u) exp(-u k cos) cos(u k sin) du`, by Simpson's rule
    /// after `u = t^2`: no series in it.
    fn integral(k: f64, angle: f64) -> (f64, f64) {
        let (fall, turn) = (k * angle.cos(), k * angle.sin());
        let end = (40.0 / fall).sqrt();
        let steps = 40_000;
        let h = end / f64::from(steps);
        let value = |t: f64| {
            let u = t * t;
            let root = Complex64::new(u * u, 1.0).sqrt();
            // sqrt(u^2 + j) - u = j / (sqrt(u^2 + j) + u), which does not lose digits as u grows.
            Complex64::new(0.0, 1.0) / (root + u) * ((-u * fall).exp() * (u * turn).cos() * 2.0 * t)
        };
        let weight = |i: i32| match i {
            0 => 1.0,
            i if i == steps => 1.0,
            i if i % 2 == 1 => 4.0,
            _ => 2.0,
        };
        let sum: Complex64 = (0..=steps).map(|i| value(f64::from(i) * h) * weight(i)).sum();
        (sum.re * h / 3.0, sum.im * h / 3.0)
    }

    /// The series to the fourth power against the integral it stands for (J. R. Carson 1926, equation 25):
    /// within 0.00002 up to k = 0.5, within 0.0005 up to k = 1.
    #[test]
    fn the_series_is_carsons_integral() {
        for k in [0.01, 0.05, 0.1, 0.25, 0.5, 0.75, 1.0] {
            let bound = if k <= 0.5 { 2e-5 } else { 5e-4 };
            for angle in [0.0, 0.3, 0.8, 1.2] {
                let ((p, q), (p_true, q_true)) = (series(k, angle), integral(k, angle));
                let off = (p - p_true).abs().max((q - q_true).abs());
                assert!(off < bound, "k {k}, angle {angle}: {p:.6}, {q:.6}; {p_true:.6}, {q_true:.6}");
            }
        }
    }
}
