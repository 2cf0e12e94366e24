//! `transformers.csv`.

use super::Intake;
use super::names::Unique;
use super::phases;
use super::row::Row;
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId, nearest};
use crate::math::Complex64;
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
const PHASES_TO: usize = 15;
const TAP_FROM: usize = 16;
const EARTH_X_FROM: usize = 17;
const EARTH_X_TO: usize = 18;

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
        Column::text("phases_to", "the terminals of the to side"),
        Column::number("tap_from_percent", PERCENT, "%", "the tap of the from winding")
            .range(Range::Within(-30.0, 30.0)),
        Column::number("earth_x_ohm_from", 1.0, "ohm", "the reactance that earths the from-side neutral")
            .range(Range::NotNegative),
        Column::number("earth_x_ohm_to", 1.0, "ohm", "the reactance that earths the to-side neutral")
            .range(Range::NotNegative),
    ],
};

/// Groups named in messages; every group of these windings is read.
const GROUPS: [&str; 21] = [
    "YNyn0", "Yyn0", "YNy0", "Yy0", "Dyn1", "Dyn5", "Dyn11", "Dy11", "Yd1", "YNd1", "YNd11", "Yd11", "Dd0",
    "Dzn0", "Yzn1", "Yzn5", "Yzn11", "Ii0", "Iin0", "YNa0", "Ia0",
];

/// Reads the rows of `transformers.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<TransformerRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("transformer");
    read_table(intake, file, &TRANSFORMERS, |row| match read_row(row, &mut unique) {
        Some(record) => records.push(record),
        None => {
            row.lose_branch(FROM, TO);
        }
    });
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
        from_tap_pu: row.number_or(TAP_FROM, 0.0),
        from_earth_ohm: earthing(row, EARTH_FROM, EARTH_X_FROM),
        to_earth_ohm: earthing(row, EARTH_TO, EARTH_X_TO),
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

/// Impedance between a neutral point and earth; `None` where neither part is given.
fn earthing(row: &mut Row<'_>, r: usize, x: usize) -> Option<Complex64> {
    let (r, x) = (row.optional_number(r), row.optional_number(x));
    (r.is_some() || x.is_some()).then(|| Complex64::new(r.unwrap_or(0.0), x.unwrap_or(0.0)))
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
    // `Dy11n`: the clock number before the last letter.
    let moved: String = text
        .chars()
        .filter(|c| !c.is_ascii_digit())
        .chain(text.chars().filter(char::is_ascii_digit))
        .collect();
    if moved != text && VectorGroup::parse(&moved).is_some() {
        return format!("did you mean `{moved}`?");
    }
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
    if lower.matches('z').count() == 2 {
        return "give one zigzag side; its other side is a star or a delta".to_owned();
    }
    match nearest(text, GROUPS) {
        Some(near) => format!("did you mean `{near}`?"),
        None => "write the symbols of the from and the to side (Y, YN, D, Z or ZN) and the clock number"
            .to_owned(),
    }
}

/// Terminals of a single-phase unit; `Some(None)` for a three-phase bank, `None` after a report.
fn terminals(row: &mut Row<'_>, group: VectorGroup) -> Option<Option<[Connection; 2]>> {
    if !group.is_single() {
        for column in [PHASES, PHASES_TO] {
            if row.is_filled(column) {
                let set = row.conductors(column)?;
                if set.phases() != Conductors::ABC {
                    let message = format!("group {group} is a three-phase bank, but only `{set}` is named");
                    let cure =
                        "leave this column blank or write `abc`; a single-phase unit has the group Ii0";
                    row.error(Code::BadPhases, column, message, cure);
                    return None;
                }
            }
        }
        return Some(None);
    }
    if !row.is_filled(PHASES) {
        let message = format!("a single-phase transformer ({group}) needs its two terminals");
        let cure = "fill in `phases` with the two terminals, such as `an` or `ab`";
        row.error(Code::MissingValue, PHASES, message, cure);
        return None;
    }
    let from = pair(row, PHASES, group)?;
    let to = match group {
        VectorGroup::CentreTap { .. } => centre_tap(row)?,
        _ if row.is_filled(PHASES_TO) => pair(row, PHASES_TO, group)?,
        _ => from,
    };
    if group == VectorGroup::SingleAuto && (from != to || !matches!(from, Connection::Star(_))) {
        let message = "a single-phase autotransformer shares its neutral terminal".to_owned();
        let cure = "write `an`, `bn` or `cn` in `phases` and leave `phases_to` blank";
        row.error(Code::BadPhases, PHASES, message, cure);
        return None;
    }
    Some(Some([from, to]))
}

/// The two terminals in a cell.
fn pair(row: &mut Row<'_>, column: usize, group: VectorGroup) -> Option<Connection> {
    let set = row.conductors(column)?;
    let pair = phases::connection(set).filter(|c| c.elements() == 1);
    if pair.is_none() {
        let message = format!("a single-phase transformer ({group}) has two terminals, but `{set}` is given");
        row.error(Code::BadPhases, column, message, "write the two terminals, such as `an` or `ab`");
    }
    pair
}

/// The to side of a centre-tapped unit is always s1, n, s2.
fn centre_tap(row: &mut Row<'_>) -> Option<Connection> {
    let wanted = Connection::Star(Conductors::S1S2);
    if row.is_filled(PHASES_TO) {
        let set = row.conductors(PHASES_TO)?;
        if phases::connection(set) != Some(wanted) {
            let message = format!("a centre-tapped winding has the conductors s1, n, s2, not `{set}`");
            row.error(Code::BadPhases, PHASES_TO, message, "leave it blank, or write `s1ns2`");
            return None;
        }
    }
    Some(wanted)
}
