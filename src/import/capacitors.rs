//! `capacitors.csv`.

use super::Intake;
use super::names::Unique;
use super::row::Row;
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId};
use crate::network::{CapacitorControl, CapacitorRecord, Conductor, Conductors, Connection, Sense};
use crate::units::KILO;

const CAPACITOR: usize = 0;
const NODE: usize = 1;
const PHASES: usize = 2;
const KVAR: usize = 3;
const KV: usize = 4;
const STATE: usize = 5;
const CONTROL: usize = 6;
const ON_V: usize = 7;
const OFF_V: usize = 8;
const PT_RATIO: usize = 9;
const ON_KVAR: usize = 10;
const OFF_KVAR: usize = 11;
const ON_A: usize = 12;
const OFF_A: usize = 13;
const SENSE_LINE: usize = 14;
const SENSE_PHASE: usize = 15;
const DELAY: usize = 16;
const PROFILE: usize = 17;

/// Delay of a control without one of its own, seconds (common practice, no source).
const DELAY_S: f64 = 60.0;

static CAPACITORS: Schema = Schema {
    file: "capacitors.csv",
    columns: &[
        Column::text("capacitor", "the name of the capacitor").required(),
        Column::text("node", "the node").required(),
        Column::text("phases", "the connection").required(),
        Column::number("kvar", KILO, "kvar", "the reactive power").required().range(Range::Positive),
        Column::number("kv", KILO, "kV", "the rated voltage").range(Range::UpTo(1000.0)),
        Column::text("state", "the state"),
        Column::text("control", "what switches the capacitor"),
        Column::number("on_v", 1.0, "V", "the switch-on voltage").range(Range::Positive),
        Column::number("off_v", 1.0, "V", "the switch-off voltage").range(Range::Positive),
        Column::number("pt_ratio", 1.0, "", "the ratio of the potential transformer").range(Range::Positive),
        Column::number("on_kvar", KILO, "kvar", "the switch-on reactive power"),
        Column::number("off_kvar", KILO, "kvar", "the switch-off reactive power"),
        Column::number("on_a", 1.0, "A", "the switch-on current").range(Range::Positive),
        Column::number("off_a", 1.0, "A", "the switch-off current").range(Range::NotNegative),
        Column::text("sense_line", "the line where the control measures"),
        Column::text("sense_phase", "the phase that the control measures"),
        Column::number("delay_s", 1.0, "s", "the delay of the control").range(Range::NotNegative),
        Column::text("profile", "the profile"),
    ],
};

/// Reads the rows of `capacitors.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<CapacitorRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("capacitor");
    read_table(intake, file, &CAPACITORS, |row| match read_row(row, &mut unique) {
        Some(record) => records.push(record),
        None => row.lose(),
    });
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
    let control = control(row, connection);
    let delay_s = row.number_or(DELAY, DELAY_S);
    Some(CapacitorRecord {
        capacitor: capacitor?,
        node: node?,
        connection: connection?,
        vars: vars?,
        rated_volts,
        state,
        control: control?,
        delay_s,
        origin: Some(row.origin),
    })
}

/// Words of the column `control`.
#[derive(Clone, Copy, PartialEq)]
enum Word {
    Fixed,
    Voltage,
    Kvar,
    Current,
    Profile,
}

const WORDS: [(&str, Option<Word>); 5] = [
    ("fixed", Some(Word::Fixed)),
    ("voltage", Some(Word::Voltage)),
    ("kvar", Some(Word::Kvar)),
    ("current", Some(Word::Current)),
    ("profile", Some(Word::Profile)),
];

/// Columns that a control uses; the first two are its thresholds, on and off.
fn columns(word: Word) -> &'static [usize] {
    match word {
        Word::Fixed => &[],
        Word::Voltage => &[ON_V, OFF_V, PT_RATIO, SENSE_PHASE, DELAY],
        Word::Kvar => &[ON_KVAR, OFF_KVAR, SENSE_LINE, SENSE_PHASE, DELAY],
        Word::Current => &[ON_A, OFF_A, SENSE_LINE, SENSE_PHASE, DELAY],
        Word::Profile => &[PROFILE],
    }
}

