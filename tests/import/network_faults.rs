//! Faults of the network as a whole, in files whose cells are all good.

use fourwire::network::build;

use super::{LINES, LOADS, SOURCE, lines_of, read_with};

type Files = &'static [(&'static str, &'static str)];

/// A two-wire construction and the four-wire one.
const WIRES: &str = "construction,row,column,r_ohm_per_km,x_ohm_per_km\n\
    service,a,a,1.2,0.1\nservice,a,n,0.05,0.08\nservice,n,n,1.2,0.1\n\
    three,a,a,0.5,0.4\nthree,a,b,0.05,0.15\nthree,a,c,0.05,0.15\n\
    three,b,b,0.5,0.4\nthree,b,c,0.05,0.15\nthree,c,c,0.5,0.4\n\
    cable,a,a,0.3,0.09\ncable,a,b,0.05,0.01\ncable,a,c,0.05,0.01\ncable,a,n,0.05,0.01\n\
    cable,b,b,0.3,0.09\ncable,b,c,0.05,0.01\ncable,b,n,0.05,0.01\n\
    cable,c,c,0.3,0.09\ncable,c,n,0.05,0.01\ncable,n,n,0.3,0.09\n";

macro_rules! lines {
    ($($row:literal),*) => {
        ("lines.csv", concat!("line,from,to,phases,length_m,construction,state\n", $($row, "\n"),*))
    };
}
macro_rules! loads {
    ($($row:literal),*) => { ("loads.csv", concat!("load,node,line,phases,kw,pf\n", $($row, "\n"),*)) };
}
macro_rules! transformers {
    ($($row:literal),*) => {
        ("transformers.csv", concat!(
            "transformer,from,to,phases,kva,kv_from,kv_to,group,r_percent,x_percent,earth_ohm_from,earth_ohm_to\n",
            $($row, "\n"),*))
    };
}
macro_rules! matrix {
    ($($row:literal),*) => {
        ("matrices.csv", concat!("construction,row,column,r_ohm_per_km,x_ohm_per_km\n", $($row, "\n"),*))
    };
}
macro_rules! regulators {
    ($($row:literal),*) => {
        ("regulators.csv", concat!("regulator,from,to,phases,across,tap_a,tap_b,tap_c\n", $($row, "\n"),*))
    };
}

