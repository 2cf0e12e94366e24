//! `motors.csv`: nameplates, driven loads and starters; the circuit of each is found here.

use super::Intake;
use super::names::Unique;
use super::row::Row;
use super::schema::{Column, Header, Range, Schema};
use super::starters;
use super::table::read_table;
use crate::diagnostic::{Code, FileId};
use crate::machine::{
    Cage, Circuit, Design, DrivenLoad, Fit, MechanicalLoss, Motor, Nameplate, Ratings, Shape, fit,
};
use crate::network::{MotorRecord, MotorState};
use crate::units::KILO;

/// Kilogram square metres in one pound square foot.
const KGM2_PER_LBFT2: f64 = 0.453_592_37 * 0.3048 * 0.3048;
/// Per unit in one percent.
const PERCENT: f64 = 0.01;

const MOTOR: usize = 0;
const NODE: usize = 1;
const COUNT: usize = 2;
const KW: usize = 3;
const HP: usize = 4;
const VOLTS: usize = 5;
const AMPS: usize = 6;
const EFFICIENCY: usize = 7;
const PF: usize = 8;
const RPM: usize = 9;
const POLES: usize = 10;
const CODE: usize = 11;
const LR_AMPS: usize = 12;
const LR_MULTIPLE: usize = 13;
const LR_PF: usize = 14;
const LR_TORQUE: usize = 15;
const PULL_UP: usize = 16;
const BREAKDOWN: usize = 17;
const DESIGN: usize = 18;
const INERTIA: usize = 19;
const H: usize = 20;
const LOAD_TORQUE: usize = 21;
const LOAD_PERCENT: usize = 22;
const LOAD_INERTIA: usize = 23;
const STATE: usize = 24;
const STARTS: usize = 25;
const LR_LIMIT: usize = 26;
const CIRCUIT: [usize; 5] = [27, 28, 29, 30, 31];
/// First column of the starter.
pub(super) const STARTER: usize = 32;

static MOTORS: Schema = Schema {
    file: "motors.csv",
    columns: &[
        Column::text("motor", "the name of the motor").required(),
        Column::text("node", "the node").required(),
        Column::number("count", 1.0, "", "the number of equal motors").range(Range::Within(1.0, 1000.0)),
        Column::number("kw", KILO, "kW", "the shaft power").range(Range::Positive),
        Column::number("hp", 1.0, "hp", "the shaft power").range(Range::Positive),
        Column::family(
            &[
                Header { name: "volts", factor: 1.0, unit: "V" },
                Header { name: "kv", factor: KILO, unit: "kV" },
            ],
            "the rated voltage",
        )
        .required()
        .range(Range::Positive),
        Column::number("amps", 1.0, "A", "the full-load current").range(Range::Positive),
        Column::number("efficiency_percent", PERCENT, "%", "the efficiency").range(Range::Within(1.0, 100.0)),
        Column::number("pf", 1.0, "", "the power factor").range(Range::Within(0.01, 1.0)),
        Column::number("rpm", 1.0, "rpm", "the full-load speed").range(Range::Positive),
        Column::number("poles", 1.0, "", "the number of poles").range(Range::Within(2.0, 100.0)),
        Column::text("code", "the code letter"),
        Column::number("locked_rotor_amps", 1.0, "A", "the locked-rotor current").range(Range::Positive),
        Column::number("locked_rotor_multiple", 1.0, "", "the locked-rotor current over full load")
            .range(Range::Positive),
        Column::number("locked_rotor_pf", 1.0, "", "the power factor at standstill")
            .range(Range::Within(0.01, 1.0)),
        Column::number("locked_rotor_torque_percent", PERCENT, "%", "the locked-rotor torque")
            .range(Range::Positive),
        Column::number("pull_up_torque_percent", PERCENT, "%", "the pull-up torque").range(Range::Positive),
        Column::number("breakdown_torque_percent", PERCENT, "%", "the breakdown torque").range(Range::Positive),
        Column::text("design", "the design letter"),
        Column::family(
            &[
                Header { name: "inertia_kgm2", factor: 1.0, unit: "kg m2" },
                Header { name: "wk2_lbft2", factor: KGM2_PER_LBFT2, unit: "lb ft2" },
            ],
            "the inertia of the rotor",
        )
        .range(Range::Positive),
        Column::number("inertia_h_s", 1.0, "s", "the inertia constant").range(Range::Positive),
        Column::text("load_torque", "the load torque"),
        Column::number("load_percent", PERCENT, "%", "the load").range(Range::Within(0.0, 200.0)),
        Column::family(
            &[
                Header { name: "load_inertia_kgm2", factor: 1.0, unit: "kg m2" },
                Header { name: "load_wk2_lbft2", factor: KGM2_PER_LBFT2, unit: "lb ft2" },
            ],
            "the inertia of the load",
        )
        .range(Range::NotNegative),
        Column::text("state", "the state"),
        Column::number("starts_per_hour", 1.0, "", "the starts an hour").range(Range::NotNegative),
        Column::number("locked_rotor_limit_s", 1.0, "s", "the longest time at standstill")
            .range(Range::Positive),
        Column::number("circuit_r1_ohm", 1.0, "ohm", "the stator resistance").range(Range::NotNegative),
        Column::number("circuit_x1_ohm", 1.0, "ohm", "the stator reactance").range(Range::NotNegative),
        Column::number("circuit_xm_ohm", 1.0, "ohm", "the magnetising reactance").range(Range::Positive),
        Column::number("circuit_r2_ohm", 1.0, "ohm", "the rotor resistance").range(Range::Positive),
        Column::number("circuit_x2_ohm", 1.0, "ohm", "the rotor reactance").range(Range::NotNegative),
        Column::text("starter", "the starter"),
        Column::number("starter_tap_percent", PERCENT, "%", "the tap of the starter")
            .range(Range::Within(1.0, 100.0)),
        Column::number("starter_limit_percent", PERCENT, "%", "the current limit of the starter")
            .range(Range::Positive),
        Column::number("starter_initial_percent", PERCENT, "%", "the first voltage of the starter")
            .range(Range::Within(0.0, 100.0)),
        Column::number("starter_ramp_s", 1.0, "s", "the ramp of the starter").range(Range::NotNegative),
        Column::number("starter_change_s", 1.0, "s", "the change-over time").range(Range::Positive),
        Column::number("starter_change_percent", PERCENT, "%", "the change-over speed")
            .range(Range::Within(1.0, 99.9)),
        Column::number("starter_pause_s", 1.0, "s", "the pause of the change-over").range(Range::NotNegative),
        Column::number("starter_kvar", KILO, "kvar", "the starting capacitors").range(Range::Positive),
        Column::number("starter_efficiency_percent", PERCENT, "%", "the efficiency of the drive")
            .range(Range::Within(1.0, 100.0)),
        Column::number("starter_pf", 1.0, "", "the power factor of the drive").range(Range::Within(0.01, 1.0)),
    ],
};

