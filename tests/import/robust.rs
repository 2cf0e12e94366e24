//! No bytes make the reader panic, and a large network is read quickly.

use std::time::Instant;

use fourwire::import::read_files;
use proptest::prelude::*;

use super::{LINES, LOADS, MATRICES, SOURCE};

const FILES: [&str; 15] = [
    "study.csv",
    "source.csv",
    "nodes.csv",
    "lines.csv",
    "matrices.csv",
    "switches.csv",
    "transformers.csv",
    "regulators.csv",
    "loads.csv",
    "capacitors.csv",
    "motors.csv",
    "profiles.csv",
    "constructions.csv",
    "conductors.csv",
    "spacings.csv",
];

const GOOD: [&str; 8] = [
    SOURCE,
    LINES,
    LOADS,
    MATRICES,
    "setting;value\nname;Ny by\nfrequency_hz;50\nvoltage_low_percent;92,5\n",
    "transformer\tfrom\tto\tphases\tkva\tkv_from\tkv_to\tgroup\tr_percent\tx_percent\nT1\tS\tA\t\t100\t11\t0,4\tDyn11\t1\t4 %\n",
    "regulator,from,to,phases,across,tap_a\r\n\"R \"\"1\"\"\",S,A,a,b,5\r\n",
    "sep=;\ncapacitor;node;phases;kvar\nC1;A;L1 L2;1,234\n# end\n;;;\n",
];

/// Reads it and writes all that was said, as the command does.
fn read_and_tell(name: &str, bytes: Vec<u8>) {
    let reading = read_files(vec![(name.to_owned(), bytes)]);
    let told: usize = reading.diagnostics.items().iter().map(|d| d.to_string().len()).sum();
    assert!(told > 0 || !reading.diagnostics.has_errors());
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 600, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn any_bytes(file in 0..FILES.len(), bytes in prop::collection::vec(any::<u8>(), 0..300)) {
        read_and_tell(FILES[file], bytes);
    }

    #[test]
    fn any_text_of_the_trade(file in 0..FILES.len(), text in "([a-z_]{1,5}|[0-9.,+%-]{1,6}|[;,\t\"# \r\n]|sep=;|L1|ü|−|\u{a0}|#N/A|NaN){0,60}") {
        read_and_tell(FILES[file], text.into_bytes());
    }

    #[test]
    fn mutated_files(
        file in 0..FILES.len(),
        good in 0..GOOD.len(),
        changes in prop::collection::vec((any::<prop::sample::Index>(), 0..4, any::<u8>(), "[;,\"\r\n#x0.-]"), 1..8),
    ) {
        let mut bytes = GOOD[good].as_bytes().to_vec();
        for (at, kind, byte, sign) in changes {
            if bytes.is_empty() { break; }
            let at = at.index(bytes.len());
            match kind {
                0 => { bytes.remove(at); }
                1 => bytes.insert(at, sign.as_bytes()[0]),
                2 => bytes[at] = byte,
                _ => bytes.truncate(at),
            }
        }
        read_and_tell(FILES[file], bytes.clone());
        // Under the name the text was written for, most columns are known.
        for name in ["source.csv", "lines.csv", "loads.csv", "matrices.csv", "regulators.csv"] {
            read_and_tell(name, bytes.clone());
        }
    }
}

#[test]
fn many_broken_quotes_end_soon() {
    let text = "load,node,phases,kw,pf\n".to_owned() + &"\"x\"y,A,an,1,1\n".repeat(200_000);
    let start = Instant::now();
    let reading = read_files(vec![("loads.csv".to_owned(), text.into_bytes())]);
    assert!(reading.diagnostics.items().len() < 30);
    assert!(start.elapsed().as_secs() < 5, "{:?}", start.elapsed());
}

/// One hundred thousand lines and as many loads.
#[test]
fn a_large_network_is_read_quickly() {
    let mut lines = "line,from,to,phases,length_m,construction,sets,rating_a,state\n".to_owned();
    let mut loads = "load,node,phases,kw,kvar,model\n".to_owned();
    for i in 0..100_000 {
        lines.push_str(&format!(
            "L{i},node{},node{},abcn,{}.25,cable,1,200,closed\n",
            i / 2,
            i + 1,
            20 + i % 80
        ));
        loads.push_str(&format!("load{i},node{},{},1.25,0.5,power\n", i + 1, ["an", "bn", "cn"][i % 3]));
    }
    let bytes = lines.len() + loads.len();
    let files =
        [("source.csv", SOURCE), ("matrices.csv", MATRICES), ("lines.csv", &lines), ("loads.csv", &loads)];
    let files = files.map(|(n, t)| (n.to_owned(), t.as_bytes().to_vec())).to_vec();
    let start = Instant::now();
    let reading = read_files(files);
    let seconds = start.elapsed().as_secs_f64();
    assert_eq!((reading.draft.lines.len(), reading.draft.loads.len()), (100_000, 100_000));
    assert_eq!(reading.diagnostics.items().len(), 0);
    // Well under a second in a release build; unoptimised and on a busy machine it may take longer.
    assert!(seconds < 10.0, "{seconds} s for {bytes} bytes");
    println!("{:.3} s, {:.0} MB/s", seconds, bytes as f64 / 1e6 / seconds);
}
