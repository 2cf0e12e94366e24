//! `regulators.csv`: one row a unit or a bank.

use std::collections::HashMap;

use super::Intake;
use super::row::Row;
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId, Origin};
use crate::network::{Across, Conductor, Conductors, Name, RegulatorControl, RegulatorRecord};

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
    let control = RegulatorControl {
        set_volts: row.optional_number(SET),
        band_volts: row.optional_number(BAND),
        pt_ratio: row.optional_number(PT_RATIO),
        ct_amps: row.optional_number(CT),
        r_volts: row.number_or(R, 0.0),
        x_volts: row.number_or(X, 0.0),
    };
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
