//! One slip is told once: what is missing for want of the faulty row is not told as well.

use fourwire::network::build;

use super::read_with;

type Files = &'static [(&'static str, &'static str)];

const FED: &str = "line,from,to,phases,length_m,construction\nL1,A,B,abcn,100,cable\nL2,B,C,abcn,100,cable\n";

/// Files that replace those of the good network, and all codes that are told.
const CASES: &[(&str, Files, &[&str])] = &[
    (
        "group of the only transformer",
        &[
            ("source.csv", "node,kv\nS,11\n"),
            (
                "transformers.csv",
                "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent\nT,S,A,63,11,0.4,Dyn99,1,4\n",
            ),
            ("lines.csv", FED),
        ],
        &["unknown-group"],
    ),
    ("voltage of the source in volts", &[("source.csv", "node,kv\nS,11000\n")], &["out-of-range"]),
    ("no source.csv", &[("source.csv", "node;kv\n")], &["no-source"]),
    (
        "resistance without unit",
        &[
            (
                "matrices.csv",
                "construction,row,column,r,x_ohm_per_km\ncable,a,a,0.3,0.09\ncable,a,n,0.1,0.02\ncable,n,n,0.3,0.09\n",
            ),
            ("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,an,100,cable\n"),
        ],
        &["unknown-column"],
    ),
    (
        "phases of one line",
        &[
            (
                "lines.csv",
                "line,from,to,phases,length_m,construction\nL1,S,A,abxn,100,cable\nL2,A,B,abcn,100,cable\nL3,B,C,abcn,100,cable\n",
            ),
            ("loads.csv", "load,node,line,phases,kw,pf\nhouse,C,,an,1,1\nlamps,,L1,an,1,1\n"),
        ],
        &["bad-phases"],
    ),
    ("column of loads missing", &[("loads.csv", "load,node,phases,pf\nhouse,A,an,1\n")], &["missing-column"]),
    (
        "row of a wire",
        &[
            ("conductors.csv", "conductor,material,r_ohm_per_km,diameter_mm\nOwn 50,copper,x,9\n"),
            ("spacings.csv", "spacing,position,x_m,y_m\npole,a,0,8\npole,n,0,7\n"),
            (
                "constructions.csv",
                "construction,kind,phase_conductor,neutral_conductor,spacing\nown,overhead,Own 50,Own 50,pole\n",
            ),
            ("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,an,100,own\n"),
        ],
        &["bad-number"],
    ),
    (
        "semicolons under a header with commas",
        &[(
            "lines.csv",
            "line,from,to,phases,length_m,construction\nL1;S;A;abcn;100;cable\nL2;A;B;abcn;12,5;cable\nL3;B;C;abcn;100;cable\n",
        )],
        &["row-length"],
    ),
    // And what stands by itself is told.
    (
        "a second slip",
        &[(
            "lines.csv",
            "line,from,to,phases,length_m,construction\nL1,S,A,abxn,100,cable\nL2,X,Y,abcn,100,cable\n",
        )],
        &["bad-phases", "not-fed"],
    ),
];

fn codes(files: Files) -> Vec<&'static str> {
    let reading = read_with(files);
    let built = build(&reading.draft);
    let all = reading.diagnostics.items().iter().chain(built.diagnostics.items());
    all.map(|d| d.code.text()).collect()
}

#[test]
fn one_slip_is_told_once() {
    for (name, files, expected) in CASES {
        assert_eq!(codes(files), *expected, "{name}");
    }
}

#[test]
fn a_folder_without_source_is_told_once() {
    let reading = super::read(&[
        ("lines.csv", super::LINES),
        ("matrices.csv", super::MATRICES),
        ("loads.csv", super::LOADS),
    ]);
    let built = build(&reading.draft);
    let all: Vec<_> =
        reading.diagnostics.items().iter().chain(built.diagnostics.items()).map(|d| d.code.text()).collect();
    assert_eq!(all, ["missing-file"]);
}
