//! Faults of profiles, of what names them, and of the time asked for.

use fourwire::diagnostic::Diagnostics;
use fourwire::network::{SwitchState, build};

use super::{lines_of, read_with};

type Files = &'static [(&'static str, &'static str)];

macro_rules! loads {
    ($($row:literal),*) => {
        ("loads.csv", concat!("load,node,phases,kw,pf,profile,share_kva\n", $($row, "\n"),*))
    };
}
macro_rules! capacitors {
    ($($row:literal),*) => {
        ("capacitors.csv", concat!("capacitor,node,phases,kvar,state,control,delay_s,profile\n", $($row, "\n"),*))
    };
}
const HOUSE: (&str, &str) = loads!("house,A,an,2,0.95,home,");
const DAY: (&str, &str) =
    ("profiles.csv", "time,Home,bank,note source\n06:00,0.4,0.2,\n07:00,0.75,0.5,\n08:00,1,1,\n");

/// Files that replace those of the good network, and the time asked for.
const CASES: &[(&str, Option<&str>, Files)] = &[
    ("nothing asked, nothing used", None, &[DAY]),
    ("no time given", None, &[HOUSE, capacitors!("C1,A,an,1,open,profile,,bank"), DAY]),
    ("profile by a slip", Some("07:00"), &[loads!("house,A,an,2,0.95,hmoe,"), DAY]),
    ("profile of no name known", Some("07:00"), &[loads!("house,A,an,2,0.95,factory,"), DAY]),
    ("profile without any file", None, &[HOUSE]),
    ("time without any file", Some("07:00"), &[]),
    ("time by a slip", Some("7:00"), &[HOUSE, DAY]),
    ("time of no row", Some("noon"), &[HOUSE, DAY]),
    (
        "time of no row among many",
        Some("noon"),
        &[HOUSE, ("profiles.csv", "time,home\n1,1\n2,1\n3,1\n4,1\n5,1\n6,1\n7,1\n")],
    ),
    ("time without any row", Some("07:00"), &[HOUSE, ("profiles.csv", "time,home\n")]),
    ("time twice", Some("07:00"), &[HOUSE, ("profiles.csv", "time,home\n07:00,1\n07:00,0.5\n")]),
    (
        "cells that hold no factor",
        Some("07:00"),
        &[HOUSE, ("profiles.csv", "time,home\n06:00,much\n07:00,\n08:00,-1\n09:00,#N/A\n,1\n10:00,85%\n")],
    ),
    ("factors in per cent", Some("07:00"), &[HOUSE, ("profiles.csv", "time,home\n06:00,40\n07:00,85\n")]),
    ("row too short", Some("06:00"), &[HOUSE, ("profiles.csv", "time,home\n06:00\n07:00,1\n")]),
    ("no column of times", Some("07:00"), &[HOUSE, ("profiles.csv", "hour,home\n07:00,1\n")]),
    ("column of times misspelt", Some("07:00"), &[HOUSE, ("profiles.csv", "tiem,home\n07:00,1\n")]),
    ("profile twice", Some("07:00"), &[HOUSE, ("profiles.csv", "time,home,Home\n07:00,1,0.5\n")]),
    ("empty file", Some("07:00"), &[HOUSE, ("profiles.csv", "")]),
    ("profile and share", Some("07:00"), &[loads!("house,A,an,,0.95,home,50"), DAY]),
    (
        "capacitors",
        Some("07:00"),
        &[
            HOUSE,
            capacitors!(
                "C1,A,an,1,,profile,,",
                "C2,A,an,1,,fixed,,bank",
                "C3,A,an,1,,profile,30,bank",
                "C4,A,an,1,,profile,,bnak"
            ),
            DAY,
        ],
    ),
];

fn told(time: Option<&str>, files: &[(&str, &str)]) -> String {
    let mut reading = read_with(files);
    let mut others = Diagnostics::new();
    let timed = time.and_then(|time| reading.draft.at_time(time, &mut others));
    if time.is_none() {
        reading.draft.warn_of_no_time(&mut others);
    }
    others.append(build(timed.as_ref().unwrap_or(&reading.draft)).diagnostics);
    reading.diagnostics.append(others);
    lines_of(&reading)
}

#[test]
fn every_fault_of_profiles_has_its_words() {
    let mut all = String::new();
    for (name, time, files) in CASES {
        let text = told(*time, files);
        assert!(!text.is_empty(), "{name} is told");
        all.push_str(&format!("== {name}\n{text}"));
    }
    insta::assert_snapshot!("faults_of_profiles", all);
}

#[test]
fn loads_and_capacitors_follow_their_profiles() {
    let files = [
        loads!("house,A,an,2,0.8,HOME,", "shop,A,bn,3,1,,"),
        capacitors!("C1,A,an,1,open,profile,,bank", "C2,A,bn,1,open,,,"),
        DAY,
    ];
    let reading = read_with(&files);
    assert_eq!(lines_of(&reading), "");
    // Factor of `home` in the file above, and whether `bank` is 0.5 or more.
    for (time, factor, state) in [
        ("06:00", 0.4, SwitchState::Open),
        ("07:00", 0.75, SwitchState::Closed),
        (" 08:00 ", 1.0, SwitchState::Closed),
    ] {
        let mut diagnostics = Diagnostics::new();
        let draft = reading.draft.at_time(time, &mut diagnostics).expect("that time");
        assert!(diagnostics.items().is_empty());
        let network = build(&draft).network.expect("a network");
        assert_eq!(network.at.as_deref(), Some(time.trim()));
        let [house, shop] = network.loads.as_slice() else { panic!("two loads") };
        // 2 kW at power factor 0.8 draw 2 * 0.6 / 0.8 = 1.5 kvar.
        assert!((house.watts - 2000.0 * factor).abs() < 1e-9 && (house.vars - 1500.0 * factor).abs() < 1e-9);
        assert!((shop.watts - 3000.0).abs() < 1e-9 && shop.vars.abs() < 1e-9);
        assert_eq!(network.capacitor_banks[0].state, state, "{time}");
        assert_eq!(network.capacitors.len(), usize::from(state == SwitchState::Closed));
    }
    let full = build(&reading.draft).network.expect("a network");
    assert!((full.loads[0].watts - 2000.0).abs() < 1e-9 && full.at.is_none());
}
