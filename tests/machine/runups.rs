//! Run-ups against closed forms, quadrature and a second integrator; starters against their tables.

use std::f64::consts::PI;

use fourwire::machine::*;
use fourwire::math::{Complex64, polar};

use super::nameplates::double_cage;
use super::near;
use super::unbalanced::motor;

const SYNC: f64 = 60.0 * PI;

fn to(speed: f64) -> RunUpSettings {
    RunUpSettings { finish: Finish::AtSpeed(speed), ..RunUpSettings::default() }
}

fn stiff() -> StiffBus {
    StiffBus(balanced(460.0))
}

/// Unbalanced terminals.
fn uneven() -> Phases {
    [polar(270.0, 0.0), polar(255.0, -2.05), polar(262.0, 2.15)]
}

/// Stator resistance and magnetising current left out, the torque is `2 Tk / (s/sk + sk/s)` (Kloss), and the time from
/// standstill to slip `s` without load is `J w0 / (2 Tk) ((1 - s^2) / (2 sk) + sk ln(1/s))`; the rotor's heat is the
/// energy of motion at synchronous speed less that of the slip left, `J w0^2 / 2 (1 - s^2)`.
#[test]
fn kloss_in_closed_form() {
    let circuit = Circuit {
        r1_ohm: 0.0,
        xm_ohm: 1e9,
        mechanical: MechanicalLoss { watts: 0.0, at_rad_s: SYNC },
        ..super::chapman()
    };
    let m = motor(circuit, Shape::Constant, 0.0);
    let x = circuit.x1_ohm + circuit.rotor_x_ohm;
    let (peak_slip, peak) = (circuit.inner.r_ohm / x, 460.0 * 460.0 / (2.0 * x * SYNC));
    let (slip, j) = (0.03, m.total_inertia_kgm2());
    let time =
        j * SYNC / (2.0 * peak) * ((1.0 - slip * slip) / (2.0 * peak_slip) - peak_slip * f64::ln(slip));
    let done = run_up(&m, &Starter::Direct, &mut stiff(), &to(SYNC * (1.0 - slip))).unwrap();
    assert_eq!(done.outcome, Outcome::Running);
    near("time", done.seconds, time, 1e-6);
    near("heat of the rotor", done.energies.rotor, 0.5 * j * SYNC * SYNC * (1.0 - slip * slip), 1e-6);
}

/// A drive at its current limit gives constant torque: `t = J w / T`.
#[test]
fn constant_accelerating_torque() {
    let circuit = Circuit { mechanical: MechanicalLoss { watts: 0.0, at_rad_s: SYNC }, ..double_cage() };
    let m = motor(circuit, Shape::Constant, 300.0);
    let drive = Starter::Drive { limit_amps: 1.25 * 115.0, ramp_s: 0.01, efficiency: 0.97, pf: 0.95 };
    let done = run_up(&m, &drive, &mut stiff(), &to(m.rated_rad_s)).unwrap();
    near("time", done.seconds, m.total_inertia_kgm2() * m.rated_rad_s / (1.25 * 400.0 - 300.0), 1e-9);
    // With a long ramp the ramp decides.
    let drive = Starter::Drive { limit_amps: 1.25 * 115.0, ramp_s: 20.0, efficiency: 0.97, pf: 0.95 };
    near("ramp", run_up(&m, &drive, &mut stiff(), &to(m.rated_rad_s)).unwrap().seconds, 20.0, 1e-9);
}

/// `t = J integral dw / (T - TL)` by Simpson's rule.
fn quadrature(m: &Motor, volts: &Phases, speed: f64) -> f64 {
    let slowness =
        |w: f64| 1.0 / (m.circuit.operation(m.circuit.slip(w), volts).torque_nm - m.resisting_nm(w));
    let pieces = 20_000;
    let step = speed / f64::from(pieces);
    let weight = |i: i32| {
        if i == 0 || i == pieces {
            1.0
        } else if i % 2 == 1 {
            4.0
        } else {
            2.0
        }
    };
    let sum: f64 = (0..=pieces).map(|i| weight(i) * slowness(f64::from(i) * step)).sum();
    m.total_inertia_kgm2() * sum * step / 3.0
}

