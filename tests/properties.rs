//! What holds for every solved network, on random ones: Kirchhoff's laws, power balance,
//! symmetries, scaling, reciprocity. Seeds are fixed, so a run repeats.

#[path = "support/feeder.rs"]
mod feeder;
#[path = "support/random.rs"]
mod random;

use std::collections::HashMap;

use fourwire::math::{Complex64, PhaseMatrix, PhaseVector};
use fourwire::network::{
    Across, Conductor, Conductors, Connection, Draft, LineRecord, LoadModel, LoadRecord, LoadSite, Network,
    Node, SwitchRecord, SwitchState, build,
};
use fourwire::solver::{Settings, Solution, Status, load_current, solve};
use fourwire::study::flow::FlowReport;
use proptest::prelude::*;
use proptest::test_runner::RngSeed;

fn config() -> ProptestConfig {
    ProptestConfig { cases: 40, rng_seed: RngSeed::Fixed(17), ..ProptestConfig::default() }
}

fn solved(draft: &Draft) -> (Network, Solution) {
    let built = build(draft);
    let network = built.network.unwrap_or_else(|| panic!("{:?}", built.diagnostics.items()));
    let solution = solve(&network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    (network, solution)
}

/// Voltages by node name.
fn by_name<'a>(network: &'a Network, solution: &'a Solution) -> HashMap<&'a str, &'a PhaseVector> {
    network.nodes.iter().map(|n| &*n.name).zip(&solution.volts).collect()
}

/// Largest difference of the voltages of nodes both networks have, as a share of nominal.
fn difference(
    a: &(Network, Solution),
    b: &(Network, Solution),
    change: impl Fn(&PhaseVector, &Node) -> PhaseVector,
) -> f64 {
    let other = by_name(&b.0, &b.1);
    a.0.nodes
        .iter()
        .zip(&a.1.volts)
        .filter_map(|(node, v)| {
            let w = other.get(&*node.name)?;
            Some((change(v, node) - *w).norm() / node.nominal_phase_volts())
        })
        .fold(0.0, f64::max)
}

fn power(volts: &PhaseVector, amps: &PhaseVector) -> Complex64 {
    (0..4).map(|k| volts[k] * amps[k].conj()).sum()
}

