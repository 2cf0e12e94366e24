//! The pages of `line`: a construction, the table of wires, the desk calculation, the table of sizes.

use std::fmt::Write as _;

use super::csv::guarded;
use super::table::{Cell, Column, Table, folded, number};
use crate::catalog::{CAUTION, Conductor};
use crate::study::construction::{ConstructionReport, Matrix};
use crate::study::line::{Case, Circuit, Drop, Sizes, Wire};

/// A construction laid open, as text.
pub fn construction_text(report: &ConstructionReport) -> String {
    let mut text = String::new();
    let per = report.per.word();
    let _ = writeln!(text, "{}, conductors {}\n", report.construction, report.conductors);
    if let Some(primitive) = &report.primitive_ohm {
        let _ = writeln!(text, "Every metallic conductor, ohm per {per}");
        for (k, name) in primitive.conductors.iter().enumerate() {
            let _ = writeln!(text, "  {} {name}", k + 1);
        }
        let numbered = (1..=primitive.conductors.len()).map(|k| k.to_string()).collect();
        let short = Matrix { conductors: numbered, ..primitive.clone() };
        let _ = writeln!(text, "\n{}", impedances(&short));
    }
    let _ = writeln!(text, "Conductors carried, ohm per {per}\n\n{}", impedances(&report.full_ohm));
    if let Some(reduced) = &report.reduced_ohm {
        let _ = writeln!(
            text,
            "Neutral taken into the phases (Kron reduction), ohm per {per}\n\n{}",
            impedances(reduced)
        );
    }
    if let Some(s) = &report.sequence_ohm {
        let _ = writeln!(
            text,
            "Sequence impedances, ohm per {per}: Z1 = {:.4} + j{:.4}, Z0 = {:.4} + j{:.4}\n",
            s.r1, s.x1, s.r0, s.x0
        );
    }
    let charged = report.charging_us.im.iter().flatten().any(|b| *b != 0.0);
    if charged {
        let _ = writeln!(
            text,
            "Shunt susceptance, microsiemens per {per}\n\n{}",
            susceptances(&report.charging_us)
        );
    } else {
        let _ = writeln!(text, "Shunt susceptance: none\n");
    }
    match report.rating_amps {
        Some(amps) => {
            let _ = writeln!(text, "Rating of the phase conductors: {} A.\n{CAUTION}\n", number(amps, 0));
        }
        None => {
            let _ = writeln!(text, "Rating of the phase conductors: not in the table.\n{CAUTION}\n");
        }
    }
    list(&mut text, "Assumptions", &report.assumptions);
    list(&mut text, "Sources", &report.sources);
    text.push_str(&provenance(report.sources.iter().map(String::as_str)));
    text
}

/// What the words in brackets behind sources mean, those that occur.
fn provenance<'a>(sources: impl Iterator<Item = &'a str>) -> String {
    let sources: Vec<&str> = sources.collect();
    let words = [
        ("read", "taken from the document named"),
        ("memory", "written down from memory of it, not held against it: check before you rely on it"),
        ("mixed", "some values taken from it, some from memory"),
        ("given", "from your own conductors.csv or the command line"),
    ];
    let told: Vec<String> = words
        .into_iter()
        .filter(|(word, _)| sources.iter().any(|s| s.ends_with(&format!("({word})"))))
        .map(|(word, meaning)| format!("({word}): {meaning}"))
        .collect();
    if told.is_empty() { String::new() } else { folded("  ", &format!("{}.", told.join("; "))) }
}

fn list(text: &mut String, heading: &str, items: &[String]) {
    if items.is_empty() {
        return;
    }
    let _ = writeln!(text, "{heading}");
    for item in items {
        text.push_str(&folded("  ", &format!("- {item}")));
    }
    text.push('\n');
}

const MATRIX_COLUMNS: [&str; 8] = ["1", "2", "3", "4", "5", "6", "7", "8"];

