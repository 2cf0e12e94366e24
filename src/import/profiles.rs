//! `profiles.csv`: one row a time, one column a profile.

use super::Intake;
use super::names::Unique;
use super::row::Row;
use super::schema::{Column, OWN_NAMES, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId};
use crate::network::{Name, ProfileRecord, Profiles};

const TIME: usize = 0;
const VALUE: usize = 1;

/// A load is hardly multiplied by more than this: such a value is in per cent (judgement, no source).
const PLAUSIBLE: f64 = 20.0;

static PROFILES: Schema = Schema {
    file: "profiles.csv",
    columns: &[
        Column::text("time", "the time").required(),
        Column::number(OWN_NAMES, 1.0, "", "the factor of the profile").range(Range::NotNegative),
    ],
};

/// Reads the rows of `profiles.csv`. Names of profiles are those of the header, in small letters.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Profiles {
    let mut times: Vec<Name> = Vec::new();
    let mut values: Vec<(usize, Vec<f64>)> = Vec::new();
    let mut unique = Unique::new("time");
    read_table(intake, file, &PROFILES, |row| read_row(row, &mut times, &mut values, &mut unique));
    let columns = intake.sources.file(file).map(|f| f.columns.clone()).unwrap_or_default();
    if !columns.iter().any(|name| name == "time") {
        intake.lose(PROFILES.file);
        return Profiles::default();
    }
    let own = |name: &str| !name.is_empty() && !name.starts_with("note") && name != "time";
    let mut profiles: Vec<ProfileRecord> = Vec::new();
    for (position, name) in columns.iter().enumerate().filter(|(_, name)| own(name)) {
        if profiles.iter().any(|p| *p.profile == **name) {
            continue;
        }
        let at = values.iter_mut().find(|(p, _)| *p == position);
        let values = at.map(|(_, values)| std::mem::take(values)).unwrap_or_default();
        profiles.push(ProfileRecord { profile: Name::from(name.as_str()), values });
    }
    profiles.iter().for_each(|p| warn_of_percent(intake, file, p));
    Profiles { times, profiles, file: Some(file) }
}

/// A row with a fault keeps its time, so that the time is not told as unknown.
fn read_row(
    row: &mut Row<'_>,
    times: &mut Vec<Name>,
    values: &mut Vec<(usize, Vec<f64>)>,
    unique: &mut Unique,
) {
    let time = row.text(TIME).map(Name::from);
    if let Some(time) = &time {
        unique.check(row, TIME, time);
    }
    if values.is_empty() {
        values.extend(row.own_positions(VALUE).map(|position| (position, Vec::new())));
    }
    for (position, list) in values.iter_mut() {
        let value = row.own_number(VALUE, *position).unwrap_or(1.0);
        if time.is_some() {
            list.push(value);
        }
    }
    times.extend(time);
}

/// Values that can only be meant in per cent.
fn warn_of_percent(intake: &mut Intake, file: FileId, profile: &ProfileRecord) {
    let highest = profile.values.iter().copied().fold(0.0, f64::max);
    if highest <= PLAUSIBLE {
        return;
    }
    let message = format!("profile `{}` multiplies loads by up to {highest}", profile.profile);
    let cure = "write a share in per cent as a factor: 0.85 for 85 %";
    intake.diagnostics.warning(Code::SuspectUnit, intake.whole_file(file), message, cure);
}
