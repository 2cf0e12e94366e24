//! Faults of wires, spacings and constructions, each with its exact words.

use super::read_with;
use fourwire::network::build;

const CONSTRUCTIONS: &str = "construction,kind,phase_conductor,neutral_conductor,spacing\n";
const SPACINGS: &str = "spacing,position,x_m,y_m\npole,a,0,9\npole,b,1,9\npole,c,2,9\npole,n,1,8\n";

/// A network whose one line uses construction `w` for `abcn`, with these rows of the three files.
fn told(constructions: &str, spacings: &str, conductors: &str) -> String {
    let constructions = format!("{CONSTRUCTIONS}{constructions}");
    let reading = read_with(&[
        ("constructions.csv", &constructions),
        ("spacings.csv", spacings),
        ("conductors.csv", conductors),
        ("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,A,abcn,100,w\n"),
        ("matrices.csv", "construction,row,column,r_ohm_per_km,x_ohm_per_km\n"),
    ]);
    let mut lines: String = reading.diagnostics.items().iter().map(|d| format!("{d}\n")).collect();
    if !reading.diagnostics.has_errors() {
        lines +=
            &build(&reading.draft).diagnostics.items().iter().map(|d| format!("{d}\n")).collect::<String>();
    }
    lines
}

#[test]
fn every_fault_of_a_construction_has_its_words() {
    let wires = "conductor,material,r_ohm_per_km,diameter_mm\nown wire,copper,0.5,8\n";
    let none = "conductor,material\n";
    let cases: Vec<(&str, String)> = vec![
        ("good", told("w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n", SPACINGS, none)),
        ("own wire", told("w,overhead,own wire,own wire,pole\n", SPACINGS, wires)),
        ("wire misspelt", told("w,overhead,Dofe,4/0 6/1 ACSR,pole\n", SPACINGS, none)),
        ("neutral misspelt", told("w,overhead,336.4 26/7 ACSR,4/0 6/2 ACSR,pole\n", SPACINGS, none)),
        ("wire of two minds", told("w,overhead,#2 AWG,4/0 6/1 ACSR,pole\n", SPACINGS, none)),
        ("wire unheard of", told("w,overhead,barbed wire,4/0 6/1 ACSR,pole\n", SPACINGS, none)),
        ("spacing misspelt", told("w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,poel\n", SPACINGS, none)),
        ("no spacing", told("w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,\n", SPACINGS, none)),
        (
            "no place for c",
            told(
                "w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n",
                "spacing,position,x_m,y_m\npole,a,0,9\npole,b,1,9\npole,n,1,8\n",
                none,
            ),
        ),
        (
            "no place for n",
            told(
                "w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n",
                "spacing,position,x_m,y_m\npole,a,0,9\npole,b,1,9\npole,c,2,9\n",
                none,
            ),
        ),
        ("no neutral wire", told("w,overhead,336.4 26/7 ACSR,,pole\n", SPACINGS, none)),
        (
            "two wires in one place",
            told(
                "w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n",
                "spacing,position,x_m,y_m\npole,a,0,9\npole,b,0,9\npole,c,2,9\npole,n,1,8\n",
                none,
            ),
        ),
        (
            "overhead below the ground",
            told(
                "w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n",
                "spacing,position,x_m,y_m\npole,a,0,-9\npole,b,1,9\npole,c,2,9\npole,n,1,8\n",
                none,
            ),
        ),
        (
            "cables that touch",
            told(
                "w,concentric,250 AA CN one-third,,pole\n",
                "spacing,position,x_m,y_m\npole,a,0,-1\npole,b,0.02,-1\npole,c,0.2,-1\n",
                none,
            ),
        ),
        ("cable of two minds", told("w,concentric,250 AA CN,,pole\n", SPACINGS, none)),
        ("cable unheard of", told("w,tape,300 AA tape,,pole\n", SPACINGS, none)),
        (
            "no GMR",
            told(
                "w,overhead,own wire,own wire,pole\n",
                SPACINGS,
                "conductor,material,r_ohm_per_km\nown wire,copper,0.5\n",
            ),
        ),
        (
            "wire without resistance",
            told(
                "w,overhead,own wire,own wire,pole\n",
                SPACINGS,
                "conductor,material,diameter_mm\nown wire,copper,8\n",
            ),
        ),
        (
            "metal unknown",
            told(
                "w,overhead,own wire,own wire,pole\n",
                SPACINGS,
                "conductor,material,r_ohm_per_km,diameter_mm\nown wire,gold,0.5,8\n",
            ),
        ),
        ("conduit without such a wire", told("w,conduit,95 mm2 copper,,\n", SPACINGS, none)),
        ("conduit of a size that a gauge shares", told("w,conduit,10 mm2 copper,,\n", SPACINGS, none)),
        ("sequence incomplete", told("w,sequence,,,\n", SPACINGS, none)),
        ("kind misspelt", told("w,overhaed,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n", SPACINGS, none)),
        ("kind missing", told("w,,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n", SPACINGS, none)),
        ("phase wire missing", told("w,overhead,,4/0 6/1 ACSR,pole\n", SPACINGS, none)),
        (
            "twice",
            told(
                "w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\nw,overhead,Dove,4/0 6/1 ACSR,pole\n",
                SPACINGS,
                none,
            ),
        ),
        (
            "position twice",
            told("w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n", &format!("{SPACINGS}pole,a,3,9\n"), none),
        ),
        (
            "position of two conductors",
            told("w,overhead,336.4 26/7 ACSR,4/0 6/1 ACSR,pole\n", &format!("{SPACINGS}pole,ab,3,9\n"), none),
        ),
    ];
    let text: String = cases.iter().map(|(name, told)| format!("== {name}\n{told}")).collect();
    insta::assert_snapshot!("faults_of_constructions", text);
}
