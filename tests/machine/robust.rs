//! Nothing a nameplate may say makes the library panic or pass off numbers that are none. Seeds are fixed.

use fourwire::machine::*;
use proptest::prelude::*;
use proptest::test_runner::RngSeed;

fn config(cases: u32) -> ProptestConfig {
    ProptestConfig { cases, rng_seed: RngSeed::Fixed(29), ..ProptestConfig::default() }
}

/// Any number at all, often a likely one, often none.
fn cell(likely: std::ops::Range<f64>) -> impl Strategy<Value = Option<f64>> {
    prop_oneof![4 => Just(None), 6 => likely.prop_map(Some), 1 => any::<f64>().prop_map(Some)]
}

prop_compose! {
    fn plates()(
        frequency_hz in prop_oneof![4 => Just(60.0), 2 => Just(50.0), 1 => any::<f64>()],
        (hp, shaft_w, volts, amps) in (cell(0.3..600.0), cell(300.0..4e5), cell(200.0..5000.0), cell(1.0..600.0)),
        (efficiency, pf, rpm) in (cell(0.7..0.97), cell(0.6..0.95), cell(700.0..3590.0)),
        poles in prop_oneof![3 => Just(None), 2 => (0u32..12).prop_map(Some)],
        code in prop_oneof![3 => Just(None), 2 => prop::char::range('A', 'W').prop_map(Some), 1 => any::<char>().prop_map(Some)],
        (locked_rotor_amps, locked_rotor_multiple, locked_rotor_pf) in (cell(5.0..4000.0), cell(4.0..8.0), cell(0.15..0.7)),
        (locked_rotor_torque, pull_up_torque, breakdown_torque) in (cell(0.7..2.8), cell(0.6..2.0), cell(1.5..3.5)),
        design in prop_oneof![Just(None), prop::char::range('A', 'P').prop_map(Design::from_letter)],
        (inertia_kgm2, inertia_h_s) in (cell(0.01..20.0), cell(0.05..3.0)),
    ) -> Nameplate {
        Nameplate {
            frequency_hz, hp, shaft_w, volts, amps, efficiency, pf, rpm, poles, code, locked_rotor_amps,
            locked_rotor_multiple, locked_rotor_pf, locked_rotor_torque, pull_up_torque, breakdown_torque, design,
            inertia_kgm2, inertia_h_s,
        }
    }
}

proptest! {
    #![proptest_config(config(3000))]
    #[test]
    fn any_plate_is_resolved_or_refused_with_reasons(plate in plates()) {
        match plate.resolve() {
            Ok(ratings) => {
                let all = [
                    &ratings.shaft_w, &ratings.amps, &ratings.efficiency, &ratings.pf, &ratings.slip,
                    &ratings.locked_rotor_amps, &ratings.locked_rotor_pf, &ratings.locked_rotor_torque,
                    &ratings.breakdown_torque, &ratings.inertia_kgm2,
                ];
                prop_assert!(all.iter().all(|r| r.value > 0.0 && r.value.is_finite()), "{ratings:?}");
                prop_assert!(ratings.efficiency.value < 1.0 && ratings.pf.value < 1.0 && ratings.slip.value < 0.31);
            }
            Err(faults) => prop_assert!(!faults.is_empty()),
        }
    }
}

proptest! {
    #![proptest_config(config(24))]
    #[test]
    fn any_ratings_are_fitted_or_refused(
        hp in 1.0f64..500.0,
        efficiency in cell(0.85..0.96),
        rpm in cell(1700.0..1790.0),
        locked_rotor_multiple in cell(4.0..8.0),
        locked_rotor_torque in cell(0.7..2.5),
        breakdown_torque in cell(1.8..3.5),
    ) {
        let plate = Nameplate {
            frequency_hz: 60.0, hp: Some(hp), volts: Some(460.0), efficiency, rpm, locked_rotor_multiple,
            locked_rotor_torque, breakdown_torque, ..Nameplate::default()
        };
        let Ok(ratings) = plate.resolve() else { return Ok(()) };
        match fit(&ratings) {
            Ok(fitted) => {
                prop_assert!(fitted.circuit.faults().is_empty(), "{:?}", fitted.circuit);
                let within = fitted.items.iter().filter(|i| i.firm).all(|i| i.error_percent().abs() <= REFUSED_ABOVE_PERCENT);
                prop_assert!(within && fitted.items.iter().all(|i| i.obtained.is_finite()));
            }
            Err(fault) => prop_assert!(!fault.message.is_empty()),
        }
    }
}

proptest! {
    #![proptest_config(config(100))]
    #[test]
    fn any_voltages_run_or_are_refused(values in prop::array::uniform6(prop_oneof![8 => -400.0f64..400.0, 1 => any::<f64>()])) {
        use fourwire::math::Complex64;
        let [a, b, c, d, e, f] = values;
        let volts = [Complex64::new(a, b), Complex64::new(c, d), Complex64::new(e, f)];
        let motor = super::unbalanced::motor(super::nameplates::double_cage(), Shape::Quadratic, 300.0);
        if let Ok(running) = run(&motor, &volts) {
            prop_assert!((0.0..=1.0).contains(&running.slip) && running.operation.input_w.is_finite());
            let short = (running.shaft_nm - motor.load.torque_nm(running.speed_rad_s)).abs();
            prop_assert!(running.slip == 0.0 || short < 1e-6 * running.operation.positive.gap_w.abs().max(400.0));
        }
        let settings = RunUpSettings { most_s: 5.0, ..RunUpSettings::default() };
        let _ = run_up(&motor, &Starter::Direct, &mut StiffBus(volts), &settings);
    }
}
