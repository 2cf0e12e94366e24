//! The program as it is run: exit status, results in every form, faults told, nothing half written.

#[path = "cli/told.rs"]
mod told;

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output, Stdio};

use assert_cmd::cargo::cargo_bin_cmd;
use serde_json::Value;
use tempfile::TempDir;

fn network(name: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("networks").join(name)
}

fn run(arguments: &[&str]) -> Output {
    cargo_bin_cmd!("fourwire").args(arguments).output().expect("the program runs")
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).expect("output is UTF-8")
}

/// A folder with a source, one line and one load of so many kilowatts.
fn small(kw: f64, lines_header: &str) -> TempDir {
    let folder = tempfile::tempdir().expect("a folder");
    let write = |name: &str, text: &str| fs::write(folder.path().join(name), text).expect("a file");
    write("source.csv", "node,kv\nS,0.4\n");
    write("lines.csv", &format!("{lines_header}\nL1,S,A,an,100,cable\n"));
    write("loads.csv", &format!("load,node,phases,kw,pf\nhouse,A,an,{kw},0.95\n"));
    write(
        "matrices.csv",
        "construction,row,column,r_ohm_per_km,x_ohm_per_km\ncable,a,a,0.5,0.09\ncable,a,n,0.05,0.01\ncable,n,n,0.5,0.09\n",
    );
    folder
}

const HEADER: &str = "line,from,to,phases,length_m,construction";

fn at(folder: &TempDir) -> String {
    folder.path().display().to_string()
}

#[test]
fn flow_prints_a_page_of_at_most_100_columns() {
    let folder = network("ieee-13-node");
    for more in [&[][..], &["--all"], &["--loadability"]] {
        let output = run(&[&["flow", folder.to_str().expect("a path")], more].concat());
        assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
        let page = text(&output.stdout);
        assert!(page.contains("Converged in"), "{page}");
        let widest = page.lines().map(|l| l.chars().count()).max();
        assert!(widest <= Some(100), "{widest:?} columns");
        assert!(!page.contains("NaN") && !page.contains("inf"), "{page}");
    }
}

#[test]
fn strict_ends_with_1_where_a_limit_is_exceeded() {
    let folder = network("ieee-13-node");
    assert_eq!(run(&["flow", folder.to_str().expect("a path"), "--strict"]).status.code(), Some(1));
    let fine = small(1.0, HEADER);
    assert_eq!(run(&["flow", &at(&fine), "--strict"]).status.code(), Some(0));
}

#[test]
fn json_has_the_fields_of_the_format_and_adds_up() {
    let output = run(&["flow", network("ieee-13-node").to_str().expect("a path"), "--format", "json"]);
    let report: Value = serde_json::from_slice(&output.stdout).expect("JSON");
    for field in [
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
    ] {
        assert!(!report[field].is_null(), "{field} is missing");
    }
    let fields = |list: &str| -> Vec<String> {
        let mut names: Vec<String> =
            report[list][0].as_object().expect("an object").keys().cloned().collect();
        names.sort_unstable();
        names
    };
    assert_eq!(fields("nodes"), ["conductor", "degrees", "node", "pu", "volts"]);
    assert_eq!(
        fields("currents"),
        ["conductor", "element", "from_amps", "from_degrees", "kind", "to_amps", "to_degrees"]
    );
    assert_eq!(fields("elements"), ["element", "kind", "loss_kvar", "loss_kw", "rating_percent"]);
    assert_eq!(fields("source"), ["amps", "conductor", "degrees", "kvar", "kw"]);
    assert_eq!(fields("regulators"), ["at_limit", "automatic", "phase", "regulator", "state", "tap", "why"]);
    assert_eq!(fields("findings"), ["limit", "rule", "severity", "text", "value", "where"]);
    let total = |name: &str| report["totals"][name].as_f64().expect("a number");
    assert!((total("source_kw") - total("load_kw") - total("loss_kw")).abs() < 1e-6);
    assert!((total("source_kvar") - total("load_kvar") - total("loss_kvar")).abs() < 1e-6);
    let sum: f64 =
        report["source"].as_array().expect("a list").iter().map(|c| c["kw"].as_f64().expect("kW")).sum();
    assert!((sum - total("source_kw")).abs() < 1e-9);
    assert_eq!(report["input_sha256"].as_str().map(str::len), Some(64));
}

