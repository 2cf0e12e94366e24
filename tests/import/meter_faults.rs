//! Faults of meters and of the loads that share what they read.

use fourwire::network::build;

use super::{lines_of, read_with};

type Files = &'static [(&'static str, &'static str)];

macro_rules! meters {
    ($($row:literal),*) => {
        ("meters.csv", concat!("meter,node,line,phases,kw,amps,kvar,pf\n", $($row, "\n"),*))
    };
}
macro_rules! loads {
    ($($row:literal),*) => {
        ("loads.csv", concat!("load,node,phases,kw,kvar,pf,share_kva,share_kwh,share_weight\n", $($row, "\n"),*))
    };
}
const LINES: (&str, &str) = (
    "lines.csv",
    "line,from,to,phases,length_m,construction,state\nL1,S,A,abcn,100,cable,\nL2,A,B,abcn,100,cable,\nL3,A,C,abcn,90,cable,open\n",
);
const HOUSE: (&str, &str) = loads!("house,B,an,,,0.95,50,,");

/// Files that replace those of the good network.
const CASES: &[(&str, Files)] = &[
    // Cells of meters.csv.
    ("meter without name", &[HOUSE, meters!(",,,,20,,,")]),
    ("meter at node and line", &[HOUSE, meters!("M,A,L1,,20,,,")]),
    ("meter with kw and amps", &[HOUSE, meters!("M,,,,20,30,,")]),
    ("meter with neither", &[HOUSE, meters!("M,,,,,,,")]),
    ("meter with kvar and pf", &[HOUSE, meters!("M,,,,20,,5,0.9")]),
    ("meter with amps and kvar", &[HOUSE, meters!("M,,,,,30,5,")]),
    ("meter of two phases", &[HOUSE, meters!("M,,,ab,20,,,")]),
    ("meter phase unreadable", &[HOUSE, meters!("M,,,q,20,,,")]),
    ("meter of no amperes", &[HOUSE, meters!("M,,,,,0,,")]),
    ("meter power factor of nothing", &[HOUSE, meters!("M,,,,20,,,0")]),
    ("meter total and phase", &[HOUSE, meters!("M,,,,20,,,", "M,,,a,10,,,")]),
    ("meter phase twice", &[HOUSE, meters!("M,,,a,20,,,", "M,,,a,10,,,")]),
    ("meter name at two places", &[HOUSE, meters!("M,,,a,20,,,", "M,A,,b,10,,,")]),
    ("meter words for numbers", &[HOUSE, meters!("M,,,,much,,,", "N,B,,,,x,,")]),
    ("meter column unknown", &[HOUSE, ("meters.csv", "meter,kilowatts\nM,20\n")]),
    ("meters without rows", &[HOUSE, meters!()]),
    // Cells of loads.csv.
    ("load with kw and share", &[loads!("house,B,an,2,,0.95,50,,"), meters!("M,,,,20,,,")]),
    ("load with kvar and share", &[loads!("house,B,an,,1,,50,,"), meters!("M,,,,20,,5,")]),
    ("load with two shares", &[loads!("house,B,an,,,0.95,50,900,"), meters!("M,,,,20,,,")]),
    ("load with a negative share", &[loads!("house,B,an,,,0.95,-50,,"), meters!("M,,,,20,,,")]),
    ("load without kw and share", &[loads!("house,B,an,,,0.95,,,"), meters!("M,,,,20,,,")]),
    // Where meters are.
    ("meter at an unknown line", &[HOUSE, meters!("M,,L7,,20,,,")]),
    ("meter at a line by a slip", &[HOUSE, meters!("M,,l1,,20,,,")]),
    ("meter at an unknown node", &[HOUSE, meters!("M,Z,,,20,,,")]),
    ("meter at a node not fed", &[HOUSE, meters!("M,C,,,20,,,")]),
    ("meter at an open line", &[HOUSE, meters!("M,,L3,,20,,,")]),
    ("two meters at one place", &[HOUSE, meters!("M,,,,20,,,", "N,S,,,20,,,")]),
    (
        "meters in a closed ring",
        &[
            (
                "lines.csv",
                "line,from,to,phases,length_m,construction\nL1,S,A,abcn,100,cable\nL2,A,B,abcn,100,cable\nL3,A,C,abcn,90,cable\nL4,B,C,abcn,90,cable\n",
            ),
            HOUSE,
            meters!("M,,,,20,,,", "N,,L2,,10,,,", "P,,L4,,1,,,", "Q,C,,,10,,,"),
        ],
    ),
    (
        "meter of a phase not carried",
        &[
            (
                "matrices.csv",
                "construction,row,column,r_ohm_per_km,x_ohm_per_km\none,a,a,0.3,0.09\none,a,n,0.05,0.01\none,n,n,0.3,0.09\n",
            ),
            ("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,an,100,one\nL2,A,B,an,90,one\n"),
            HOUSE,
            meters!("M,A,,a,20,,,", "M,A,,b,20,,,"),
        ],
    ),
    // Who shares.
    ("share without any meter", &[HOUSE]),
    (
        "share before the only meter",
        &[loads!("house,A,an,,,1,50,,", "shop,B,an,,,1,50,,"), meters!("M,B,,,20,,,")],
    ),
    ("no share behind the meter", &[loads!("house,B,an,2,,0.95,,,"), meters!("M,,,,20,,,")]),
    ("no share left for the outer meter", &[HOUSE, meters!("M,,,,20,,,", "N,B,,,20,,,")]),
    ("shares all zero", &[loads!("house,B,an,,,1,,,0", "shop,B,bn,,,1,,,0"), meters!("M,,,,20,,,")]),
    ("shares of two kinds", &[loads!("house,B,an,,,1,50,,", "shop,B,bn,,,1,,900,"), meters!("M,,,,20,,,")]),
    (
        "load on a phase without reading",
        &[loads!("house,B,an,,,1,50,,", "shop,B,bn,,,1,50,,"), meters!("M,,,a,20,,,")],
    ),
    ("no power factor anywhere", &[loads!("house,B,an,,,,50,,"), meters!("M,,,,20,,,")]),
    ("power factor of all loads and of the meter", &[HOUSE, meters!("M,,,,20,,,0.9")]),
    // What is left.
    (
        "known loads take more than is read",
        &[loads!("house,B,an,,,1,50,,", "mill,B,abcn,30,,1,,,"), meters!("M,,,,20,,,")],
    ),
    (
        "known load of a phase takes more than is read",
        &[loads!("house,B,an,,,1,50,,", "mill,B,an,30,,1,,,"), meters!("M,,,a,20,,,")],
    ),
    (
        "inner meters read more than the outer",
        &[loads!("house,B,an,,,1,50,,", "shop,A,an,,,1,50,,"), meters!("M,,,,20,,,", "N,B,,,25,,,")],
    ),
];

