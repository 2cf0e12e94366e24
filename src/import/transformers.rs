//! `transformers.csv`.

use super::Intake;
use super::names::Unique;
use super::phases;
use super::row::Row;
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId, nearest};
use crate::network::{Conductors, Connection, TransformerRecord, VectorGroup};
use crate::units::KILO;

const TRANSFORMER: usize = 0;
const FROM: usize = 1;
const TO: usize = 2;
const KVA: usize = 3;
const KV_FROM: usize = 4;
const KV_TO: usize = 5;
const GROUP: usize = 6;
const PHASES: usize = 7;
const R: usize = 8;
const X: usize = 9;
const NO_LOAD: usize = 10;
const MAGNETIZING: usize = 11;
const TAP: usize = 12;
const EARTH_FROM: usize = 13;
const EARTH_TO: usize = 14;

/// Per unit in one percent.
const PERCENT: f64 = 0.01;

static TRANSFORMERS: Schema = Schema {
    file: "transformers.csv",
    columns: &[
        Column::text("transformer", "the name of the transformer").required(),
        Column::text("from", "the node at the from side").required(),
        Column::text("to", "the node at the to side").required(),
        Column::number("kva", KILO, "kVA", "the rating of the bank").required().range(Range::Positive),
        Column::number("kv_from", KILO, "kV", "the rated voltage of the from side")
            .required()
            .range(Range::UpTo(1000.0)),
        Column::number("kv_to", KILO, "kV", "the rated voltage of the to side")
            .required()
            .range(Range::UpTo(1000.0)),
        Column::text("group", "the vector group").required(),
        Column::text("phases", "the terminals"),
        Column::number("r_percent", PERCENT, "%", "the resistance")
            .required()
            .range(Range::Within(0.0, 100.0)),
        Column::number("x_percent", PERCENT, "%", "the reactance")
            .required()
            .range(Range::Within(0.0, 100.0)),
        Column::number("no_load_kw", KILO, "kW", "the no-load loss").range(Range::NotNegative),
        Column::number("magnetizing_percent", PERCENT, "%", "the magnetising current")
            .range(Range::Within(0.0, 100.0)),
        Column::number("tap_percent", PERCENT, "%", "the tap").range(Range::Within(-30.0, 30.0)),
        Column::number("earth_ohm_from", 1.0, "ohm", "the earthing of the from-side neutral")
            .range(Range::NotNegative),
        Column::number("earth_ohm_to", 1.0, "ohm", "the earthing of the to-side neutral")
            .range(Range::NotNegative),
    ],
};

/// Groups named in messages; every group of these windings is read.
const GROUPS: [&str; 14] = [
    "YNyn0", "Yyn0", "YNy0", "Yy0", "Dyn1", "Dyn5", "Dyn11", "Dy11", "Yd1", "YNd1", "YNd11", "Yd11", "Dd0",
    "Ii0",
];

/// Reads the rows of `transformers.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<TransformerRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("transformer");
    read_table(intake, file, &TRANSFORMERS, |row| records.extend(read_row(row, &mut unique)));
    records
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique) -> Option<TransformerRecord> {
    let transformer = row.own_name(TRANSFORMER);
    if let Some(transformer) = &transformer {
        unique.check(row, TRANSFORMER, transformer);
    }
    let from = row.node(FROM);
    let to = row.node(TO);
    let rated_va = row.optional_number(KVA);
    let from_volts = row.optional_number(KV_FROM);
    let to_volts = row.optional_number(KV_TO);
    let group = group(row);
    let terminals = group.and_then(|group| terminals(row, group));
    let r_pu = row.optional_number(R);
    let x_pu = row.optional_number(X);
    if r_pu == Some(0.0) && x_pu == Some(0.0) {
        let message = "resistance and reactance of the transformer are both zero";
        let cure = "fill in `r_percent` and `x_percent` from the nameplate or the test sheet";
        row.error(Code::OutOfRange, X, message, cure);
    }
    Some(TransformerRecord {
        no_load_watts: row.number_or(NO_LOAD, 0.0),
        magnetizing_pu: row.number_or(MAGNETIZING, 0.0),
        tap_pu: row.number_or(TAP, 0.0),
        from_earth_ohm: row.optional_number(EARTH_FROM),
        to_earth_ohm: row.optional_number(EARTH_TO),
        transformer: transformer?,
        from: from?,
        to: to?,
        rated_va: rated_va?,
        from_volts: from_volts?,
        to_volts: to_volts?,
        group: group?,
        terminals: terminals?,
        r_pu: r_pu?,
        x_pu: x_pu?,
        origin: Some(row.origin),
    })
}

fn group(row: &mut Row<'_>) -> Option<VectorGroup> {
    let text = row.text(GROUP)?;
    let group = VectorGroup::parse(text);
    if group.is_none() {
        let message =
            format!("`{text}` is no vector group that can be solved; expected one such as Dyn11 or YNyn0");
        let cure = group_cure(text);
        row.error(Code::UnknownGroup, GROUP, message, cure);
    }
    group
}

fn group_cure(text: &str) -> String {
    let lower = text.to_ascii_lowercase();
    let letters = lower.trim_end_matches(|c: char| c.is_ascii_digit());
    let clocks: Vec<String> = (0..12)
        .filter(|n| VectorGroup::parse(&format!("{letters}{n}")).is_some())
        .map(|n| n.to_string())
        .collect();
    if !clocks.is_empty() {
        let letters = text.trim_end_matches(|c: char| c.is_ascii_digit());
        return format!(
            "write {letters} with the clock number of the nameplate, one of {}",
            clocks.join(", ")
        );
    }
    if lower.contains('z') {
        return "zigzag windings are not solved in this version".to_owned();
    }
    match nearest(text, GROUPS) {
        Some(near) => format!("did you mean `{near}`?"),
        None => "write the symbols of the from and the to side (Y, YN or D) and the clock number".to_owned(),
    }
}

/// Terminals of a single-phase unit; `Some(None)` for a three-phase bank, `None` after a report.
fn terminals(row: &mut Row<'_>, group: VectorGroup) -> Option<Option<Connection>> {
    match group {
        VectorGroup::Three { .. } => {
            if row.is_filled(PHASES) {
                let set = row.conductors(PHASES)?;
                if set.phases() != Conductors::ABC {
                    let message = format!("group {group} is a three-phase bank, but only `{set}` is named");
                    let cure = "leave `phases` blank or write `abc`; a single-phase unit has the group Ii0";
                    row.error(Code::BadPhases, PHASES, message, cure);
                    return None;
                }
            }
            Some(None)
        }
        VectorGroup::Single { .. } => {
            if !row.is_filled(PHASES) {
                let message = format!("a single-phase transformer ({group}) needs its two terminals");
                let cure = "fill in `phases` with the two terminals, such as `an` or `ab`";
                row.error(Code::MissingValue, PHASES, message, cure);
                return None;
            }
            let set = row.conductors(PHASES)?;
            match phases::connection(set).filter(|c| c.elements() == 1) {
                Some(connection) => Some(Some(connection)),
                None => {
                    let message = format!(
                        "a single-phase transformer ({group}) has two terminals, but `{set}` is given"
                    );
                    let cure = "write the two terminals, such as `an` or `ab`";
                    row.error(Code::BadPhases, PHASES, message, cure);
                    None
                }
            }
        }
    }
}