proptest! {
    #![proptest_config(config())]

    /// Currents at every node and conductor sum to zero: branch ends, loads, capacitors, electrodes.
    #[test]
    fn currents_balance_at_every_node(seed in any::<u64>()) {
        let (network, solution) = solved(&random::random_draft(seed));
        let mut sum = vec![PhaseVector::zeros(); network.nodes.len()];
        sum[network.supply.node.index()] += solution.source_amps;
        for (b, branch) in network.branches.iter().enumerate() {
            sum[branch.from.index()] -= solution.from_amps[b];
            sum[branch.to.index()] += solution.to_amps[b];
        }
        for (i, node) in network.nodes.iter().enumerate() {
            for (k, y) in node.earth_admittance().into_iter().enumerate() {
                sum[i][k] -= y * solution.volts[i][k];
            }
        }
        let mut take = |node: usize, connection: Connection, current: &dyn Fn(Complex64) -> Complex64| {
            for (p, q) in connection.pairs() {
                let carried = network.nodes[node].conductors.has(q);
                let base = if carried { solution.volts[node][q.slot()] } else { Complex64::default() };
                let amps = current(solution.volts[node][p.slot()] - base);
                sum[node][p.slot()] -= amps;
                if carried { sum[node][q.slot()] += amps; }
            }
        };
        for load in &network.loads {
            let each = Complex64::new(load.watts, load.vars) / load.connection.elements() as f64;
            for (id, share) in network.load_sites(load) {
                let nominal = network.node(id).nominal_across(load.connection);
                take(id.index(), load.connection, &|u| load_current(load.model, each * share, nominal, 0.7, u));
            }
        }
        for c in &network.capacitors {
            let y = Complex64::new(0.0, c.vars / c.connection.elements() as f64 / c.rated_volts.powi(2));
            take(c.node.index(), c.connection, &|u| y * u);
        }
        let feeder = solution.source_amps.norm().max(1.0);
        for (node, rest) in network.nodes.iter().zip(&sum) {
            prop_assert!(rest.norm() < 1e-6_f64.max(1e-9 * feeder), "{}: {rest}", node.name);
        }
    }

    /// Source power is what loads draw and what is lost, and losses are what branches do not pass on.
    #[test]
    fn power_balances(seed in any::<u64>()) {
        let (network, solution) = solved(&random::random_draft(seed));
        let report = FlowReport::new(&network, &solution, &[], "").expect("converged");
        let t = &report.totals;
        let scale = t.source_kw.hypot(t.source_kvar).max(t.load_kw.hypot(t.load_kvar)).max(1e-3);
        prop_assert!((t.source_kw - t.load_kw - t.loss_kw).abs() < 1e-8 * scale);
        prop_assert!((t.source_kvar - t.load_kvar - t.loss_kvar).abs() < 1e-8 * scale);
        let branches: Complex64 = network.branches.iter().enumerate().map(|(b, branch)| {
            power(&solution.volts[branch.from.index()], &solution.from_amps[b])
                - power(&solution.volts[branch.to.index()], &solution.to_amps[b])
        }).sum();
        let electrodes: Complex64 = network.nodes.iter().zip(&solution.volts).map(|(node, v)| {
            node.earth_admittance().iter().enumerate().map(|(k, y)| v[k].norm_sqr() * y.conj()).sum::<Complex64>()
        }).sum();
        let losses = (branches + electrodes) / 1e3;
        prop_assert!((losses - Complex64::new(t.loss_kw, t.loss_kvar)).norm() < 1e-8 * scale);
        let parts = t.line_loss_kw + t.neutral_loss_kw + t.transformer_loss_kw + t.earth_loss_kw;
        prop_assert!((parts - t.loss_kw).abs() < 1e-8 * scale);
        prop_assert!(!report.findings.iter().any(|f| f.rule.text() == "power balance"));
    }

    /// Renaming a to b, b to c, c to a, source included, renames the result.
    #[test]
    fn rotating_the_phase_names_rotates_the_result(seed in any::<u64>()) {
        let draft = random::random_draft(seed);
        let (plain, rotated) = (solved(&draft), solved(&rotate(&draft)));
        let turn = |v: &PhaseVector, node: &Node| match node.conductors.is_split() {
            true => *v,
            false => PhaseVector::from_column_slice(&[v[2], v[0], v[1], v[3]]),
        };
        let off = difference(&plain, &rotated, turn);
        prop_assert!(off < 1e-8, "{off}");
    }

    /// Voltages and ratings times k, powers times k squared: voltages times k.
    #[test]
    fn scaling_voltages_and_ratings_scales_the_result(seed in any::<u64>(), k in 0.3..3.0f64) {
        let draft = random::random_draft(seed);
        let (plain, scaled) = (solved(&draft), solved(&scale(&draft, k)));
        let off = difference(&plain, &scaled, |v, _| v * Complex64::from(k));
        prop_assert!(off < 1e-8 * k.max(1.0), "{off}");
    }

    /// A line in two halves is the same line.
    #[test]
    fn splitting_a_line_changes_nothing(seed in any::<u64>(), which in any::<prop::sample::Index>()) {
        let mut draft = random::random_draft(seed);
        draft.constructions.iter_mut().for_each(|c| c.y_per_m = PhaseMatrix::zeros());
        prop_assume!(!draft.lines.is_empty());
        let i = which.index(draft.lines.len());
        let spread = draft.lines[i].line.clone();
        prop_assume!(!draft.loads.iter().any(|l| matches!(&l.site, LoadSite::Line(line) if *line == spread)));
        let mut split = draft.clone();
        let half = LineRecord {
            line: "half".into(),
            from: "middle".into(),
            length_m: draft.lines[i].length_m / 2.0,
            ..draft.lines[i].clone()
        };
        split.lines[i].to = "middle".into();
        split.lines[i].length_m /= 2.0;
        split.lines.push(half);
        let off = difference(&solved(&draft), &solved(&split), |v, _| *v);
        prop_assert!(off < 1e-8, "{off}");
    }

    /// A closed switch in a line changes nothing.
    #[test]
    fn a_closed_switch_changes_nothing(seed in any::<u64>(), which in any::<prop::sample::Index>()) {
        let draft = random::random_draft(seed);
        prop_assume!(!draft.lines.is_empty());
        let i = which.index(draft.lines.len());
        let mut switched = draft.clone();
        let line = &mut switched.lines[i];
        // The switch at the end where no load spread along the line would move.
        let (end, conductors) = (line.to.clone(), line.conductors);
        line.to = "gap".into();
        prop_assume!(!draft.loads.iter().any(|l| matches!(&l.site, LoadSite::Line(name) if *name == line.line)));
        switched.switches.push(SwitchRecord {
            switch: "gap".into(),
            from: "gap".into(),
            to: end,
            conductors,
            state: SwitchState::Closed,
            origin: None,
        });
        let off = difference(&solved(&draft), &solved(&switched), |v, _| *v);
        prop_assert!(off < 1e-8, "{off}");
    }

    /// Writing a line the other way round turns its currents, and nothing else.
    #[test]
    fn exchanging_the_ends_of_lines_turns_their_currents(seed in any::<u64>()) {
        let draft = random::random_draft(seed);
        let mut turned = draft.clone();
        for line in &mut turned.lines {
            std::mem::swap(&mut line.from, &mut line.to);
        }
        let (plain, turned) = (solved(&draft), solved(&turned));
        prop_assert!(difference(&plain, &turned, |v, _| *v) < 1e-8);
        for (b, branch) in plain.0.branches.iter().enumerate().filter(|(_, b)| b.kind.word() == "line") {
            let other = turned.0.branches.iter().position(|o| o.name == branch.name).expect("the same line");
            let rest = plain.1.from_amps[b] + turned.1.to_amps[other];
            prop_assert!(rest.norm() < 1e-6 * (1.0 + plain.1.source_amps.norm()), "{}: {rest}", branch.name);
        }
    }

    /// Transfer impedance is the same both ways: an admittance y added at i moves V_j by -Z_ji y V_i.
    #[test]
    fn the_linear_part_is_reciprocal(seed in any::<u64>(), first in any::<prop::sample::Index>(), second in any::<prop::sample::Index>()) {
        let mut draft = random::random_draft(seed);
        draft.loads.iter_mut().for_each(|l| l.model = LoadModel::Impedance);
        let plain = solved(&draft);
        // Places with a phase and its own way back, so that the probe is a load like any other.
        let places: Vec<(usize, Conductor)> = plain.0.nodes.iter().enumerate().skip(1)
            .filter(|(_, n)| n.conductors.has_neutral())
            .flat_map(|(i, n)| n.conductors.phases().iter().map(move |c| (i, c)).collect::<Vec<_>>())
            .filter(|(i, _)| !blocked(&plain.0, *i))
            .collect();
        prop_assume!(places.len() > 1);
        let (i, j) = (places[first.index(places.len())], places[second.index(places.len())]);
        let (to_j, to_i) = (transfer(&draft, &plain, i, j), transfer(&draft, &plain, j, i));
        // Places that hardly see each other are left to rounding.
        let size = to_j.norm().max(to_i.norm()).max(1e-6);
        prop_assert!((to_j - to_i).norm() < 1e-5 * size, "{to_j} {to_i}");
    }
}

