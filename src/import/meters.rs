//! `meters.csv`: demand read at the head of the feeder, at a node or at a line.

use std::collections::HashMap;

use super::Intake;
use super::loads::ratio_of;
use super::row::{Number, Row};
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId, Origin};
use crate::network::{Conductor, Conductors, MeterRecord, MeterSite, Name, ReactiveReading, Reading};
use crate::units::KILO;

const METER: usize = 0;
const NODE: usize = 1;
const LINE: usize = 2;
const PHASES: usize = 3;
const KW: usize = 4;
const AMPS: usize = 5;
const KVAR: usize = 6;
const PF: usize = 7;

static METERS: Schema = Schema {
    file: "meters.csv",
    columns: &[
        Column::text("meter", "the name of the meter").required(),
        Column::text("node", "the node"),
        Column::text("line", "the line"),
        Column::text("phases", "the phase"),
        Column::number("kw", KILO, "kW", "the active power"),
        Column::number("amps", 1.0, "A", "the current").range(Range::Positive),
        Column::number("kvar", KILO, "kvar", "the reactive power"),
        Column::number("pf", 1.0, "", "the power factor").range(Range::Within(-1.0, 1.0)),
    ],
};

/// Rows of each meter met so far: its place and the phases read.
type Known = HashMap<Name, (MeterSite, Vec<(Option<Conductor>, Origin)>)>;

/// Reads the rows of `meters.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<MeterRecord> {
    let mut records = Vec::new();
    let mut known = Known::new();
    read_table(intake, file, &METERS, |row| records.extend(read_row(row, &mut known)));
    records
}

fn read_row(row: &mut Row<'_>, known: &mut Known) -> Option<MeterRecord> {
    let meter = row.own_name(METER);
    let site = site(row);
    let phase = phase(row);
    if let (Some(meter), Some(site), Some(phase)) = (&meter, &site, phase) {
        check_rows(row, known, meter, site, phase);
    }
    let reading = reading(row);
    let reactive = reactive(row);
    Some(MeterRecord {
        meter: meter?,
        site: site?,
        phase: phase?,
        reading: reading?,
        reactive: reactive?,
        origin: Some(row.origin),
    })
}

fn site(row: &mut Row<'_>) -> Option<MeterSite> {
    match (row.is_filled(NODE), row.is_filled(LINE)) {
        (false, false) => Some(MeterSite::Head),
        (true, false) => row.node(NODE).map(MeterSite::Node),
        (false, true) => row.shared_name(LINE).map(MeterSite::Line),
        (true, true) => {
            let message = "the meter is given both at a node and at a line";
            row.error(
                Code::Conflict,
                NODE,
                message,
                "clear `node` or `line`; both blank: head of the feeder",
            );
            None
        }
    }
}

/// The phase of a row: one, or none for the total (blank, or all three).
fn phase(row: &mut Row<'_>) -> Option<Option<Conductor>> {
    if !row.is_filled(PHASES) {
        return Some(None);
    }
    let set = row.conductors(PHASES)?.phases();
    let mut all = set.iter();
    match (all.next(), all.next()) {
        (Some(one), None) => Some(Some(one)),
        _ if set == Conductors::ABC => Some(None),
        _ => {
            let message = "a row of a meter reads one phase, or the total";
            row.error(
                Code::BadPhases,
                PHASES,
                message,
                "write one row a phase, or leave the cell blank for the total",
            );
            None
        }
    }
}

fn check_rows(
    row: &mut Row<'_>,
    known: &mut Known,
    meter: &Name,
    site: &MeterSite,
    phase: Option<Conductor>,
) {
    let (first, rows) = known.entry(meter.clone()).or_insert_with(|| (site.clone(), Vec::new()));
    let Some((_, earlier)) = rows.first() else {
        rows.push((phase, row.origin));
        return;
    };
    let line = earlier.line;
    let same = rows.iter().find(|(p, _)| *p == phase).map(|(_, o)| o.line);
    let mixed = rows.iter().any(|(p, _)| p.is_none() != phase.is_none());
    rows.push((phase, row.origin));
    if first != site {
        let message = format!("meter `{meter}` stands already in row {line}, at another place");
        row.error(Code::DuplicateName, METER, message, "give each meter its own name");
    } else if let Some(line) = same {
        let what = phase.map_or("the total".to_owned(), |p| format!("phase {p}"));
        let message = format!("meter `{meter}` reads {what} already in row {line}");
        row.error(
            Code::DuplicateName,
            METER,
            message,
            "give each meter its own name, and each phase one row",
        );
    } else if mixed {
        let message = format!("meter `{meter}` reads both the total and single phases");
        row.error(Code::Conflict, PHASES, message, "keep the total, or one row a phase");
    }
}

fn reading(row: &mut Row<'_>) -> Option<Reading> {
    match (row.number(KW), row.number(AMPS)) {
        (Number::Value(watts), Number::Blank) => Some(Reading::Watts(watts)),
        (Number::Blank, Number::Value(amps)) => {
            if row.is_filled(KVAR) {
                let message = "`kvar` is given beside `amps`";
                row.error(Code::Conflict, KVAR, message, "give `pf` beside amps, or `kw` with kvar");
                return None;
            }
            Some(Reading::Amps(amps))
        }
        (Number::Blank, Number::Blank) => {
            let message = "the meter reads neither power nor current";
            row.row_error(Code::MissingValue, message, "fill in `kw` or `amps`");
            None
        }
        (Number::Value(_), Number::Value(_)) => {
            let message = "both `kw` and `amps` are given";
            row.error(Code::Conflict, AMPS, message, "keep the one you know better and clear the other");
            None
        }
        (Number::Faulty, _) | (_, Number::Faulty) => None,
    }
}

fn reactive(row: &mut Row<'_>) -> Option<ReactiveReading> {
    match (row.number(KVAR), row.number(PF)) {
        (Number::Blank, Number::Blank) => Some(ReactiveReading::None),
        (Number::Value(vars), Number::Blank) => Some(ReactiveReading::Vars(vars)),
        (Number::Blank, Number::Value(pf)) => ratio_of(row, PF, pf).map(ReactiveReading::Ratio),
        (Number::Value(_), Number::Value(_)) => {
            let message = "both `kvar` and `pf` are given";
            row.error(Code::Conflict, KVAR, message, "keep the one you know better and clear the other");
            None
        }
        (Number::Faulty, _) | (_, Number::Faulty) => None,
    }
}