#[test]
fn csv_and_json_hold_the_same_numbers() {
    let folder = network("ieee-13-node");
    let out = tempfile::tempdir().expect("a folder");
    let results = out.path().join("results");
    let arguments =
        ["flow", folder.to_str().expect("a path"), "--out", results.to_str().expect("a path"), "--format"];
    for format in ["csv", "json", "text"] {
        let output = run(&[&arguments[..], &[format]].concat());
        assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    }
    let report: Value =
        serde_json::from_slice(&fs::read(results.join("flow.json")).expect("a file")).expect("JSON");
    for list in
        ["nodes", "currents", "elements", "nodes_summary", "source", "regulators", "findings", "loads"]
    {
        let mut reader = csv::Reader::from_path(results.join(format!("{list}.csv"))).expect("a file");
        let header = reader.headers().expect("a header").clone();
        let rows: Vec<csv::StringRecord> = reader.records().collect::<Result<_, _>>().expect("rows");
        let objects = report[list].as_array().expect("a list");
        assert_eq!(rows.len(), objects.len(), "{list}");
        for (row, object) in rows.iter().zip(objects) {
            for (column, cell) in header.iter().zip(row) {
                match &object[column] {
                    Value::Number(n) => {
                        let (a, b) = (cell.parse::<f64>().expect("a number"), n.as_f64().expect("a number"));
                        // Reading JSON numbers may err in the last bit.
                        assert!((a - b).abs() <= 1e-15 * a.abs().max(b.abs()), "{list} {column}: {a} {b}");
                    }
                    Value::String(s) => assert_eq!(cell.trim_start_matches('\''), s, "{list} {column}"),
                    Value::Bool(b) => assert_eq!(cell, b.to_string(), "{list} {column}"),
                    Value::Null => assert_eq!(cell, "", "{list} {column}"),
                    other => panic!("{list} {column}: {other}"),
                }
            }
        }
    }
    assert!(results.join("totals.csv").exists() && results.join("flow.txt").exists());
}

#[test]
fn a_broken_folder_is_told_in_full_and_nothing_is_written() {
    let folder = small(1.0, "line,from,too,phases,lenght_m,construction");
    let out = folder.path().join("out");
    let output = run(&["flow", &at(&folder), "--format", "csv", "--out", out.to_str().expect("a path")]);
    assert_eq!(output.status.code(), Some(2));
    let told = text(&output.stderr);
    assert!(told.contains("unknown-column") && told.contains("lines.csv"), "{told}");
    assert!(told.contains("too") && told.contains("lenght_m") && told.contains("length_m"), "{told}");
    assert!(output.stdout.is_empty() && !out.exists());

    let checked = run(&["check", &at(&folder), "--format", "lines"]);
    assert_eq!(checked.status.code(), Some(2));
    assert!(text(&checked.stdout).lines().all(|l| l.contains("error[")), "{}", text(&checked.stdout));
    let json: Value =
        serde_json::from_slice(&run(&["check", &at(&folder), "--format", "json"]).stdout).expect("JSON");
    assert_eq!(json["diagnostics"][0]["severity"], "error");
    assert!(json["summary"].is_null());
}

#[test]
fn check_of_a_good_folder_shows_what_was_read() {
    let output = run(&["check", network("ieee-13-node").to_str().expect("a path")]);
    assert_eq!(output.status.code(), Some(0));
    let page = text(&output.stdout);
    for part in ["Source at node 650", "YNyn0", "Load by phase", "Nothing wrong found."] {
        assert!(page.contains(part), "{part} in {page}");
    }
    assert!(page.lines().count() < 60 && page.lines().all(|l| l.chars().count() <= 100), "{page}");
}