#[test]
fn time_agrees_with_quadrature() {
    let pump = Shape::Table(vec![(0.0, 0.2), (0.1, 0.05), (0.5, 0.3), (1.0, 1.0)]);
    for shape in [Shape::Constant, Shape::Linear, Shape::Quadratic, pump] {
        for volts in [balanced(460.0), uneven()] {
            let m = motor(double_cage(), shape.clone(), 300.0);
            let speed = 0.97 * SYNC;
            let done = run_up(&m, &Starter::Direct, &mut StiffBus(volts), &to(speed)).unwrap();
            let time = quadrature(&m, &volts, speed);
            println!(
                "{shape:?}: {:.6} s, by quadrature {time:.6} s, {} evaluations",
                done.seconds, done.evaluations
            );
            // The corner of the table costs Simpson's rule some digits.
            near("time", done.seconds, time, 1e-5);
            assert!(done.energies.imbalance().abs() < 1e-5, "{:?}", done.energies);
        }
    }
}

/// Classical Runge-Kutta of order 4 with small fixed steps, speed against time.
#[test]
fn trace_agrees_with_a_second_integrator() {
    let m = motor(double_cage(), Shape::Quadratic, 300.0);
    let done = run_up(&m, &Starter::Direct, &mut StiffBus(uneven()), &RunUpSettings::default()).unwrap();
    assert_eq!(done.outcome, Outcome::Running);
    let rate = |w: f64| {
        (m.circuit.operation(m.circuit.slip(w), &uneven()).torque_nm - m.resisting_nm(w))
            / m.total_inertia_kgm2()
    };
    let (mut speed, mut time) = (0.0, 0.0);
    for instant in &done.trace {
        let steps = ((instant.time_s - time) / 2e-4).ceil().max(1.0);
        let h = (instant.time_s - time) / steps;
        for _ in 0..steps as u32 {
            let a = rate(speed);
            let b = rate(speed + 0.5 * h * a);
            let c = rate(speed + 0.5 * h * b);
            let d = rate(speed + h * c);
            speed += h / 6.0 * (a + 2.0 * b + 2.0 * c + d);
        }
        time = instant.time_s;
        assert!((instant.speed_rad_s - speed).abs() < 1e-5 * SYNC, "{time}: {} {speed}", instant.speed_rad_s);
    }
    // Where it settles, it runs.
    let slip = running_slip(&m, &uneven()).unwrap();
    near("final speed", done.speed_rad_s, m.circuit.speed_rad_s(slip), 1e-3);
}

fn starters() -> Vec<Starter> {
    let change = ChangeOver::AtSpeed(0.9);
    vec![
        Starter::Direct,
        Starter::StarDelta { change, pause_s: 0.05 },
        Starter::StarDelta { change: ChangeOver::AfterSeconds(3.0), pause_s: 0.0 },
        Starter::Autotransformer { tap: 0.5, change },
        Starter::Autotransformer { tap: 0.65, change },
        Starter::Autotransformer { tap: 0.8, change },
        Starter::PartWinding { change: ChangeOver::AfterSeconds(2.0) },
        Starter::Soft { limit_amps: 350.0, initial: 0.4, ramp_s: 6.0 },
        Starter::Drive { limit_amps: 150.0, ramp_s: 8.0, efficiency: 0.97, pf: 0.95 },
        Starter::Capacitor { var: 80e3, change },
    ]
}

/// Electrical energy in is losses, motion and work on the load, for every starter, even and uneven.
#[test]
fn energy_balances_for_every_starter() {
    let m = motor(double_cage(), Shape::Quadratic, 120.0);
    for starter in starters() {
        for volts in [balanced(460.0), uneven()] {
            let done = run_up(&m, &starter, &mut StiffBus(volts), &RunUpSettings::default()).unwrap();
            println!(
                "{starter:?}: {:?} {:.2} s, {:.0} A, {:.1} kJ, imbalance {:.1e}, {} evaluations",
                done.outcome,
                done.seconds,
                done.greatest_amps,
                done.energies.input / 1e3,
                done.energies.imbalance(),
                done.evaluations
            );
            assert_eq!(done.outcome, Outcome::Running, "{starter:?}");
            assert!(done.energies.imbalance().abs() < 1e-5, "{starter:?} {:?}", done.energies);
        }
    }
}

/// What the feeder sees is one thing told in three ways: admittance, currents, power.
#[test]
fn admittance_currents_and_power_agree() {
    let m = motor(double_cage(), Shape::Quadratic, 300.0);
    for starter in starters() {
        for stage in starter.stages(&m) {
            for (speed, time) in [(0.0, 0.0), (90.0, 1.0), (180.0, 9.0)] {
                let seen = stage.coupling.seen(&m, speed, time, &uneven());
                let drawn = seen.admittance * nalgebra::Vector3::from(uneven());
                let power: Complex64 = (0..3).map(|i| uneven()[i] * seen.amps[i].conj()).sum();
                let scale = power.norm().max(1.0);
                assert!((0..3).all(|i| (drawn[i] - seen.amps[i]).norm() < 1e-9 * scale), "{stage:?}");
                assert!((power.re - seen.input_w).abs() < 1e-9 * scale, "{stage:?} {speed}");
                let out =
                    seen.stator_w + seen.rotor_w + seen.core_w + seen.starter_w + seen.torque_nm * speed;
                assert!((seen.input_w - out).abs() < 1e-9 * scale, "{stage:?} {speed}");
            }
        }
    }
}

