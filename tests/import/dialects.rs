//! The same network in every dialect a spreadsheet writes gives the same records.

use std::fmt::Write;

use fourwire::import::{Reading, read_files};

use super::{LINES, LOADS, MATRICES, SOURCE, lines_of};

const PLAIN: [(&str, &str); 5] = [
    ("source.csv", SOURCE),
    ("lines.csv", LINES),
    ("loads.csv", LOADS),
    ("matrices.csv", MATRICES),
    ("nodes.csv", "node,x,y,earth_ohm\nA,1.5,-2.25,10\n"),
];

/// The records, without the places where they were written.
fn records(reading: &Reading) -> String {
    let mut out = String::new();
    let d = &reading.draft;
    let _ = writeln!(out, "{:?}", d.study);
    for s in &d.supplies {
        let _ = writeln!(
            out,
            "{} {} {:?} {:?} {}",
            s.node, s.nominal_volts, s.held_pu, s.three_phase, s.earth_ohm
        );
    }
    for n in &d.nodes {
        let _ = writeln!(out, "{} {:?} {:?}", n.node, n.xy, n.earth_ohm);
    }
    for c in &d.constructions {
        let _ = writeln!(
            out,
            "{} {} {:.12?} {:.12?}",
            c.name,
            c.conductors,
            c.z_per_m.as_slice(),
            c.y_per_m.as_slice()
        );
    }
    for l in &d.lines {
        let ends = format!("{} {} {} {}", l.line, l.from, l.to, l.construction);
        let _ = writeln!(
            out,
            "{ends} {} {:.9} {} {:?} {:?}",
            l.conductors, l.length_m, l.sets, l.rating_amps, l.state
        );
    }
    for l in &d.loads {
        let power = format!("{:.9} {:.9} {:?}", l.watts, l.vars, l.model);
        let _ = writeln!(out, "{} {:?} {} {power} {:?}", l.load, l.site, l.connection, l.profile);
    }
    out
}

fn read_bytes(files: impl Iterator<Item = (String, Vec<u8>)>) -> Reading {
    read_files(files.collect())
}

fn with_texts(change: impl Fn(&str) -> String) -> Reading {
    read_bytes(PLAIN.iter().map(|(n, t)| ((*n).to_owned(), change(t).into_bytes())))
}

fn assert_same(reading: &Reading, dialect: &str) {
    assert_eq!(lines_of(reading), "", "{dialect}");
    assert_eq!(records(reading), records(&with_texts(str::to_owned)), "{dialect}");
}

#[test]
fn separators_and_line_ends() {
    let semicolons = |t: &str| t.replace(',', ";");
    let tabs = |t: &str| t.replace(',', "\t");
    let decimal_commas = |t: &str| t.replace(',', ";").replace('.', ",");
    assert_same(&with_texts(semicolons), "semicolons");
    assert_same(&with_texts(tabs), "tabs");
    assert_same(&with_texts(decimal_commas), "semicolons and decimal commas");
    assert_same(&with_texts(|t| t.replace(',', "\t").replace('.', ",")), "tabs and decimal commas");
    assert_same(&with_texts(|t| t.replace('\n', "\r\n")), "CRLF");
    assert_same(&with_texts(|t| t.replace('\n', "\r")), "CR");
    assert_same(&with_texts(|t| t.trim_end().to_owned()), "no line end at the end");
    assert_same(&with_texts(|t| format!("sep=;\r\n{}", semicolons(t))), "separator line");
    assert_same(&with_texts(|t| format!("\"sep=;\"\n{}", semicolons(t))), "quoted separator line");
}

#[test]
fn blank_rows_comments_and_empty_columns() {
    let commented = |t: &str| format!("# survey of May\n\n{}\n\n", t.replace('\n', "\n\n# more, \"less\n"));
    assert_same(&with_texts(commented), "comments");
    let padded = |t: &str| t.replace('\n', ",,\n") + ",,,\n , ,\n";
    assert_same(&with_texts(padded), "empty columns and rows of separators");
    let quoted = |t: &str| t.replacen('\n', "\n\"# a, quoted\ncomment\",\n", 1);
    assert_same(&with_texts(quoted), "quoted comment");
    let noted = |t: &str| -> String {
        let note = |i: usize| if i == 0 { "Notes" } else { "\"ask, \"\"Bea\"\"\"" };
        t.lines().enumerate().map(|(i, l)| format!("{l},{}\n", note(i))).collect()
    };
    assert_same(&with_texts(noted), "notes");
}

