//! Circuits with a solution in closed form.

use fourwire::import::read_files;
use fourwire::math::Complex64;
use fourwire::network::{Conductor, Network, build};
use fourwire::solver::{Settings, Solution, Status, solve};
use fourwire::study::flow::FlowReport;
use fourwire::study::loadability::loadability;
use nalgebra::{DMatrix, DVector};

const LINES: &str = "line,from,to,phases,length_m,construction";
const LOADS: &str = "load,node,phases,kw,kvar,model";

fn network(files: &[(&str, &str)]) -> Network {
    let files = files.iter().map(|(name, text)| ((*name).to_string(), text.as_bytes().to_vec())).collect();
    let reading = read_files(files);
    assert!(!reading.diagnostics.has_errors(), "{:?}", reading.diagnostics.items());
    let built = build(&reading.draft);
    built.network.unwrap_or_else(|| panic!("{:?}", built.diagnostics.items()))
}

fn solved(network: &Network) -> Solution {
    let solution = solve(network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    solution
}

fn volts(network: &Network, solution: &Solution, node: &str) -> [Complex64; 4] {
    let i = network.nodes.iter().position(|n| &*n.name == node).expect("the node is there");
    solution.volts[i].into()
}

/// Source of 230 V to neutral (kV line-to-line given to full precision).
const SOURCE: &str = "node,kv\nS,0.39837168574084177\n";

/// A two-wire circuit of 10 AWG copper at 20 C, out and back: 3.27 ohm per 1000 m of wire (common
/// practice, no source). Drop is I R of both wires, loss I^2 R of both.
#[test]
fn two_wires_of_10_awg_copper_out_and_back() {
    let (length_m, ohm_per_km, kw) = (60.0, 3.27, 2.3);
    let matrices = format!(
        "construction,row,column,r_ohm_per_km,x_ohm_per_km\nawg10,a,a,{ohm_per_km},0\nawg10,a,n,0,0\nawg10,n,n,{ohm_per_km},0\n"
    );
    let network = network(&[
        ("source.csv", SOURCE),
        ("lines.csv", &format!("{LINES}\nL,S,A,an,{length_m},awg10\n")),
        ("matrices.csv", &matrices),
        ("loads.csv", &format!("{LOADS}\nD,A,an,{kw},0,current\n")),
    ]);
    let solution = solved(&network);
    let amps = kw * 1e3 / 230.0;
    let wire_ohm = ohm_per_km * length_m / 1e3;
    let [a, _, _, n] = volts(&network, &solution, "A");
    let drop = 230.0 - (a - n).norm();
    assert!((drop - 2.0 * wire_ohm * amps).abs() < 1e-7, "{drop}");
    // The neutral rises by its own share above earth, which the source holds.
    assert!((n.norm() - wire_ohm * amps).abs() < 1e-7);
    let report = FlowReport::new(&network, &solution, &[], "").expect("converged");
    let loss_kw = 2.0 * wire_ohm * amps * amps / 1e3;
    assert!((report.totals.loss_kw - loss_kw).abs() < 1e-9, "{}", report.totals.loss_kw);
    assert!((report.totals.neutral_loss_kw - loss_kw / 2.0).abs() < 1e-9);
    assert!(
        (solution.from_amps[0][3] + solution.from_amps[0][0]).norm() < 1e-9,
        "all returns in the neutral"
    );
}

/// One resistance R, a load of constant power P: V = (E + sqrt(E^2 - 4 R P)) / 2.
#[test]
fn constant_power_behind_a_resistance() {
    let (ohm, kw) = (0.5, 10.0);
    let network = network(&[
        ("source.csv", SOURCE),
        ("lines.csv", &format!("{LINES}\nL,S,A,a,1000,r\n")),
        ("matrices.csv", &format!("construction,row,column,r_ohm_per_km,x_ohm_per_km\nr,a,a,{ohm},0\n")),
        ("loads.csv", &format!("{LOADS}\nD,A,an,{kw},0,power\n")),
    ]);
    let [a, ..] = volts(&network, &solved(&network), "A");
    let expected = (230.0 + (230.0f64.powi(2) - 4.0 * ohm * kw * 1e3).sqrt()) / 2.0;
    assert!((a.norm() - expected).abs() < 1e-6, "{} {expected}", a.norm());
}

/// A constant impedance divides the voltage with the line's.
#[test]
fn constant_impedance_divides_the_voltage() {
    let line = Complex64::new(0.3, 0.4);
    let network = network(&[
        ("source.csv", SOURCE),
        ("lines.csv", &format!("{LINES}\nL,S,A,a,1000,z\n")),
        ("matrices.csv", "construction,row,column,r_ohm_per_km,x_ohm_per_km\nz,a,a,0.3,0.4\n"),
        ("loads.csv", &format!("{LOADS}\nD,A,an,20,10,impedance\n")),
    ]);
    let load = Complex64::from(230.0 * 230.0) / Complex64::new(20e3, -10e3);
    let expected = Complex64::from(230.0) * load / (load + line);
    let [a, ..] = volts(&network, &solved(&network), "A");
    assert!((a - expected).norm() < 1e-6, "{a} {expected}");
}

/// A neutral of equal spans with an electrode at each, one load at the end: the neutral's voltages
/// against a direct solution of the ladder.
#[test]
fn ladder_of_earthed_neutral_spans() {
    let (spans, electrode, kw) = (12usize, 25.0, 4.6);
    let own = Complex64::new(0.02, 0.04);
    let mut lines = format!("{LINES}\n");
    let mut nodes = "node,earth_ohm\n".to_string();
    for k in 1..=spans {
        lines += &format!("L{k},{},N{k},an,100,w\n", if k == 1 { "S".into() } else { format!("N{}", k - 1) });
        nodes += &format!("N{k},{electrode}\n");
    }
    // Wires without coupling, so that the ladder stands alone.
    let matrices =
        "construction,row,column,r_ohm_per_km,x_ohm_per_km\nw,a,a,0.2,0.4\nw,a,n,0,0\nw,n,n,0.2,0.4\n";
    let network = network(&[
        ("source.csv", SOURCE),
        ("lines.csv", &lines),
        ("nodes.csv", &nodes),
        ("matrices.csv", matrices),
        ("loads.csv", &format!("{LOADS}\nD,N{spans},an,{kw},0,current\n")),
    ]);
    let solution = solved(&network);
    let end = volts(&network, &solution, &format!("N{spans}"));
    let u = end[0] - end[3];
    let amps = Complex64::from(kw * 1e3 / 230.0) * u / u.norm();
    let y = Complex64::from(1.0) / own;
    let mut ladder = DMatrix::<Complex64>::zeros(spans, spans);
    for k in 0..spans {
        ladder[(k, k)] += y + 1.0 / electrode;
        if k > 0 {
            ladder[(k - 1, k - 1)] += y;
            ladder[(k, k - 1)] -= y;
            ladder[(k - 1, k)] -= y;
        }
    }
    let mut injected = DVector::<Complex64>::zeros(spans);
    injected[spans - 1] = amps;
    let expected = ladder.lu().solve(&injected).expect("a regular ladder");
    for k in 0..spans {
        let n = volts(&network, &solution, &format!("N{}", k + 1))[3];
        assert!((n - expected[k]).norm() < 1e-6, "span {k}: {n} {}", expected[k]);
    }
}

/// Unequal resistances in a star whose star point returns through a wire: Millman's theorem.
#[test]
fn neutral_shift_of_an_unequal_star() {
    let (wire_ohm, ohms) = (0.1, [10.0, 20.0, 40.0]);
    let mut matrices = "construction,row,column,r_ohm_per_km,x_ohm_per_km\n".to_string();
    for (i, p) in ["a", "b", "c", "n"].into_iter().enumerate() {
        for q in &["a", "b", "c", "n"][i..] {
            matrices += &format!("w,{p},{q},{},0\n", if p == *q { wire_ohm } else { 0.0 });
        }
    }
    let kw = ohms.map(|r| 230.0 * 230.0 / r / 1e3);
    let loads = format!(
        "{LOADS}\nA,A,an,{},0,impedance\nB,A,bn,{},0,impedance\nC,A,cn,{},0,impedance\n",
        kw[0], kw[1], kw[2]
    );
    let network = network(&[
        ("source.csv", SOURCE),
        ("lines.csv", &format!("{LINES}\nL,S,A,abcn,1000,w\n")),
        ("matrices.csv", &matrices),
        ("loads.csv", &loads),
    ]);
    let third = 2.0 * std::f64::consts::PI / 3.0;
    let y = ohms.map(|r| Complex64::from(1.0 / (r + wire_ohm)));
    let weighted: Complex64 = (0..3).map(|k| Complex64::from_polar(230.0, -third * k as f64) * y[k]).sum();
    let expected = weighted / (y.iter().sum::<Complex64>() + 1.0 / wire_ohm);
    let n = volts(&network, &solved(&network), "A")[Conductor::N.slot()];
    assert!((n - expected).norm() < 1e-6, "{n} {expected}");
}

/// A balanced delta draws sqrt(3) times its element current from each line.
#[test]
fn a_delta_draws_sqrt_3_times_its_element_current() {
    let network = network(&[
        ("source.csv", SOURCE),
        ("lines.csv", &format!("{LINES}\nL,S,A,abc,1,w\n")),
        (
            "matrices.csv",
            "construction,row,column,r_ohm_per_km,x_ohm_per_km\nw,a,a,1,0\nw,a,b,0,0\nw,a,c,0,0\nw,b,b,1,0\nw,b,c,0,0\nw,c,c,1,0\n",
        ),
        ("loads.csv", &format!("{LOADS}\nD,A,abc,3,0,current\n")),
    ]);
    let solution = solved(&network);
    let element = 1000.0 / (230.0 * 3f64.sqrt());
    for k in 0..3 {
        assert!((solution.from_amps[0][k].norm() - 3f64.sqrt() * element).abs() < 1e-6);
    }
}

/// A transformer of hardly any impedance: voltages by the turns, currents against them.
#[test]
fn a_transformer_without_drop_is_its_turns() {
    let network = network(&[
        ("source.csv", "node,kv\nS,11\n"),
        (
            "transformers.csv",
            "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\nT,S,A,1000,11,0.4,Dyn11,0.0001,0.0001\n",
        ),
        ("loads.csv", &format!("{LOADS}\nD,A,an,30,0,current\n")),
    ]);
    let solution = solved(&network);
    let [a, ..] = volts(&network, &solution, "A");
    assert!((a.norm() - 400.0 / 3f64.sqrt()).abs() < 1e-3);
    assert!((a.arg().to_degrees() - 30.0).abs() < 1e-4, "Dyn11 leads by 30 degrees");
    let secondary = 30e3 / (400.0 / 3f64.sqrt());
    // The phase winding of a sits between two lines of the delta: its current flows in both.
    let expected = secondary * (400.0 / 3f64.sqrt()) / 11e3;
    let primary = solution.from_amps[0];
    assert!((primary[0].norm() - expected).abs() < 1e-6 && (primary[1].norm() - expected).abs() < 1e-6);
    assert!(primary[2].norm() < 1e-6);
}

/// A load of unity power factor at the end of a reactance X: the greatest power is E^2 / (2 X), at
/// E / sqrt(2) (maximum power transfer, textbook).
#[test]
fn one_line_one_load_gives_way_at_maximum_power_transfer() {
    let network = network(&[
        ("source.csv", SOURCE),
        ("lines.csv", &format!("{LINES}\nL,S,A,a,1000,x\n")),
        ("matrices.csv", "construction,row,column,r_ohm_per_km,x_ohm_per_km\nx,a,a,0.0000001,0.5\n"),
        ("loads.csv", &format!("{LOADS}\nD,A,an,10,0,power\n")),
    ]);
    let found = loadability(&network, &Settings::default());
    let expected = 230.0 * 230.0 / (2.0 * 0.5) / 10e3;
    let factor = found.factor.expect("a limit");
    assert!((factor / expected - 1.0).abs() < 3e-3, "{factor} {expected}");
    assert_eq!(found.weakest_node.as_deref(), Some("A"));
    assert!((found.weakest_pu.expect("a voltage") - 0.5f64.sqrt()).abs() < 0.05);
}
