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