/// Whether the side of a node is fed by a winding that blocks unbalanced current.
fn blocked(network: &Network, mut node: usize) -> bool {
    while let Some(feed) = network.feeds[node] {
        if !network.nodes[node].reference_on.is_empty() {
            return true;
        }
        if network.branch(feed.branch).kind.word() == "transformer" {
            return false;
        }
        node = feed.parent.index();
    }
    false
}

/// Transfer impedance from a probe at `at` to the phase-to-neutral voltage at `seen`, ohms.
fn transfer(
    draft: &Draft,
    plain: &(Network, Solution),
    at: (usize, Conductor),
    seen: (usize, Conductor),
) -> Complex64 {
    let node = &plain.0.nodes[at.0];
    let mut probed = draft.clone();
    // A hundredth of an ampere per volt is felt by a low-voltage node, a tenth of a milliampere by a high one.
    let watts =
        1e-3 * node.nominal_phase_volts().powi(2) * if node.nominal_volts > 2000.0 { 0.1 } else { 10.0 };
    probed.loads.push(LoadRecord {
        load: "probe".into(),
        site: LoadSite::Node(node.name.clone()),
        connection: Connection::Star(Conductors::NONE.with(at.1)),
        watts,
        vars: 0.0,
        model: LoadModel::Impedance,
        profile: None,
        origin: None,
    });
    let with = solved(&probed);
    let across =
        |s: &Solution, (i, c): (usize, Conductor)| s.volts[i][c.slot()] - s.volts[i][Conductor::N.slot()];
    let siemens = watts / node.nominal_phase_volts().powi(2);
    (across(&plain.1, seen) - across(&with.1, seen)) / (siemens * across(&with.1, at))
}

