//! Motors on the feeder: running, standing still under voltage, and running up.

#[path = "support/nodal.rs"]
mod nodal;
#[path = "support/random.rs"]
mod random;

use fourwire::import::read_files;
use fourwire::machine::{
    DrivenLoad, Motor, Nameplate, Outcome, RunUpSettings, Shape, Starter, StiffBus, balanced, fit, run_up,
};
use fourwire::network::{Conductors, MotorRecord, MotorState, Network, build};
use fourwire::solver::{Settings, Status, solve, solve_running};
use fourwire::study::flow::FlowReport;
use fourwire::study::start::{StartOutcome, start};

/// A motor of that power at that voltage, fan on its shaft.
fn machine(hp: f64, volts: f64) -> Motor {
    let plate = Nameplate { frequency_hz: 60.0, hp: Some(hp), volts: Some(volts), ..Nameplate::default() };
    let ratings = plate.resolve().expect("nothing contradicts");
    let load = DrivenLoad {
        shape: Shape::Quadratic,
        torque_nm: 0.8 * ratings.torque_nm(),
        rated_rad_s: ratings.rated_rad_s(),
        inertia_kgm2: 0.5,
    };
    Motor::new(&ratings, fit(&ratings).expect("a circuit").circuit, load)
}

/// Random networks with motors at random three-phase nodes, at running slip and at standstill:
/// voltages against the nodal method.
#[test]
fn motors_running_and_at_standstill_agree_with_the_nodal_method() {
    let machines: Vec<(f64, Motor)> =
        [208.0, 400.0, 480.0, 4160.0].map(|volts| (volts, machine(50.0, volts))).into();
    let (mut compared, mut standing, mut worst) = (0, 0, 0.0f64);
    for seed in 9000..9080u64 {
        let mut draft = random::random_draft(seed);
        let Some(plain) = build(&draft).network else { continue };
        let fits = |volts: f64| machines.iter().find(|(v, _)| (v / volts - 1.0).abs() < 0.01);
        let three = plain.nodes.iter().filter(|n| Conductors::ABC.is_subset_of(n.conductors));
        let places: Vec<_> =
            three.filter_map(|n| Some((n.name.clone(), &fits(n.nominal_volts)?.1))).collect();
        for (i, (node, machine)) in places.iter().enumerate().take(4) {
            draft.motors.push(MotorRecord {
                motor: format!("M{i}").into(),
                node: node.clone(),
                count: 1 + i as u32 % 2,
                machine: (*machine).clone(),
                starter: Starter::Direct,
                state: MotorState::Running,
                starts_per_hour: None,
                locked_rotor_limit_s: None,
                filled: Vec::new(),
                fit: Vec::new(),
                origin: None,
            });
        }
        let Some(mut network) = build(&draft).network else { continue };
        if network.motors.is_empty() {
            continue;
        }
        // One of them stands still.
        network.motors[0].slip = 1.0;
        let solution = solve(&network, &Settings::default());
        if solution.status != Status::Converged {
            assert!(nodal::solve_nodal(&network).is_none_or(|n| !n.followed), "seed {seed}");
            continue;
        }
        let Some(other) = nodal::solve_nodal(&network).filter(|n| n.followed) else { continue };
        for (node, (a, b)) in network.nodes.iter().zip(solution.volts.iter().zip(&other.volts)) {
            for k in 0..4 {
                let off = (a[k] - b[k]).norm() / node.nominal_phase_volts();
                assert!(off < 1e-8, "seed {seed}, node {}: {off:e}", node.name);
                worst = worst.max(off);
            }
        }
        compared += 1;
        standing += 1;
    }
    println!("{compared} networks, {standing} with a motor at standstill, worst {worst:.1e} of nominal");
    assert!(compared >= 25, "{compared}");
}