/// The control, or `None` after a report.
fn control(row: &mut Row<'_>, connection: Option<Connection>) -> Option<CapacitorControl> {
    let word = row.word(CONTROL, &WORDS, None);
    // A slip was reported; what was meant is not known.
    if word.is_none() && row.is_filled(CONTROL) {
        return None;
    }
    let word = word.unwrap_or(Word::Fixed);
    let unused = (ON_V..=PROFILE).filter(|c| row.is_filled(*c) && !columns(word).contains(c));
    for column in unused.collect::<Vec<_>>() {
        let name = WORDS.iter().find(|(_, w)| *w == Some(word)).map_or("fixed", |(name, _)| name);
        let message = format!(
            "{} is given, but a capacitor with the control `{name}` does not use it",
            CAPACITORS.column(column).what
        );
        row.error(Code::Conflict, column, message, "clear this cell, or write another `control`");
    }
    match word {
        Word::Fixed => Some(CapacitorControl::Fixed),
        Word::Profile => {
            if !row.is_filled(PROFILE) {
                missing(row, PROFILE);
            }
            row.shared_name(PROFILE).map(CapacitorControl::Profile)
        }
        Word::Voltage => {
            let thresholds = thresholds(row, word, ON_V, OFF_V);
            let across = sense_across(row, connection);
            let pt_ratio = row.number_or(PT_RATIO, 1.0);
            let (on_volts, off_volts) = thresholds?;
            Some(CapacitorControl::Voltage { on_volts, off_volts, pt_ratio, across: across? })
        }
        Word::Kvar => {
            let thresholds = thresholds(row, word, ON_KVAR, OFF_KVAR);
            let sense = sense(row, Conductors::ABC);
            let (on_vars, off_vars) = thresholds?;
            Some(CapacitorControl::Kvar { on_vars, off_vars, sense: sense? })
        }
        Word::Current => {
            let thresholds = thresholds(row, word, ON_A, OFF_A);
            let own = connection.map_or(Conductors::ABC, |c| c.phases().without(Conductor::N));
            let sense = sense(row, own);
            let (on_amps, off_amps) = thresholds?;
            Some(CapacitorControl::Current { on_amps, off_amps, sense: sense? })
        }
    }
}

/// Both thresholds, with a dead band between them in the right order.
fn thresholds(row: &mut Row<'_>, word: Word, on_column: usize, off_column: usize) -> Option<(f64, f64)> {
    let (on, off) = (needed(row, on_column), needed(row, off_column));
    let (on, off) = (on?, off?);
    let (side, apart) = match word {
        Word::Voltage => ("below", off > on),
        _ => ("above", on > off),
    };
    if !apart {
        let spec = |c| CAPACITORS.column(c).name();
        let message = format!(
            "there is no dead band: `{}` must lie {side} `{}`, else the capacitor would switch without end",
            spec(on_column),
            spec(off_column)
        );
        let cure = "set them apart by more than the change that switching the capacitor makes";
        row.error(Code::Conflict, on_column, message, cure);
        return None;
    }
    Some((on, off))
}

/// A number that this control cannot do without.
fn needed(row: &mut Row<'_>, column: usize) -> Option<f64> {
    if !row.is_filled(column) {
        missing(row, column);
        return None;
    }
    row.optional_number(column)
}

fn missing(row: &mut Row<'_>, column: usize) {
    let spec = CAPACITORS.column(column);
    let message = format!("{} is missing, and the control needs it", spec.what);
    row.error(
        Code::MissingValue,
        column,
        message,
        format!("fill in `{}`, or write `fixed` in `control`", spec.name()),
    );
}

/// What a voltage control measures: one phase to the neutral, or two phases across; by default
/// what the capacitor is joined to, where that is one pair.
fn sense_across(row: &mut Row<'_>, connection: Option<Connection>) -> Option<Connection> {
    if !row.is_filled(SENSE_PHASE) {
        let own = connection?;
        if own.elements() == 1 {
            return Some(own);
        }
        let message =
            "the capacitor has several phases, and it is not said which of them the control measures";
        row.error(
            Code::MissingValue,
            SENSE_PHASE,
            message,
            "write one phase such as `a`, or two such as `ab`",
        );
        return None;
    }
    let set = row.conductors(SENSE_PHASE)?;
    match set.phases().count() {
        1 => Some(Connection::Star(set.phases())),
        2 if !set.has_neutral() => super::phases::connection(set),
        _ => {
            let message =
                format!("a control measures one phase, or the voltage across two, but `{set}` is given");
            row.error(
                Code::BadPhases,
                SENSE_PHASE,
                message,
                "write one phase such as `a`, or two such as `ab`",
            );
            None
        }
    }
}

/// Line and phases of a kvar or current control.
fn sense(row: &mut Row<'_>, default: Conductors) -> Option<Sense> {
    let line = row.shared_name(SENSE_LINE);
    if !row.is_filled(SENSE_LINE) {
        missing(row, SENSE_LINE);
    }
    let phases =
        if row.is_filled(SENSE_PHASE) { row.branch_conductors(SENSE_PHASE)?.phases() } else { default };
    Some(Sense { line: line?, phases })
}
