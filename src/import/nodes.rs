//! `nodes.csv`: coordinates and electrodes.

use super::Intake;
use super::names::Unique;
use super::row::Row;
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId};
use crate::network::NodeRecord;

const NODE: usize = 0;
const X: usize = 1;
const Y: usize = 2;
const EARTH: usize = 3;

static NODES: Schema = Schema {
    file: "nodes.csv",
    columns: &[
        Column::text("node", "the name of the node").required(),
        Column::number("x", 1.0, "", "the coordinate x"),
        Column::number("y", 1.0, "", "the coordinate y"),
        Column::number("earth_ohm", 1.0, "ohm", "the resistance of the electrode").range(Range::NotNegative),
    ],
};

/// Reads the rows of `nodes.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<NodeRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("node");
    read_table(intake, file, &NODES, |row| records.extend(read_row(row, &mut unique)));
    records
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique) -> Option<NodeRecord> {
    let node = row.node(NODE);
    if let Some(node) = &node {
        unique.check(row, NODE, node);
    }
    for (given, blank, name) in [(X, Y, "y"), (Y, X, "x")] {
        if row.is_filled(given) && !row.is_filled(blank) {
            let message = "one coordinate is given without the other";
            row.error(
                Code::MissingValue,
                given,
                message,
                format!("fill in `{name}` too, or clear this cell"),
            );
        }
    }
    let xy = row.optional_number(X).zip(row.optional_number(Y)).map(|(x, y)| [x, y]);
    let earth_ohm = row.optional_number(EARTH);
    Some(NodeRecord { node: node?, xy, earth_ohm, origin: Some(row.origin) })
}
