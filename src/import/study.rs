//! `study.csv`: settings.

use super::Intake;
use super::names::Unique;
use super::row::{Number, Row};
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId, nearest};
use crate::network::{Name, Study};

const SETTING: usize = 0;
const VALUE: usize = 1;

static STUDY: Schema = Schema {
    file: "study.csv",
    columns: &[
        Column::text("setting", "the name of the setting").required(),
        Column::text("value", "the value of the setting"),
    ],
};
/// A setting that holds a number, and where it goes.
struct Setting {
    spec: Column,
    put: fn(&mut Study, f64),
}

const fn setting(
    name: &'static str,
    unit: &'static str,
    what: &'static str,
    range: Range,
    put: fn(&mut Study, f64),
) -> Setting {
    Setting { spec: Column::number(name, 1.0, unit, what).range(range), put }
}

static SETTINGS: &[Setting] = &[
    setting("frequency_hz", "Hz", "the frequency", Range::Within(50.0, 60.0), |s, v| s.frequency_hz = v),
    setting(
        "conductor_temperature_c",
        "degrees Celsius",
        "the conductor temperature",
        Range::Within(-60.0, 250.0),
        |s, v| s.conductor_temperature_c = v,
    ),
    setting(
        "earth_resistivity_ohm_m",
        "ohm metres",
        "the earth resistivity",
        Range::Within(0.1, 1e5),
        |s, v| {
            s.earth_resistivity_ohm_m = v;
        },
    ),
    setting(
        "voltage_low_percent",
        "% of nominal",
        "the low voltage limit",
        Range::Within(0.0, 100.0),
        |s, v| {
            s.voltage_low_percent = v;
        },
    ),
    setting(
        "voltage_high_percent",
        "% of nominal",
        "the high voltage limit",
        Range::Within(100.0, 200.0),
        |s, v| {
            s.voltage_high_percent = v;
        },
    ),
    setting("drop_limit_percent", "% of nominal", "the voltage drop limit", Range::UpTo(100.0), |s, v| {
        s.drop_limit_percent = v;
    }),
    setting("unbalance_limit_percent", "%", "the voltage unbalance limit", Range::UpTo(100.0), |s, v| {
        s.unbalance_limit_percent = v;
    }),
    setting("neutral_limit_v", "V", "the neutral-to-earth voltage limit", Range::Positive, |s, v| {
        s.neutral_limit_v = Some(v);
    }),
    setting(
        "start_dip_limit_percent",
        "%",
        "the limit of the dip at motor start",
        Range::UpTo(100.0),
        |s, v| {
            s.start_dip_limit_percent = v;
        },
    ),
    setting(
        "constant_power_floor_percent",
        "% of nominal",
        "the constant-power floor",
        Range::Within(0.0, 100.0),
        |s, v| s.constant_power_floor_percent = v,
    ),
    setting("energy_price_per_kwh", "currency per kWh", "the energy price", Range::NotNegative, |s, v| {
        s.energy_price_per_kwh = Some(v);
    }),
    setting("load_growth_percent", "% a year", "the load growth", Range::Within(-100.0, 1000.0), |s, v| {
        s.load_growth_percent = Some(v);
    }),
];

const TEXT_SETTINGS: [&str; 2] = ["name", "currency"];

/// Reads the settings of `study.csv`.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Study {
    let mut study = Study::default();
    let mut unique = Unique::new("setting");
    read_table(intake, file, &STUDY, |row| {
        read_setting(row, &mut study, &mut unique);
    });
    study
}

fn read_setting(row: &mut Row<'_>, study: &mut Study, unique: &mut Unique) {
    let Some(text) = row.text(SETTING) else { return };
    let name = text.to_lowercase();
    if name.starts_with("note") {
        return;
    }
    unique.check(row, SETTING, &Name::from(name.as_str()));
    if TEXT_SETTINGS.contains(&name.as_str()) {
        let value = row.text(VALUE).map(str::to_owned);
        match name.as_str() {
            "name" => study.name = value.unwrap_or_default(),
            _ => study.currency = value,
        }
        return;
    }
    let Some(setting) = SETTINGS.iter().find(|s| s.spec.name() == name) else {
        unknown(row, &name);
        return;
    };
    if let Number::Value(value) = row.number_as(VALUE, &setting.spec) {
        if setting.spec.name() == "frequency_hz" && value != 50.0 && value != 60.0 {
            row.error(Code::OutOfRange, VALUE, "the frequency must be 50 or 60 Hz", "write 50 or 60");
            return;
        }
        if is_fraction(row, setting.spec.name(), value) {
            return;
        }
        (setting.put)(study, value);
    }
}

/// Below this a limit or growth in percent is a fraction rather than a percentage.
const TINY_PERCENT: f64 = 0.2;

/// Reports a percentage given as a fraction: an error where it would switch a limit off without a
/// word, else a remark.
fn is_fraction(row: &mut Row<'_>, name: &str, value: f64) -> bool {
    let hundredfold = (value * 1e10).round() / 1e8;
    match name {
        "voltage_low_percent" | "constant_power_floor_percent" if value > 0.0 && value <= 1.0 => {
            let message = format!("{value} is a fraction; this setting is in percent of nominal");
            let cure = format!("write {hundredfold}, or 0 to do without it");
            row.error(Code::SuspectUnit, VALUE, message, cure);
            true
        }
        "drop_limit_percent"
        | "unbalance_limit_percent"
        | "start_dip_limit_percent"
        | "load_growth_percent"
            if value != 0.0 && value.abs() < TINY_PERCENT =>
        {
            let message = format!("{value} is taken as {value} percent, which is very little");
            let cure = format!("write {hundredfold} if {value} is meant as a fraction");
            row.warning(Code::SuspectUnit, VALUE, message, cure);
            false
        }
        _ => false,
    }
}

fn unknown(row: &mut Row<'_>, name: &str) {
    let known = || TEXT_SETTINGS.into_iter().chain(SETTINGS.iter().map(|s| s.spec.name()));
    let all: Vec<String> = known().map(|k| format!("`{k}`")).collect();
    let (message, cure) = match nearest(name, known()) {
        Some(near) => (
            format!("there is no setting `{name}`"),
            format!("did you mean `{near}`? Correct it, or delete the row"),
        ),
        None => {
            let message = format!("there is no setting `{name}`");
            (message, format!("delete the row; the settings are {}", all.join(", ")))
        }
    };
    row.error(Code::UnknownSetting, SETTING, message, cure);
}
