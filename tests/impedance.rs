//! What holds for impedances from any wires in any sound places.

use fourwire::impedance::{Conditions, EPSILON_0, EarthReturn, Layout, Target, Wire, compute};
use fourwire::math::PhaseMatrix;
use proptest::prelude::*;
use proptest::test_runner::RngSeed;

fn config() -> ProptestConfig {
    ProptestConfig { cases: 200, rng_seed: RngSeed::Fixed(5), ..ProptestConfig::default() }
}

fn site(rho: f64) -> Conditions {
    Conditions { frequency_hz: 60.0, earth_resistivity_ohm_m: rho, permittivity_f_per_m: EPSILON_0 }
}

/// A wire on a grid of places a metre apart, so that no two touch.
fn wire(slot: usize, target: Target, ohm_per_km: f64, radius_mm: f64, place: (i32, i32)) -> Wire {
    Wire {
        name: ["a", "b", "c", "n"][slot].to_string(),
        ohm_per_m: ohm_per_km / 1e3,
        gmr_m: 0.75 * radius_mm / 1e3,
        diameter_m: Some(2.0 * radius_mm / 1e3),
        x_m: f64::from(place.0),
        y_m: 7.0 + f64::from(place.1),
        own_distance_m: None,
        target,
    }
}

prop_compose! {
    /// Four wires in different places; the neutral to slot n.
    fn four_wires()(
        ohm in prop::array::uniform4(0.05..3.0f64),
        radius in prop::array::uniform4(2.0..20.0f64),
        places in Just((0..12).flat_map(|k| [(k % 4, k / 4)]).collect::<Vec<(i32, i32)>>()).prop_shuffle(),
    ) -> Vec<Wire> {
        (0..4).map(|k| wire(k, Target::Slot(k), ohm[k], radius[k], places[k])).collect()
    }
}

fn z(wires: &[Wire], form: EarthReturn, rho: f64) -> PhaseMatrix {
    compute(&Layout { wires: wires.to_vec(), shunt: None }, form, &site(rho)).expect("a sound layout").z_per_m
}

fn smallest_eigenvalue(z: &PhaseMatrix, part: impl Fn(num_complex::Complex64) -> f64, size: usize) -> f64 {
    nalgebra::DMatrix::from_fn(size, size, |i, j| part(z[(i, j)])).symmetric_eigenvalues().min()
}

proptest! {
    #![proptest_config(config())]

    /// Impedance is symmetric (reciprocity) and its resistance positive definite, in both forms; so is the capacitance.
    #[test]
    fn matrices_are_symmetric_and_positive(wires in four_wires(), rho in 1.0..5000.0f64) {
        for form in [EarthReturn::Modified, EarthReturn::Series] {
            let z = z(&wires, form, rho);
            prop_assert!((z - z.transpose()).norm() <= 1e-15 * z.norm());
            prop_assert!(smallest_eigenvalue(&z, |v| v.re, 4) > 0.0);
            prop_assert!(smallest_eigenvalue(&z, |v| v.im, 4) > 0.0);
        }
        let layout = Layout { wires, shunt: None };
        let y = compute(&layout, EarthReturn::Modified, &site(rho)).expect("a sound layout").y_per_m.expect("diameters are known");
        prop_assert!((y - y.transpose()).norm() <= 1e-12 * y.norm());
        prop_assert!(smallest_eigenvalue(&y, |v| v.im, 4) > 0.0);
    }

    /// The order in which wires are listed does not matter.
    #[test]
    fn order_of_wires_does_not_matter(wires in four_wires(), order in Just(vec![0usize, 1, 2, 3]).prop_shuffle()) {
        let shuffled: Vec<Wire> = order.iter().map(|&k| wires[k].clone()).collect();
        let (one, two) = (z(&wires, EarthReturn::Modified, 100.0), z(&shuffled, EarthReturn::Modified, 100.0));
        prop_assert!((one - two).norm() < 1e-12 * one.norm());
    }

    /// Taking a neutral to earth in one step or by Kron's formula is the same; without one nothing is taken.
    #[test]
    fn reduction(wires in four_wires()) {
        let full = z(&wires, EarthReturn::Modified, 100.0);
        let mut earthed = wires.clone();
        earthed[3].target = Target::Earth;
        let reduced = z(&earthed, EarthReturn::Modified, 100.0);
        for i in 0..3 {
            for j in 0..3 {
                let kron = full[(i, j)] - full[(i, 3)] * full[(3, j)] / full[(3, 3)];
                prop_assert!((kron - reduced[(i, j)]).norm() < 1e-12 * full.norm());
            }
        }
        let without = compute(&Layout { wires: wires[..3].to_vec(), shunt: None }, EarthReturn::Modified, &site(100.0)).expect("a sound layout");
        for i in 0..3 {
            for j in 0..3 {
                prop_assert!((without.z_per_m[(i, j)] - without.primitive[(i, j)]).norm() < 1e-12 * full.norm());
            }
        }
    }

    /// Earth resistivity from brine to rock: finite, and reactance grows with it.
    #[test]
    fn earth_resistivity_to_its_limits(wires in four_wires()) {
        let mut last = 0.0;
        for rho in [0.1, 1.0, 10.0, 100.0, 1e3, 1e4, 1e6] {
            let z = z(&wires, EarthReturn::Modified, rho);
            prop_assert!(z.iter().all(|v| v.is_finite()));
            prop_assert!(z[(0, 0)].im > last, "reactance falls at {rho} ohm m");
            last = z[(0, 0)].im;
        }
    }
}