/// A stiff source straight at a 60 hp motor, and the plate it has.
fn stiff(state: &str) -> Network {
    let motors = format!(
        "motor,node,hp,volts,rpm,load_torque,load_percent,load_inertia_kgm2,state\nfan,B,60,460,1780,quadratic,80,2,{state}\n"
    );
    let files = [
        ("study.csv", "setting,value\nfrequency_hz,60\n"),
        ("source.csv", "node,kv\nS,0.46\n"),
        ("switches.csv", "switch,from,to,phases\nQ,S,B,abc\n"),
        ("motors.csv", &motors),
    ];
    let reading = read_files(files.iter().map(|(n, t)| ((*n).to_owned(), t.as_bytes().to_vec())).collect());
    let built = build(&reading.draft);
    let told: Vec<_> =
        reading.diagnostics.items().iter().chain(built.diagnostics.items()).map(|d| d.to_string()).collect();
    built.network.unwrap_or_else(|| panic!("{told:#?}"))
}

/// At a stiff bus the feeder's run-up is that of the motor alone: time to any speed, and energy.
#[test]
fn a_start_at_a_stiff_bus_is_the_run_up_of_the_motor_alone() {
    let network = stiff("off");
    for starter in [
        Starter::Direct,
        Starter::Autotransformer { tap: 0.8, change: fourwire::machine::ChangeOver::AtSpeed(0.9) },
    ] {
        let report = start(&network, 0, &starter, "").expect("a start");
        assert_eq!(report.outcome, StartOutcome::Runs);
        let alone = run_up(
            &network.motors[0].machine,
            &starter,
            &mut StiffBus(balanced(460.0)),
            &RunUpSettings::default(),
        )
        .expect("a run-up");
        assert_eq!(alone.outcome, Outcome::Running);
        // Where both pass 1700 rpm, between the steps they happened to take.
        let passes = |points: Vec<(f64, f64)>| {
            let k = points.iter().position(|p| p.1 >= 1700.0).expect("it gets there");
            let (a, b) = (points[k - 1], points[k]);
            a.0 + (b.0 - a.0) * (1700.0 - a.1) / (b.1 - a.1)
        };
        let rpm = |rad_s: f64| rad_s * 30.0 / std::f64::consts::PI;
        let mine = passes(report.trace.iter().map(|i| (i.seconds, i.rpm)).collect());
        let theirs = passes(alone.trace.iter().map(|i| (i.time_s, rpm(i.speed_rad_s))).collect());
        assert!((mine / theirs - 1.0).abs() < 5e-3, "{mine} {theirs}");
        assert!((report.energy_kj * 1e3 / alone.energies.input - 1.0).abs() < 5e-3);
        assert!((report.inrush_amps / alone.trace[0].seen.amps[0].norm() - 1.0).abs() < 1e-9);
    }
}

/// Running motors: what goes in is shaft power and losses, and the network's balance holds.
#[test]
fn a_running_motor_is_part_of_the_balance() {
    let mut network = stiff("running");
    let solution = solve_running(&mut network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    let report = FlowReport::new(&network, &solution, &[], "").expect("a report");
    let motor = &report.motors[0];
    assert!((motor.kw - motor.shaft_kw - motor.loss_kw).abs() < 1e-6 * motor.kw, "{motor:?}");
    assert!((report.totals.source_kw - motor.kw).abs() < 1e-6 * motor.kw);
    assert!(motor.voltage_unbalance_percent < 1e-6 && motor.derating == Some(1.0), "{motor:?}");
    // 80 % of 60 hp at nearly rated speed.
    assert!((motor.shaft_kw / (0.8 * 60.0 * 0.7457) - 1.0).abs() < 0.02, "{motor:?}");
}

/// A weak line: the motor does not get up to speed, and that is told.
#[test]
fn a_start_on_a_weak_line_stalls() {
    let mut network = stiff("off");
    network.supply.impedance = fourwire::math::PhaseMatrix::from_fn(|i, j| {
        if i == j && i < 3 { fourwire::math::Complex64::new(1.0, 1.2) } else { Default::default() }
    });
    let report = start(&network, 0, &Starter::Direct, "").expect("a start");
    assert_eq!(report.outcome, StartOutcome::Stalls);
    assert!(!report.passes());
}
