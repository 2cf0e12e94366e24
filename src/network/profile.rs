//! Profiles: factors of loads and states of capacitors by time.

use std::collections::HashSet;

use super::build::Builder;
use super::draft::{CapacitorControl, Draft, Name, SwitchState};
use super::graph::place;
use crate::diagnostic::{Code, Diagnostics, FileId, Origin, Place, nearest};

/// A capacitor is closed where its profile has at least this value.
const CLOSED_FROM: f64 = 0.5;
/// Times that a message lists.
const LISTED: usize = 5;

/// Factors by time, all profiles with the same times.
#[derive(Debug, Clone, Default)]
pub struct Profiles {
    /// Times as written, in the order of their rows.
    pub times: Vec<Name>,
    /// Profiles.
    pub profiles: Vec<ProfileRecord>,
    /// File they came from.
    pub file: Option<FileId>,
}

/// One profile.
#[derive(Debug, Clone)]
pub struct ProfileRecord {
    /// Name of the profile; compared without regard to case.
    pub profile: Name,
    /// A factor for each of [`Profiles::times`].
    pub values: Vec<f64>,
}

impl Profiles {
    /// The profile of that name.
    pub fn find(&self, name: &str) -> Option<&ProfileRecord> {
        let wanted = name.to_lowercase();
        self.profiles.iter().find(|p| p.profile.to_lowercase() == wanted)
    }

    fn value(&self, name: &str, row: usize) -> Option<f64> {
        self.find(name)?.values.get(row).copied()
    }
}

impl Draft {
    /// The draft with its loads and capacitors as they are at a time of the profiles.
    ///
    /// Both powers of a load with a profile are multiplied by its value at that time; a capacitor
    /// switched by a profile is closed where the value is 0.5 or more. Only for a draft as it was
    /// written, not for one that was already taken at a time. `None`, after an error, where the
    /// profiles have no such time.
    pub fn at_time(&self, time: &str, diagnostics: &mut Diagnostics) -> Option<Draft> {
        let profiles = &self.profiles;
        let Some(row) = profiles.times.iter().position(|t| **t == *time.trim()) else {
            if !self.unread.profiles {
                self.unknown_time(time.trim(), diagnostics);
            }
            return None;
        };
        let mut draft = self.clone();
        draft.at = profiles.times.get(row).cloned();
        for load in &mut draft.loads {
            let value = load.profile.as_ref().and_then(|name| profiles.value(name, row));
            let factor = value.unwrap_or(1.0);
            load.watts *= factor;
            load.vars *= factor;
        }
        for capacitor in &mut draft.capacitors {
            let CapacitorControl::Profile(name) = &capacitor.control else { continue };
            if let Some(value) = profiles.value(name, row) {
                capacitor.state = if value >= CLOSED_FROM { SwitchState::Closed } else { SwitchState::Open };
            }
        }
        Some(draft)
    }

    fn unknown_time(&self, time: &str, diagnostics: &mut Diagnostics) {
        let times = &self.profiles.times;
        if times.is_empty() {
            let message = format!("there are no profiles to look up at {time:?}");
            let cure = "give a row of that time in profiles.csv, or leave out --at";
            diagnostics.error(Code::UnknownTime, self.profile_place(None), message, cure);
            return;
        }
        let cure = match nearest(time, times.iter().map(|t| &**t)) {
            Some(near) => format!("did you mean {near:?}?"),
            None => {
                let first: Vec<String> = times.iter().take(LISTED).map(|t| format!("{t:?}")).collect();
                let more = match times.len().saturating_sub(LISTED) {
                    0 => String::new(),
                    more => format!(", and {more} more"),
                };
                format!("write a time as it stands there: {}{more}", first.join(", "))
            }
        };
        let message = format!("no row has the time {time:?}");
        diagnostics.error(Code::UnknownTime, self.profile_place(None), message, cure);
    }

    /// Warns where profiles are used and no time was asked for.
    pub fn warn_of_no_time(&self, diagnostics: &mut Diagnostics) {
        let known = |name: &Name| self.profiles.find(name).is_some();
        let loads = self.loads.iter().filter(|l| l.profile.as_ref().is_some_and(known)).count();
        let capacitors = self.profiled_capacitors().filter(|(_, name, _)| known(name)).count();
        if self.at.is_some() || loads + capacitors == 0 {
            return;
        }
        let mut taken = Vec::new();
        if loads > 0 {
            taken.push("every load with a profile is taken at the full value of its row");
        }
        if capacitors > 0 {
            taken.push("every capacitor switched by a profile in its `state`");
        }
        let message = format!("no time is given: {}", taken.join(", "));
        let cure = match self.profiles.times.first() {
            Some(first) => format!("to solve one time give it, such as --at {:?}", &**first),
            None => "give a row a time in profiles.csv".to_string(),
        };
        diagnostics.warning(Code::NoTime, self.profile_place(None), message, cure);
    }

    fn profiled_capacitors(&self) -> impl Iterator<Item = (&Name, &Name, Option<Origin>)> {
        self.capacitors.iter().filter_map(|c| match &c.control {
            CapacitorControl::Profile(name) => Some((&c.capacitor, name, c.origin)),
            _ => None,
        })
    }

    fn profile_place(&self, column: Option<&str>) -> Option<Place> {
        let file = self.sources.file(self.profiles.file?)?;
        let column = column.map(str::to_owned);
        Some(Place { file: file.name.clone(), row: 0, column, cell: None, found: None, row_text: None })
    }
}

impl Builder<'_> {
    /// Every profile named must exist; one that nothing uses is told.
    pub(super) fn check_profiles(&mut self) {
        let draft = self.draft;
        let loads = draft.loads.iter().filter_map(|l| Some((&l.load, l.profile.as_ref()?, l.origin)));
        let (mut used, mut unknown): (HashSet<String>, bool) = (HashSet::new(), false);
        for (kind, (element, name, origin)) in
            loads.map(|l| ("load", l)).chain(draft.profiled_capacitors().map(|c| ("capacitor", c)))
        {
            if draft.profiles.find(name).is_none() && !draft.unread.profiles {
                unknown = true;
                self.unknown_profile(&format!("{kind} {element}"), name, origin);
            }
            used.insert(name.to_lowercase());
        }
        // The one not used may be the one misspelt.
        if unknown || draft.unread.loads || draft.unread.capacitors || draft.unread.profiles {
            return;
        }
        for profile in &draft.profiles.profiles {
            if used.contains(&profile.profile.to_lowercase()) {
                continue;
            }
            let message = format!("nothing uses profile {:?}", &*profile.profile);
            let cure =
                "name it in `profile` of loads.csv or capacitors.csv, or let its name begin with `note`";
            let place = draft.profile_place(Some(&profile.profile));
            self.diagnostics.warning(Code::UnusedProfile, place, message, cure);
        }
    }

    fn unknown_profile(&mut self, who: &str, name: &str, origin: Option<Origin>) {
        let profiles = &self.draft.profiles.profiles;
        let cure = match nearest(name, profiles.iter().map(|p| &*p.profile)) {
            Some(near) => format!("did you mean {near:?}?"),
            None if profiles.is_empty() => "give it a column in profiles.csv, or clear `profile`".to_string(),
            None => {
                let all: Vec<String> =
                    profiles.iter().take(LISTED).map(|p| format!("{:?}", &*p.profile)).collect();
                format!("profiles.csv has {}; give {name:?} a column there", all.join(", "))
            }
        };
        self.diagnostics.error(
            Code::UnknownProfile,
            place(self.draft, origin, "profile", name),
            format!("{who} follows profile {name:?}, which is not defined"),
            cure,
        );
    }
}