#[derive(Clone, Copy)]
enum Torque {
    Constant,
    Linear,
    Quadratic,
}

const TORQUES: [(&str, Torque); 3] =
    [("constant", Torque::Constant), ("linear", Torque::Linear), ("quadratic", Torque::Quadratic)];
const STATES: [(&str, MotorState); 2] = [("running", MotorState::Running), ("off", MotorState::Off)];

/// Reads the rows of `motors.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId, frequency_hz: f64) -> Vec<MotorRecord> {
    let mut records = Vec::new();
    let mut unique = Unique::new("motor");
    read_table(intake, file, &MOTORS, |row| match read_row(row, &mut unique, frequency_hz) {
        Some(record) => records.push(record),
        None => row.lose(),
    });
    records
}

fn read_row(row: &mut Row<'_>, unique: &mut Unique, frequency_hz: f64) -> Option<MotorRecord> {
    let motor = row.own_name(MOTOR);
    if let Some(motor) = &motor {
        unique.check(row, MOTOR, motor);
    }
    let node = row.node(NODE);
    let count = row.number_or(COUNT, 1.0);
    if count.fract() != 0.0 {
        row.error(Code::BadNumber, COUNT, "the number of motors must be whole", "write 1, 2, 3, ...");
    }
    let plate = nameplate(row, frequency_hz);
    let found = plate.and_then(|plate| machine(row, &plate));
    let state = row.word(STATE, &STATES, MotorState::Running);
    let starts_per_hour = row.optional_number(STARTS);
    let locked_rotor_limit_s = row.optional_number(LR_LIMIT);
    let starter = starters::read(row, found.as_ref().map_or(0.0, |f| f.0.amps));
    let (machine, filled, fit) = found?;
    Some(MotorRecord {
        motor: motor?,
        node: node?,
        count: count as u32,
        machine,
        starter: starter?,
        state,
        starts_per_hour,
        locked_rotor_limit_s,
        filled,
        fit,
        origin: Some(row.origin),
    })
}