fn turned(set: Conductors) -> Conductors {
    set.iter().map(turned_conductor).collect()
}

/// The phase after it; what stands behind a centre tap keeps its name.
fn turned_conductor(c: Conductor) -> Conductor {
    if matches!(c, Conductor::S1 | Conductor::S2) { c } else { c.next() }
}

fn turned_connection(connection: Connection) -> Connection {
    match connection {
        Connection::Star(p) => Connection::Star(turned(p)),
        Connection::Delta(p) => Connection::Delta(turned(p)),
    }
}

fn turned_matrix(m: &PhaseMatrix) -> PhaseMatrix {
    let from = |slot: usize| [2, 0, 1, 3][slot];
    PhaseMatrix::from_fn(|i, j| m[(from(i), from(j))])
}

/// The draft with every a called b, b called c and c called a.
fn rotate(draft: &Draft) -> Draft {
    let mut d = draft.clone();
    let supply = &mut d.supplies[0];
    supply.held_pu.rotate_right(1);
    supply.angle_rad += 2.0 * std::f64::consts::PI / 3.0;
    for c in &mut d.constructions {
        if c.conductors.is_split() {
            continue;
        }
        c.conductors = turned(c.conductors);
        c.z_per_m = turned_matrix(&c.z_per_m);
        c.y_per_m = turned_matrix(&c.y_per_m);
    }
    d.lines.iter_mut().for_each(|l| l.conductors = turned(l.conductors));
    d.switches.iter_mut().for_each(|s| s.conductors = turned(s.conductors));
    d.transformers.iter_mut().for_each(|t| t.terminals = t.terminals.map(|both| both.map(turned_connection)));
    for r in &mut d.regulators {
        r.phases = turned(r.phases);
        r.taps.rotate_right(1);
        if let Across::Phase(m) = &mut r.across {
            *m = m.next();
        }
    }
    d.loads.iter_mut().for_each(|l| l.connection = turned_connection(l.connection));
    d.capacitors.iter_mut().for_each(|c| c.connection = turned_connection(c.connection));
    d
}

/// The draft with voltages times `k` and powers times `k` squared: impedances stay.
fn scale(draft: &Draft, k: f64) -> Draft {
    let mut d = draft.clone();
    let supply = &mut d.supplies[0];
    supply.nominal_volts *= k;
    for level in [&mut supply.three_phase, &mut supply.single_phase].into_iter().flatten() {
        level.volt_amperes *= k * k;
    }
    for t in &mut d.transformers {
        t.from_volts *= k;
        t.to_volts *= k;
        t.rated_va *= k * k;
        t.no_load_watts *= k * k;
    }
    for l in &mut d.loads {
        l.watts *= k * k;
        l.vars *= k * k;
    }
    for c in &mut d.capacitors {
        c.vars *= k * k;
    }
    d
}

/// Transposed lines, equal loads: balanced voltages, and a neutral that carries nothing.
#[test]
fn a_balanced_network_stays_balanced() {
    let mut draft = feeder::feeder(60);
    for load in &mut draft.loads {
        (load.watts, load.vars) = (2000.0, 800.0);
    }
    let (network, solution) = solved(&draft);
    let third = Complex64::from_polar(1.0, 2.0 * std::f64::consts::PI / 3.0);
    for (node, v) in network.nodes.iter().zip(&solution.volts) {
        assert!((v[0] - v[1] * third).norm() < 1e-8 * v[0].norm(), "{}", node.name);
        assert!((v[0] - v[2] * third.conj()).norm() < 1e-8 * v[0].norm(), "{}", node.name);
        assert!(v[3].norm() < 1e-6, "{}: neutral at {} V", node.name, v[3].norm());
    }
    assert!(solution.from_amps.iter().all(|i| i[3].norm() < 1e-6));
}

/// The neutral's earthing is part of the elimination: its resistance does not slow the iteration.
#[test]
fn iterations_do_not_depend_on_the_earth_resistance() {
    let iterations: Vec<usize> = [1e-3, 0.1, 1.0, 10.0, 1e3, 1e6]
        .into_iter()
        .map(|ohm| {
            let mut draft = feeder::feeder(400);
            draft.nodes.iter_mut().for_each(|n| n.earth_ohm = Some(ohm));
            solved(&draft).1.iterations
        })
        .collect();
    let (least, most) = (iterations.iter().min(), iterations.iter().max());
    assert!(most.zip(least).is_some_and(|(a, b)| a - b <= 2), "{iterations:?}");
}
