//! Several motors on one weak supply, one started after the other, with the solver of the library and its
//! bookkeeping of stages: energy of the whole, and the running motor's response.

use fourwire::machine::*;
use fourwire::math::Complex64;

use super::nameplates::double_cage;
use super::near;
use super::unbalanced::motor;

/// Voltages behind an impedance a phase under motors of these speeds.
fn terminals(motors: &[Motor; 2], starts: &[Progress; 2], time_s: f64, speeds: &[f64]) -> Phases {
    let source = nalgebra::Vector3::from(balanced(470.0));
    let mut volts: Phases = source.into();
    // Direct starting is linear: once is enough; a soft starter would need more.
    for _ in 0..2 {
        let drawn = |i: usize| starts[i].seen(&motors[i], time_s, speeds[i], &volts).admittance;
        let whole = Matrix3::identity() + (drawn(0) + drawn(1)) * Complex64::new(0.008, 0.04);
        volts = whole.lu().solve(&source).expect("a solution").into();
    }
    volts
}

/// Two motors, the second switched on at 4 s: the first slows, draws more, and comes back.
#[test]
fn the_second_start_pulls_on_the_first() {
    let motors = [300.0, 200.0].map(|torque| motor(double_cage(), Shape::Quadratic, torque));
    let mut starts =
        [Progress::new(&motors[0], &Starter::Direct, 0.0), Progress::new(&motors[1], &Starter::Direct, 4.0)];
    let control =
        StepControl { relative: 1e-8, absolute: vec![1e-6, 1e-6, 1.0], longest_s: 0.2, shortest_s: 1e-9 };
    // Speeds of both, energy left after losses, work on the loads and motion.
    let rates = |starts: &[Progress; 2], t: f64, y: &[f64], dy: &mut [f64]| -> Result<(), ()> {
        let volts = terminals(&motors, starts, t, y);
        dy[2] = 0.0;
        for i in 0..2 {
            let seen = starts[i].seen(&motors[i], t, y[i], &volts);
            dy[i] = net_nm(&motors[i], y[i], seen.torque_nm) / motors[i].total_inertia_kgm2();
            let lost = seen.stator_w + seen.rotor_w + seen.core_w + seen.starter_w;
            dy[2] += seen.input_w - lost - motors[i].resisting_nm(y[i]) * y[i];
        }
        Ok(())
    };
    let mut ode = Ode::new(0.0, vec![0.0; 3], control, &mut |t, y, dy| rates(&starts, t, y, dy)).unwrap();
    let (mut before, mut lowest, mut seen_waiting) = (0.0, f64::MAX, false);
    while ode.time_s() < 12.0 {
        let until = starts.iter().filter_map(|s| s.next_corner(ode.time_s())).fold(12.0, f64::min);
        ode.advance(until, &[], &mut |t, y, dy| rates(&starts, t, y, dy)).unwrap();
        let (time, speeds) = (ode.time_s(), [ode.state()[0], ode.state()[1]]);
        for i in 0..2 {
            starts[i].go_on(&motors[i], time, speeds[i]);
        }
        if time >= until {
            ode.restart(&mut |t, y, dy| rates(&starts, t, y, dy)).unwrap();
        }
        seen_waiting |= starts[1].condition(&motors[1], time, speeds[1], 0.0, 0.01) == Condition::Waiting;
        if time <= 4.0 {
            before = speeds[0];
            assert_eq!(speeds[1], 0.0);
        } else {
            lowest = speeds[0].min(lowest);
        }
    }
    let end = [ode.state()[0], ode.state()[1]];
    let volts = terminals(&motors, &starts, 12.0, &end);
    for i in 0..2 {
        let torque = starts[i].seen(&motors[i], 12.0, end[i], &volts).torque_nm;
        assert_eq!(starts[i].condition(&motors[i], 12.0, end[i], torque, 0.01), Condition::Running);
        let slip = running_slip(&motors[i], &volts).unwrap();
        near("final speed", end[i], motors[i].circuit.speed_rad_s(slip), 1e-5);
    }
    let moving: f64 = (0..2).map(|i| 0.5 * motors[i].total_inertia_kgm2() * end[i] * end[i]).sum();
    near("energy of motion", ode.state()[2], moving, 1e-5);
    assert!(seen_waiting && lowest < before - 0.2, "{lowest} {before}");
    assert!(end[0] > lowest && end[0] < before);
}
