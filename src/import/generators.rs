//! `generators.csv`.

use super::Intake;
use super::names::Unique;
use super::row::{Number, Row};
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId};
use crate::network::{GeneratorRecord, Priority, ReactiveRecord};
use crate::units::KILO;

const GENERATOR: usize = 0;
const NODE: usize = 1;
const PHASES: usize = 2;
const KW: usize = 3;
const KVAR: usize = 4;
const PF: usize = 5;
const KVA: usize = 6;
const VOLT_VAR: usize = 7;
const VOLT_WATT: usize = 8;
const PRIORITY: usize = 9;
const STATE: usize = 10;

static GENERATORS: Schema = Schema {
    file: "generators.csv",
    columns: &[
        Column::text("generator", "the name of the generator").required(),
        Column::text("node", "the node").required(),
        Column::text("phases", "the connection").required(),
        Column::number("kw", KILO, "kW", "the active power delivered").required().range(Range::NotNegative),
        Column::number("kvar", KILO, "kvar", "the reactive power delivered"),
        Column::number("pf", 1.0, "", "the power factor").range(Range::Within(-1.0, 1.0)),
        Column::number("kva", KILO, "kVA", "the rating").range(Range::Positive),
        Column::text("volt_var", "the volt-var curve"),
        Column::text("volt_watt", "the volt-watt curve"),
        Column::text("priority", "the priority"),
        Column::text("state", "the state"),
    ],
};

const PRIORITIES: [(&str, Priority); 2] = [("watts", Priority::Watts), ("vars", Priority::Vars)];

/// Reads the rows of `generators.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<GeneratorRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("generator");
    read_table(intake, file, &GENERATORS, |row| records.extend(read_row(row, &mut unique)));
    records
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique) -> Option<GeneratorRecord> {
    let generator = row.own_name(GENERATOR);
    if let Some(generator) = &generator {
        unique.check(row, GENERATOR, generator);
    }
    let node = row.node(NODE);
    let connection = row.connection(PHASES);
    let watts = row.optional_number(KW);
    let reactive = reactive(row);
    let rated_va = row.optional_number(KVA);
    let volt_watt = row.shared_name(VOLT_WATT);
    if !row.is_filled(KVA) {
        rating_needed(row);
    }
    let priority = priority(row, &reactive);
    let state = row.state(STATE);
    Some(GeneratorRecord {
        generator: generator?,
        node: node?,
        connection: connection?,
        watts: watts?,
        reactive: reactive?,
        volt_watt,
        rated_va,
        priority,
        state,
        origin: Some(row.origin),
    })
}

/// Curves are in per cent of the rating.
fn rating_needed(row: &mut Row<'_>) {
    let curve = [VOLT_VAR, VOLT_WATT].into_iter().find(|&c| row.is_filled(c));
    if curve.is_some() {
        let message = "the rating is missing; the curves of a generator are in per cent of it";
        row.error(Code::MissingValue, KVA, message, "fill in `kva`, the rating of the inverter");
    }
}

fn priority(row: &mut Row<'_>, reactive: &Option<ReactiveRecord>) -> Priority {
    let priority = row.word(PRIORITY, &PRIORITIES, Priority::Watts);
    if row.is_filled(PRIORITY) && matches!(reactive, Some(ReactiveRecord::PerWatt(_))) {
        let message = "a priority has no effect with `pf`: both powers give way in proportion";
        row.error(Code::Conflict, PRIORITY, message, "clear this cell, or give `kvar` instead of `pf`");
    }
    priority
}

/// Reactive power from `kvar`, `pf` or `volt_var`: `Q = P tan(acos |pf|)`, negative where `pf` is.
fn reactive(row: &mut Row<'_>) -> Option<ReactiveRecord> {
    let (kvar, pf, curve) = (row.number(KVAR), row.number(PF), row.shared_name(VOLT_VAR));
    let filled: Vec<usize> = [KVAR, PF, VOLT_VAR].into_iter().filter(|&c| row.is_filled(c)).collect();
    if let [_, second, ..] = filled.as_slice() {
        let names = filled.iter().map(|&c| match c {
            KVAR => "`kvar`",
            PF => "`pf`",
            _ => "`volt_var`",
        });
        let message = format!("{} are given together", names.collect::<Vec<_>>().join(" and "));
        row.error(Code::Conflict, *second, message, "keep the one that sets the reactive power");
        return None;
    }
    match (kvar, pf, curve) {
        (Number::Value(vars), ..) => Some(ReactiveRecord::Held(vars)),
        (_, Number::Value(pf), _) if pf.abs() < 0.01 => {
            let message = "the power factor must be between 0.01 and 1 where reactive power is delivered, or between -0.01 and -1 where it is taken in";
            row.error(Code::OutOfRange, PF, message, "write the power factor, or clear it and write `kvar`");
            None
        }
        (_, Number::Value(pf), _) => Some(ReactiveRecord::PerWatt(pf.abs().acos().tan() * pf.signum())),
        (_, _, Some(curve)) => Some(ReactiveRecord::VoltVar(curve)),
        (Number::Faulty, ..) | (_, Number::Faulty, _) => None,
        (Number::Blank, Number::Blank, None) => {
            if !row.is_filled(VOLT_VAR) {
                let message = "nothing says what reactive power the generator delivers";
                let cure = "fill in `kvar`, `pf` or `volt_var`; write 1 in `pf` for none";
                row.row_error(Code::MissingValue, message, cure);
            }
            None
        }
    }
}
