//! Linear networks against a general-purpose circuit simulator (`ngspice`): every voltage within
//! 1e-6 of nominal. Skipped, loudly, where the simulator is not installed.

#[path = "support/circuit.rs"]
mod circuit;

use fourwire::import::read_files;
use fourwire::network::{Network, build};
use fourwire::solver::{Settings, Status, solve};

const TOLERANCE: f64 = 1e-6;

/// Constructions from wires: own and mutual impedance and charging all differ.
const COMMON: [(&str, &str); 3] = [
    (
        "spacings.csv",
        "spacing,position,x_m,y_m\npole,a,-0.9,9.5\npole,b,0.2,9.9\npole,c,1.1,9.5\npole,n,0.3,8.1\n\
         arm,a,-1.0,9.5\narm,b,0.1,9.8\narm,c,1.2,9.5\none,a,0,9\n\
         service,a,0,5\nservice,b,0.016,5\nservice,n,0.008,4.986\n",
    ),
    (
        "constructions.csv",
        "construction,kind,phase_conductor,neutral_conductor,spacing\n\
         four,overhead,4/0 AWG 6/1 ACSR,1/0 AWG 6/1 ACSR,pole\nthree,overhead,2 AWG 6/1 ACSR,,arm\n\
         single,overhead,4 AWG 7/1 ACSR,,one\nservice,bundle,1/0 AWG copper NEC,1/0 AWG copper NEC,service\n",
    ),
    ("study.csv", "setting,value\nfrequency_hz,50\nearth_resistivity_ohm_m,150\n"),
];

const SOURCE: (&str, &str) = (
    "source.csv",
    "node,kv,pu_a,pu_b,pu_c,mva_3ph,x_over_r_3ph,mva_1ph,x_over_r_1ph,earth_ohm\nS,11,1.02,1,0.99,150,6,110,5,0.3\n",
);
const LINES: &str = "line,from,to,phases,length_km,construction\n";
const LOADS: &str = "load,node,phases,kw,kvar,model\n";
const TRANSFORMERS: &str = "transformer,from,to,kva,kv_from,kv_to,group,phases,phases_to,r_percent,x_percent,no_load_kw,magnetizing_percent,tap_percent,tap_from_percent,earth_ohm_from,earth_ohm_to,earth_x_ohm_to\n";
const REGULATORS: &str = "regulator,from,to,phases,across,tap_a,tap_b,tap_c\n";

/// A name and the rows of the files that differ: lines, loads, transformers, regulators, nodes.
type Case = (&'static str, &'static str, &'static str, &'static str, &'static str, &'static str);

/// Uneven loads of the far side at 0.4 kV, star and delta.
const UNEVEN: &str =
    "x,C,an,40,15,impedance\ny,C,bn,15,10,impedance\nz,C,cn,5,-2,impedance\nw,C,ab,20,8,impedance\n";

