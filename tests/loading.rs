//! Networks loaded up to what they can carry, and beyond: the solution that no load leads to is
//! found, and where there is none that is said.

#[path = "support/feeder.rs"]
mod feeder;
#[path = "support/nodal.rs"]
mod nodal;
#[path = "support/random.rs"]
mod random;

use fourwire::network::{
    Conductors, Connection, Construction, Draft, LineRecord, LoadModel, LoadRecord, LoadSite, Network,
    SupplyRecord, SwitchState, TransformerRecord, VectorGroup, build,
};
use fourwire::solver::{Path, Settings, Solution, Status, solve};
use fourwire::study::loadability::loadability;

fn scaled(network: &Network, factor: f64) -> Network {
    let mut scaled = network.clone();
    // Demand that cannot be met is what is looked for: no load gives way by itself.
    scaled.study.constant_power_floor_percent = 0.0;
    for load in &mut scaled.loads {
        load.watts *= factor;
        load.vars *= factor;
    }
    scaled
}

fn good(solution: &Solution) -> bool {
    solution.status == Status::Converged && !matches!(solution.path, Path::Folds { .. })
}

/// Just below the limit the solution is the nodal method's, followed from no load; just above there is none.
#[test]
fn random_networks_are_solved_up_to_their_limit_and_not_beyond() {
    let settings = Settings::default();
    let (mut compared, mut leapt, mut worst) = (0, 0, 0.0f64);
    for seed in 5000..5040 {
        let Some(network) = build(&random::random_draft(seed)).network else { continue };
        let Some(limit) = loadability(&network, &settings).factor.filter(|f| *f > 1e-3) else { continue };
        let below = scaled(&network, 0.99 * limit);
        let solution = solve(&below, &settings);
        assert!(good(&solution), "seed {seed}: {:?} at 0.99 of {limit}", solution.status);
        let above = solve(&scaled(&network, 1.01 * limit), &settings);
        assert!(!good(&above), "seed {seed}: a solution at 1.01 of {limit}");
        let other = nodal::solve_nodal(&below).expect("a solution below the limit");
        // Where the nodal method had to leap it may stand on another solution.
        if !other.followed {
            leapt += 1;
            continue;
        }
        for (node, (a, b)) in below.nodes.iter().zip(solution.volts.iter().zip(&other.volts)) {
            for k in 0..4 {
                let off = (a[k] - b[k]).norm() / node.nominal_phase_volts();
                // A hundredth below the fold an error of the currents counts tenfold in the voltages.
                assert!(off < 1e-7, "seed {seed} at 0.99 of {limit}, node {}: {off:e}", node.name);
                worst = worst.max(off);
            }
        }
        compared += 1;
    }
    println!(
        "{compared} networks at 0.99 of their limit, worst {worst:.1e} of nominal; {leapt} where the nodal method leapt"
    );
    assert!(compared >= 30 && leapt <= 3, "{compared} compared, {leapt} leapt");
}

/// Passes against loading on a generated feeder; printed, and bounded.
#[test]
fn passes_against_loading() {
    let settings = Settings::default();
    for nodes in [100, 1000] {
        let network = build(&feeder::feeder(nodes)).network.expect("a network");
        let limit = loadability(&network, &settings).factor.expect("a limit");
        println!("{nodes} nodes: all loads can grow {limit:.3} times");
        for share in [0.25, 0.5, 0.9, 0.95, 0.99, 0.999] {
            let loaded = scaled(&network, share * limit);
            let solution = solve(&loaded, &settings);
            let phases = loaded.nodes.iter().zip(&solution.volts);
            let lowest = phases
                .map(|(n, v)| {
                    (0..3).map(|k| (v[k] - v[3]).norm()).fold(f64::INFINITY, f64::min)
                        / n.nominal_phase_volts()
                })
                .fold(f64::INFINITY, f64::min);
            println!(
                "  {share:5} of it: {:3} passes ({:?}), lowest {lowest:.3} pu",
                solution.iterations, solution.path
            );
            assert!(good(&solution) && solution.iterations < 500);
        }
    }
}

