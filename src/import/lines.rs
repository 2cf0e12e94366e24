//! `lines.csv`.

use super::Intake;
use super::names::Unique;
use super::row::Row;
use super::schema::{Column, LENGTH, Range, Schema};
use super::table::read_table;
use crate::diagnostic::FileId;
use crate::network::LineRecord;

const LINE: usize = 0;
const FROM: usize = 1;
const TO: usize = 2;
const PHASES: usize = 3;
const LENGTH_OF_LINE: usize = 4;
const CONSTRUCTION: usize = 5;
const SETS: usize = 6;
const RATING: usize = 7;
const STATE: usize = 8;

static LINES: Schema = Schema {
    file: "lines.csv",
    columns: &[
        Column::text("line", "the name of the line").required(),
        Column::text("from", "the node at the from end").required(),
        Column::text("to", "the node at the to end").required(),
        Column::text("phases", "the set of conductors").required(),
        Column::family(LENGTH, "the length").required().range(Range::Positive),
        Column::text("construction", "the construction").required(),
        Column::number("sets", 1.0, "", "the number of parallel sets").range(Range::Within(1.0, 1000.0)),
        Column::number("rating_a", 1.0, "A", "the current rating").range(Range::Positive),
        Column::text("state", "the state"),
    ],
};

/// Reads the rows of `lines.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<LineRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("line");
    read_table(intake, file, &LINES, |row| match read_row(row, &mut unique) {
        Some(record) => records.push(record),
        None => {
            row.lose_branch(FROM, TO);
            if let Some(name) = row.peek(LINE) {
                row.intake.unread.lines.insert(name.into());
            }
        }
    });
    records
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique) -> Option<LineRecord> {
    let line = row.own_name(LINE);
    if let Some(line) = &line {
        unique.check(row, LINE, line);
    }
    let from = row.node(FROM);
    let to = row.node(TO);
    let conductors = row.branch_conductors(PHASES);
    // A reported length keeps the line, so that the nodes behind it are not reported as well.
    let length_m = row.number_or(LENGTH_OF_LINE, 1.0);
    let construction = row.shared_name(CONSTRUCTION);
    let sets = row.whole_number(SETS).and_then(|n| u32::try_from(n).ok()).unwrap_or(1);
    let rating_amps = row.optional_number(RATING);
    let state = row.state(STATE);
    Some(LineRecord {
        line: line?,
        from: from?,
        to: to?,
        conductors: conductors?,
        length_m,
        construction: construction?,
        sets,
        rating_amps,
        state,
        origin: Some(row.origin),
    })
}