const CASES: &[Case] = &[
    (
        "coupled three-wire lines with charging",
        "1,S,A,abc,6,three\n2,A,C,abc,9,three\n3,A,D,a,4,single\n",
        "x,C,an,300,100,impedance\ny,C,bc,200,50,impedance\nz,A,ca,150,60,impedance\nu,D,an,90,-10,impedance\n",
        "",
        "",
        "",
    ),
    (
        "a neutral earthed at many poles",
        "1,S,A,abcn,1,four\n2,A,B,abcn,1,four\n3,B,C,abcn,1,four\n4,C,D,abcn,1,four\n5,D,E,abcn,1,four\n",
        "x,E,an,300,100,impedance\ny,E,bn,90,30,impedance\nz,C,abcn,210,60,impedance\n",
        "",
        "",
        "A,30\nB,12\nC,55\nD,8\nE,20\n",
    ),
    (
        "Dyn11",
        "1,S,A,abc,3,three\n2,B,C,abcn,0.2,four\n",
        UNEVEN,
        "T,A,B,200,11,0.4,Dyn11,,,1.2,4,0.4,1,2.5,,,,\n",
        "",
        "B,4\nC,25\n",
    ),
    (
        "Yd1 and YNd5 with loads between phases",
        "1,S,A,abc,3,three\n2,B,C,abc,0.2,three\n3,D,E,abc,0.1,three\n",
        "x,C,ab,40,15,impedance\ny,C,bc,10,2,impedance\nz,E,ca,30,15,impedance\n",
        "T,A,B,200,11,0.4,Yd1,,,1.2,4,,,,,,,\nU,A,D,100,11,0.4,YNd5,,,1,5,0.2,0.8,,2.5,7,,\n",
        "",
        "",
    ),
    (
        "YNyn0 with both neutrals carried",
        "1,S,A,abcn,3,four\n2,B,C,abcn,0.2,four\n",
        UNEVEN,
        "T,A,B,200,11,0.4,YNyn0,,,1.2,4,0.4,1,,,,,\n",
        "",
        "A,9\nB,6\n",
    ),
    (
        "Dd0 and Dd10, earthed nowhere",
        "1,S,A,abc,3,three\n2,B,C,abc,0.2,three\n3,B,D,abc,0.1,three\n",
        "x,C,ab,40,15,impedance\ny,E,bc,10,2,impedance\n",
        "T,A,B,200,11,0.4,Dd0,,,1.2,4,,,,,,,\nU,D,E,50,0.4,0.23,Dd10,,,1.2,4,,,,,,,\n",
        "",
        "",
    ),
    (
        "single-phase units of both polarities",
        "1,S,A,abcn,3,four\n2,B,C,a,0.1,single\n",
        "x,C,an,10,3,impedance\ny,D,ab,12,4,impedance\n",
        "T,A,B,25,6.35,0.23,Ii6,an,,1.5,3,0.1,1,2.5,,,3,\nU,A,D,25,11,0.4,Ii0,ab,,1.5,3,,,,,,,\n",
        "",
        "A,15\n",
    ),
    (
        "regulators to the neutral",
        "1,S,A,abcn,5,four\n2,B,C,abcn,5,four\n",
        "x,C,an,300,100,impedance\ny,C,bn,200,90,impedance\nz,C,abc,210,60,impedance\n",
        "",
        "R,A,B,abc,,12,-3,7\n",
        "A,20\nB,20\nC,10\n",
    ),
    (
        "an open-delta pair of regulators",
        "1,S,A,abc,5,three\n2,B,C,abc,5,three\n",
        "x,C,ab,300,100,impedance\ny,C,bc,200,90,impedance\nz,C,abc,210,60,impedance\n",
        "",
        "R1,A,B,a,b,11,,\nR2,A,B,c,b,,,5\n",
        "",
    ),
    (
        "Dzn0",
        "1,S,A,abc,3,three\n2,B,C,abcn,0.2,four\n",
        UNEVEN,
        "T,A,B,200,11,0.4,Dzn0,,,1.2,4,0.4,1,2.5,,,,\n",
        "",
        "B,4\nC,25\n",
    ),
    (
        "Yzn5, ZNd6 and Zy11",
        "1,S,A,abcn,3,four\n2,B,C,abcn,0.2,four\n",
        "x,C,an,40,15,impedance\ny,C,bn,15,10,impedance\nz,E,ab,20,8,impedance\nw,F,bc,12,1,impedance\n",
        "T,A,B,200,11,0.4,Yzn5,,,1.2,4,0.4,1,,2.5,,,\nU,A,E,100,11,0.4,ZNd6,,,1.2,4,0.2,1,,,,,\nV,A,F,50,11,0.4,Zy11,,,1.2,4,,,,,,,\n",
        "",
        "A,12\nB,4\nC,25\n",
    ),
    (
        "centre taps: halves and both",
        "1,S,A,abcn,3,four\n2,B,C,s1ns2,0.05,service\n",
        "x,C,s1n,6,2,impedance\ny,C,s2n,2,1,impedance\nz,C,s1s2,7,1,impedance\nw,D,s1ns2,5,2,impedance\n",
        "T,A,B,25,6.35,0.24,Iin0,an,,1.6,2.8,0.1,1,2.5,,,,\nU,A,D,25,11,0.24,Iin6,ab,,1.6,2.8,,,,2.5,,,\n",
        "",
        "A,20\nB,6\nC,30\nD,9\n",
    ),
    (
        "open star to open delta, and open delta",
        "1,S,A,abcn,3,four\n2,B,C,abc,0.1,three\n",
        "x,C,abc,30,15,impedance\ny,C,ab,9,1,impedance\nz,D,abc,20,8,impedance\n",
        "T1,A,B,37.5,6.35,0.4,Ii0,an,ab,1.5,3.4,0.1,1,,,,,\nT2,A,B,15,6.35,0.4,Ii0,bn,bc,1.7,3.1,,,,,,,\nU1,A,D,25,11,0.4,Ii0,ab,ab,1.5,3.4,,,,,,,\nU2,A,D,25,11,0.4,Ii0,bc,bc,1.5,3.4,,,,,,,\n",
        "",
        "A,12\n",
    ),
    (
        "autotransformers, neutral carried on one side, on both, on none",
        "1,S,A,abcn,3,four\n2,B,C,abcn,1,four\n3,B,D,abc,1,three\n",
        "x,C,an,120,40,impedance\ny,C,bc,90,30,impedance\nz,E,an,40,10,impedance\nw,E,bcn,60,20,impedance\nv,F,an,25,5,impedance\n",
        "T,A,B,1000,11,6.6,YNa0,,,0.5,2,0.8,0.5,,,,,\nU,D,E,300,6.6,3.3,YNa0,,,0.6,2.2,,,2.5,,4,,\nV,C,F,100,3.81,3.3,Ia0,an,,0.6,2.2,,,,,,,\n",
        "",
        "A,14\nB,10\nC,9\n",
    ),
    (
        "star points earthed through reactor and resistor",
        "1,S,A,abc,3,three\n2,B,C,abc,2,three\n3,D,E,abc,0.1,three\n",
        "x,C,an,100,30,impedance\ny,C,bn,40,10,impedance\nz,E,an,10,3,impedance\nw,E,bcn,12,4,impedance\n",
        "T,A,B,500,11,3.3,Dyn11,,,1,5,,,,,,0.5,6\nU,C,D,100,3.3,0.4,YNyn0,,,1.2,4,0.3,1,,,12,8,\n",
        "",
        "",
    ),
    (
        "a ring, and transformers in parallel",
        "1,S,A,abc,3,three\n2,S,B,abc,5,three\n3,A,B,abc,4,three\n4,C,D,abcn,0.2,four\n",
        "x,D,an,60,15,impedance\ny,C,bn,15,10,impedance\nz,D,ca,30,8,impedance\nw,B,ab,100,40,impedance\n",
        "T,A,C,200,11,0.4,Dyn11,,,1.2,4,0.4,1,,,,,\nU,A,C,100,11,0.4,Dyn11,,,1.4,4.4,,,,,,,\n",
        "",
        "C,4\nD,25\n",
    ),
    (
        "a single wire with earth return",
        "1,S,A,abc,3,three\n2,B,C,a,25,single\n3,C,D,a,12,single\n",
        "x,E,an,12,4,impedance\ny,F,an,9,2,impedance\n",
        "T,A,B,100,11,12.7,Ii0,ab,an,1.3,3.2,0.3,0.8,,,,1.5,\nU,C,E,25,12.7,0.25,Ii0,an,,1.6,2.8,0.1,1,,,7,2,\nV,D,F,25,12.7,0.25,Ii0,an,,1.6,2.8,0.1,1,,,11,3,\n",
        "",
        "",
    ),
];

