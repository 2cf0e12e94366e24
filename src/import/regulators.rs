//! `regulators.csv`: one row a unit or a bank.

use std::collections::HashMap;

use super::Intake;
use super::row::Row;
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId, Origin};
use crate::network::{
    Across, BankMode, Conductor, Conductors, Name, RegulatorControl, RegulatorRecord, ReverseFlow,
};

const REGULATOR: usize = 0;
const FROM: usize = 1;
const TO: usize = 2;
const PHASES: usize = 3;
const ACROSS: usize = 4;
const TAPS: [usize; 3] = [5, 6, 7];
const STEP: usize = 8;
const STEPS: usize = 9;
const SET: usize = 10;
const BAND: usize = 11;
const PT_RATIO: usize = 12;
const CT: usize = 13;
const R: usize = 14;
const X: usize = 15;
const LIMIT: usize = 16;
const MODE: usize = 17;
const GANG_PHASE: usize = 18;
const REVERSE: usize = 19;
const REVERSE_SET: usize = 20;

static REGULATORS: Schema = Schema {
    file: "regulators.csv",
    columns: &[
        Column::text("regulator", "the name of the regulator").required(),
        Column::text("from", "the node at the source side").required(),
        Column::text("to", "the node at the regulated side").required(),
        Column::text("phases", "the set of phases").required(),
        Column::text("across", "the conductor regulated against"),
        Column::number("tap_a", 1.0, "steps", "the tap of phase a"),
        Column::number("tap_b", 1.0, "steps", "the tap of phase b"),
        Column::number("tap_c", 1.0, "steps", "the tap of phase c"),
        Column::number("step_percent", 0.01, "%", "the voltage of one step").range(Range::UpTo(10.0)),
        Column::number("steps", 1.0, "", "the number of steps each way").range(Range::Within(1.0, 100.0)),
        Column::number("set_v", 1.0, "V", "the set voltage").range(Range::Positive),
        Column::number("band_v", 1.0, "V", "the bandwidth").range(Range::Positive),
        Column::number("pt_ratio", 1.0, "", "the ratio of the potential transformer").range(Range::Positive),
        Column::number("ct_a", 1.0, "A", "the primary current of the current transformer")
            .range(Range::Positive),
        Column::number("r_v", 1.0, "V", "the compensator resistance"),
        Column::number("x_v", 1.0, "V", "the compensator reactance"),
        Column::number("limit_v", 1.0, "V", "the highest voltage at the regulator").range(Range::Positive),
        Column::text("mode", "how the phases of the bank move"),
        Column::text("gang_phase", "the phase that a gang measures"),
        Column::text("reverse", "what the control does in reverse flow"),
        Column::number("reverse_set_v", 1.0, "V", "the set voltage in reverse flow").range(Range::Positive),
    ],
};

const STEP_PU: f64 = 0.006_25;
const STEPS_EACH_WAY: u32 = 16;

/// Names with the ends of their bank: units of one bank may share a name.
type Banks = HashMap<Name, (Name, Name, Origin)>;

/// Reads the rows of `regulators.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<RegulatorRecord> {
    let mut records = Vec::new();
    let mut banks = Banks::new();
    read_table(intake, file, &REGULATORS, |row| match read_row(row, &mut banks) {
        Some(record) => records.push(record),
        None => row.lose_branch(FROM, TO),
    });
    records
}

fn read_row(row: &mut Row<'_>, banks: &mut Banks) -> Option<RegulatorRecord> {
    let regulator = row.own_name(REGULATOR);
    let from = row.node(FROM);
    let to = row.node(TO);
    if let (Some(name), Some(from), Some(to)) = (&regulator, &from, &to) {
        check_name(row, banks, name, from, to);
    }
    let phases = row.branch_conductors(PHASES).map(Conductors::phases);
    let across = across(row, phases);
    let steps = row.whole_number(STEPS).and_then(|n| u32::try_from(n).ok()).unwrap_or(STEPS_EACH_WAY);
    let taps = taps(row, phases, steps);
    let step_pu = row.number_or(STEP, STEP_PU);
    let mode = mode(row, phases, &taps);
    let reverse = reverse(row);
    let control = RegulatorControl {
        set_volts: row.optional_number(SET),
        band_volts: row.optional_number(BAND),
        pt_ratio: row.optional_number(PT_RATIO),
        ct_amps: row.optional_number(CT),
        r_volts: row.number_or(R, 0.0),
        x_volts: row.number_or(X, 0.0),
        limit_volts: row.optional_number(LIMIT),
        mode,
        reverse,
    };
    check_limit(row, &control);
    Some(RegulatorRecord {
        regulator: regulator?,
        from: from?,
        to: to?,
        phases: phases?,
        across: across?,
        taps,
        step_pu,
        steps,
        control,
        origin: Some(row.origin),
    })
}

