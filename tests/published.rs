//! Published test feeders: every published value against the solved network.
//!
//! Source of feeders and values: IEEE PES Distribution System Analysis Subcommittee, Radial
//! Distribution Test Feeders (1991, 2001; four-node transformer feeder 2000). The files in
//! `tests/published` say which values were confirmed by independent solutions.

use std::collections::BTreeMap;
use std::fs;
use std::path::PathBuf;

use fourwire::import::read_folder;
use fourwire::math::{Complex64, degrees};
use fourwire::network::{
    BranchKind, Conductor, Conductors, Connection, Draft, Network, RegulatorControl, VectorGroup, build,
};
use fourwire::solver::{Settings, Solution, Status, TapState, solve, solve_regulated};

fn path(relative: &str) -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR")).join(relative)
}

fn draft(folder: &str) -> Draft {
    let reading = read_folder(&path(folder));
    assert!(!reading.diagnostics.has_errors(), "{:?}", reading.diagnostics.items());
    reading.draft
}

fn solved(draft: &Draft) -> (Network, Solution) {
    let built = build(draft);
    let network = built.network.unwrap_or_else(|| panic!("{:?}", built.diagnostics.items()));
    let solution = solve(&network, &Settings::default());
    assert_eq!(solution.status, Status::Converged, "{solution:?}");
    (network, solution)
}

/// Rows of a published file as maps from column to text.
fn rows(file: &str) -> Vec<BTreeMap<String, String>> {
    let text = fs::read_to_string(path(file)).expect("published values are there");
    let mut reader = csv::ReaderBuilder::new().comment(Some(b'#')).from_reader(text.as_bytes());
    reader.deserialize().collect::<Result<_, _>>().expect("published values can be read")
}

fn number(row: &BTreeMap<String, String>, column: &str) -> f64 {
    row[column].parse().expect("a number")
}

/// Difference of two angles in degrees, around the circle.
fn angle_between(a: f64, b: f64) -> f64 {
    (a - b + 540.0).rem_euclid(360.0) - 180.0
}

fn conductor(letter: char) -> Conductor {
    Conductor::ALL.into_iter().find(|c| c.letter() == letter.to_string()).expect("a conductor")
}

fn node_volts(network: &Network, solution: &Solution, node: &str, c: Conductor) -> Complex64 {
    let index = network.nodes.iter().position(|n| &*n.name == node).expect("node exists");
    solution.volts[index][c.slot()]
}

fn source_power(network: &Network, solution: &Solution) -> Complex64 {
    let volts = &solution.volts[network.supply.node.index()];
    (0..4).map(|k| volts[k] * solution.source_amps[k].conj()).sum()
}

fn branch_losses(network: &Network, solution: &Solution) -> Complex64 {
    let power = |volts: &fourwire::math::PhaseVector, amps: &fourwire::math::PhaseVector| -> Complex64 {
        (0..4).map(|k| volts[k] * amps[k].conj()).sum()
    };
    network
        .branches
        .iter()
        .enumerate()
        .map(|(b, branch)| {
            power(&solution.volts[branch.from.index()], &solution.from_amps[b])
                - power(&solution.volts[branch.to.index()], &solution.to_amps[b])
        })
        .sum()
}

#[test]
fn thirteen_node_feeder() {
    let (network, solution) = solved(&draft("networks/ieee-13-node"));
    let mut compared = 0;
    let (mut worst_pu, mut worst_degrees) = (0.0f64, 0.0f64);
    for row in rows("tests/published/13-node.csv") {
        let c = conductor(row["conductor"].chars().next().expect("a letter"));
        let volts = node_volts(&network, &solution, &row["node"], c);
        let index = network.nodes.iter().position(|n| *n.name == row["node"]).expect("node exists");
        let pu = volts.norm() / network.nodes[index].nominal_phase_volts();
        let off = (pu - number(&row, "pu")).abs();
        let turned = angle_between(degrees(volts), number(&row, "degrees")).abs();
        // Published to four digits of voltage and two of angle: half a digit, and as much again for their rounding.
        assert!(off < 0.0002, "{} {c}: {pu:.5} pu, published {}", row["node"], row["pu"]);
        assert!(
            turned < 0.02,
            "{} {c}: {:.3} degrees, published {}",
            row["node"],
            degrees(volts),
            row["degrees"]
        );
        worst_pu = worst_pu.max(off);
        worst_degrees = worst_degrees.max(turned);
        compared += 1;
    }
    assert_eq!(compared, 35, "no published value may drop out");
    // Totals published with the solution: source 3577.191 kW, 1724.772 kvar; losses 111.063 kW, 324.653 kvar.
    let (source, losses) =
        (source_power(&network, &solution) / 1e3, branch_losses(&network, &solution) / 1e3);
    let within = |value: f64, published: f64, share: f64| (value / published - 1.0).abs() < share;
    assert!(within(source.re, 3577.191, 0.001) && within(source.im, 1724.772, 0.001), "source {source}");
    assert!(within(losses.re, 111.063, 0.002) && within(losses.im, 324.653, 0.002), "losses {losses}");
    println!(
        "13-node: {compared} values, worst {worst_pu:.6} pu, {worst_degrees:.4} degrees, {} iterations; source {source:.3} kVA, losses {losses:.3} kVA",
        solution.iterations
    );
}

