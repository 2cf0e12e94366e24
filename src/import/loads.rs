//! `loads.csv`.

use super::Intake;
use super::names::Unique;
use super::row::{Number, Row};
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId};
use crate::network::{LoadModel, LoadRecord, LoadSite, Name, ShareBasis, ShareRecord};
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
const SHARE_KVA: usize = 9;
const SHARE_KWH: usize = 10;
const SHARE_WEIGHT: usize = 11;
const SHARES: [(usize, ShareBasis); 3] =
    [(SHARE_KVA, ShareBasis::Kva), (SHARE_KWH, ShareBasis::Kwh), (SHARE_WEIGHT, ShareBasis::Weight)];

static LOADS: Schema = Schema {
    file: "loads.csv",
    columns: &[
        Column::text("load", "the name of the load").required(),
        Column::text("node", "the node"),
        Column::text("line", "the line"),
        Column::text("phases", "the connection").required(),
        Column::number("kw", KILO, "kW", "the active power").required_without(&[
            SHARE_KVA,
            SHARE_KWH,
            SHARE_WEIGHT,
        ]),
        Column::number("kvar", KILO, "kvar", "the reactive power"),
        Column::number("pf", 1.0, "", "the power factor").range(Range::Within(-1.0, 1.0)),
        Column::text("model", "the load model"),
        Column::text("profile", "the profile"),
        Column::number("share_kva", 1.0, "kVA", "the share by transformer rating").range(Range::NotNegative),
        Column::number("share_kwh", 1.0, "kWh", "the share by energy").range(Range::NotNegative),
        Column::number("share_weight", 1.0, "", "the share by weight").range(Range::NotNegative),
    ],
};

const MODELS: [(&str, LoadModel); 3] =
    [("power", LoadModel::Power), ("current", LoadModel::Current), ("impedance", LoadModel::Impedance)];

/// Reads the rows of `loads.csv`: loads, and the shares of those that are allocated.
pub(super) fn read(intake: &mut Intake, file: FileId) -> (Vec<LoadRecord>, Vec<ShareRecord>) {
    let (mut records, mut shares) = (Vec::new(), Vec::new());
    let mut unique = Unique::new("load");
    read_table(intake, file, &LOADS, |row| match read_row(row, &mut unique, &mut shares) {
        Some(record) => records.push(record),
        None => row.lose(),
    });
    (records, shares)
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique, shares: &mut Vec<ShareRecord>) -> Option<LoadRecord> {
    let load = row.own_name(LOAD);
    if let Some(load) = &load {
        unique.check(row, LOAD, load);
    }
    let site = site(row);
    let connection = row.connection(PHASES);
    let (watts, vars) = match SHARES.iter().any(|(column, _)| row.is_filled(*column)) {
        true => {
            let share = share(row, load.clone());
            let drawn = share.as_ref().map(|_| 0.0);
            shares.extend(share);
            (drawn, drawn)
        }
        false => {
            let watts = watts(row);
            (watts, vars(row, watts))
        }
    };
    let model = row.word(MODEL, &MODELS, LoadModel::Power);
    let profile = row.shared_name(PROFILE);
    if row.is_filled(PROFILE) && SHARES.iter().any(|(column, _)| row.is_filled(*column)) {
        let message =
            "both a profile and a share are given: a load with a share takes its power from the meter";
        row.error(Code::Conflict, PROFILE, message, "clear `profile`, or clear the share");
    }
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

fn watts(row: &mut Row<'_>) -> Option<f64> {
    match row.number(KW) {
        Number::Value(watts) => Some(watts),
        Number::Faulty => None,
        // A header without any of these was reported.
        Number::Blank if ![KW, SHARE_KVA, SHARE_KWH, SHARE_WEIGHT].iter().any(|&c| row.has_column(c)) => None,
        Number::Blank => {
            let message = "the active power is missing";
            let cure = "fill in `kw`, or a share (`share_kva`, `share_kwh` or `share_weight`) for a load that takes its part of what a meter reads";
            row.error(Code::MissingValue, KW, message, cure);
            None
        }
    }
}

/// Share of a load that is allocated: just one basis, and no power of its own.
fn share(row: &mut Row<'_>, load: Option<Name>) -> Option<ShareRecord> {
    let mut filled = SHARES.into_iter().filter(|(column, _)| row.is_filled(*column));
    let first = filled.next();
    if let Some((second, _)) = filled.next() {
        let message = "two shares are given";
        row.error(Code::Conflict, second, message, "keep one of `share_kva`, `share_kwh` and `share_weight`");
        return None;
    }
    for (column, name) in [(KW, "kw"), (KVAR, "kvar")] {
        if row.is_filled(column) {
            let message = format!(
                "both `{name}` and a share are given: a load with a share takes its power from the meter"
            );
            row.error(Code::Conflict, column, message, format!("clear `{name}`, or clear the share"));
            return None;
        }
    }
    let (column, basis) = first?;
    let amount = row.optional_number(column)?;
    let ratio = match row.number(PF) {
        Number::Blank => None,
        Number::Faulty => return None,
        Number::Value(pf) => Some(ratio_of(row, PF, pf)?),
    };
    Some(ShareRecord { load: load?, basis, amount, ratio, origin: Some(row.origin) })
}

/// `Q / P = tan(acos |pf|)` of a power factor, negative where it leads.
pub(super) fn ratio_of(row: &mut Row<'_>, column: usize, pf: f64) -> Option<f64> {
    if pf.abs() < 0.01 {
        let message = "the power factor must be between 0.01 and 1, or between -0.01 and -1 where it leads";
        row.error(Code::OutOfRange, column, message, "write the power factor, or clear it and write `kvar`");
        return None;
    }
    Some(pf.abs().acos().tan() * pf.signum())
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
        (Number::Blank, Number::Value(pf)) => {
            let ratio = ratio_of(row, PF, pf);
            Some(watts? * ratio?)
        }
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
