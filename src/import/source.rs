//! `source.csv`: the supply point.

use super::Intake;
use super::row::{Number, Row};
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId};
use crate::network::{FaultLevel, SupplyRecord};
use crate::units::{KILO, MEGA};

const NODE: usize = 0;
const KV: usize = 1;
const PU: usize = 2;
const PU_PHASES: [usize; 3] = [3, 4, 5];
const ANGLE: usize = 6;
const MVA_3PH: usize = 7;
const X_OVER_R_3PH: usize = 8;
const MVA_1PH: usize = 9;
const X_OVER_R_1PH: usize = 10;
const EARTH: usize = 11;

const RADIANS_PER_DEGREE: f64 = std::f64::consts::PI / 180.0;
const HELD: Range = Range::Within(0.5, 1.5);
const RATIO: Range = Range::Within(0.0, 1000.0);

static SOURCE: Schema = Schema {
    file: "source.csv",
    columns: &[
        Column::text("node", "the node fed").required(),
        Column::number("kv", KILO, "kV line to line", "the nominal voltage")
            .required()
            .range(Range::UpTo(1000.0)),
        Column::number("pu", 1.0, "per unit", "the held voltage").range(HELD),
        Column::number("pu_a", 1.0, "per unit", "the held voltage of phase a").range(HELD),
        Column::number("pu_b", 1.0, "per unit", "the held voltage of phase b").range(HELD),
        Column::number("pu_c", 1.0, "per unit", "the held voltage of phase c").range(HELD),
        Column::number("angle_deg", RADIANS_PER_DEGREE, "degrees", "the angle of phase a")
            .range(Range::Within(-360.0, 360.0)),
        Column::number("mva_3ph", MEGA, "MVA", "the three-phase fault level").range(Range::Positive),
        Column::number("x_over_r_3ph", 1.0, "", "X/R of the three-phase fault").range(RATIO),
        Column::number("mva_1ph", MEGA, "MVA", "the single-phase fault level").range(Range::Positive),
        Column::number("x_over_r_1ph", 1.0, "", "X/R of the single-phase fault").range(RATIO),
        Column::number("earth_ohm", 1.0, "ohm", "the earthing of the source neutral")
            .range(Range::NotNegative),
    ],
};

/// Reads the rows of `source.csv`; that there is exactly one is checked with the network.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<SupplyRecord> {
    let mut records = Vec::new();
    read_table(intake, file, &SOURCE, |row| match read_row(row) {
        Some(record) => records.push(record),
        None => row.lose(),
    });
    records
}

fn read_row(row: &mut Row<'_>) -> Option<SupplyRecord> {
    let node = row.node(NODE);
    let nominal_volts = row.optional_number(KV);
    let held_pu = held(row);
    let angle_rad = row.number_or(ANGLE, 0.0);
    let three_phase = fault_level(row, MVA_3PH, X_OVER_R_3PH);
    let mut single_phase = fault_level(row, MVA_1PH, X_OVER_R_1PH);
    if row.is_filled(MVA_1PH) && !row.is_filled(MVA_3PH) {
        let message = "a single-phase fault level is given without the three-phase one";
        let cure =
            "fill in `mva_3ph` and `x_over_r_3ph` too, or leave both fault levels blank for a stiff source";
        row.error(Code::MissingValue, MVA_1PH, message, cure);
        single_phase = None;
    }
    let earth_ohm = row.number_or(EARTH, 0.0);
    Some(SupplyRecord {
        node: node?,
        nominal_volts: nominal_volts?,
        held_pu,
        angle_rad,
        three_phase,
        single_phase,
        earth_ohm,
        origin: Some(row.origin),
    })
}

fn held(row: &mut Row<'_>) -> [f64; 3] {
    let all = row.number_or(PU, 1.0);
    if row.is_filled(PU) && PU_PHASES.iter().any(|&c| row.is_filled(c)) {
        let message = "the held voltage is given both in `pu` and by phase";
        row.error(Code::Conflict, PU, message, "clear `pu`, or clear `pu_a`, `pu_b` and `pu_c`");
    }
    PU_PHASES.map(|column| row.number_or(column, all))
}

fn fault_level(row: &mut Row<'_>, mva: usize, ratio: usize) -> Option<FaultLevel> {
    let (name, ratio_name) =
        if mva == MVA_3PH { ("mva_3ph", "x_over_r_3ph") } else { ("mva_1ph", "x_over_r_1ph") };
    match (row.number(mva), row.number(ratio)) {
        (Number::Value(volt_amperes), Number::Value(x_over_r)) => Some(FaultLevel { volt_amperes, x_over_r }),
        (Number::Value(_), Number::Blank) => {
            let message = format!("`{name}` is given without `{ratio_name}`");
            row.error(Code::MissingValue, mva, message, format!("fill in `{ratio_name}` too"));
            None
        }
        (Number::Blank, Number::Value(_)) => {
            let message = format!("`{ratio_name}` is given without `{name}`");
            let cure = format!("fill in `{name}` too, or clear `{ratio_name}`");
            row.error(Code::MissingValue, ratio, message, cure);
            None
        }
        _ => None,
    }
}
