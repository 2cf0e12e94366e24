//! From a folder of CSV files to a [`crate::network::Draft`], with every fault of every cell.
//!
//! `text` decodes a file, `records` splits it, and `table` gives its rows, whose cells know where
//! they stand; `header` finds the columns a `schema` declares, and `row` reads cells as names,
//! numbers, words and conductors. Each kind of file has a module of its own that declares its
//! columns and makes its records; `folder` calls them all.

mod capacitors;
mod constructions;
mod curves;
mod folder;
mod generators;
mod header;
mod lines;
mod loads;
mod matrices;
mod meters;
mod motors;
mod names;
mod nodes;
mod number;
mod phases;
mod profiles;
mod records;
mod regulators;
mod row;
mod schema;
mod source;
mod starters;
mod study;
mod switches;
mod table;
mod text;
mod transformers;
mod wires;
mod words;

use std::collections::HashSet;

use crate::catalog::Catalog;
use crate::diagnostic::{Diagnostics, FileId, Place, Sources};
use crate::network::{Draft, Unread};

pub use constructions::DescribedConstruction;
pub use folder::{read_files, read_folder};

/// What was read from a folder.
#[derive(Debug)]
pub struct Reading {
    /// The records. Complete only where `diagnostics` holds no error.
    pub draft: Draft,
    /// Faults and remarks of files, headers and cells.
    pub diagnostics: Diagnostics,
    /// SHA-256 of the files read, lower-case hexadecimal: over each known file in the order of
    /// their names, its name, its length in bytes (8 bytes, least first) and its bytes.
    pub input_sha256: String,
    /// Constructions described by wires and geometry.
    pub described: Vec<DescribedConstruction>,
    /// The built-in wires with those of `conductors.csv`.
    pub catalog: Catalog,
}

/// What grows while files are read: the files, the faults, and the names met so far.
#[derive(Debug, Default)]
pub(crate) struct Intake {
    pub(crate) sources: Sources,
    pub(crate) diagnostics: Diagnostics,
    pub(crate) nodes: names::NodeNames,
    pub(crate) shared: names::SharedNames,
    /// What could not be read, for the network.
    pub(crate) unread: Unread,
    /// Wires and spacings that could not be read; rows of either file whose name is lost.
    pub(crate) unread_wires: UnreadNames,
    pub(crate) unread_spacings: UnreadNames,
    /// True where a row of `matrices.csv` was lost.
    pub(crate) unread_elements: bool,
}

/// Names whose row could not be read.
#[derive(Debug, Default)]
pub(crate) struct UnreadNames {
    names: HashSet<String>,
    any: bool,
}

impl UnreadNames {
    /// Keeps the name of a row that could not be read, or that there is one without a name.
    pub(crate) fn add(&mut self, name: Option<&str>) {
        match name {
            Some(name) => _ = self.names.insert(name.to_lowercase()),
            None => self.any = true,
        }
    }

    /// True where the name may be that of a row that could not be read.
    pub(crate) fn has(&self, name: &str) -> bool {
        self.any || self.names.contains(&name.to_lowercase())
    }
}

impl Intake {
    /// Notes that a row, or a whole file, could not be read and nothing is known of it.
    pub(crate) fn lose(&mut self, file: &str) {
        match file {
            "lines.csv" | "switches.csv" | "transformers.csv" | "regulators.csv" => {
                self.unread.branches = true;
            }
            "loads.csv" => self.unread.loads = true,
            "capacitors.csv" => self.unread.capacitors = true,
            "profiles.csv" => self.unread.profiles = true,
            "source.csv" => self.unread.supply = true,
            "constructions.csv" => self.unread.constructions = true,
            "matrices.csv" => {
                self.unread.constructions = true;
                self.unread_elements = true;
            }
            "conductors.csv" => self.unread_wires.add(None),
            "spacings.csv" => self.unread_spacings.add(None),
            _ => {}
        }
    }

    /// The place of a fault that belongs to a file as a whole.
    pub(crate) fn whole_file(&self, file: FileId) -> Option<Place> {
        self.sources.file(file).map(|f| place_of_file(&f.name))
    }
}

/// A place that names a file only.
pub(crate) fn place_of_file(name: &str) -> Place {
    Place { file: name.to_owned(), row: 0, column: None, cell: None, found: None, row_text: None }
}