#[test]
fn capitals_order_and_spaces() {
    assert_same(
        &with_texts(|t| match t.split_once('\n') {
            Some((head, rest)) => format!("{}\n{rest}", head.to_uppercase().replace(',', " , ")),
            None => t.to_owned(),
        }),
        "capital headers",
    );
    assert_same(&with_texts(|t| t.replace(',', "\u{a0}, ")), "spaces around cells");
    let reversed = |t: &str| -> String {
        t.lines().map(|l| format!("{}\n", l.split(',').rev().collect::<Vec<_>>().join(","))).collect()
    };
    assert_same(&with_texts(reversed), "columns in reverse");
    assert_same(
        &with_texts(|t| t.replace('-', "\u{2212}").replace("abcn", "L1 L2 L3 N")),
        "typographic minus, L1 L2 L3",
    );
    assert_same(&with_texts(|t| t.replace("abcn", "n123").replace(",an,", ",R-N,")), "digits and letters");
}

#[test]
fn encodings() {
    let utf16 = |t: &str| t.encode_utf16().flat_map(u16::to_le_bytes).collect::<Vec<u8>>();
    let marked = |mark: &[u8], body: &[u8]| [mark, body].concat();
    let files =
        |code: &dyn Fn(&str) -> Vec<u8>| read_bytes(PLAIN.iter().map(|(n, t)| ((*n).to_owned(), code(t))));
    assert_same(&files(&|t| marked(b"\xEF\xBB\xBF", t.as_bytes())), "UTF-8 with mark");
    assert_same(&files(&|t| marked(&[0xFF, 0xFE], &utf16(t))), "UTF-16 with mark");
    assert_same(&files(&|t| utf16(t)), "UTF-16 without mark");
    let windows = read_bytes(PLAIN.iter().map(|(n, t)| {
        (
            (*n).to_owned(),
            t.replace('A', "Hof").replace("Hof", "H\u{f6}f").chars().map(|c| c as u32 as u8).collect(),
        )
    }));
    assert_eq!(lines_of(&windows), "");
    assert_eq!(&*windows.draft.lines[0].to, "Höf");
}

#[test]
fn units_of_length_agree() {
    let mut lengths = Vec::new();
    for (unit, value) in [("m", "1609.344"), ("km", "1.609344"), ("ft", "5280"), ("kft", "5.28"), ("mi", "1")]
    {
        let text = format!("line,from,to,phases,length_{unit},construction\nL1,S,A,abcn,{value},cable\n");
        let reading = super::read_with(&[("lines.csv", &text)]);
        assert_eq!(lines_of(&reading), "");
        lengths.push(reading.draft.lines[0].length_m);
    }
    // One statute mile is 5280 ft or 1609.344 m exactly.
    assert!(lengths.iter().all(|l| (l - 1609.344).abs() < 1e-9), "{lengths:?}");
}

#[test]
fn decimal_comma_settles_thousands() {
    let text = "load;node;phases;kw;pf\nhouse;A;an;1,234;1\nshop;A;bn;12,5;1\n";
    let reading = super::read_with(&[("loads.csv", text)]);
    assert_eq!(lines_of(&reading), "");
    assert!((reading.draft.loads[0].watts - 1234.0).abs() < 1e-9);
}

#[test]
fn power_factor_gives_reactive_power() {
    let text =
        "load,node,phases,kw,pf\nlag,A,an,8,0.8\nlead,A,bn,8,-0.8\none,A,cn,8,1\nnothing,A,abcn,0,0.8\n";
    let reading = super::read_with(&[("loads.csv", text)]);
    assert_eq!(lines_of(&reading), "");
    // The 3-4-5 triangle: 8 kW at 0.8 lagging is 6 kvar, leading -6.
    for (load, kvar) in reading.draft.loads.iter().zip([6.0, -6.0, 0.0, 0.0]) {
        assert!((load.vars / 1000.0 - kvar).abs() < 1e-9, "{}", load.load);
    }
}

#[test]
fn the_hash_is_of_the_files_and_not_of_their_order() {
    let forward = read_bytes(PLAIN.iter().map(|(n, t)| ((*n).to_owned(), t.as_bytes().to_vec())));
    let backward = read_bytes(PLAIN.iter().rev().map(|(n, t)| ((*n).to_owned(), t.as_bytes().to_vec())));
    assert_eq!(forward.input_sha256, backward.input_sha256);
    let changed = with_texts(|t| t.replace("100", "101"));
    assert_ne!(forward.input_sha256, changed.input_sha256);
    // SHA-256 of no bytes at all (FIPS 180-4 example values, NIST).
    let nothing = read_files(Vec::new()).input_sha256;
    assert_eq!(nothing, "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
}