#[test]
fn no_solution_is_said_with_place_and_advice_and_without_results() {
    // 0.4 kV, 100 m of half an ohm a kilometre each way: far more than it can carry at any voltage.
    let folder = small(5000.0, HEADER);
    fs::write(folder.path().join("study.csv"), "setting,value\nconstant_power_floor_percent,0\n")
        .expect("a file");
    let output = run(&["flow", &at(&folder)]);
    assert_eq!(output.status.code(), Some(3));
    let told = text(&output.stderr);
    assert!(
        told.contains("node A") && told.contains("wrong unit") && told.contains("missing transformer"),
        "{told}"
    );
    assert!(output.stdout.is_empty());
}

#[test]
fn the_command_line_is_checked() {
    for arguments in [&["flow"][..], &["flow", "x", "--colour"], &["fly"], &["flow", "x", "--format", "xml"]]
    {
        assert_eq!(run(arguments).status.code(), Some(2), "{arguments:?}");
    }
    let missing = run(&["flow", "no-such-folder"]);
    assert_eq!(missing.status.code(), Some(2));
    assert!(text(&missing.stderr).contains("no-such-folder"));
    let fine = small(1.0, HEADER);
    let csv = run(&["flow", &at(&fine), "--format", "csv"]);
    assert_eq!(csv.status.code(), Some(2));
    assert!(text(&csv.stderr).contains("--out"));
    for arguments in [&["--version"][..], &["--help"], &["flow", "--help"]] {
        assert_eq!(run(arguments).status.code(), Some(0), "{arguments:?}");
    }
}

#[test]
fn results_never_go_into_the_input_folder() {
    let folder = small(1.0, HEADER);
    let before = fs::read(folder.path().join("loads.csv")).expect("a file");
    let output = run(&["flow", &at(&folder), "--format", "csv", "--out", &at(&folder)]);
    assert_eq!(output.status.code(), Some(2));
    assert!(text(&output.stderr).contains("network folder itself"));
    assert_eq!(fs::read(folder.path().join("loads.csv")).expect("a file"), before);
}

#[test]
fn results_never_go_into_another_network() {
    let (folder, other) = (small(1.0, HEADER), small(2.0, HEADER));
    let before = fs::read(other.path().join("loads.csv")).expect("a file");
    for format in ["csv", "json", "text"] {
        let output = run(&["flow", &at(&folder), "--format", format, "--out", &at(&other)]);
        assert_eq!(output.status.code(), Some(2));
        assert!(text(&output.stderr).contains("holds a network (lines.csv)"), "{}", text(&output.stderr));
    }
    assert_eq!(fs::read(other.path().join("loads.csv")).expect("a file"), before);
    assert_eq!(fs::read_dir(other.path()).expect("a folder").count(), 4, "nothing was added");
}

#[test]
fn results_can_be_written_again_and_leave_nothing_else() {
    let folder = small(1.0, HEADER);
    let out = tempfile::tempdir().expect("a folder");
    for _ in 0..2 {
        let output = run(&["flow", &at(&folder), "--format", "csv", "--out", &at(&out)]);
        assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    }
    let mut names: Vec<String> = fs::read_dir(out.path())
        .expect("a folder")
        .map(|e| e.expect("an entry").file_name().to_string_lossy().into_owned())
        .collect();
    names.sort_unstable();
    let expected = [
        "capacitor_states.csv",
        "currents.csv",
        "electrodes.csv",
        "elements.csv",
        "findings.csv",
        "generators_delivering.csv",
        "loads.csv",
        "motors_running.csv",
        "nodes.csv",
        "nodes_summary.csv",
        "regulators.csv",
        "source.csv",
        "totals.csv",
    ];
    assert_eq!(names, expected);
}

