//! The one-screen summary of `check`.

use std::fmt::Write as _;

use super::table::{Cell, Column, Table, folded, number};
use crate::study::summary::Summary;

/// The summary as text.
pub fn summary_text(summary: &Summary) -> String {
    let mut text = String::new();
    let name = if summary.network.is_empty() { "Network without a name" } else { &summary.network };
    let level = match summary.source_mva {
        Some(mva) => format!("fault level {} MVA", number(mva, 1)),
        None => "stiff".to_string(),
    };
    text.push_str(&folded("", name));
    // Six decimals: a voltage in kV back from volts may end in rounding.
    let kv = (summary.source_kv * 1e6).round() / 1e6;
    let source =
        format!("Source at node {}, {kv} kV, {} Hz, {level}", summary.source_node, summary.frequency_hz);
    text.push_str(&folded("", &source));
    text.push('\n');
    section(&mut text, "Nodes", &nodes(summary));
    section(&mut text, "Lines", &lines(summary));
    section(&mut text, "Transformers", &transformers(summary));
    section(&mut text, "Loads at nominal voltage", &loads(summary));
    section(&mut text, "Load by phase", &phases(summary));
    if !summary.rings_closed_by.is_empty() {
        text.push_str(&folded("", &rings(&summary.rings_closed_by)));
    }
    let _ = writeln!(
        text,
        "Closed switches {}, regulated phases {}, capacitors {} ({} kvar)",
        summary.switches,
        summary.regulated_phases,
        summary.capacitors,
        number(summary.capacitor_kvar, 1)
    );
    if summary.generators > 0 || summary.motors > 0 || summary.meters > 0 {
        let _ = writeln!(
            text,
            "Generators {} ({} kW), motors {}, meters {}",
            summary.generators,
            number(summary.generation_kw, 1),
            summary.motors,
            summary.meters
        );
    }
    text
}

/// How many rings there are, and what closes them.
fn rings(closed_by: &[String]) -> String {
    const SHOWN: usize = 8;
    let names = closed_by.iter().take(SHOWN).cloned().collect::<Vec<_>>().join(", ");
    let more = match closed_by.len().saturating_sub(SHOWN) {
        0 => String::new(),
        more => format!(" and {more} more"),
    };
    let many = if closed_by.len() == 1 { "ring" } else { "rings" };
    format!("{} closed {many}, closed by {names}{more}", closed_by.len())
}

fn section(text: &mut String, heading: &str, table: &Table) {
    if table.rows.is_empty() {
        let _ = writeln!(text, "{heading}: none\n");
    } else {
        let _ = writeln!(text, "{heading}\n{}", table.text());
    }
}

fn nodes(summary: &Summary) -> Table {
    let mut table = Table::new(&[
        Column::number("nominal", "kV", 3),
        Column::number("nodes", "", 0),
        Column::number("earthed", "", 0),
    ]);
    for row in &summary.nodes {
        table.rows.push(vec![Cell::Number(row.kv), count(row.nodes), count(row.electrodes)]);
    }
    table
}

fn lines(summary: &Summary) -> Table {
    let mut table = Table::new(&[
        Column::text("conductors"),
        Column::number("lines", "", 0),
        Column::number("length", "km", 3),
    ]);
    for row in &summary.lines {
        table.rows.push(vec![Cell::Text(row.conductors.clone()), count(row.lines), Cell::Number(row.km)]);
    }
    table
}

fn transformers(summary: &Summary) -> Table {
    let mut table = Table::new(&[
        Column::text("group"),
        Column::number("number", "", 0),
        Column::number("rating", "kVA", 1),
    ]);
    for row in &summary.transformers {
        table.rows.push(vec![Cell::Text(row.group.clone()), count(row.transformers), Cell::Number(row.kva)]);
    }
    table
}

fn loads(summary: &Summary) -> Table {
    let mut table = Table::new(&[
        Column::text("constant"),
        Column::number("loads", "", 0),
        Column::number("active", "kW", 2),
        Column::number("reactive", "kvar", 2),
    ]);
    for row in &summary.loads {
        table.rows.push(vec![
            Cell::Text(row.model.to_string()),
            count(row.loads),
            Cell::Number(row.kw),
            Cell::Number(row.kvar),
        ]);
    }
    table
}

fn phases(summary: &Summary) -> Table {
    let mut table = Table::new(&[
        Column::text("phase"),
        Column::number("active", "kW", 2),
        Column::number("reactive", "kvar", 2),
    ]);
    for row in &summary.phases {
        table.rows.push(vec![
            Cell::Text(row.phase.to_string()),
            Cell::Number(row.kw),
            Cell::Number(row.kvar),
        ]);
    }
    table
}

fn count(number: usize) -> Cell {
    Cell::Number(number as f64)
}
