//! The record of `flow` and its page: numbers against a second way to get them, findings, words.

use fourwire::import::read_files;
use fourwire::math::{Complex64, PhaseVector};
use fourwire::network::{BranchKind, Network, NodeId, build};
use fourwire::output::{Colour, Length, WIDTH, flow_text, no_solution_text};
use fourwire::solver::{Settings, Solution, Status, solve};
use fourwire::study::flow::{Finding, FindingSeverity, FlowReport, Rule};
use nalgebra::{DMatrix, DVector};

const LINES: &str = "line,from,to,phases,length_m,construction,rating_a";
const LOADS: &str = "load,node,phases,kw,pf,model";
/// A cable of four like conductors (invented); the charging is far above any real cable's, so that
/// it shows in the losses.
const CABLE: &str = "construction,row,column,r_ohm_per_km,x_ohm_per_km,b_us_per_km
cable,a,a,0.4,0.3,9000\ncable,a,b,0.05,0.1,-2000\ncable,a,c,0.05,0.1,-2000\ncable,a,n,0.05,0.1,-2000
cable,b,b,0.4,0.3,9000\ncable,b,c,0.05,0.1,-2000\ncable,b,n,0.05,0.1,-2000
cable,c,c,0.4,0.3,9000\ncable,c,n,0.05,0.1,-2000\ncable,n,n,0.4,0.3,9000
wire,a,a,0.4,0.3,0\nwire,a,b,0.05,0.1,0\nwire,a,c,0.05,0.1,0\nwire,b,b,0.4,0.3,0\nwire,b,c,0.05,0.1,0\nwire,c,c,0.4,0.3,0
pair,a,a,0.4,0.3,0\npair,a,n,0.05,0.1,0\npair,n,n,0.4,0.3,0\none,a,a,0.4,0.3,0\n";

fn network(files: &[(&str, &str)]) -> Network {
    let files = files.iter().map(|(name, text)| ((*name).to_string(), text.as_bytes().to_vec())).collect();
    let reading = read_files(files);
    assert!(!reading.diagnostics.has_errors(), "{:?}", reading.diagnostics.items());
    let built = build(&reading.draft);
    built.network.unwrap_or_else(|| panic!("{:?}", built.diagnostics.items()))
}