/// Files that replace those of the good network; `matrices.csv` is [`WIRES`] unless given.
const CASES: &[(&str, Files)] = &[
    // The supply.
    ("two sources", &[("source.csv", "node,kv\nS,0.4\nA,0.4\n")]),
    ("source file without rows", &[("source.csv", "node,kv\n")]),
    ("source at a node nothing joins", &[("source.csv", "node,kv\nX,0.4\n")]),
    ("source at a node in another case", &[("source.csv", "node,kv\ns,0.4\n")]),
    (
        "fault levels that contradict",
        &[("source.csv", "node,kv,mva_3ph,x_over_r_3ph,mva_1ph,x_over_r_1ph\nS,0.4,10,3,40,3\n")],
    ),
    // What hangs together.
    (
        "node not fed",
        &[lines!("L1,S,A,abcn,100,cable,", "L2,B,C,abcn,100,cable,"), loads!("house,C,,an,5,1")],
    ),
    ("node not fed by a slip", &[lines!("L1,S,A,abcn,100,cable,", "L2,a,B,abcn,100,cable,")]),
    (
        "behind an open line",
        &[
            lines!("L1,S,A,abcn,100,cable,", "L2,A,B,abcn,100,cable,open"),
            loads!("house,B,,an,5,1", "shop,A,,an,1,1"),
        ],
    ),
    (
        "behind an open switch",
        &[
            lines!("L1,S,A,abcn,100,cable,", "L2,B,C,abcn,100,cable,"),
            ("switches.csv", "switch,from,to,phases,state\nQ1,A,B,abcn,open\n"),
            loads!("house,C,,an,5,1", "shop,A,,an,1,1"),
        ],
    ),
    (
        "ring of switches alone",
        &[(
            "switches.csv",
            "switch,from,to,phases,state\nQ1,A,B,abcn,\nQ2,B,C,abcn,\nQ3,C,A,abcn,\nQ4,B,D,abcn,open\n",
        )],
    ),
    (
        "two switches side by side",
        &[("switches.csv", "switch,from,to,phases,state\nQ1,A,B,abcn,\nQ2,A,B,an,\n")],
    ),
    (
        "the poles of a switch written apart",
        &[("switches.csv", "switch,from,to,phases,state\nQ1,A,B,an,\nQ2,A,B,b,\nQ3,A,B,c,\n")],
    ),
    (
        "ring in which the phases do not meet",
        &[
            ("lines.csv", "line,from,to,phases,length_m,construction\n"),
            ("source.csv", "node,kv\nS,11\n"),
            (
                "transformers.csv",
                "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\nT1,S,A,100,11,0.4,Dyn11,1,4\nT2,S,A,100,11,0.4,Dyn1,1,4\n",
            ),
        ],
    ),
    (
        "ring at two voltages",
        &[
            ("lines.csv", "line,from,to,phases,length_m,construction\n"),
            ("source.csv", "node,kv\nS,11\n"),
            (
                "transformers.csv",
                "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\nT1,S,A,100,11,0.4,Dyn11,1,4\nT2,S,A,100,11,0.69,Dyn11,1,4\n",
            ),
        ],
    ),
    ("line from a node to itself", &[lines!("L1,S,A,abcn,100,cable,", "L2,A,A,abcn,100,cable,")]),
    ("isolated switch", &[("switches.csv", "switch,from,to,phases,state\nQ1,A,Z,abcn,closed\n")]),
    ("isolated open switch", &[("switches.csv", "switch,from,to,phases,state\nQ1,Y,Z,abcn,open\n")]),
    (
        "generators at the wrong place and of unknown curves",
        &[
            (
                "generators.csv",
                "generator,node,phases,kw,kvar,kva,volt_var,volt_watt\nG1,AA,an,5,0,,,\nG2,A,an,5,,6,vv,\nG3,A,an,5,0,6,,w\n",
            ),
            ("curves.csv", "curve,pu,percent\nv,0.95,40\nv,1.05,-40\n"),
        ],
    ),
    (
        "motors at the wrong place and voltage",
        &[("motors.csv", "motor,node,kw,volts\nM1,AA,15,400\nM2,A,15,690\n")],
    ),
    // Names.
    ("load at a missing node", &[loads!("house,AA,,an,5,1", "shop,nowhere,,an,5,1")]),
    ("load along a missing line", &[loads!("house,,L2,an,5,1")]),
    ("load at a line", &[loads!("house,L1,,an,5,1")]),
    ("node row of a line", &[("nodes.csv", "node,x,y\nL1,1,2\n")]),
    ("capacitor at a missing node", &[("capacitors.csv", "capacitor,node,phases,kvar\nC1,B,abc,10\n")]),
    ("node row of a missing node", &[("nodes.csv", "node,x,y\nB,1,2\n")]),
    ("unknown construction", &[lines!("L1,S,A,abcn,100,cabel,", "L2,A,B,abcn,100,overhead,")]),
    // Conductors.
    ("construction for other conductors", &[lines!("L1,S,A,abc,100,cable,")]),
    ("phase not carried to a load", &[lines!("L1,S,A,an,100,service,"), loads!("house,A,,bn,5,1")]),
    ("phase not carried to a line", &[lines!("L1,S,A,an,100,service,", "L2,A,B,abcn,100,cable,")]),
    ("phase not carried along a line", &[lines!("L1,S,A,an,100,service,"), loads!("house,,L1,bc,5,1")]),
    (
        "phase not carried to a transformer",
        &[lines!("L1,S,A,an,100,service,"), transformers!("T1,A,B,,100,0.4,0.4,Dyn11,1,4,,")],
    ),
    (
        "terminals of a transformer not carried",
        &[lines!("L1,S,A,an,100,service,"), transformers!("T1,A,B,bn,10,0.23,0.23,Ii0,1,4,,")],
    ),
    (
        "phase not carried through a switch",
        &[
            lines!("L1,S,A,an,100,service,"),
            ("switches.csv", "switch,from,to,phases,state\nQ1,A,B,abn,closed\n"),
            loads!("house,B,,an,5,1"),
        ],
    ),
    (
        "phase not carried to a regulator",
        &[lines!("L1,S,A,an,100,service,"), regulators!("R1,A,B,abc,n,1,1,1"), loads!("house,B,,an,5,1")],
    ),
    (
        "phase not carried to a capacitor",
        &[lines!("L1,S,A,an,100,service,"), ("capacitors.csv", "capacitor,node,phases,kvar\nC1,A,abc,10\n")],
    ),
    (
        "electrode without neutral",
        &[
            lines!("L1,S,A,abc,100,three,"),
            ("nodes.csv", "node,earth_ohm\nA,10\n"),
            loads!("house,A,,ab,5,1"),
        ],
    ),
    // Impedances.
    (
        "resistance not positive definite",
        &[
            lines!("L1,S,A,an,100,service,"),
            matrix!("service,a,a,0.3,0.1", "service,a,n,0.5,0.05", "service,n,n,0.3,0.1"),
        ],
    ),
    ("resistance of nothing", &[lines!("L1,S,A,a,100,w,"), matrix!("w,a,a,0,0.1")]),
    ("reactance a hundred times too high", &[lines!("L1,S,A,a,100,w,"), matrix!("w,a,a,0.3,38")]),
    ("reactance a hundred times too low", &[lines!("L1,S,A,a,100,w,"), matrix!("w,a,a,0.3,0.0012")]),
    ("reactance negative", &[lines!("L1,S,A,a,100,w,"), matrix!("w,a,a,0.3,-0.3")]),
    ("resistance in the wrong unit", &[lines!("L1,S,A,a,100,w,"), matrix!("w,a,a,300,0.3")]),
    // Voltages.
    (
        "transformer for another voltage",
        &[transformers!("T1,A,B,,100,11,0.4,Dyn11,1,4,,"), loads!("house,B,,an,5,1")],
    ),
    (
        "transformer for a higher voltage class",
        &[
            ("source.csv", "node,kv\nS,6.6\n"),
            lines!("L1,S,A,abc,100,three,"),
            transformers!("T1,A,B,,100,11,0.4,Dyn11,1,4,,"),
            loads!("house,B,,an,5,1"),
        ],
    ),
    (
        "transformer by its phase voltage",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,"),
            transformers!("T1,A,B,,100,6.35,0.4,Dyn11,1,4,,"),
            loads!("house,B,,an,5,1"),
        ],
    ),
    (
        "transformer the wrong way round",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,"),
            transformers!("T1,B,A,,100,11,0.4,Dyn11,1,4,,"),
            loads!("house,B,,an,5,1"),
        ],
    ),
    (
        "single-phase transformer for another voltage",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,"),
            transformers!("T1,A,B,an,25,11,0.24,Ii0,1,4,,"),
            loads!("house,B,,an,5,1"),
        ],
    ),
    (
        "capacitor for another voltage",
        &[("capacitors.csv", "capacitor,node,phases,kvar,kv\nC1,A,an,10,0.4\n")],
    ),
    // Earthing.
    (
        "side earthed nowhere",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,", "L2,B,C,abc,100,three,"),
            transformers!("T1,A,B,,100,11,0.4,Dd0,1,4,,"),
            loads!("house,C,,ab,5,1"),
        ],
    ),
    (
        "neutral earthed nowhere",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,", "L2,B,C,abcn,100,cable,"),
            transformers!("T1,A,B,,100,11,0.4,Dyn11,1,4,,"),
            loads!("house,C,,an,5,1"),
        ],
    ),
    (
        "load to earth where nothing is earthed",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,", "L2,B,C,abc,100,three,"),
            transformers!("T1,A,B,,100,11,0.4,Dd0,1,4,,"),
            loads!("house,C,,an,5,1"),
        ],
    ),
    (
        "earthing given on a delta",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,", "L2,B,C,abc,100,three,"),
            transformers!("T1,A,B,,100,11,0.4,Dyn11,1,4,5,5"),
            loads!("house,C,,an,5,1"),
        ],
    ),
    (
        "earthing given where n is carried",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,", "L2,B,C,abcn,100,cable,"),
            transformers!("T1,A,B,,100,11,0.4,Dyn11,1,4,,5"),
            ("nodes.csv", "node,earth_ohm\nC,3\n"),
            loads!("house,C,,an,5,1"),
        ],
    ),
    (
        "single-phase load behind a star point earthed through an impedance",
        &[
            ("source.csv", "node,kv\nS,33\n"),
            lines!("L1,S,A,abc,100,three,", "L2,B,C,abc,100,three,"),
            transformers!("T1,A,B,,5000,33,11,Dyn11,1,7,,63"),
            loads!("farm,C,,an,50,1", "mill,C,,abc,50,1"),
        ],
    ),
    // Sizes far from any in use.
    (
        "load in watts behind a transformer",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,", "L2,B,C,abcn,100,cable,"),
            transformers!("T1,A,B,,63,11,0.4,Dyn11,1,4,,"),
            ("nodes.csv", "node,earth_ohm\nB,3\n"),
            loads!("house,C,,an,9000,1", "shop,C,,an,5,1"),
        ],
    ),
    ("load of thousands of amperes", &[loads!("house,A,,abcn,9000,1")]),
    ("line of 120 km at 400 V", &[lines!("L1,S,A,abcn,120000,cable,")]),
    (
        "rating in MVA",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            lines!("L1,S,A,abc,100,three,", "L2,B,C,abcn,100,cable,"),
            transformers!("T1,A,B,,0.063,11,0.4,Dyn11,0.01,0.04,,"),
            ("nodes.csv", "node,earth_ohm\nB,3\n"),
            loads!("house,C,,an,0.01,1"),
        ],
    ),
    (
        "steps per unit",
        &[
            ("regulators.csv", "regulator,from,to,phases,tap_a,step_percent\nR1,A,B,a,1,0.00625\n"),
            loads!("house,B,,an,5,1"),
        ],
    ),
    // Regulators.
    (
        "phase regulated twice",
        &[regulators!("R1,A,B,a,n,1,,", "R2,A,B,ab,n,2,2,"), loads!("house,B,,an,5,1")],
    ),
    ("automatic regulator", &[regulators!("R1,A,B,ab,n,1,,"), loads!("house,B,,an,5,1")]),
    (
        "bank in both directions",
        &[regulators!("R1,A,B,a,n,1,,", "R2,B,A,b,n,,2,"), loads!("house,B,,an,5,1")],
    ),
    (
        "closed delta with a pair twice",
        &[
            ("regulators.csv", "regulator,from,to,phases,across,tap_a,tap_b\nR1,A,B,a,b,1,\nR2,A,B,b,a,,1\n"),
            loads!("house,B,,an,5,1"),
        ],
    ),
    // Controls of capacitors.
    (
        "capacitor switched by a line that is not there",
        &[(
            "capacitors.csv",
            "capacitor,node,phases,kvar,control,on_kvar,off_kvar,sense_line\nC1,A,abc,10,kvar,20,5,L9\nC2,A,abc,10,kvar,20,5,l1\n",
        )],
    ),
    (
        "capacitor switched by an open line",
        &[
            lines!("L1,S,A,abcn,100,cable,", "L2,A,B,abcn,100,cable,open"),
            (
                "capacitors.csv",
                "capacitor,node,phases,kvar,control,on_a,off_a,sense_line\nC1,A,abc,10,current,20,5,L2\n",
            ),
        ],
    ),
    (
        "capacitor switched by a phase that is not carried",
        &[
            lines!("L1,S,A,an,100,service,"),
            (
                "capacitors.csv",
                "capacitor,node,phases,kvar,control,on_a,off_a,on_v,off_v,sense_line,sense_phase\n\
                 C1,A,an,1,current,20,5,,,L1,b\nC2,A,an,1,voltage,,,220,240,,c\n",
            ),
        ],
    ),
    (
        "capacitor thresholds on another base",
        &[(
            "capacitors.csv",
            "capacitor,node,phases,kvar,control,on_v,off_v,pt_ratio\nC1,A,an,1,voltage,118,124,20\n",
        )],
    ),
    // Nothing to do.
    ("no load", &[loads!()]),
    ("nothing but a source", &[("lines.csv", "line,from,to,phases,length_m,construction\n"), loads!()]),
];