/// Regulator settings published with the feeder: each phase 122 V, band 2 V, PT 20, CT 700 A, R 3 V, X 9 V.
#[test]
fn thirteen_node_feeder_with_automatic_taps_lands_on_the_published_ones() {
    let mut draft = draft("networks/ieee-13-node");
    draft.regulators[0].taps = [None; 3];
    draft.regulators[0].control = RegulatorControl {
        set_volts: Some(122.0),
        band_volts: Some(2.0),
        pt_ratio: Some(20.0),
        ct_amps: Some(700.0),
        r_volts: 3.0,
        x_volts: 9.0,
        ..RegulatorControl::default()
    };
    let mut network = build(&draft).network.expect("settings are complete");
    let (solution, units) = solve_regulated(&mut network, &Settings::default());
    assert_eq!(solution.status, Status::Converged);
    assert!(units.iter().all(|u| u.state == TapState::Settled), "{units:?}");
    let bank = network.branches.iter().find_map(|b| match &b.kind {
        BranchKind::Regulator(bank) => Some(bank),
        _ => None,
    });
    let taps: Vec<i32> = bank.expect("a bank").units.iter().map(|u| u.tap).collect();
    assert_eq!(taps, [10, 8, 11]);
}

/// The four-node feeder with another transformer and another load: star loads on a star
/// secondary, delta loads on a delta one; three-wire lines on a delta side.
fn four_node(group: &str, load: &str) -> Draft {
    let mut draft = draft("networks/ieee-4-node/Dyn1-bal");
    let group = VectorGroup::parse(group).expect("a group");
    let text = group.to_string();
    draft.transformers[0].group = group;
    let delta_from = text.starts_with('D');
    let delta_to = text.contains('d');
    draft.lines[0].construction = if delta_from { "d" } else { "y" }.into();
    draft.lines[1].construction = if delta_to { "d" } else { "y" }.into();
    let powers: [(f64, f64); 3] = match load {
        "bal" => [(1800.0, 0.9); 3],
        _ => [(1275.0, 0.85), (1800.0, 0.9), (2375.0, 0.95)],
    };
    for (record, (kw, pf)) in draft.loads.iter_mut().zip(powers) {
        record.watts = kw * 1e3;
        record.vars = record.watts * pf.acos().tan();
        if delta_to {
            let Connection::Star(phase) = record.connection else { panic!("a star load") };
            record.connection = Connection::Delta(phase);
        }
    }
    draft
}

#[test]
fn four_node_feeder() {
    let mut cases: BTreeMap<(String, String), Vec<BTreeMap<String, String>>> = BTreeMap::new();
    for row in rows("tests/published/4-node.csv") {
        cases.entry((row["group"].clone(), row["load"].clone())).or_default().push(row);
    }
    assert_eq!(cases.len(), 10, "no case may drop out");
    let mut compared = 0;
    for ((group, load), rows) in cases {
        let (network, solution) = solved(&four_node(&group, &load));
        let mut worst = (0.0f64, 0.0f64);
        for row in rows {
            let value = four_node_value(&network, &solution, &row["where"], &row["quantity"]);
            let published = number(&row, "magnitude");
            let off = (value.norm() - published).abs();
            let turned = angle_between(degrees(value), number(&row, "degrees")).abs();
            let allowed = (published * 0.001).max(1.0);
            assert!(
                off < allowed,
                "{group} {load} {} {}: {:.2}, published {published}",
                row["where"],
                row["quantity"],
                value.norm()
            );
            assert!(
                turned < 0.1,
                "{group} {load} {} {}: {:.3} degrees, published {}",
                row["where"],
                row["quantity"],
                degrees(value),
                row["degrees"]
            );
            worst = (worst.0.max(off), worst.1.max(turned));
            compared += 1;
        }
        println!(
            "4-node {group} {load}: worst {:.2} V or A, {:.3} degrees, {} iterations",
            worst.0, worst.1, solution.iterations
        );
    }
    assert_eq!(compared, 150, "no published value may drop out");
}