/// EASA Electrical Engineering Handbook, starting characteristics of cage motors: line current and torque in percent
/// of those at full voltage: star 33 and 33, taps of 80, 65 and 50 % 64, 42 and 25, part winding 70 and 50.
#[test]
fn starters_at_standstill() {
    let m = motor(double_cage(), Shape::Constant, 0.0);
    let at = |coupling: Coupling| {
        let seen = coupling.seen(&m, 0.0, 0.0, &balanced(460.0));
        (seen.amps[0].norm(), seen.torque_nm)
    };
    let full = at(Coupling::Direct);
    for (coupling, current, torque) in [
        (Coupling::Star, 0.33, 0.33),
        (Coupling::Tap(0.8), 0.64, 0.64),
        (Coupling::Tap(0.65), 0.42, 0.42),
        (Coupling::Tap(0.5), 0.25, 0.25),
        (Coupling::HalfWinding, 0.70, 0.50),
        (Coupling::Off, 0.0, 0.0),
    ] {
        let seen = at(coupling);
        assert!((seen.0 / full.0 - current).abs() < 0.006, "{coupling:?}");
        assert!((seen.1 / full.1 - torque).abs() < 0.006, "{coupling:?}");
    }
    // Soft starter: torque as the square of the current (k / LRC)^2.
    let soft = at(Coupling::Soft { limit_amps: 0.5 * full.0, initial: 0.9, ramp_s: 1.0 });
    near("current", soft.0, 0.5 * full.0, 1e-9);
    near("torque", soft.1, 0.25 * full.1, 1e-9);
    // Capacitors take reactive current off the line and leave the torque.
    let helped = at(Coupling::Capacitor(0.5));
    assert!(helped.0 < full.0 && (helped.1 - full.1).abs() < 1e-9);
}

#[test]
fn the_limit_of_a_soft_starter_holds() {
    let m = motor(double_cage(), Shape::Quadratic, 300.0);
    let soft = Starter::Soft { limit_amps: 300.0, initial: 0.3, ramp_s: 1.0 };
    let done = run_up(&m, &soft, &mut stiff(), &RunUpSettings::default()).unwrap();
    assert_eq!(done.outcome, Outcome::Running);
    assert!(done.greatest_amps <= 300.0 * (1.0 + 1e-9), "{}", done.greatest_amps);
}

#[test]
fn stalls_are_told() {
    // Too little voltage for a constant load: at standstill for ever.
    let m = motor(double_cage(), Shape::Constant, 400.0);
    let low =
        run_up(&m, &Starter::Direct, &mut StiffBus(balanced(230.0)), &RunUpSettings::default()).unwrap();
    assert_eq!((low.outcome, low.speed_rad_s, low.seconds), (Outcome::Stalled, 0.0, 0.0));
    // A fan on too low a voltage hangs half way up.
    let fan = motor(double_cage(), Shape::Quadratic, 700.0);
    let hung =
        run_up(&fan, &Starter::Direct, &mut StiffBus(balanced(260.0)), &RunUpSettings::default()).unwrap();
    assert!(
        hung.outcome == Outcome::Stalled && hung.speed_rad_s > 50.0 && hung.speed_rad_s < 0.95 * SYNC,
        "{hung:?}"
    );
    // A change-over at a speed that star never reaches.
    let change = ChangeOver::AtSpeed(0.95);
    let star =
        run_up(&m, &Starter::StarDelta { change, pause_s: 0.0 }, &mut stiff(), &RunUpSettings::default());
    assert_eq!(star.unwrap().outcome, Outcome::Stalled);
    // By time it goes on from where it stands.
    let change = ChangeOver::AfterSeconds(2.0);
    let timed =
        run_up(&m, &Starter::StarDelta { change, pause_s: 0.1 }, &mut stiff(), &RunUpSettings::default());
    let timed = timed.unwrap();
    assert_eq!((timed.outcome, timed.changes.len()), (Outcome::Running, 2));
    near("change", timed.changes[1].0, 2.1, 1e-9);
    // A great inertia takes longer than the time looked at.
    let mut heavy = motor(double_cage(), Shape::Quadratic, 300.0);
    heavy.load.inertia_kgm2 = 5e4;
    let slow = run_up(&heavy, &Starter::Direct, &mut stiff(), &RunUpSettings::default()).unwrap();
    assert_eq!((slow.outcome, slow.seconds), (Outcome::TooSlow, 120.0));
}

