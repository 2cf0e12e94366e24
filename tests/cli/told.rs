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

#[test]
fn loadability_is_told_in_words_that_fit() {
    let fine = text(&run(&["flow", &at(&small(10.0, HEADER)), "--loadability"]).stdout);
    assert!(fine.contains("all loads can grow to") && fine.contains("floor of 70 %"), "{fine}");
    let folder = small(5000.0, HEADER);
    fs::write(folder.path().join("study.csv"), "setting,value\nconstant_power_floor_percent,0\n")
        .expect("a file");
    let output = run(&["flow", &at(&folder), "--loadability"]);
    assert_eq!(output.status.code(), Some(3));
    let told = text(&output.stderr);
    assert!(told.contains("% of the loads can be fed") && !told.contains("grow to"), "{told}");
    let folder = small(1.0, HEADER);
    fs::write(folder.path().join("loads.csv"), "load,node,phases,kw,pf\n").expect("a file");
    let none = text(&run(&["flow", &at(&folder), "--loadability"]).stdout);
    assert!(none.contains("no loads to grow"), "{none}");
}

#[test]
fn results_for_a_file_name_its_path() {
    let folder = small(1.0, HEADER);
    let file = folder.path().join("loads.csv").display().to_string();
    let output = run(&["flow", &at(&folder), "--out", &file]);
    assert_eq!(output.status.code(), Some(2));
    let told = text(&output.stderr);
    assert!(told.contains(&file) && told.contains("is a file, not a folder"), "{told}");
}

#[test]
fn a_clean_check_for_editors_says_so_beside_them() {
    let output = run(&["check", &at(&small(1.0, HEADER)), "--format", "lines"]);
    assert_eq!(output.status.code(), Some(0));
    assert_eq!(text(&output.stdout), "");
    assert_eq!(text(&output.stderr), "Nothing wrong found.\n");
}

#[test]
fn a_folder_of_networks_names_them() {
    let folder = network("ieee-4-node");
    for command in ["check", "flow"] {
        let output = run(&[command, folder.to_str().expect("a path")]);
        assert_eq!(output.status.code(), Some(2));
        let told = text(&output.stdout) + &text(&output.stderr);
        assert!(told.contains("Dyn1-bal") && told.contains("YNyn0-unb"), "{told}");
        assert!(told.contains("1 error;"), "{told}");
    }
}

/// A feeder of so many lines in a row.
fn chain(lines: usize) -> tempfile::TempDir {
    let folder = small(1.0, HEADER);
    let mut rows = format!("{HEADER}\nL1,S,A,an,10,cable\n");
    for k in 1..lines {
        let from = if k == 1 { "A".to_string() } else { format!("N{}", k - 1) };
        rows.push_str(&format!("M{k},{from},N{k},an,10,cable\n"));
    }
    fs::write(folder.path().join("lines.csv"), rows).expect("a file");
    folder
}

#[test]
fn tables_are_cut_only_where_it_saves_room() {
    let page = text(&run(&["flow", &at(&chain(21))]).stdout);
    assert!(!page.contains("--all") && page.contains("Branches, currents at the from end"), "{page}");
    let page = text(&run(&["flow", &at(&chain(60))]).stdout);
    assert!(page.contains("most loaded of 60 (--all for all), currents at the from end"), "{page}");
    assert!(page.contains("largest voltage drop") && page.contains("that last set the voltage"), "{page}");
}

#[test]
fn words_behind_sources_are_explained() {
    let page = text(&run(&["line", "--list", "4/0"]).stdout);
    let explained = |word: &str| page.contains(&format!("({word}):"));
    for word in ["read", "memory", "mixed"] {
        assert_eq!(page.contains(&format!("({word})\n")), explained(word), "{word}: {page}");
    }
    assert!(explained("memory") || explained("mixed"), "{page}");
}