fn heading(name: &str, index: usize) -> &'static str {
    match name {
        "a" => "a",
        "b" => "b",
        "c" => "c",
        "n" => "n",
        _ => MATRIX_COLUMNS.get(index).copied().unwrap_or("..."),
    }
}

/// Rows of `r + jx`; the upper triangle says it all.
fn impedances(m: &Matrix) -> String {
    let shown = |i: usize, j: usize| {
        format!("{:.4} {} j{:.4}", m.re[i][j], if m.im[i][j] < 0.0 { '-' } else { '+' }, m.im[i][j].abs())
    };
    grid(m, shown)
}

fn susceptances(m: &Matrix) -> String {
    grid(m, |i, j| format!("{:.4}", m.im[i][j]))
}

fn grid(m: &Matrix, shown: impl Fn(usize, usize) -> String) -> String {
    let mut columns = vec![Column::text("")];
    columns.extend(m.conductors.iter().enumerate().map(|(k, n)| Column::number(heading(n, k), "", 0)));
    let mut table = Table::new(&columns);
    for i in 0..m.conductors.len() {
        let mut row = vec![Cell::Text(heading(&m.conductors[i], i).to_string())];
        row.extend(
            (0..m.conductors.len())
                .map(|j| if j < i { Cell::Text(String::new()) } else { Cell::Text(shown(i, j)) }),
        );
        table.rows.push(row);
    }
    table.text()
}

/// Wires of the table, as text.
pub fn wires_text(wires: &[&Conductor], temperature_c: f64, frequency_hz: f64) -> String {
    let mut table = Table::new(&[
        Column::text("wire"),
        Column::number("area", "mm2", 2),
        Column::number("resistance", "ohm/km", 4),
        Column::number("diameter", "mm", 2),
        Column::number("GMR", "mm", 3),
        Column::number("rating", "A", 0),
    ]);
    for wire in wires {
        table.rows.push(vec![
            Cell::Text(wire.name.clone()),
            wire.area_m2.map(|a| a * 1e6).into(),
            wire.ohm_per_m(temperature_c, frequency_hz).map(|r| r * 1e3).into(),
            wire.diameter_m.map(|d| d * 1e3).into(),
            wire.gmr_m.map(|g| g * 1e3).into(),
            wire.rating_amps.into(),
        ]);
    }
    let mut text = format!(
        "{} wires; resistance at {temperature_c} C, {frequency_hz} Hz\n\n{}\n",
        wires.len(),
        table.text()
    );
    let mut sources: Vec<String> = wires.iter().map(|w| format!("{} ({})", w.source, w.provenance)).collect();
    sources.sort();
    sources.dedup();
    list(&mut text, "Sources", &sources);
    text.push_str(&provenance(sources.iter().map(String::as_str)));
    let _ = writeln!(text, "{CAUTION}");
    text
}

/// The desk calculation as text.
pub fn drop_text(case: &Case, wire: &Wire, result: &Drop) -> String {
    let what = match case.circuit {
        Circuit::Single => "Single-phase, out and back",
        Circuit::Three => "Three-phase, balanced; voltages line to line",
        Circuit::Dc => "Direct current, out and back",
    };
    let pf = if case.circuit == Circuit::Dc { String::new() } else { format!(", power factor {}", case.pf) };
    let mut text = format!(
        "{what}: {} A over {} m at {} V{pf}\n",
        number(case.amps, 2),
        number(case.length_m, 1),
        number(case.volts, 1)
    );
    let _ = writeln!(
        text,
        "  one wire        {:.5} + j{:.5} ohm per km",
        wire.r_ohm_per_m * 1e3,
        wire.x_ohm_per_m * 1e3
    );
    let _ =
        writeln!(text, "  drop            {} V, {} %", number(result.volts, 3), number(result.percent, 3));
    let _ = writeln!(text, "  exact phasors   {} V", number(result.exact_volts, 3));
    let _ = writeln!(text, "  load voltage    {} V", number(case.volts - result.volts, 2));
    let _ = writeln!(text, "  loss            {} W\n", number(result.loss_watts, 1));
    text
}

