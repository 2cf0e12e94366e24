//! `loads.csv`.

use super::Intake;
use super::names::Unique;
use super::row::{Number, Row};
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId};
use crate::network::{LoadModel, LoadRecord, LoadSite};
use crate::units::KILO;

const LOAD: usize = 0;
const NODE: usize = 1;
const LINE: usize = 2;
const PHASES: usize = 3;
const KW: usize = 4;
const KVAR: usize = 5;
const PF: usize = 6;
const MODEL: usize = 7;
const PROFILE: usize = 8;

static LOADS: Schema = Schema {
    file: "loads.csv",
    columns: &[
        Column::text("load", "the name of the load").required(),
        Column::text("node", "the node"),
        Column::text("line", "the line"),
        Column::text("phases", "the connection").required(),
        Column::number("kw", KILO, "kW", "the active power").required(),
        Column::number("kvar", KILO, "kvar", "the reactive power"),
        Column::number("pf", 1.0, "", "the power factor").range(Range::Within(-1.0, 1.0)),
        Column::text("model", "the load model"),
        Column::text("profile", "the profile"),
    ],
};

const MODELS: [(&str, LoadModel); 3] =
    [("power", LoadModel::Power), ("current", LoadModel::Current), ("impedance", LoadModel::Impedance)];

/// Reads the rows of `loads.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<LoadRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("load");
    read_table(intake, file, &LOADS, |row| match read_row(row, &mut unique) {
        Some(record) => records.push(record),
        None => row.lose(),
    });
    records
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique) -> Option<LoadRecord> {
    let load = row.own_name(LOAD);
    if let Some(load) = &load {
        unique.check(row, LOAD, load);
    }
    let site = site(row);
    let connection = row.connection(PHASES);
    let watts = row.optional_number(KW);
    let vars = vars(row, watts);
    let model = row.word(MODEL, &MODELS, LoadModel::Power);
    let profile = row.shared_name(PROFILE);
    Some(LoadRecord {
        load: load?,
        site: site?,
        connection: connection?,
        watts: watts?,
        vars: vars?,
        model,
        profile,
        origin: Some(row.origin),
    })
}

fn site(row: &mut Row<'_>) -> Option<LoadSite> {
    match (row.is_filled(NODE), row.is_filled(LINE)) {
        (true, false) => row.node(NODE).map(LoadSite::Node),
        (false, true) => row.shared_name(LINE).map(LoadSite::Line),
        (true, true) => {
            let message = "the load is given both at a node and along a line";
            row.error(Code::Conflict, NODE, message, "clear `node` or `line`");
            None
        }
        (false, false) => {
            let message = "the load is given neither at a node nor along a line";
            let cure = "fill in `node`, or `line` for a load spread along a line";
            row.row_error(Code::NoPlace, message, cure);
            None
        }
    }
}

/// Reactive power from `kvar`, or from `pf`: `Q = P tan(acos |pf|)`, negative where `pf` is.
fn vars(row: &mut Row<'_>, watts: Option<f64>) -> Option<f64> {
    match (row.number(KVAR), row.number(PF)) {
        (Number::Value(vars), Number::Blank) => Some(vars),
        (Number::Blank, Number::Value(pf)) if pf.abs() < 0.01 => {
            let message =
                "the power factor must be between 0.01 and 1, or between -0.01 and -1 where it leads";
            row.error(Code::OutOfRange, PF, message, "write the power factor, or clear it and write `kvar`");
            None
        }
        (Number::Blank, Number::Value(pf)) => Some(watts? * pf.abs().acos().tan() * pf.signum()),
        (Number::Blank, Number::Blank) => {
            let message = "neither the reactive power nor the power factor is given";
            let cure = "fill in `kvar` or `pf`; write 1 in `pf` for a load without reactive power";
            row.row_error(Code::MissingValue, message, cure);
            None
        }
        (Number::Faulty, _) | (_, Number::Faulty) => None,
        (Number::Value(_), Number::Value(_)) => {
            let message = "both `kvar` and `pf` are given";
            row.error(Code::Conflict, KVAR, message, "keep the one you know better and clear the other");
            None
        }
    }
}