fn check_name(row: &mut Row<'_>, banks: &mut Banks, name: &Name, from: &Name, to: &Name) {
    match banks.get(name) {
        None => {
            banks.insert(name.clone(), (from.clone(), to.clone(), row.origin));
        }
        Some((f, t, first)) if (f, t) != (from, to) => {
            let message =
                format!("regulator `{name}` stands already in row {}, between `{f}` and `{t}`", first.line);
            let cure = "give each bank its own name; only units between the same two nodes may share one";
            row.error(Code::DuplicateName, REGULATOR, message, cure);
        }
        Some(_) => {}
    }
}

fn across(row: &mut Row<'_>, phases: Option<Conductors>) -> Option<Across> {
    if !row.is_filled(ACROSS) {
        return Some(Across::Neutral);
    }
    let set = row.conductors(ACROSS)?;
    let mut all = set.iter();
    let (Some(one), None) = (all.next(), all.next()) else {
        let message = format!("expected one conductor to regulate against, but `{set}` is given");
        row.error(Code::BadPhases, ACROSS, message, "write n for phase to neutral, or one other phase");
        return None;
    };
    if one == Conductor::N {
        return Some(Across::Neutral);
    }
    if phases.is_some_and(|p| p.has(one)) {
        let message = format!("phase {one} cannot be regulated against itself");
        row.error(Code::BadPhases, ACROSS, message, "write n, or a phase that `phases` does not name");
        return None;
    }
    Some(Across::Phase(one))
}

fn taps(row: &mut Row<'_>, phases: Option<Conductors>, steps: u32) -> [Option<i32>; 3] {
    let limit = i64::from(steps);
    let mut taps = [None; 3];
    for ((conductor, column), slot) in Conductor::PHASES.into_iter().zip(TAPS).zip(&mut taps) {
        let Some(tap) = row.whole_number(column) else { continue };
        if i64::from(tap).abs() > limit {
            let message = format!("the taps of this regulator run from -{limit} to {limit}");
            let cure = "write a tap within that range, or give the number of steps each way in `steps`";
            row.error(Code::TapRange, column, message, cure);
        } else if phases.is_some_and(|p| !p.has(conductor)) {
            let named = phases.unwrap_or_default();
            let message =
                format!("a tap is given for phase {conductor}, but the row regulates only `{named}`");
            row.error(Code::Conflict, column, message, "clear this cell, or add the phase to `phases`");
        } else {
            *slot = Some(tap);
        }
    }
    taps
}

/// Words of the column `mode`.
#[derive(Clone, Copy, PartialEq)]
enum ModeWord {
    Each,
    Gang,
}