/// The table of sizes as text.
pub fn sizes_text(sizes: &Sizes) -> String {
    let priced = sizes.rows.iter().any(|r| r.loss_cost_per_year.is_some());
    let mut columns = vec![
        Column::text("size"),
        Column::number("drop", "%", 2),
        Column::number("loss", "W", 1),
        Column::number("rating", "A", 0),
    ];
    if priced {
        columns.push(Column::number("loss a year", "", 0));
    }
    columns.push(Column::text("verdict"));
    let mut table = Table::new(&columns);
    for (k, row) in sizes.rows.iter().enumerate() {
        let mut cells = vec![
            Cell::Text(row.size.clone()),
            Cell::Number(row.drop_percent),
            Cell::Number(row.loss_watts),
            row.rating_amps.into(),
        ];
        if priced {
            cells.push(row.loss_cost_per_year.into());
        }
        cells.push(Cell::Text(match (&row.refused, Some(k) == sizes.least) {
            (Some(reason), _) => reason.clone(),
            (None, true) => "least that will do".to_string(),
            (None, false) => "will do".to_string(),
        }));
        table.rows.push(cells);
    }
    let mut text = table.text();
    if priced {
        let _ = writeln!(text, "\n  Loss a year: this current for 8760 hours, in the currency of the price.");
    }
    let _ = match sizes.least.and_then(|k| sizes.rows.get(k)) {
        Some(row) => writeln!(text, "\nLeast size that keeps the limit and the current: {}", row.size),
        None => writeln!(text, "\nNo size of the table keeps the limit and the current."),
    };
    let _ = writeln!(text, "{CAUTION}");
    text
}

/// Fields of flat JSON objects as text cells, the header first.
pub fn json_rows(header: &[&str], objects: &[serde_json::Value]) -> Vec<Vec<String>> {
    let cell = |value: Option<&serde_json::Value>| match value {
        None | Some(serde_json::Value::Null) => String::new(),
        Some(serde_json::Value::String(text)) => guarded(text).into_owned(),
        Some(other) => other.to_string(),
    };
    let rows = objects.iter().map(|o| header.iter().map(|h| cell(o.get(h))).collect());
    let names = header.iter().map(|h| h.to_string()).collect();
    std::iter::once(names).chain(rows).collect()
}

/// Elements of a construction's matrices, a row each.
pub fn matrix_rows(report: &ConstructionReport) -> Vec<Vec<String>> {
    let per = report.per.word();
    let mut rows = vec![vec![
        "matrix".to_string(),
        "row".to_string(),
        "column".to_string(),
        format!("r_ohm_per_{per}"),
        format!("x_ohm_per_{per}"),
        format!("b_us_per_{per}"),
    ]];
    let mut add = |name: &str, m: &Matrix, b: Option<&Matrix>| {
        for i in 0..m.conductors.len() {
            for j in i..m.conductors.len() {
                rows.push(vec![
                    name.to_string(),
                    m.conductors[i].clone(),
                    m.conductors[j].clone(),
                    m.re[i][j].to_string(),
                    m.im[i][j].to_string(),
                    b.map_or(String::new(), |b| b.im[i][j].to_string()),
                ]);
            }
        }
    };
    if let Some(primitive) = &report.primitive_ohm {
        add("primitive", primitive, None);
    }
    add("full", &report.full_ohm, Some(&report.charging_us));
    if let Some(reduced) = &report.reduced_ohm {
        add("reduced", reduced, None);
    }
    rows
}

/// Rows as CSV text.
pub fn rows_csv(rows: &[Vec<String>]) -> String {
    let mut writer = csv::Writer::from_writer(Vec::new());
    for row in rows {
        // Writing to memory does not fail.
        let _ = writer.write_record(row);
    }
    writer.into_inner().ok().and_then(|bytes| String::from_utf8(bytes).ok()).unwrap_or_default()
}
