//! The starter of a motor, from the last columns of `motors.csv`.

use super::motors::STARTER;
use super::row::Row;
use crate::diagnostic::Code;
use crate::machine::{ChangeOver, Starter};

const TAP: usize = STARTER + 1;
const LIMIT: usize = STARTER + 2;
const INITIAL: usize = STARTER + 3;
const RAMP: usize = STARTER + 4;
const CHANGE_S: usize = STARTER + 5;
const CHANGE_SPEED: usize = STARTER + 6;
const PAUSE: usize = STARTER + 7;
const KVAR: usize = STARTER + 8;
const EFFICIENCY: usize = STARTER + 9;
const DRIVE_PF: usize = STARTER + 10;

#[derive(Clone, Copy, PartialEq)]
enum Kind {
    Direct,
    StarDelta,
    Autotransformer,
    PartWinding,
    Soft,
    Drive,
    Capacitor,
}

const KINDS: [(&str, Kind); 7] = [
    ("direct", Kind::Direct),
    ("star-delta", Kind::StarDelta),
    ("autotransformer", Kind::Autotransformer),
    ("part-winding", Kind::PartWinding),
    ("soft", Kind::Soft),
    ("drive", Kind::Drive),
    ("capacitor", Kind::Capacitor),
];

/// Speed at which starters change over where nothing is given, part of synchronous speed (common practice, no source).
const CHANGE_SPEED_DEFAULT: f64 = 0.9;
/// Current limit of a soft starter, multiple of full load (common practice, no source).
const SOFT_LIMIT: f64 = 3.5;
/// First voltage of a soft starter (common practice, no source).
const SOFT_INITIAL: f64 = 0.35;
/// Ramp of a soft starter and of a drive, seconds (common practice, no source).
const RAMP_S: f64 = 10.0;
/// Current limit of a drive, multiple of full load; its efficiency and power factor (common practice, no source).
const DRIVE: (f64, f64, f64) = (1.5, 0.97, 0.95);

/// The starter of a motor of that full-load current; `None` after a report.
pub(super) fn read(row: &mut Row<'_>, full_load_amps: f64) -> Option<Starter> {
    let kind = row.word(STARTER, &KINDS, Kind::Direct);
    let fits: &[usize] = match kind {
        Kind::Direct => &[],
        Kind::StarDelta => &[CHANGE_S, CHANGE_SPEED, PAUSE],
        Kind::Autotransformer => &[TAP, CHANGE_S, CHANGE_SPEED],
        Kind::PartWinding => &[CHANGE_S, CHANGE_SPEED],
        Kind::Soft => &[LIMIT, INITIAL, RAMP],
        Kind::Drive => &[LIMIT, RAMP, EFFICIENCY, DRIVE_PF],
        Kind::Capacitor => &[KVAR, CHANGE_S, CHANGE_SPEED],
    };
    let word = KINDS.iter().find(|(_, k)| *k == kind).map_or("", |(w, _)| *w);
    for column in TAP..=DRIVE_PF {
        if row.is_filled(column) && !fits.contains(&column) {
            let message = format!("this setting has no effect: the starter is `{word}`");
            row.error(Code::Conflict, column, message, "clear this cell, or choose the starter it belongs to");
            return None;
        }
    }
    let change = change(row)?;
    let starter = match kind {
        Kind::Direct => Starter::Direct,
        Kind::StarDelta => Starter::StarDelta { change, pause_s: row.number_or(PAUSE, 0.05) },
        Kind::Autotransformer => Starter::Autotransformer { tap: row.number_or(TAP, 0.65), change },
        Kind::PartWinding => Starter::PartWinding { change },
        Kind::Soft => Starter::Soft {
            limit_amps: row.number_or(LIMIT, SOFT_LIMIT) * full_load_amps,
            initial: row.number_or(INITIAL, SOFT_INITIAL),
            ramp_s: row.number_or(RAMP, RAMP_S),
        },
        Kind::Drive => Starter::Drive {
            limit_amps: row.number_or(LIMIT, DRIVE.0) * full_load_amps,
            ramp_s: row.number_or(RAMP, RAMP_S),
            efficiency: row.number_or(EFFICIENCY, DRIVE.1),
            pf: row.number_or(DRIVE_PF, DRIVE.2),
        },
        Kind::Capacitor => {
            if !row.is_filled(KVAR) {
                let message = "a start with capacitors needs their reactive power";
                row.error(Code::MissingValue, KVAR, message, "fill in `starter_kvar`");
                return None;
            }
            Starter::Capacitor { var: row.optional_number(KVAR)?, change }
        }
    };
    let faults = if full_load_amps > 0.0 { starter.faults() } else { Vec::new() };
    for fault in &faults {
        row.error(Code::OutOfRange, STARTER, fault.clone(), "check the columns that begin with `starter_`");
    }
    faults.is_empty().then_some(starter)
}

fn change(row: &mut Row<'_>) -> Option<ChangeOver> {
    match (row.optional_number(CHANGE_S), row.optional_number(CHANGE_SPEED)) {
        (Some(_), Some(_)) => {
            let message = "the change-over is given both as a time and as a speed";
            row.error(Code::Conflict, CHANGE_SPEED, message, "keep one of the two");
            None
        }
        (Some(s), None) => Some(ChangeOver::AfterSeconds(s)),
        (None, Some(part)) => Some(ChangeOver::AtSpeed(part)),
        (None, None) => Some(ChangeOver::AtSpeed(CHANGE_SPEED_DEFAULT)),
    }
}
