//! The page of `start`: the verdict, judgements, dips and the run-up; and its files.

use std::fmt::Write as _;
use std::io::{self, Write};

use super::csv::{Field, write_row};
use super::files::Folder;
use super::table::{Cell, Column, Table, folded, number};
use crate::study::start::{CannotStart, StartOutcome, StartReport};

/// Nodes of the table of dips.
const DEEPEST: usize = 12;
/// Instants of the table of the run-up.
const INSTANTS: usize = 14;

/// The page as text, at most 100 columns wide.
pub fn start_text(report: &StartReport) -> String {
    let mut text = String::new();
    let name = if report.network.is_empty() { "Network without a name" } else { &report.network };
    text.push_str(&folded("", name));
    let head = format!(
        "Start of motor {} at node {}, {}: {}",
        report.motor,
        report.node,
        report.starter,
        outcome_words(report)
    );
    text.push_str(&folded("", &head));
    let _ = writeln!(
        text,
        "Inrush {} A, {} times full load; energy taken in {} kJ; largest current mismatch {:.1e} A.\n",
        number(report.inrush_amps, 0),
        number(report.inrush_multiple, 2),
        number(report.energy_kj, 0),
        report.mismatch_a
    );
    judgements(&mut text, report);
    dips(&mut text, report);
    run_up(&mut text, report);
    text.push_str(&folded(
        "",
        "Regulators and switched capacitors stay where they stood; flicker, and heating of the motor beyond the \
         start time, are not judged. Protection and the maker's limits: a licensed engineer decides, not this table.",
    ));
    text
}

fn outcome_words(report: &StartReport) -> String {
    let seconds = number(report.seconds, 2);
    match report.outcome {
        StartOutcome::Runs => format!("up to speed in {seconds} s"),
        StartOutcome::Stalls => {
            let rpm = report.trace.last().map_or(0.0, |i| i.rpm);
            format!("STALLS at {} rpm after {seconds} s", number(rpm, 0))
        }
        StartOutcome::Slow => format!("NOT up to speed after {seconds} s"),
        StartOutcome::Collapses => format!("the feeder has NO SOLUTION after {seconds} s"),
    }
}

fn judgements(text: &mut String, report: &StartReport) {
    let mut table = Table::new(&[
        Column::text("judged"),
        Column::text("where"),
        Column::number("value", "", 2),
        Column::number("limit", "", 2),
        Column::text("unit"),
        Column::text("verdict"),
    ]);
    for j in &report.judgements {
        table.rows.push(vec![
            Cell::Text(j.what.to_string()),
            Cell::Text(j.place.clone()),
            Cell::Number(j.value),
            Cell::Number(j.limit),
            Cell::Text(j.unit.to_string()),
            Cell::Text(if j.holds { "holds" } else { "FAILS" }.to_string()),
        ]);
    }
    let _ = writeln!(text, "{}", table.text());
}

fn dips(text: &mut String, report: &StartReport) {
    let mut table = Table::new(&[
        Column::text("node"),
        Column::text("phase"),
        Column::number("before", "pu", 4),
        Column::number("at once", "pu", 4),
        Column::number("lowest", "pu", 4),
        Column::number("dip", "%", 2),
    ]);
    for dip in report.dips.iter().take(DEEPEST) {
        table.rows.push(vec![
            Cell::Text(dip.node.to_string()),
            Cell::Text(dip.conductor.to_string()),
            Cell::Number(dip.before_pu),
            Cell::Number(dip.start_pu),
            Cell::Number(dip.lowest_pu),
            Cell::Number(dip.dip_percent),
        ]);
    }
    let heading = match report.dips.len() > DEEPEST {
        true => format!("Dips: the {DEEPEST} deepest of {} nodes", report.dips.len()),
        false => "Dips, deepest first".to_string(),
    };
    let _ = writeln!(text, "{heading}\n{}", table.text());
}