/// Voltage behind an impedance a phase, and a dip of the source between 0.5 and 0.8 s.
struct Weak;

impl Terminals for Weak {
    type Fault = String;
    fn volts(&mut self, time_s: f64, draws: &dyn Fn(&Phases) -> Seen) -> Result<Phases, String> {
        let part = if (0.5..0.8).contains(&time_s) { 0.7 } else { 1.0 };
        let source = nalgebra::Vector3::from(balanced(460.0 * part));
        let mut volts: Phases = source.into();
        for _ in 0..200 {
            let z = Complex64::new(0.01, 0.05);
            let whole = Matrix3::identity() + draws(&volts).admittance * z;
            let next = whole.lu().solve(&source).ok_or("no solution")?;
            let moved = (0..3).map(|i| (next[i] - volts[i]).norm()).fold(0.0, f64::max);
            volts = next.into();
            if moved < 1e-9 {
                return Ok(volts);
            }
        }
        Err("not converged".to_string())
    }
}

#[test]
fn a_weak_supply_dips_and_recovers() {
    let m = motor(double_cage(), Shape::Quadratic, 100.0);
    let settings = RunUpSettings { corners_s: vec![0.5, 0.8], ..RunUpSettings::default() };
    for starter in starters() {
        let done = run_up(&m, &starter, &mut Weak, &settings).unwrap();
        assert_eq!(done.outcome, Outcome::Running, "{starter:?}");
        assert!(done.energies.imbalance().abs() < 1e-5, "{starter:?}: {:?}", done.energies);
        let (first, last) = (&done.trace[0], &done.trace[done.trace.len() - 1]);
        assert!(first.volts[0].norm() < last.volts[0].norm() + 1.0);
    }
    let direct = run_up(&m, &Starter::Direct, &mut Weak, &settings).unwrap();
    let firm = run_up(&m, &Starter::Direct, &mut stiff(), &settings).unwrap();
    assert!(direct.seconds > firm.seconds && direct.greatest_amps < firm.greatest_amps);
}

#[test]
fn senseless_settings_are_told() {
    let mut m = motor(double_cage(), Shape::Table(vec![(0.5, 1.0)]), 300.0);
    (m.inertia_kgm2, m.load.inertia_kgm2) = (0.0, -1.0);
    m.circuit.xm_ohm = f64::NAN;
    let starter = Starter::Autotransformer { tap: 1.5, change: ChangeOver::AtSpeed(2.0) };
    let Err(RunUpFault::Settings(faults)) = run_up(&m, &starter, &mut stiff(), &RunUpSettings::default())
    else {
        panic!("not refused")
    };
    assert!(faults.len() >= 5, "{faults:?}");
}

/// A running motor in a dip: it slows and settles, or slows to a stop; from above speed it comes down.
#[test]
fn a_running_motor_in_a_dip() {
    let m = motor(double_cage(), Shape::Constant, 380.0);
    let at = |part: f64| {
        let volts = balanced(460.0 * part);
        let from_rad_s = m.circuit.speed_rad_s(running_slip(&m, &balanced(460.0)).unwrap());
        let settings =
            RunUpSettings { from_rad_s, finish: Finish::Settled(1e-4), ..RunUpSettings::default() };
        (run_up(&m, &Starter::Direct, &mut StiffBus(volts), &settings).unwrap(), volts)
    };
    let (shallow, volts) = at(0.85);
    assert_eq!(shallow.outcome, Outcome::Running);
    near("speed", shallow.speed_rad_s, m.circuit.speed_rad_s(running_slip(&m, &volts).unwrap()), 1e-5);
    assert!(shallow.energies.kinetic < 0.0 && shallow.energies.imbalance().abs() < 1e-5);
    let (deep, volts) = at(0.55);
    assert!(running_slip(&m, &volts).is_err());
    assert_eq!((deep.outcome, deep.speed_rad_s), (Outcome::Stalled, 0.0));
    assert!(deep.seconds > 0.1 && deep.energies.imbalance().abs() < 1e-5);
    let above = RunUpSettings { from_rad_s: 1.02 * SYNC, ..RunUpSettings::default() };
    let down = run_up(&m, &Starter::Direct, &mut stiff(), &above).unwrap();
    assert!(down.outcome == Outcome::Running && down.speed_rad_s < SYNC);
}