fn solved(network: &Network) -> (Solution, FlowReport) {
    let solution = solve(network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    let report = FlowReport::new(network, &solution, &[], "hash").expect("converged");
    (solution, report)
}

/// 400/230 V, one cable S-A and one A-B, electrode at B, uneven loads; more settings as given.
fn uneven(study: &str) -> Network {
    network(&[
        ("study.csv", &format!("setting,value\n{study}\n")),
        ("source.csv", "node,kv\nS,0.4\n"),
        ("nodes.csv", "node,earth_ohm\nA,0\nB,10\n"),
        ("matrices.csv", CABLE),
        ("lines.csv", &format!("{LINES}\nL1,S,A,abcn,200,cable,100\nL2,A,B,abcn,300,cable,\n")),
        ("loads.csv", &format!("{LOADS}\nx,B,an,9,0.9,power\ny,B,bn,4,0.8,current\nz,A,cn,2,1,impedance\n")),
    ])
}

fn of(report: &FlowReport, rule: Rule) -> Vec<&Finding> {
    report.findings.iter().filter(|f| f.rule == rule).collect()
}

fn node(network: &Network, name: &str) -> usize {
    network.nodes.iter().position(|n| &*n.name == name).expect("the node is there")
}

fn page(network: &Network, solution: &Solution, report: &FlowReport) -> String {
    flow_text(network, solution, report, Length::Full, Colour::Plain)
}

/// Losses of each conductor from `I = Z^-1 (V_from - V_to)`, the current inside the pi model by a
/// general solve, against the report's split.
#[test]
fn losses_of_phases_and_neutral_leave_the_charging_out() {
    let network = uneven("");
    let (solution, report) = solved(&network);
    let (mut phases, mut neutral, mut charging_share) = (0.0, 0.0, 0.0f64);
    for (b, branch) in network.branches.iter().enumerate() {
        let BranchKind::Line(line) = &branch.kind else { panic!("only lines here") };
        let z = network.line_impedance(line);
        let fall = solution.volts[branch.from.index()] - solution.volts[branch.to.index()];
        let inside = DMatrix::from_fn(4, 4, |i, j| z[(i, j)])
            .lu()
            .solve(&DVector::from_fn(4, |k, _| fall[k]))
            .expect("an impedance has an inverse");
        let watts = |k: usize| (fall[k] * inside[k].conj()).re;
        phases += (0..3).map(watts).sum::<f64>() / 1e3;
        neutral += watts(3) / 1e3;
        let ends = (solution.from_amps[b][3] + solution.to_amps[b][3]) / 2.0;
        charging_share = charging_share.max((ends - inside[3]).norm());
    }
    assert!(charging_share > 1e-4, "charging must matter here: {charging_share}");
    assert!((report.totals.neutral_loss_kw - neutral).abs() < 1e-8, "{neutral} {:?}", report.totals);
    assert!((report.totals.line_loss_kw - phases).abs() < 1e-8, "{phases} {:?}", report.totals);
}

/// Kirchhoff's current law with what the report lists alone: what the lines leave at A's neutral
/// goes into its electrode, of zero ohms here, and into the load and charging of A.
#[test]
fn electrode_currents_close_kirchhoffs_law() {
    let network = uneven("");
    let (_, report) = solved(&network);
    let phasor = |element: &str, kind: &str, from: bool| {
        let row = report
            .currents
            .iter()
            .find(|c| &*c.element == element && c.kind == kind && c.conductor == "n")
            .expect("the current is listed");
        let (amps, degrees) =
            if from { (row.from_amps, row.from_degrees) } else { (row.to_amps, row.to_degrees) };
        Complex64::from_polar(amps, degrees.to_radians())
    };
    let i = node(&network, "A");
    let rest = phasor("L1", "line", false) - phasor("L2", "line", true) - phasor("A", "electrode", true);
    // Load z is an impedance of 2 kW at 400/sqrt(3) V between c and n.
    let volts = solve(&network, &Settings::default()).volts[i];
    let load = (volts[2] - volts[3]) * 2e3 / (400.0f64 / 3f64.sqrt()).powi(2);
    assert!((rest + load).norm() < 1e-6, "{rest} {load}");
    let electrode = report.elements.iter().find(|e| e.kind == "electrode" && &*e.element == "B");
    let amps = phasor("B", "electrode", true).norm();
    let loss = electrode.expect("the electrode is listed").loss_kw;
    assert!(amps > 0.1 && (loss - 10.0 * amps * amps / 1e3).abs() < 1e-9, "{amps} {loss}");
}

/// The unbalance factor from line-to-line magnitudes alone,
/// `sqrt((1 - sqrt(3 - 6 b)) / (1 + sqrt(3 - 6 b)))`, `b = sum U^4 / (sum U^2)^2` (CIGRE's form, as
/// quoted in IEC 61000-2-2; from memory).
#[test]
fn unbalance_agrees_with_the_form_in_magnitudes() {
    let network = uneven("");
    let (solution, report) = solved(&network);
    let i = node(&network, "B");
    let v = &solution.volts[i];
    let squares = [(v[0] - v[1]).norm_sqr(), (v[1] - v[2]).norm_sqr(), (v[2] - v[0]).norm_sqr()];
    let beta = squares.iter().map(|s| s * s).sum::<f64>() / squares.iter().sum::<f64>().powi(2);
    let root = (3.0 - 6.0 * beta).sqrt();
    let percent = 100.0 * ((1.0 - root) / (1.0 + root)).sqrt();
    let found = report.nodes_summary[i].unbalance_percent.expect("three phases");
    assert!(percent > 0.1 && (found - percent).abs() < 1e-6, "{found} {percent}");
    assert_eq!(report.nodes_summary[i].neutral_volts, Some(v[3].norm()));
}

#[test]
fn ratings_are_the_largest_phase_current_over_the_rated() {
    let network = network(&[
        ("source.csv", "node,kv\nS,11\n"),
        ("matrices.csv", CABLE),
        (
            "transformers.csv",
            "transformer,from,to,kva,kv_from,kv_to,group,phases,r_percent,x_percent
T,S,A,50,11,0.4,Dyn11,,1,4\nU,S,P,10,11,0.23,Ii0,ab,1,3\n",
        ),
        ("nodes.csv", "node,earth_ohm\nA,1\n"),
        ("lines.csv", &format!("{LINES}\nL1,A,B,abcn,10,cable,40\nL2,A,C,abcn,10,cable,\n")),
        ("loads.csv", &format!("{LOADS}\nx,B,abcn,24,0.9,power\ny,B,an,6,1,power\nz,P,ab,8,1,power\n")),
    ]);
    let (solution, report) = solved(&network);
    for (b, branch) in network.branches.iter().enumerate() {
        let most = |amps: &PhaseVector| amps.iter().take(3).map(|i| i.norm()).fold(0.0, f64::max);
        let (from, to) = (most(&solution.from_amps[b]), most(&solution.to_amps[b]));
        // Rated currents: 50 kVA / (sqrt(3) U) in a line conductor, 10 kVA / U in a winding.
        let expected = match &*branch.name {
            "L1" => Some(from.max(to) / 40.0),
            "L2" => None,
            "T" => Some((from * 3f64.sqrt() * 11e3 / 50e3).max(to * 3f64.sqrt() * 400.0 / 50e3)),
            "U" => Some((from * 11e3 / 10e3).max(to * 230.0 / 10e3)),
            other => panic!("{other}"),
        };
        let found = report.elements[b].rating_percent;
        match (found, expected) {
            (Some(a), Some(b)) => assert!((a - 100.0 * b).abs() < 1e-9, "{}: {a} {b}", branch.name),
            (a, b) => assert_eq!(a.is_some(), b.is_some(), "{}", branch.name),
        }
    }
    let over = of(&report, Rule::Overload);
    assert_eq!(over.len(), 1, "{over:?}");
    assert_eq!(over[0].place, "line L1");
    assert!(over[0].value > 100.0 && over[0].limit == Some(100.0));
    assert_eq!(of(&report, Rule::Caution).len(), 1, "an overload brings the caution");
    assert!(page(&network, &solution, &report).contains("the local code and a licensed engineer decide"));
}

/// A 0.4 kV side behind a delta, nothing earthed: 30 kW between a and b at the end of a line.
fn unearthed() -> Network {
    network(&[
        ("study.csv", "setting,value\ndrop_limit_percent,1\n"),
        ("source.csv", "node,kv\nS,11\n"),
        ("matrices.csv", CABLE),
        (
            "transformers.csv",
            "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\nT,S,D,100,11,0.4,Dd0,1,4\n",
        ),
        ("lines.csv", &format!("{LINES}\nL,D,E,abc,200,wire,\nM,E,F,a,10,one,\n")),
        ("loads.csv", &format!("{LOADS}\nx,E,ab,30,0.9,power\n")),
    ])
}

#[test]
fn a_side_that_no_earth_holds_is_judged_between_phases() {
    let network = unearthed();
    let (solution, report) = solved(&network);
    let (d, e) = (solution.volts[node(&network, "D")], solution.volts[node(&network, "E")]);
    let between = |v: &PhaseVector, p: usize, q: usize| (v[p] - v[q]).norm() / 400.0;
    let low = of(&report, Rule::LowVoltage);
    assert_eq!(low[0].place, "node E, ab", "{low:?}");
    assert!((low[0].value - between(&e, 0, 1)).abs() < 1e-12);
    assert!(low.iter().all(|f| !f.place.contains("node F")), "one phase alone has nothing to judge: {low:?}");
    let falls = [(0, 1), (1, 2), (2, 0)].map(|(p, q)| 100.0 * (between(&d, p, q) - between(&e, p, q)));
    let most = falls.into_iter().fold(f64::MIN, f64::max);
    let drop = of(&report, Rule::VoltageDrop);
    assert_eq!((drop.len(), drop[0].place.as_str()), (1, "node E, ab"), "{drop:?}");
    assert!((drop[0].value - most).abs() < 1e-9, "{} {most}", drop[0].value);
    let unheld = of(&report, Rule::NoEarth);
    assert_eq!((unheld.len(), unheld[0].place.as_str()), (1, "node D"), "one a side");
    assert!(unheld[0].text.contains("fed by T"), "{}", unheld[0].text);
    let text = page(&network, &solution, &report);
    assert!(text.contains("judged against each other"), "{text}");
}

#[test]
fn limits_are_found_worst_first_and_by_their_own_value() {
    let network = uneven(
        "voltage_low_percent,97\nvoltage_high_percent,101\ndrop_limit_percent,1\nunbalance_limit_percent,0.2",
    );
    let (solution, report) = solved(&network);
    for rule in [Rule::LowVoltage, Rule::HighVoltage, Rule::VoltageDrop, Rule::Unbalance] {
        let found = of(&report, rule);
        assert!(!found.is_empty(), "{rule:?}");
        for pair in found.windows(2) {
            let ascending = rule == Rule::LowVoltage;
            assert!(if ascending { pair[0].value <= pair[1].value } else { pair[0].value >= pair[1].value });
        }
        assert!(found.iter().all(|f| f.severity == FindingSeverity::Warning && f.limit.is_some()));
    }
    let v = &solution.volts[node(&network, "B")];
    let lowest = &of(&report, Rule::LowVoltage)[0];
    assert_eq!(lowest.place, "node B, a");
    assert!((lowest.value - (v[0] - v[3]).norm() / (400.0 / 3f64.sqrt())).abs() < 1e-12);
    assert!(report.exceeds_a_limit());
    let lax = uneven(
        "voltage_low_percent,50\nvoltage_high_percent,150\ndrop_limit_percent,50\nunbalance_limit_percent,50",
    );
    let (solution, report) = solved(&lax);
    assert!(report.findings.is_empty() && !report.exceeds_a_limit(), "{:?}", report.findings);
    assert!(page(&lax, &solution, &report).contains("Findings: none"));
}

/// A neutral far above earth: its own limit, the conventional touch voltage of 50 V, and the caution.
#[test]
fn a_neutral_above_50_v_is_told_whatever_the_limit() {
    let high = |study: &str| {
        network(&[
            ("study.csv", &format!("setting,value\n{study}\n")),
            ("source.csv", "node,kv\nS,11\n"),
            ("nodes.csv", "node,earth_ohm\nA,100\n"),
            ("matrices.csv", CABLE),
            ("lines.csv", &format!("{LINES}\nL1,S,A,abcn,5000,cable,\n")),
            ("loads.csv", &format!("{LOADS}\nx,A,an,400,1,impedance\n")),
        ])
    };
    let cases =
        [("", Some(None)), ("neutral_limit_v,5000", Some(None)), ("neutral_limit_v,20", Some(Some(20.0)))];
    for (study, expected) in cases {
        let network = high(study);
        let (solution, report) = solved(&network);
        let volts = solution.volts[node(&network, "A")][3].norm();
        assert!((60.0..1000.0).contains(&volts), "{volts}");
        let found = of(&report, Rule::NeutralVoltage);
        assert_eq!(found.first().map(|f| f.limit), expected, "{study}: {found:?}");
        assert!((found[0].value - volts).abs() < 1e-9);
        assert_eq!(of(&report, Rule::Caution).len(), 1, "{study}");
    }
    // A limit that is kept brings the caution and no finding; without a limit there is nothing to say.
    let kept = solved(&uneven("neutral_limit_v,40")).1;
    assert!(of(&kept, Rule::NeutralVoltage).is_empty() && of(&kept, Rule::Caution).len() == 1);
    let plain = solved(&uneven("")).1;
    assert!(of(&plain, Rule::NeutralVoltage).is_empty() && of(&plain, Rule::Caution).is_empty());
}

#[test]
fn a_balance_that_does_not_close_is_an_error_and_comes_first() {
    let network = uneven("");
    let (good, report) = solved(&network);
    assert!(of(&report, Rule::Balance).is_empty());
    for factor in [1.001, f64::NAN] {
        let mut bad = good.clone();
        bad.source_amps *= Complex64::from(factor);
        let report = FlowReport::new(&network, &bad, &[], "").expect("the status says converged");
        let first = &report.findings[0];
        assert_eq!((first.rule, first.severity), (Rule::Balance, FindingSeverity::Error), "{factor}");
        assert!(report.exceeds_a_limit());
        assert!(page(&network, &bad, &report).contains("error, power balance: network: "));
    }
}

#[test]
fn loads_below_the_floor_are_listed_with_what_they_draw() {
    let network = network(&[
        ("source.csv", "node,kv\nS,0.4\n"),
        ("matrices.csv", CABLE),
        ("lines.csv", &format!("{LINES}\nL1,S,A,an,1000,pair,\n")),
        ("loads.csv", &format!("{LOADS}\nx,A,an,40,1,power\ny,A,an,1,1,impedance\n")),
    ]);
    let (_, report) = solved(&network);
    let [x, y] = report.loads.as_slice() else { panic!("two loads") };
    assert!(x.below_floor && x.lowest_pu < 0.7 && x.kw < 40.0, "{x:?}");
    assert!(!y.below_floor, "an impedance has no floor: {y:?}");
    assert!((y.kw - y.lowest_pu.powi(2)).abs() < 1e-9, "1 kW at nominal, by the square of voltage: {y:?}");
    let found = of(&report, Rule::BelowFloor);
    assert_eq!((found.len(), found[0].place.as_str()), (1, "load x"));
}

/// Fields and their order are those of the result format; more may stand between, none may move.
#[test]
fn json_keeps_the_order_of_the_format() {
    let (_, report) = solved(&uneven("voltage_low_percent,99"));
    let json = serde_json::to_string(&report).expect("JSON");
    let in_order = |text: &str, fields: &[&str]| {
        let mut at = 0;
        for field in fields {
            let found = text[at..].find(&format!("\"{field}\":"));
            at += found.unwrap_or_else(|| panic!("{field} is missing or out of order in {text:.300}"));
        }
    };
    in_order(
        &json,
        &[
            "fourwire",
            "network",
            "input_sha256",
            "converged",
            "iterations",
            "mismatch_a",
            "nodes",
            "currents",
            "elements",
            "nodes_summary",
            "source",
            "totals",
            "regulators",
            "findings",
        ],
    );
    let one = |value: serde_json::Result<String>| value.expect("JSON");
    in_order(&one(serde_json::to_string(&report.nodes[0])), &["node", "conductor", "volts", "degrees", "pu"]);
    in_order(
        &one(serde_json::to_string(&report.currents[0])),
        &["element", "kind", "conductor", "from_amps", "from_degrees", "to_amps", "to_degrees"],
    );
    in_order(
        &one(serde_json::to_string(&report.elements[0])),
        &["element", "kind", "loss_kw", "loss_kvar", "rating_percent"],
    );
    in_order(&one(serde_json::to_string(&report.source[0])), &["conductor", "kw", "kvar", "amps", "degrees"]);
    in_order(
        &one(serde_json::to_string(&report.findings[0])),
        &["severity", "rule", "where", "value", "limit", "text"],
    );
    in_order(
        &one(serde_json::to_string(&report.totals)),
        &[
            "source_kw",
            "source_kvar",
            "load_kw",
            "load_kvar",
            "loss_kw",
            "loss_kvar",
            "line_loss_kw",
            "neutral_loss_kw",
            "transformer_loss_kw",
        ],
    );
    assert!(report.nodes.iter().all(|n| (n.conductor == "n") == n.pu.is_none()), "no pu of a neutral");
}

#[test]
fn nothing_to_compare_is_said_in_words() {
    let network = network(&[
        ("source.csv", "node,kv\nS,11\n"),
        ("matrices.csv", CABLE),
        ("lines.csv", &format!("{LINES}\nL1,S,A,abc,100,wire,\n")),
    ]);
    let (solution, report) = solved(&network);
    let text = page(&network, &solution, &report);
    for words in ["No loads:", "no line carries a neutral", "no node carries a neutral", "no ratings given"] {
        assert!(text.contains(words), "{words} in {text}");
    }
    assert!(!text.contains("NaN") && !text.contains("inf"), "{text}");
    let json = serde_json::to_string(&report).expect("JSON");
    assert!(json.contains("\"rating_percent\":null") && json.contains("\"neutral_volts\":null"));
}

/// Columns a terminal needs: wide characters (here only Chinese ones) take two.
fn columns(line: &str) -> usize {
    line.chars().map(|c| if ('\u{4e00}'..='\u{9fff}').contains(&c) { 2 } else { 1 }).sum()
}

#[test]
fn no_name_breaks_the_page() {
    let long = "x".repeat(150);
    let wide = "水泵站".repeat(30);
    let network = network(&[
        ("study.csv", &format!("setting,value\nname,{wide}{long}\n")),
        ("source.csv", "node,kv\nS,0.4\n"),
        ("matrices.csv", CABLE),
        (
            "lines.csv",
            &format!(
                "{LINES}\n=L1,S,{long},abcn,900,cable,1\n{wide},{long},{wide},abcn,900,cable,2\nL3,S,\"red\u{1b}[31m\nnode\",abcn,900,cable,3\n"
            ),
        ),
        (
            "loads.csv",
            &format!("{LOADS}\n@,{long},an,9,1,\n{long},{wide},an,9,1,\nq,\"red\u{1b}[31m\nnode\",bn,9,1,\n"),
        ),
    ]);
    let (solution, report) = solved(&network);
    let text = page(&network, &solution, &report);
    assert!(of(&report, Rule::LowVoltage).len() >= 2, "{:?}", report.findings);
    for line in text.lines() {
        assert!(columns(line) <= WIDTH, "{} columns: {line}", columns(line));
    }
    assert!(text.chars().all(|c| c == '\n' || !c.is_control()), "a control character gets through");
    assert!(text.contains("red [31m node"), "{text}");
}

#[test]
fn no_solution_says_where_and_why_and_no_voltage() {
    let network = uneven("");
    let (mut solution, _) = solved(&network);
    assert_eq!(no_solution_text(&network, &solution), "");
    solution.worst_node = NodeId(node(&network, "B") as u32);
    let mut told = |status: Status, change: f64| {
        (solution.status, solution.change_pu, solution.mismatch_amps) = (status, change, 12.0);
        assert!(FlowReport::new(&network, &solution, &[], "").is_none(), "no report without a solution");
        let text = no_solution_text(&network, &solution);
        assert!(text.lines().all(|l| columns(l) <= WIDTH), "{text}");
        assert!(!text.contains(" V ") && !text.contains("pu"), "{text}");
        text
    };
    let limit = told(Status::IterationLimit, 0.02);
    assert!(limit.contains("not settled") && limit.contains("node B: last change 2.0e-2"), "{limit}");
    assert!(limit.contains("wrong unit") && limit.contains("missing transformer"), "{limit}");
    let diverged = told(Status::Diverged, f64::INFINITY);
    assert!(diverged.contains("beyond all bounds") && !diverged.contains("inf"), "{diverged}");
    let singular = told(Status::Singular(NodeId(node(&network, "A") as u32)), 0.0);
    assert!(singular.contains("node A") && singular.contains("path to earth"), "{singular}");
    assert!(!singular.contains("beyond what the feeder"), "advice of another fault: {singular}");
}
