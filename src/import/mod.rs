//! From a folder of CSV files to a [`crate::network::Draft`], with every fault of every cell.
//!
//! `text` decodes a file, `records` splits it, and `table` gives its rows, whose cells know where
//! they stand; `header` finds the columns a `schema` declares, and `row` reads cells as names,
//! numbers, words and conductors. Each kind of file has a module of its own that declares its
//! columns and makes its records; `folder` calls them all.

mod capacitors;
mod constructions;
mod folder;
mod header;
mod lines;
mod loads;
mod matrices;
mod meters;
mod names;
mod nodes;
mod number;
mod phases;
mod records;
mod regulators;
mod row;
mod schema;
mod source;
mod study;
mod switches;
mod table;
mod text;
mod transformers;
mod unsupported;
mod wires;
mod words;

use crate::catalog::Catalog;
use crate::diagnostic::{Diagnostics, FileId, Place, Sources};
use crate::network::Draft;

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
}

impl Intake {
    /// The place of a fault that belongs to a file as a whole.
    pub(crate) fn whole_file(&self, file: FileId) -> Option<Place> {
        self.sources.file(file).map(|f| place_of_file(&f.name))
    }
}

/// A place that names a file only.
pub(crate) fn place_of_file(name: &str) -> Place {
    Place { file: name.to_owned(), row: 0, column: None, cell: None, found: None, row_text: None }
}
