//! What the program says, and that it says nothing false.

use std::fs;

use super::{HEADER, at, network, run, small, text};

#[test]
fn a_feeder_without_loads_is_in_balance() {
    for name in ["brindle-quarry", "ieee-4-node/Dyn1-bal"] {
        let folder = tempfile::tempdir().expect("a folder");
        for entry in fs::read_dir(network(name)).expect("a folder") {
            let file = entry.expect("an entry").path();
            let name = file.file_name().expect("a name");
            if name != "loads.csv" && name != "capacitors.csv" {
                fs::copy(&file, folder.path().join(name)).expect("a file");
            }
        }
        fs::write(folder.path().join("loads.csv"), "load,node,phases,kw,pf\n").expect("a file");
        let output = run(&["flow", &at(&folder), "--strict"]);
        assert_eq!(output.status.code(), Some(0), "{name}: {}", text(&output.stdout));
        assert!(!text(&output.stdout).contains("power balance"), "{}", text(&output.stdout));
    }
}

#[test]
fn a_limit_given_as_a_fraction_is_refused() {
    let folder = small(1.0, HEADER);
    fs::write(folder.path().join("study.csv"), "setting,value\nvoltage_low_percent,0.94\n").expect("a file");
    let output = run(&["flow", &at(&folder)]);
    assert_eq!(output.status.code(), Some(2));
    assert!(text(&output.stderr).contains("write 94"), "{}", text(&output.stderr));
}

/// The mark stands under the cell as it was typed, not under the whole row.
#[test]
fn the_mark_stands_under_an_alias_with_a_space() {
    let folder = small(1.0, HEADER);
    fs::write(folder.path().join("loads.csv"), "load,node,phases,kw,pf\nhouse,A,L2 N,1,0.95\n")
        .expect("a file");
    let told = text(&run(&["check", &at(&folder)]).stdout);
    assert!(told.contains("loads.csv (cell C2):2:9"), "{told}");
    assert!(told.contains("|         ^^^^ column phases"), "{told}");
}
