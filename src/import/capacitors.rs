//! `capacitors.csv`.

use super::Intake;
use super::names::Unique;
use super::row::Row;
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::FileId;
use crate::network::CapacitorRecord;
use crate::units::KILO;

const CAPACITOR: usize = 0;
const NODE: usize = 1;
const PHASES: usize = 2;
const KVAR: usize = 3;
const KV: usize = 4;
const STATE: usize = 5;

static CAPACITORS: Schema = Schema {
    file: "capacitors.csv",
    columns: &[
        Column::text("capacitor", "the name of the capacitor").required(),
        Column::text("node", "the node").required(),
        Column::text("phases", "the connection").required(),
        Column::number("kvar", KILO, "kvar", "the reactive power").required().range(Range::Positive),
        Column::number("kv", KILO, "kV", "the rated voltage").range(Range::UpTo(1000.0)),
        Column::text("state", "the state"),
    ],
};

/// Reads the rows of `capacitors.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<CapacitorRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("capacitor");
    read_table(intake, file, &CAPACITORS, |row| records.extend(read_row(row, &mut unique)));
    records
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique) -> Option<CapacitorRecord> {
    let capacitor = row.own_name(CAPACITOR);
    if let Some(capacitor) = &capacitor {
        unique.check(row, CAPACITOR, capacitor);
    }
    let node = row.node(NODE);
    let connection = row.connection(PHASES);
    let vars = row.optional_number(KVAR);
    let rated_volts = row.optional_number(KV);
    let state = row.state(STATE);
    Some(CapacitorRecord {
        capacitor: capacitor?,
        node: node?,
        connection: connection?,
        vars: vars?,
        rated_volts,
        state,
        origin: Some(row.origin),
    })
}