fn network(&(name, lines, loads, transformers, regulators, nodes): &Case) -> Network {
    let rows = [
        ("lines.csv", LINES, lines),
        ("loads.csv", LOADS, loads),
        ("transformers.csv", TRANSFORMERS, transformers),
        ("regulators.csv", REGULATORS, regulators),
        ("nodes.csv", "node,earth_ohm\n", nodes),
    ];
    let mut files: Vec<(String, Vec<u8>)> =
        COMMON.iter().chain([&SOURCE]).map(|(n, t)| ((*n).to_owned(), t.as_bytes().to_vec())).collect();
    for (file, header, rows) in rows.into_iter().filter(|(.., rows)| !rows.is_empty()) {
        files.push((file.to_owned(), format!("{header}{rows}").into_bytes()));
    }
    files.push(("capacitors.csv".to_owned(), b"capacitor,node,phases,kvar\nbank,A,abc,60\n".to_vec()));
    let reading = read_files(files);
    let built = build(&reading.draft);
    let told: Vec<_> =
        reading.diagnostics.items().iter().chain(built.diagnostics.items()).map(|d| d.to_string()).collect();
    assert!(!reading.diagnostics.has_errors(), "{name}: {told:#?}");
    built.network.unwrap_or_else(|| panic!("{name}: {told:#?}"))
}

#[test]
fn linear_networks_agree_with_a_circuit_simulator() {
    if !circuit::is_installed() {
        eprintln!("!! SKIPPED: ngspice is not installed; no network was compared with it");
        println!("!! SKIPPED: ngspice is not installed; no network was compared with it");
        return;
    }
    let mut failed = Vec::new();
    for case in CASES {
        let network = network(case);
        let solution = solve(&network, &Settings::default());
        assert_eq!(solution.status, Status::Converged, "{}", case.0);
        let simulated = circuit::simulate(&network);
        let mut worst = (0.0f64, String::new());
        for (i, node) in network.nodes.iter().enumerate() {
            for c in node.conductors.iter() {
                let off = (solution.volts[i][c.slot()] - simulated[i][c.slot()]).norm();
                let off = off / node.nominal_phase_volts();
                if off > worst.0 || off.is_nan() {
                    worst = (off, format!("node {} {c}", node.name));
                }
            }
        }
        println!("{:.1e} of nominal at {:12} {}", worst.0, worst.1, case.0);
        if worst.0.is_nan() || worst.0 >= TOLERANCE {
            failed.push(format!("{}: {:e} at {}", case.0, worst.0, worst.1));
        }
    }
    assert!(failed.is_empty(), "{failed:#?}");
    assert!(CASES.len() >= 17);
}
