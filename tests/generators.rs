//! Generators and inverters: constant power, power factor, curves, ratings, reverse flow.

#[path = "support/nodal.rs"]
mod nodal;
#[path = "support/random.rs"]
mod random;

use fourwire::import::read_files;
use fourwire::network::{
    Curve, CurvePoint, GeneratorRecord, LoadSite, Network, Priority, ReactiveRecord, SwitchState, build,
};
use fourwire::solver::{Settings, Solution, Status, generator_pu, solve_operating};
use fourwire::study::flow::{FlowReport, Rule};

fn network(generators: &str, curves: &str, load_kw: f64) -> Network {
    let loads = format!("load,node,phases,kw,kvar\nmill,B,abc,{load_kw},0\n");
    let files = [
        ("source.csv", "node,kv\nS,0.4\n"),
        ("lines.csv", "line,from,to,phases,length_km,construction\nL,S,B,abc,1,line\n"),
        (
            "constructions.csv",
            "construction,kind,r1_ohm_per_km,x1_ohm_per_km,r0_ohm_per_km,x0_ohm_per_km\nline,sequence,0.12,0.08,0.3,0.3\n",
        ),
        ("loads.csv", &loads),
        ("generators.csv", generators),
        ("curves.csv", curves),
    ];
    let files = files.iter().filter(|(_, t)| !t.is_empty());
    let reading = read_files(files.map(|(n, t)| ((*n).to_owned(), t.as_bytes().to_vec())).collect());
    let built = build(&reading.draft);
    let told: Vec<_> =
        reading.diagnostics.items().iter().chain(built.diagnostics.items()).map(|d| d.to_string()).collect();
    assert!(!reading.diagnostics.has_errors(), "{told:#?}");
    built.network.unwrap_or_else(|| panic!("{told:#?}"))
}