/// A quantity of the published table: `an` phase to earth, `ab` line to line, `Ia` at the from end of a line.
fn four_node_value(network: &Network, solution: &Solution, place: &str, quantity: &str) -> Complex64 {
    let letters: Vec<char> = quantity.chars().collect();
    if letters[0] == 'I' {
        let b = network.branches.iter().position(|b| &*b.name == place).expect("line exists");
        return solution.from_amps[b][conductor(letters[1]).slot()];
    }
    let node = place.trim_start_matches("node ");
    let volts = |letter| match letter {
        'n' => Complex64::default(),
        letter => node_volts(network, solution, node, conductor(letter)),
    };
    volts(letters[0]) - volts(letters[1])
}

#[test]
fn ready_four_node_folders_agree_with_the_cases_made_from_them() {
    for (folder, group, load) in [("Dyn1-bal", "Dyn1", "bal"), ("YNyn0-unb", "YNyn0", "unb")] {
        let (network, ready) = solved(&draft(&format!("networks/ieee-4-node/{folder}")));
        let (_, made) = solved(&four_node(group, load));
        let node = network.nodes.iter().position(|n| &*n.name == "4").expect("node 4");
        assert_eq!(network.nodes[node].conductors, Conductors::ABC);
        assert!((ready.volts[node] - made.volts[node]).norm() < 1e-6);
    }
}

/// The 13-node feeder without its published matrices: every construction from wires and geometry.
#[test]
fn thirteen_node_feeder_from_wires_and_geometry() {
    let folder = path("networks/ieee-13-node");
    let mut files: Vec<(String, Vec<u8>)> = fs::read_dir(folder)
        .expect("the folder is there")
        .map(|e| e.expect("an entry").path())
        .filter(|p| p.extension().is_some_and(|e| e == "csv"))
        .filter(|p| p.file_name().is_some_and(|n| n != "matrices.csv" && n != "study.csv"))
        .map(|p| {
            (p.file_name().expect("a name").to_string_lossy().into_owned(), fs::read(&p).expect("a file"))
        })
        .collect();
    // The handbook's resistances hold at 50 C.
    let study = "setting,value\nname,from wires\nfrequency_hz,60\nconductor_temperature_c,50\n";
    let constructions = "construction,kind,phase_conductor,neutral_conductor,spacing\n\
        601,overhead,556.5 26/7 ACSR,4/0 6/1 ACSR,500-BAC\n\
        602,overhead,4/0 6/1 ACSR,4/0 6/1 ACSR,500-CAB\n\
        603,overhead,1/0 6/1 ACSR,1/0 6/1 ACSR,505-CB\n\
        604,overhead,1/0 6/1 ACSR,1/0 6/1 ACSR,505-AC\n\
        605,overhead,1/0 6/1 ACSR,1/0 6/1 ACSR,510-C\n\
        606,concentric,250 AA CN one-third,,515\n\
        607,tape,1/0 AA tape,1/0 7-strand copper,520\n";
    let spacings = "spacing,position,x_ft,y_ft\n\
        500-BAC,b,0,29\n500-BAC,a,2.5,29\n500-BAC,c,7,29\n500-BAC,n,4,25\n\
        500-CAB,c,0,29\n500-CAB,a,2.5,29\n500-CAB,b,7,29\n500-CAB,n,4,25\n\
        505-CB,c,0,29\n505-CB,b,7,29\n505-CB,n,4,25\n\
        505-AC,a,0,29\n505-AC,c,7,29\n505-AC,n,4,25\n\
        510-C,c,0.5,29\n510-C,n,0,24\n\
        515,a,0,-3\n515,b,0.5,-3\n515,c,1,-3\n\
        520,a,0,-3\n520,n,0.0833333333,-3\n";
    for (name, text) in
        [("study.csv", study), ("constructions.csv", constructions), ("spacings.csv", spacings)]
    {
        files.push((name.to_string(), text.as_bytes().to_vec()));
    }
    let reading = fourwire::import::read_files(files);
    assert!(!reading.diagnostics.has_errors(), "{:#?}", reading.diagnostics.items());
    let (network, solution) = solved(&reading.draft);
    let mut worst = 0.0f64;
    for row in rows("tests/published/13-node.csv") {
        let c = conductor(row["conductor"].chars().next().expect("a letter"));
        let index = network.nodes.iter().position(|n| *n.name == row["node"]).expect("node exists");
        let pu = node_volts(&network, &solution, &row["node"], c).norm()
            / network.nodes[index].nominal_phase_volts();
        let off = (pu - number(&row, "pu")).abs();
        assert!(off < 0.001, "{} {c}: {pu:.5} pu, published {}", row["node"], row["pu"]);
        worst = worst.max(off);
    }
    println!("13-node from wires: worst {worst:.5} pu");
}