#[test]
fn a_weak_star_point_is_found() {
    let folder = tempfile::tempdir().expect("a folder");
    let write = |name: &str, text: &str| fs::write(folder.path().join(name), text).expect("a file");
    write("source.csv", "node,kv\nS,33\n");
    write(
        "transformers.csv",
        "transformer,from,to,kva,kv_from,kv_to,group,r_percent,x_percent,earth_ohm_to\nT1,S,A,5000,33,11,Dyn11,1,7,63\n",
    );
    write("loads.csv", "load,node,phases,kw,pf\nfarm,A,an,50,1\nmill,A,abc,50,1\n");
    let page = text(&run(&["flow", &at(&folder)]).stdout);
    assert!(page.contains("weak star point: transformer T1") && page.contains("farm"), "{page}");
    assert!(page.contains("licensed engineer"), "{page}");
    write("loads.csv", "load,node,phases,kw,pf\nmill,A,abc,50,1\n");
    let page = text(&run(&["flow", &at(&folder)]).stdout);
    assert!(!page.contains("weak star point"), "{page}");
}

#[test]
fn the_search_for_the_limit_tells_how_far_it_is() {
    use fourwire::study::loadability::{loadability, loadability_with};
    let folder = small(10.0, HEADER);
    let reading = fourwire::import::read_folder(folder.path());
    let network = fourwire::network::build(&reading.draft).network.expect("a network");
    let settings = fourwire::solver::Settings::default();
    let mut told = Vec::new();
    let found = loadability_with(&network, &settings, |at| told.push((at.solved, at.expected)));
    assert_eq!(found, loadability(&network, &settings));
    assert!(
        told.len() > 5 && told.iter().enumerate().all(|(i, t)| t.0 as usize == i && t.1 > t.0),
        "{told:?}"
    );
}

#[test]
fn flow_at_a_time_takes_the_profiles_of_that_time() {
    let folder = small(1.0, HEADER);
    let write = |name: &str, text: &str| fs::write(folder.path().join(name), text).expect("a file");
    write("loads.csv", "load,node,phases,kw,pf,profile\nhouse,A,an,10,1,home\nshop,A,an,1,1,\n");
    write(
        "capacitors.csv",
        "capacitor,node,phases,kvar,state,control,profile\nC1,A,an,1,open,profile,bank\n",
    );
    write("profiles.csv", "time,home,bank\n2026-07-01T06:00,0.25,0\n2026-07-01T07:00,0.5,1\n");
    let report = |more: &[&str]| -> serde_json::Value {
        let output = run(&[&["flow", &at(&folder), "--format", "json"], more].concat());
        assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
        assert_eq!(text(&output.stderr).contains("no-time"), more.is_empty(), "{}", text(&output.stderr));
        serde_json::from_slice(&output.stdout).expect("JSON")
    };
    // Constant power: 10 kW times the profile, and 1 kW that has none.
    for (time, kw, state) in [("2026-07-01T06:00", 3.5, "open"), ("2026-07-01T07:00", 6.0, "closed")] {
        let found = report(&["--at", time]);
        assert_eq!(found["at"], time);
        let drawn = found["totals"]["load_kw"].as_f64().expect("a number");
        assert!((drawn - kw).abs() < 1e-6, "{drawn}");
        assert_eq!(found["capacitors"][0]["state"], state);
    }
    let full = report(&[]);
    assert!(full["at"].is_null());
    assert!(full["totals"]["load_kw"].as_f64().is_some_and(|kw| (kw - 11.0).abs() < 1e-6));
    assert_eq!(full["capacitors"][0]["state"], "open");
    let page = text(&run(&["flow", &at(&folder), "--at", "2026-07-01T07:00"]).stdout);
    assert!(page.lines().next().is_some_and(|first| first.ends_with(", at 2026-07-01T07:00")), "{page}");
    let wrong = run(&["flow", &at(&folder), "--at", "2026-07-01T08:00"]);
    assert_eq!(wrong.status.code(), Some(2));
    assert!(wrong.stdout.is_empty());
    assert!(text(&wrong.stderr).contains("did you mean"), "{}", text(&wrong.stderr));
    // Nothing is solved by `check`, so no time is missed.
    assert!(text(&run(&["check", &at(&folder)]).stdout).ends_with("Nothing wrong found.\n"));
}