fn told(files: &[(&str, &str)]) -> String {
    let mut files = files.to_vec();
    if !files.iter().any(|(name, _)| *name == "matrices.csv") {
        files.push(("matrices.csv", WIRES));
    }
    let reading = read_with(&files);
    let read = lines_of(&reading).lines().filter(|l| l.contains("error")).collect::<String>();
    assert_eq!(read, "", "the reader has nothing against these files");
    build(&reading.draft).diagnostics.items().iter().map(|d| format!("{d}\n")).collect()
}

#[test]
fn every_network_fault_has_its_words() {
    let mut all = String::new();
    for (name, files) in CASES {
        let said = told(files);
        all.push_str(&format!("== {name}\n{said}"));
    }
    insta::assert_snapshot!("faults_of_networks", all);
}

#[test]
fn the_good_network_is_built() {
    let files: &[(&str, &str)] = &[("source.csv", SOURCE), ("lines.csv", LINES), ("loads.csv", LOADS)];
    assert_eq!(told(files), "");
    assert!(build(&read_with(&[]).draft).network.is_some());
}

#[test]
fn cases_are_many_and_each_says_something() {
    assert!(CASES.len() >= 45, "{} cases", CASES.len());
    let silent: Vec<_> = CASES.iter().filter(|(_, files)| told(files).is_empty()).map(|(n, _)| *n).collect();
    assert_eq!(silent, [""; 0]);
}