fn run_up(text: &mut String, report: &StartReport) {
    let mut table = Table::new(&[
        Column::number("time", "s", 3),
        Column::number("speed", "rpm", 0),
        Column::number("current", "A", 0),
        Column::number("voltage", "pu", 4),
        Column::number("torque", "N m", 0),
        Column::number("load", "N m", 0),
    ]);
    let count = report.trace.len();
    let picked: Vec<usize> = match count <= INSTANTS {
        true => (0..count).collect(),
        // Even in time: the steps of the integration are not.
        false => {
            let end = report.seconds;
            let near = |k: usize| {
                let wanted = end * k as f64 / (INSTANTS - 1) as f64;
                report.trace.iter().position(|i| i.seconds >= wanted - 1e-9).unwrap_or(count - 1)
            };
            let mut picked: Vec<usize> = (0..INSTANTS).map(near).collect();
            picked.dedup();
            picked
        }
    };
    for i in picked {
        let now = &report.trace[i];
        table.rows.push(vec![
            Cell::Number(now.seconds),
            Cell::Number(now.rpm),
            Cell::Number(now.amps),
            Cell::Number(now.pu),
            Cell::Number(now.torque_nm),
            Cell::Number(now.load_nm),
        ]);
    }
    let _ = writeln!(
        text,
        "Run-up of one motor; voltage is the lowest between lines at its node\n{}",
        table.text()
    );
}

/// Several starters side by side.
pub fn starters_text(reports: &[(String, Result<StartReport, String>)]) -> String {
    let mut table = Table::new(&[
        Column::text("starter"),
        Column::number("dip there", "%", 2),
        Column::number("dip, others", "%", 2),
        Column::number("inrush", "A", 0),
        Column::number("time", "s", 2),
        Column::number("energy", "kJ", 0),
        Column::text("verdict"),
    ]);
    for (starter, report) in reports {
        let row = match report {
            Ok(r) => {
                let judged = |what: &str| r.judgements.iter().find(|j| j.what == what).map(|j| j.value);
                let verdict = match r.outcome {
                    StartOutcome::Runs if r.passes() => "holds",
                    StartOutcome::Runs => "FAILS a limit",
                    StartOutcome::Stalls => "STALLS",
                    StartOutcome::Slow => "TOO SLOW",
                    StartOutcome::Collapses => "NO SOLUTION",
                };
                vec![
                    Cell::Text(starter.clone()),
                    judged("dip at the motor").into(),
                    judged("dip at other loads").into(),
                    Cell::Number(r.inrush_amps),
                    Cell::Number(r.seconds),
                    Cell::Number(r.energy_kj),
                    Cell::Text(verdict.to_string()),
                ]
            }
            Err(why) => {
                let mut row = vec![Cell::Text(starter.clone())];
                row.extend((0..5).map(|_| Cell::Blank));
                row.push(Cell::Text(why.clone()));
                row
            }
        };
        table.rows.push(row);
    }
    format!("Starters side by side\n{}\n", table.text())
}

/// Why a start could not be computed, in words.
pub fn cannot_start_text(cannot: &CannotStart) -> String {
    match cannot {
        CannotStart::Before(_) => {
            "the feeder has no solution before the start; see `fourwire flow` of it".to_string()
        }
        CannotStart::NoInertia => {
            "no moment of inertia is known; fill in inertia_kgm2 or wk2_lbft2 of the motor".to_string()
        }
        CannotStart::AtOnce => "the feeder has no solution at the instant of starting".to_string(),
        CannotStart::Unchecked(time_s) => {
            format!("the solution {time_s:.3} s after switching on failed the independent check")
        }
    }
}

/// The report as one JSON object.
///
/// # Errors
/// What the writer says.
pub fn start_json(report: &StartReport, writer: &mut dyn Write) -> io::Result<()> {
    serde_json::to_writer_pretty(&mut *writer, report)?;
    writeln!(writer)
}

/// Run-up and dips as CSV files of the folder.
///
/// # Errors
/// What the file system says.
pub fn start_csv(report: &StartReport, folder: &mut Folder) -> io::Result<()> {
    folder.write("run_up.csv", |out| {
        let mut writer = csv::Writer::from_writer(out);
        writer.write_record(["seconds", "rpm", "torque_nm", "load_nm", "amps", "pu"])?;
        for i in &report.trace {
            let row = [i.seconds, i.rpm, i.torque_nm, i.load_nm, i.amps, i.pu].map(Field::Number);
            write_row(&mut writer, &row)?;
        }
        writer.flush()
    })?;
    folder.write("dips.csv", |out| {
        let mut writer = csv::Writer::from_writer(out);
        writer.write_record(["node", "conductor", "before_pu", "start_pu", "lowest_pu", "dip_percent"])?;
        for d in &report.dips {
            let row = [
                Field::Text(&d.node),
                Field::Text(d.conductor),
                Field::Number(d.before_pu),
                Field::Number(d.start_pu),
                Field::Number(d.lowest_pu),
                Field::Number(d.dip_percent),
            ];
            write_row(&mut writer, &row)?;
        }
        writer.flush()
    })
}