#[test]
fn text_that_a_spreadsheet_takes_for_a_formula_is_guarded() {
    let folder = small(1.0, HEADER);
    fs::write(folder.path().join("loads.csv"), "load,node,phases,kw,pf\n=1+2,A,an,-1,1\n").expect("a file");
    let out = tempfile::tempdir().expect("a folder");
    let output = run(&["flow", &at(&folder), "--format", "csv", "--out", &at(&out)]);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    let loads = fs::read_to_string(out.path().join("loads.csv")).expect("a file");
    let row = loads.lines().nth(1).expect("a row");
    assert!(row.starts_with("'=1+2,A,-"), "{row}");
}

/// `/dev/full` stands for a full disk.
#[cfg(target_os = "linux")]
#[test]
fn a_full_disk_is_told_and_is_no_success() {
    let folder = network("ieee-13-node");
    let program = assert_cmd::cargo::cargo_bin!("fourwire");
    for arguments in
        [&["flow"][..], &["flow", "--format", "json"], &["check"], &["check", "--format", "json"]]
    {
        let full = fs::OpenOptions::new().write(true).open("/dev/full").expect("/dev/full");
        let output = Command::new(program)
            .args(arguments)
            .arg(&folder)
            .stdout(full)
            .stderr(Stdio::piped())
            .output()
            .expect("the program runs");
        assert_eq!(output.status.code(), Some(2), "{arguments:?}");
        assert!(text(&output.stderr).contains("standard output cannot be written"), "{arguments:?}");
    }
}

#[test]
fn a_pipe_carries_no_colour() {
    for arguments in [&["flow"][..], &["check"]] {
        let folder = network("ieee-13-node");
        let output = run(&[arguments, &[folder.to_str().expect("a path")]].concat());
        assert!(!output.stdout.contains(&0x1b) && !output.stderr.contains(&0x1b));
    }
}

#[test]
fn every_network_fits_100_columns() {
    for name in
        ["ieee-13-node", "ieee-4-node/Dyn1-bal", "ieee-4-node/YNyn0-unb", "brindle-quarry", "larkfoot-valley"]
    {
        let folder = network(name);
        let folder = folder.to_str().expect("a path");
        for arguments in [&["flow", folder][..], &["flow", folder, "--all"], &["check", folder]] {
            let output = run(arguments);
            assert_eq!(output.status.code(), Some(0), "{arguments:?}: {}", text(&output.stderr));
            let page = text(&output.stdout);
            let widest = page.lines().map(|l| l.chars().count()).max();
            assert!(widest > Some(40) && widest <= Some(100), "{arguments:?}: {widest:?}");
        }
    }
}

#[test]
fn a_reader_that_goes_away_is_no_fault() {
    let program = assert_cmd::cargo::cargo_bin!("fourwire");
    for format in ["json", "text"] {
        let mut child = Command::new(program)
            .args(["flow", network("ieee-13-node").to_str().expect("a path"), "--format", format])
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("the program runs");
        drop(child.stdout.take());
        let output = child.wait_with_output().expect("the program ends");
        assert_eq!(output.status.code(), Some(0));
        assert_eq!(text(&output.stderr), "");
    }
}

#[test]
fn line_lays_a_construction_open() {
    let folder = network("larkfoot-valley");
    let arguments = ["line", "--construction", "trunk336", folder.to_str().expect("a path"), "--per", "mi"];
    let output = run(&arguments);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stderr));
    let page = text(&output.stdout);
    for part in
        ["Kron reduction", "Sequence impedances", "Shunt susceptance", "Assumptions", "Sources", "local code"]
    {
        assert!(page.contains(part), "{part} in {page}");
    }
    assert!(page.lines().all(|l| l.chars().count() <= 100), "{page}");
    // Own impedance of 336.4 kcmil 26/7 ACSR: 0.4013 + j1.4133 ohm per mile (Kersting, ex. 4.1).
    assert!(page.contains("0.4013 + j1.4133"), "{page}");
    let json: Value =
        serde_json::from_slice(&run(&[&arguments[..], &["--format", "json"]].concat()).stdout).expect("JSON");
    assert!((json["construction"]["full_ohm"]["re"][0][0].as_f64().expect("a number") - 0.4013).abs() < 1e-4);
    let csv = text(&run(&[&arguments[..], &["--format", "csv"]].concat()).stdout);
    assert!(csv.starts_with("matrix,row,column,r_ohm_per_mi,x_ohm_per_mi,b_us_per_mi\n"), "{csv}");
}

