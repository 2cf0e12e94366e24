//! The reader of network folders: published folders, every dialect, and what it says of faults.

#[path = "import/construction_faults.rs"]
mod construction_faults;
#[path = "import/dialects.rs"]
mod dialects;
#[path = "import/faults.rs"]
mod faults;
#[path = "import/knock_on.rs"]
mod knock_on;
#[path = "import/meter_faults.rs"]
mod meter_faults;
#[path = "import/network_faults.rs"]
mod network_faults;
#[path = "import/places.rs"]
mod places;
#[path = "import/profile_faults.rs"]
mod profile_faults;
#[path = "import/robust.rs"]
mod robust;

use std::path::Path;

use fourwire::import::{Reading, read_files, read_folder};

/// A small network without fault: a stiff source, one line, one load.
pub const SOURCE: &str = "node,kv\nS,0.4\n";
/// Its line.
pub const LINES: &str = "line,from,to,phases,length_m,construction\nL1,S,A,abcn,100,cable\n";
/// Its load.
pub const LOADS: &str = "load,node,phases,kw,pf\nhouse,A,an,2,0.95\n";
/// Its construction.
pub const MATRICES: &str = "construction,row,column,r_ohm_per_km,x_ohm_per_km\n\
    cable,a,a,0.3,0.09\ncable,a,b,0.05,0.01\ncable,a,c,0.05,0.01\ncable,a,n,0.05,0.01\n\
    cable,b,b,0.3,0.09\ncable,b,c,0.05,0.01\ncable,b,n,0.05,0.01\n\
    cable,c,c,0.3,0.09\ncable,c,n,0.05,0.01\ncable,n,n,0.3,0.09\n";

/// Reads files given as text.
pub fn read(files: &[(&str, &str)]) -> Reading {
    read_files(files.iter().map(|(name, text)| ((*name).to_owned(), text.as_bytes().to_vec())).collect())
}

/// The good network with some files replaced or added; an empty text takes a file away.
pub fn read_with(changed: &[(&str, &str)]) -> Reading {
    let mut files =
        vec![("source.csv", SOURCE), ("lines.csv", LINES), ("loads.csv", LOADS), ("matrices.csv", MATRICES)];
    files.retain(|(name, _)| !changed.iter().any(|(other, _)| other == name));
    files.extend(changed);
    read(&files)
}

/// One line a diagnostic.
pub fn lines_of(reading: &Reading) -> String {
    reading.diagnostics.items().iter().map(|d| format!("{d}\n")).collect()
}

#[test]
fn the_small_network_has_no_fault() {
    let reading = read_with(&[]);
    assert_eq!(lines_of(&reading), "");
    assert_eq!((reading.draft.lines.len(), reading.draft.loads.len()), (1, 1));
}

#[test]
fn published_folders_have_no_fault() {
    let mut folders = 0;
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("networks");
    for name in ["ieee-13-node", "ieee-4-node/Dyn1-bal", "ieee-4-node/YNyn0-unb"] {
        let reading = read_folder(&root.join(name));
        assert_eq!(lines_of(&reading), "", "{name}");
        assert_eq!(reading.draft.supplies.len(), 1);
        assert_eq!(reading.input_sha256.len(), 64);
        folders += 1;
    }
    assert_eq!(folders, 3);
}

#[test]
fn the_published_13_node_feeder_is_read_in_full() {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("networks/ieee-13-node");
    let draft = read_folder(&root).draft;
    let counts = [
        draft.lines.len(),
        draft.switches.len(),
        draft.transformers.len(),
        draft.regulators.len(),
        draft.capacitors.len(),
    ];
    // Rows of the files of that folder.
    assert_eq!(counts, [10, 1, 1, 1, 4]);
    // Line 632-671: 2000 ft of configuration 601, r_aa 0.3465 ohm per mile (the feeder's published data).
    let line = draft.lines.iter().find(|l| &*l.line == "632-671").expect("line 632-671");
    assert!((line.length_m - 609.6).abs() < 1e-9);
    let construction = draft.constructions.iter().find(|c| &*c.name == "601").expect("601");
    assert!((construction.z_per_m[(0, 0)].re * 1609.344 - 0.3465).abs() < 1e-12);
    assert_eq!(draft.regulators[0].taps, [Some(10), Some(8), Some(11)]);
    assert!((draft.study.frequency_hz - 60.0).abs() < 1e-12);
}
