//! Names kept once, and checks that they are unique and not confusingly alike.

use std::collections::{HashMap, HashSet};
use std::hash::{BuildHasher, Hasher, RandomState};

use super::row::Row;
use crate::diagnostic::{Code, Diagnostics, Origin, Sources};
use crate::network::Name;

/// Names that many rows share, each kept once.
#[derive(Debug, Default)]
pub(crate) struct SharedNames {
    set: HashSet<Name>,
}

impl SharedNames {
    /// The kept name equal to `text`.
    pub(crate) fn name(&mut self, text: &str) -> Name {
        if let Some(name) = self.set.get(text) {
            return name.clone();
        }
        let name = Name::from(text);
        self.set.insert(name.clone());
        name
    }
}

/// Names of nodes, with the place where each was first written.
#[derive(Debug, Default)]
pub(crate) struct NodeNames {
    set: HashSet<Name>,
    first: Vec<(Name, Origin, &'static str)>,
}

impl NodeNames {
    /// True where the name was met already.
    pub(crate) fn knows(&self, text: &str) -> bool {
        self.set.contains(text)
    }

    /// The kept name equal to `text`.
    pub(crate) fn name(&mut self, text: &str, origin: Origin, column: &'static str) -> Name {
        if let Some(name) = self.set.get(text) {
            return name.clone();
        }
        let name = Name::from(text);
        self.set.insert(name.clone());
        self.first.push((name.clone(), origin, column));
        name
    }

    /// Warns of nodes whose names differ only by case or spaces.
    pub(crate) fn warn_of_similar(&self, sources: &Sources, diagnostics: &mut Diagnostics) {
        let hasher = RandomState::new();
        let mut seen: HashMap<u64, usize> = HashMap::with_capacity(self.first.len());
        for (at, (name, origin, column)) in self.first.iter().enumerate() {
            let hash = hash_of(plain(name), &hasher);
            let Some(other) = seen.get(&hash).and_then(|&i| self.first.get(i)) else {
                seen.insert(hash, at);
                continue;
            };
            if !plain(name).eq(plain(&other.0)) {
                continue; // the same hash by chance
            }
            let place = sources.place(*origin, Some(column), Some(name));
            let other_file = sources.file(other.1.file).map_or("", |f| f.name.as_str());
            let message = format!(
                "node `{name}` and node `{}` ({other_file} row {}) differ only by capital letters or spaces",
                other.0, other.1.line
            );
            let cure = "if they are one node, write its name the same way everywhere";
            diagnostics.warning(Code::SimilarName, place, message, cure);
        }
    }
}

/// A name without spaces and capitals.
fn plain(name: &str) -> impl Iterator<Item = char> + '_ {
    name.chars().filter(|c| !c.is_whitespace()).flat_map(lower)
}

fn lower(c: char) -> impl Iterator<Item = char> {
    let (one, many) =
        if c.is_ascii() { (Some(c.to_ascii_lowercase()), None) } else { (None, Some(c.to_lowercase())) };
    one.into_iter().chain(many.into_iter().flatten())
}

fn hash_of(chars: impl Iterator<Item = char>, hasher: &RandomState) -> u64 {
    let mut state = hasher.build_hasher();
    chars.for_each(|c| state.write_u32(c.into()));
    state.finish()
}

/// What a spreadsheet has most likely made of a name: `4-Mar` of `3-4`, `1.00E+05` of `100E3`.
fn mangled(name: &str) -> Option<&'static str> {
    const MONTHS: [&str; 16] = [
        "jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec", "mai", "okt",
        "dez", "mrz",
    ];
    let digits =
        |p: &str, most: usize| (1..=most).contains(&p.len()) && p.bytes().all(|b| b.is_ascii_digit());
    let lower = name.to_lowercase();
    let parts: Vec<&str> = lower.split(['-', '.', '/', ' ']).filter(|p| !p.is_empty()).collect();
    let months = parts.iter().filter(|p| MONTHS.contains(p)).count();
    let worded = (2..=3).contains(&parts.len())
        && months == 1
        && !lower.contains(' ')
        && parts.iter().all(|p| MONTHS.contains(p) || digits(p, 4));
    let year = |p: &&&str| p.len() == 4 && (p.starts_with("19") || p.starts_with("20"));
    let numeric = parts.len() == 3
        && parts.iter().all(|p| digits(p, 4))
        && parts.iter().filter(year).count() == 1
        && parts.iter().filter(|p| p.len() <= 2).count() == 2;
    if worded || numeric {
        return Some("a date");
    }
    let (mantissa, exponent) = lower.split_once("e+").or_else(|| lower.split_once("e-"))?;
    let rounded = digits(exponent, 3)
        && exponent.len() >= 2
        && mantissa.split('.').count() <= 2
        && mantissa.split(['.', ',']).all(|p| digits(p, 15));
    rounded.then_some("a rounded number")
}

/// Warns of a name that a spreadsheet has most likely changed.
pub(super) fn warn_of_mangled(row: &mut Row<'_>, column: usize, name: &str) {
    if !name.starts_with(|c: char| c.is_ascii_digit())
        && !name.get(..3).is_some_and(|m| m.bytes().all(|b| b.is_ascii_alphabetic()))
    {
        return;
    }
    let Some(what) = mangled(name) else { return };
    let message = format!("the name `{name}` looks like {what} that a spreadsheet has made of another name");
    let cure = "if so, set the column's format to text, type the name again, and look at the other files; else leave it";
    row.warning(Code::MangledName, column, message, cure);
}

/// Names of one kind of element, which must be unique.
#[derive(Debug)]
pub(crate) struct Unique {
    kind: &'static str,
    first: HashMap<Name, Origin>,
}

impl Unique {
    /// For elements of this kind, e.g. `line`.
    pub(crate) fn new(kind: &'static str) -> Unique {
        Unique { kind, first: HashMap::new() }
    }

    /// Reports a name that an earlier row has.
    pub(crate) fn check(&mut self, row: &mut Row<'_>, column: usize, name: &Name) {
        match self.first.get(name) {
            None => {
                self.first.insert(name.clone(), row.origin);
            }
            Some(first) => {
                let message = format!("{} `{name}` stands already in row {}", self.kind, first.line);
                let cure = "give each its own name, or delete the row that is there twice";
                row.error(Code::DuplicateName, column, message, cure);
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::mangled;

    #[test]
    fn what_spreadsheets_make_of_names() {
        for name in ["4-Mar", "Mar-04", "03.Apr", "2026-03-04", "04.03.2026", "3/4/2026", "4-Mar-26"] {
            assert_eq!(mangled(name), Some("a date"), "{name}");
        }
        for name in ["1.00E+05", "1E+05", "1,2E-03", "1.23457e+11"] {
            assert_eq!(mangled(name), Some("a rounded number"), "{name}");
        }
        for name in [
            "3-4",
            "632-671",
            "632-671-2",
            "May Street",
            "Mar",
            "May 2",
            "Mayfield-3",
            "P13",
            "1-2-3",
            "E+05",
            "10-20-3000",
            "1.2.3",
            "Line e-2",
        ] {
            assert_eq!(mangled(name), None, "{name}");
        }
    }
}