#[test]
fn line_finds_wires_and_the_least_size() {
    let list = text(&run(&["line", "--list", "4/0"]).stdout);
    assert!(list.contains("4/0 AWG 6/1 ACSR") && list.contains("Kersting"), "{list}");
    assert!(list.lines().all(|l| l.chars().count() <= 100), "{list}");
    assert!(text(&run(&["line", "--list"]).stdout).lines().count() > 180);
    let sizes = run(&[
        "line",
        "--phase",
        "1 AWG copper NEC",
        "--conduit",
        "aluminium",
        "--circuit",
        "three",
        "--volts",
        "240",
        "--amps",
        "100",
        "--length",
        "150ft",
        "--limit",
        "3",
        "--price",
        "0.12",
    ]);
    let page = text(&sizes.stdout);
    assert_eq!(sizes.status.code(), Some(0), "{}", text(&sizes.stderr));
    assert!(page.contains("Least size that keeps the limit and the current: 3 AWG copper NEC"), "{page}");
    assert!(page.lines().all(|l| l.chars().count() <= 100), "{page}");
}

#[test]
fn line_says_what_is_missing_or_wrong() {
    let folder = network("larkfoot-valley");
    let folder = folder.to_str().expect("a path");
    for (arguments, word) in [
        (&["line"][..], "--phase"),
        (&["line", "--phase", "Dofe"], "--spacing"),
        (&["line", "--phase", "Dofe", "--spacing", "a 0 9 m"], "Dove"),
        (&["line", "--phase", "Dove", "--spacing", "a 0 9"], "unit"),
        (&["line", "--phase", "#2", "--volts", "240", "--amps", "5", "--length", "10m"], "write one of"),
        (&["line", "--phase", "Dove", "--amps", "5"], "--volts"),
        (&["line", "--phase", "Dove", "--amps", "5", "--volts", "240", "--length", "10"], "unit"),
        (&["line", "--phase", "Dove", "--amps", "-5", "--volts", "240", "--length", "10m"], "above zero"),
        (&["line", "--construction", "trunk337", folder], "trunk336"),
        (&["line", "--construction", "trunk336"], "folder"),
        (&["line", "--list", "moonlight"], "moonlight"),
        (&["line", "--phase", "Dove", "--spacing", "a 0 9 m", "--frequency", "0"], "above zero"),
    ] {
        let output = run(arguments);
        assert_eq!(output.status.code(), Some(2), "{arguments:?}");
        let told = text(&output.stderr);
        assert!(told.contains(word), "{arguments:?}: {word} in {told}");
    }
}

#[test]
fn a_start_is_judged_and_an_unknown_motor_is_told() {
    let folder = network("larkfoot-valley");
    let folder = folder.to_str().expect("a path");
    let output = run(&["start", folder, "--motor", "Head pump", "--strict"]);
    let page = text(&output.stdout);
    assert_eq!(output.status.code(), Some(1), "straight on the line it dips too far: {page}");
    assert!(page.contains("up to speed in") && page.contains("dip at the motor") && page.contains("FAILS"));
    assert!(page.lines().all(|l| l.chars().count() <= 100), "{page}");
    let output =
        run(&["start", folder, "--motor", "Head pump", "--starter", "soft", "--strict", "--format", "json"]);
    assert_eq!(output.status.code(), Some(0), "{}", text(&output.stdout));
    let report: Value = serde_json::from_slice(&output.stdout).expect("JSON");
    assert_eq!(report["outcome"], "runs");
    let output = run(&["start", folder, "--motor", "Head pumb"]);
    assert_eq!(output.status.code(), Some(2));
    assert!(text(&output.stderr).contains("did you mean `Head pump`?"));
}