fn solved(network: &mut Network) -> Solution {
    let solution = solve_operating(network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    solution
}

/// Per-unit voltage at the far end of a line `r + j x` ohm, 400 V, that takes `p + j q` watts there:
/// `u^4 + u^2 (2 (r p + x q) - 1) + |z s|^2 = 0`, all per unit (any text on short lines, from memory).
fn far_pu(p: f64, q: f64) -> f64 {
    let (r, x) = (0.12 / 0.16, 0.08 / 0.16);
    let (p, q) = (p / 1e6, q / 1e6);
    let b = 2.0 * (r * p + x * q) - 1.0;
    let c = (r * r + x * x) * (p * p + q * q);
    ((-b + (b * b - 4.0 * c).sqrt()) / 2.0).sqrt()
}

const HEADER: &str = "generator,node,phases,kw,kvar,pf,kva,volt_var,volt_watt\n";

#[test]
fn constant_power_is_the_closed_form_of_a_short_line() {
    for (row, p, q) in [("G,B,abc,90,20,,,,\n", 90e3, 20e3), ("G,B,abc,60,,-0.8,,,\n", 60e3, -45e3)] {
        let mut network = network(&format!("{HEADER}{row}"), "", 30.0);
        let solution = solved(&mut network);
        let pu = generator_pu(&network, &solution, &network.generators[0]);
        assert!((pu - far_pu(30e3 - p, -q)).abs() < 1e-9, "{pu} {}", far_pu(30e3 - p, -q));
        let report = FlowReport::new(&network, &solution, &[], "").expect("a report");
        assert!(report.totals.source_kw < 0.0, "the feeder delivers");
        let delivered =
            |f: &&fourwire::study::flow::Finding| f.rule == Rule::Generation && f.place == "source";
        assert!(report.findings.iter().any(|f| delivered(&f)));
        assert!(report.findings.iter().all(|f| f.rule != Rule::Balance));
    }
}

/// The operating point is where curve and line meet: found here by bisection on the closed form.
#[test]
fn a_volt_var_curve_meets_the_line() {
    for slope in [1.0, 10.0, 100.0] {
        // 44 % of 100 kVA over so many per unit, about 1.02 pu; the steepest is a step of 0.04 %.
        let (low, high) = (1.02 - 0.04 / slope, 1.02 + 0.04 / slope);
        let curves = format!("curve,pu,percent\nv,{low},44\nv,{high},-44\n");
        let mut network = network(&format!("{HEADER}G,B,abc,90,,,100,v,\n"), &curves, 30.0);
        let solution = solved(&mut network);
        let pu = generator_pu(&network, &solution, &network.generators[0]);
        let points = [(low, 44.0), (high, -44.0)].map(|(pu, percent)| CurvePoint { pu, percent });
        let curve = Curve::new("v".into(), points.to_vec()).expect("a curve");
        let vars = |u: f64| {
            let most = (100e3f64.powi(2) - 90e3f64.powi(2)).sqrt();
            (curve.percent(u) * 1e3).clamp(-most, most)
        };
        let (mut a, mut b) = (0.8, 1.3);
        for _ in 0..200 {
            let middle = 0.5 * (a + b);
            if far_pu(-60e3, -vars(middle)) > middle { a = middle } else { b = middle }
        }
        assert!((pu - a).abs() < 1e-8, "slope {slope}: {pu} instead of {a}");
    }
}

#[test]
fn a_volt_watt_curve_holds_active_power_back() {
    let curves = "curve,pu,percent\nw,1.02,100\nw,1.06,0\n";
    let mut network = network(&format!("{HEADER}G,B,abc,100,0,,100,,w\n"), curves, 0.1);
    let solution = solved(&mut network);
    let report = FlowReport::new(&network, &solution, &[], "").expect("a report");
    let g = &report.generators[0];
    assert!(g.by_volt_watt && g.kw < 99.0, "{g:?}");
    assert!((g.kw - (1.06 - g.pu) / 0.04 * 100.0).abs() < 1e-5, "{g:?}");
    assert!((g.pu - far_pu(100.0 - g.kw * 1e3, 0.0)).abs() < 1e-9);
}

/// Random networks with a generator beside every third load, some on curves, against the nodal method.
#[test]
fn random_networks_with_generators_agree_with_the_nodal_method() {
    let (mut compared, mut following) = (0, 0);
    for seed in 7000..7080 {
        let mut draft = random::random_draft(seed);
        let loads: Vec<_> = draft.loads.iter().step_by(3).cloned().collect();
        draft.curves.push(fourwire::network::CurveRecord {
            curve: "v".into(),
            points: [(0.9, 40.0), (0.97, 0.0), (1.0, 0.0), (1.06, -40.0)]
                .map(|(pu, percent)| CurvePoint { pu, percent })
                .to_vec(),
            origin: None,
        });
        for (i, load) in loads.iter().enumerate() {
            let LoadSite::Node(node) = &load.site else { continue };
            let by_curve = i % 2 == 1;
            draft.generators.push(GeneratorRecord {
                generator: format!("G{i}").into(),
                node: node.clone(),
                connection: load.connection,
                watts: load.watts * 1.3,
                reactive: if by_curve {
                    ReactiveRecord::VoltVar("v".into())
                } else {
                    ReactiveRecord::Held(0.2 * load.watts)
                },
                volt_watt: None,
                rated_va: Some(1.6 * load.watts),
                priority: Priority::Watts,
                state: SwitchState::Closed,
                origin: None,
            });
        }
        let Some(mut network) = build(&draft).network else { continue };
        if network.generators.is_empty() {
            continue;
        }
        let solution = solve_operating(&mut network, &Settings::default());
        assert_eq!(solution.status, Status::Converged, "seed {seed}");
        let other = nodal::solve_nodal(&network).expect("a solution");
        for (node, (a, b)) in network.nodes.iter().zip(solution.volts.iter().zip(&other.volts)) {
            for k in 0..4 {
                let off = (a[k] - b[k]).norm() / node.nominal_phase_volts();
                assert!(off < 1e-8, "seed {seed}, node {}: {off:e}", node.name);
            }
        }
        for g in &network.generators {
            let wanted = g.output(generator_pu(&network, &solution, g)).power;
            assert!((wanted - g.delivering).norm() <= 2e-9 * g.rated_va, "seed {seed}, {}", g.name);
            following += usize::from(g.follows_voltage());
        }
        compared += 1;
    }
    println!("{compared} networks, {following} generators on curves");
    assert!(compared >= 50 && following >= 50);
}