/// What the row tells of the plate; `None` where a cell of it is faulty.
fn nameplate(row: &mut Row<'_>, frequency_hz: f64) -> Option<Nameplate> {
    let before = row.faults();
    let letter = |text: &str| text.trim().chars().next().map(|c| c.to_ascii_uppercase());
    let design = row.text(DESIGN).map(str::to_owned);
    let design = design.and_then(|text| {
        let found = letter(&text).filter(|_| text.trim().len() == 1).and_then(Design::from_letter);
        if found.is_none() {
            let message = format!("`{text}` is no design letter");
            row.error(Code::UnknownWord, DESIGN, message, "write A, B, C or D (NEMA), or N or H (IEC)");
        }
        found
    });
    let code = row.text(CODE).map(str::to_owned);
    let code = code.and_then(|text| {
        let one = letter(&text).filter(|_| text.trim().len() == 1);
        if one.is_none() {
            let message = format!("`{text}` is no code letter");
            row.error(Code::UnknownWord, CODE, message, "write the one letter of the plate, such as G");
        }
        one
    });
    let plate = Nameplate {
        frequency_hz,
        hp: row.optional_number(HP),
        shaft_w: row.optional_number(KW),
        volts: row.optional_number(VOLTS),
        amps: row.optional_number(AMPS),
        efficiency: row.optional_number(EFFICIENCY),
        pf: row.optional_number(PF),
        rpm: row.optional_number(RPM),
        poles: row.optional_number(POLES).map(|p| p as u32),
        code,
        locked_rotor_amps: row.optional_number(LR_AMPS),
        locked_rotor_multiple: row.optional_number(LR_MULTIPLE),
        locked_rotor_pf: row.optional_number(LR_PF),
        locked_rotor_torque: row.optional_number(LR_TORQUE),
        pull_up_torque: row.optional_number(PULL_UP),
        breakdown_torque: row.optional_number(BREAKDOWN),
        design,
        inertia_kgm2: row.optional_number(INERTIA),
        inertia_h_s: row.optional_number(H),
    };
    (row.faults() == before).then_some(plate)
}

type Found = (Motor, Vec<(&'static str, f64, String)>, Vec<crate::machine::FitItem>);

/// The machine and its load, from the plate or from the circuit where that is given.
fn machine(row: &mut Row<'_>, plate: &Nameplate) -> Option<Found> {
    let given = CIRCUIT.iter().filter(|&&c| row.is_filled(c)).count();
    let ratings = match plate.resolve() {
        Ok(ratings) => ratings,
        Err(faults) => {
            for fault in faults {
                row.error(Code::Conflict, column_of(fault.column), fault.message, fault.mend);
            }
            return None;
        }
    };
    let shape = match row.word(LOAD_TORQUE, &TORQUES, Torque::Quadratic) {
        Torque::Constant => Shape::Constant,
        Torque::Linear => Shape::Linear,
        Torque::Quadratic => Shape::Quadratic,
    };
    let load = DrivenLoad {
        shape,
        torque_nm: row.number_or(LOAD_PERCENT, 1.0) * ratings.torque_nm(),
        rated_rad_s: ratings.rated_rad_s(),
        inertia_kgm2: row.number_or(LOAD_INERTIA, 0.0),
    };
    let filled = ratings.filled().into_iter().map(|(q, v, source)| (q, v, source.to_owned())).collect();
    if given > 0 {
        let circuit = circuit(row, &ratings)?;
        return Some((Motor::new(&ratings, circuit, load), filled, Vec::new()));
    }
    match fit(&ratings) {
        Ok(Fit { circuit, items, .. }) => Some((Motor::new(&ratings, circuit, load), filled, items)),
        Err(fault) => {
            let column = fault.worst.map_or(MOTOR, |item| column_of(item.quantity));
            row.error(Code::Conflict, column, fault.message, fault.mend);
            None
        }
    }
}

/// A single-cage circuit of the user's own.
fn circuit(row: &mut Row<'_>, ratings: &Ratings) -> Option<Circuit> {
    let values = CIRCUIT.map(|c| row.optional_number(c));
    if let Some(missing) = CIRCUIT.into_iter().find(|&c| !row.is_filled(c)) {
        let message = "the circuit is given in part: it needs all five of its values";
        row.error(Code::MissingValue, missing, message, "fill in this one, or clear the others");
        return None;
    }
    let [r1, x1, xm, r2, x2] = values;
    let (circuit, column) = (
        Circuit {
            r1_ohm: r1?,
            x1_ohm: x1?,
            xm_ohm: xm?,
            core_siemens: 0.0,
            rotor_x_ohm: 0.0,
            inner: Cage { r_ohm: r2?, x_ohm: x2? },
            outer: None,
            mechanical: MechanicalLoss { watts: 0.0, at_rad_s: ratings.rated_rad_s() },
            sync_rad_s: ratings.sync_rad_s(),
        },
        CIRCUIT[0],
    );
    let faults = circuit.faults();
    for fault in &faults {
        row.error(Code::Conflict, column, fault.clone(), "check the five values of the circuit");
    }
    faults.is_empty().then_some(circuit)
}

/// Column of `motors.csv` that a name of the machine's faults and fits means.
fn column_of(name: &str) -> usize {
    let plain = name.trim_end_matches("_percent");
    let found = MOTORS.columns.iter().position(|c| {
        c.headers().any(|h| h.name == name || h.name.trim_end_matches("_percent") == plain)
    });
    found.unwrap_or(MOTOR)
}