/// `each`, or `gang` with the phase it measures; in a gang all taps are the same.
fn mode(row: &mut Row<'_>, phases: Option<Conductors>, taps: &[Option<i32>; 3]) -> BankMode {
    let words = [("each", Some(ModeWord::Each)), ("gang", Some(ModeWord::Gang))];
    let word = row.word(MODE, &words, None);
    // A slip was reported; what was meant is not known.
    if word.is_none() && row.is_filled(MODE) {
        return BankMode::Each;
    }
    let word = word.unwrap_or(ModeWord::Each);
    if word == ModeWord::Each {
        if row.is_filled(GANG_PHASE) {
            let message = "a phase to measure is given, but the phases do not move as a gang";
            row.error(Code::Conflict, GANG_PHASE, message, "write `gang` in `mode`, or clear this cell");
        }
        return BankMode::Each;
    }
    let Some(phases) = phases else { return BankMode::Each };
    if phases.count() < 2 {
        let message = format!("a gang needs several phases, but the row regulates only `{phases}`");
        let cure = "write all phases of the gang in one row, or `each` in `mode`";
        row.error(Code::Conflict, MODE, message, cure);
        return BankMode::Each;
    }
    let mut given = phases.iter().map(|c| taps.get(c.slot()).copied().flatten());
    let first = given.next().flatten();
    if given.any(|tap| tap != first) {
        let message = "the phases of a gang stand on one tap, but their taps differ";
        let cure = "write the same tap for every phase, or leave all of them blank";
        row.error(Code::Conflict, MODE, message, cure);
    }
    gang_phase(row, phases).map_or(BankMode::Each, BankMode::Gang)
}

fn gang_phase(row: &mut Row<'_>, phases: Conductors) -> Option<Conductor> {
    if !row.is_filled(GANG_PHASE) {
        let message = "the phase that the gang measures is missing";
        row.error(
            Code::MissingValue,
            GANG_PHASE,
            message,
            format!("write one phase of `{phases}` in `gang_phase`"),
        );
        return None;
    }
    let set = row.conductors(GANG_PHASE)?;
    let mut all = set.iter();
    match (all.next(), all.next()) {
        (Some(one), None) if phases.has(one) => Some(one),
        _ => {
            let message = format!("a gang measures one of its phases `{phases}`, but `{set}` is given");
            row.error(Code::BadPhases, GANG_PHASE, message, format!("write one phase of `{phases}`"));
            None
        }
    }
}

/// Words of the column `reverse`.
#[derive(Clone, Copy, PartialEq)]
enum ReverseWord {
    Hold,
    Neutral,
    Regulate,
    Ignore,
}

fn reverse(row: &mut Row<'_>) -> ReverseFlow {
    let words = [
        ("hold", Some(ReverseWord::Hold)),
        ("neutral", Some(ReverseWord::Neutral)),
        ("reverse", Some(ReverseWord::Regulate)),
        ("ignore", Some(ReverseWord::Ignore)),
    ];
    let word = row.word(REVERSE, &words, None);
    let set_volts = row.optional_number(REVERSE_SET);
    // A slip was reported; what was meant is not known.
    if word.is_none() && row.is_filled(REVERSE) {
        return ReverseFlow::Hold;
    }
    let word = word.unwrap_or(ReverseWord::Hold);
    if word != ReverseWord::Regulate && set_volts.is_some() {
        let message = "a set voltage for reverse flow is given, but the control does not regulate then";
        row.error(Code::Conflict, REVERSE_SET, message, "write `reverse` in `reverse`, or clear this cell");
    }
    match (word, set_volts) {
        (ReverseWord::Hold, _) => ReverseFlow::Hold,
        (ReverseWord::Neutral, _) => ReverseFlow::Neutral,
        (ReverseWord::Ignore, _) => ReverseFlow::Ignore,
        (ReverseWord::Regulate, Some(set_volts)) => ReverseFlow::Regulate { set_volts },
        (ReverseWord::Regulate, None) => {
            if !row.is_filled(REVERSE_SET) {
                let message = "the control regulates in reverse flow, but its set voltage then is missing";
                let cure = "write the voltage at the relay in `reverse_set_v`, or `hold` in `reverse`";
                row.error(Code::MissingValue, REVERSE_SET, message, cure);
            }
            ReverseFlow::Hold
        }
    }
}

/// A limit within the band would keep the regulator from ever settling there.
fn check_limit(row: &mut Row<'_>, control: &RegulatorControl) {
    let Some(limit) = control.limit_volts else { return };
    let top = control.set_volts.unwrap_or(0.0) + control.band_volts.unwrap_or(0.0) / 2.0;
    if control.set_volts.is_some() && limit < top {
        let message = format!("the limit must not lie below the top of the band, {top} V");
        let cure = "raise the limit above `set_v` and half of `band_v`, or lower `set_v`";
        row.error(Code::Conflict, LIMIT, message, cure);
    }
}
