//! `switches.csv`.

use super::Intake;
use super::names::Unique;
use super::row::Row;
use super::schema::{Column, Schema};
use super::table::read_table;
use crate::diagnostic::FileId;
use crate::network::SwitchRecord;

const SWITCH: usize = 0;
const FROM: usize = 1;
const TO: usize = 2;
const PHASES: usize = 3;
const STATE: usize = 4;

static SWITCHES: Schema = Schema {
    file: "switches.csv",
    columns: &[
        Column::text("switch", "the name of the switch").required(),
        Column::text("from", "the node at the from end").required(),
        Column::text("to", "the node at the to end").required(),
        Column::text("phases", "the set of conductors").required(),
        Column::text("state", "the state"),
    ],
};

/// Reads the rows of `switches.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<SwitchRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("switch");
    read_table(intake, file, &SWITCHES, |row| match read_row(row, &mut unique) {
        Some(record) => records.push(record),
        None => {
            row.lose_branch(FROM, TO);
        }
    });
    records
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique) -> Option<SwitchRecord> {
    let switch = row.own_name(SWITCH);
    if let Some(switch) = &switch {
        unique.check(row, SWITCH, switch);
    }
    let from = row.node(FROM);
    let to = row.node(TO);
    let conductors = row.branch_conductors(PHASES);
    let state = row.state(STATE);
    Some(SwitchRecord {
        switch: switch?,
        from: from?,
        to: to?,
        conductors: conductors?,
        state,
        origin: Some(row.origin),
    })
}