/// A star point earthed through many ohms behind which loads return by earth: the sweep alone goes
/// to and fro. The single-phase load shifts the star point; three equal phases do not.
#[test]
fn loads_behind_a_high_star_point_resistance_are_followed_from_no_load() {
    let mut draft = Draft::default();
    draft.supplies.push(SupplyRecord {
        node: "S".into(),
        nominal_volts: 11e3,
        held_pu: [1.0; 3],
        angle_rad: 0.0,
        three_phase: None,
        single_phase: None,
        earth_ohm: 0.0,
        origin: None,
    });
    draft.transformers.push(TransformerRecord {
        transformer: "T".into(),
        from: "S".into(),
        to: "B".into(),
        rated_va: 60e3,
        from_volts: 11e3,
        to_volts: 400.0,
        group: VectorGroup::parse("Dyn11").expect("a group"),
        terminals: None,
        r_pu: 0.015,
        x_pu: 0.04,
        no_load_watts: 0.0,
        magnetizing_pu: 0.0,
        tap_pu: 0.0,
        from_tap_pu: 0.0,
        from_earth_ohm: None,
        to_earth_ohm: Some(100.0.into()),
        origin: None,
    });
    let mut load = |name: &str, connection, watts, vars| {
        draft.loads.push(LoadRecord {
            load: name.into(),
            site: LoadSite::Node("B".into()),
            connection,
            watts,
            vars,
            model: LoadModel::Current,
            profile: None,
            origin: None,
        });
    };
    load("three", Connection::Star(Conductors::ABC), 10e3, 3e3);
    let a = Conductors::NONE.with(fourwire::network::Conductor::A);
    load("one", Connection::Star(a), 1e3, 200.0);
    let network = build(&draft).network.expect("a network");
    let solution = solve(&network, &Settings::default());
    let other = nodal::solve_nodal(&network).expect("a solution");
    assert!(good(&solution), "{:?} {:?}", solution.status, solution.path);
    for (a, b) in solution.volts.iter().zip(&other.volts) {
        for k in 0..4 {
            assert!((a[k] - b[k]).norm() < 1e-6, "{} {}", a[k], b[k]);
        }
    }
}

/// Networks that strain numbers rather than voltages: micro-ohm links, resistive cables, cables
/// whose charging exceeds their load, impedances a million times apart.
#[test]
fn extreme_impedances_agree_with_the_nodal_method() {
    for (label, ohm_per_km, siemens_per_km, lengths_km) in [
        ("links of a micro-ohm beside ten kilometres", (0.3, 0.35), 0.0, [1e-6, 10.0, 1e-6, 1.0]),
        ("resistance fifty times reactance", (2.0, 0.04), 0.0, [0.5, 0.5, 0.5, 0.5]),
        ("reactance a hundred times resistance", (0.004, 0.4), 0.0, [2.0, 2.0, 2.0, 2.0]),
        ("cables that charge more than they carry", (0.1, 0.1), 120e-6, [20.0, 20.0, 10.0, 10.0]),
        ("a line a million times another", (0.3, 0.35), 3e-6, [2e-5, 20.0, 2e-5, 2e-5]),
    ] {
        let network = build(&chain(ohm_per_km, siemens_per_km, lengths_km)).network.expect(label);
        let solution = solve(&network, &Settings::default());
        let other = nodal::solve_nodal(&network).expect(label);
        assert!(good(&solution), "{label}: {:?}", solution.status);
        for (node, (a, b)) in network.nodes.iter().zip(solution.volts.iter().zip(&other.volts)) {
            for k in 0..4 {
                let off = (a[k] - b[k]).norm() / node.nominal_phase_volts();
                assert!(off < 1e-8, "{label}, node {}: {off:e}", node.name);
            }
        }
    }
}

/// Four lines in a row at 11 kV with an uneven load at the end of each.
fn chain((r, x): (f64, f64), b: f64, lengths_km: [f64; 4]) -> Draft {
    use fourwire::math::{Complex64, PhaseMatrix};
    let mut draft = Draft::default();
    draft.supplies.push(SupplyRecord {
        node: "n0".into(),
        nominal_volts: 11e3,
        held_pu: [1.0; 3],
        angle_rad: 0.0,
        three_phase: None,
        single_phase: None,
        earth_ohm: 0.0,
        origin: None,
    });
    let matrix = |own: Complex64, mutual: Complex64| {
        PhaseMatrix::from_fn(|i, j| match (i, j) {
            (3, _) | (_, 3) => Complex64::default(),
            _ if i == j => own / 1e3,
            _ => mutual / 1e3,
        })
    };
    draft.constructions.push(Construction {
        name: "c".into(),
        conductors: Conductors::ABC,
        z_per_m: matrix(Complex64::new(r, x), Complex64::new(0.2 * r, 0.4 * x)),
        y_per_m: matrix(Complex64::new(0.0, b), Complex64::new(0.0, -0.1 * b)),
        rating_amps: None,
        origin: None,
    });
    for (i, length_km) in lengths_km.into_iter().enumerate() {
        draft.lines.push(LineRecord {
            line: format!("l{i}").into(),
            from: format!("n{i}").into(),
            to: format!("n{}", i + 1).into(),
            conductors: Conductors::ABC,
            length_m: 1e3 * length_km,
            construction: "c".into(),
            sets: 1,
            rating_amps: None,
            state: SwitchState::Closed,
            origin: None,
        });
        for (k, phase) in fourwire::network::Conductor::PHASES.into_iter().enumerate() {
            draft.loads.push(LoadRecord {
                load: format!("d{i}{k}").into(),
                site: LoadSite::Node(format!("n{}", i + 1).into()),
                connection: Connection::Star(Conductors::NONE.with(phase)),
                watts: 60e3 * (k + 1) as f64,
                vars: 20e3,
                model: LoadModel::Power,
                profile: None,
                origin: None,
            });
        }
    }
    draft
}
