//! Tables of wires and cables with the source of every row; lookup that forgives spelling.
//!
//! The tables are CSV files in `data/`, compiled in. Each row names its published `source` and its
//! `provenance` (`read` in the document, from `memory`, or `mixed`); both travel with whatever uses
//! the row.

mod ampacity;
mod cables;
mod conductor;
mod lookup;
pub mod motors;
mod tables;

pub use ampacity::{CAUTION, IecMethod, iec_rating_amps, nec_rating_amps, short_time_amps};
pub use cables::{ConcentricCable, ConduitKind, ConduitRow, TapeCable};
pub use conductor::{Conductor, Current, Family, Material, Resistance, at_temperature};
pub use lookup::LookupFault;
pub use tables::Catalog;