fn told(files: &[(&str, &str)]) -> String {
    let mut files = files.to_vec();
    if !files.iter().any(|(name, _)| *name == "lines.csv") {
        files.push(LINES);
    }
    let reading = read_with(&files);
    let built = build(&reading.draft);
    let errors = reading.diagnostics.has_errors() || built.diagnostics.has_errors();
    assert!(errors, "{files:?} is refused");
    let open = |line: &&str| !line.contains("[switched-off]");
    let lines: String = built.diagnostics.items().iter().map(|d| format!("{d}\n")).collect();
    (lines_of(&reading) + &lines).lines().filter(open).map(|l| format!("{l}\n")).collect()
}

#[test]
fn every_fault_of_meters_has_its_words() {
    let mut all = String::new();
    for (name, files) in CASES {
        all.push_str(&format!("== {name}\n{}", told(files)));
    }
    insta::assert_snapshot!("faults_of_meters", all);
}

#[test]
fn good_meters_are_joined() {
    let reading = read_with(&[LINES, HOUSE, meters!("M,,,,20,,,")]);
    assert_eq!(lines_of(&reading), "");
    let network = build(&reading.draft).network.expect("a network");
    assert_eq!((network.meters.len(), network.meters[0].channels[0].shares.len()), (1, 1));
}
