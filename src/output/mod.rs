//! From a result to text, JSON or CSV: one result, one table, many writers.

mod allocation;
mod check;
mod csv;
mod diagnostics;
mod files;
mod flow;
mod line;
mod start;
mod table;

pub use allocation::{allocation_json, allocation_text, loads_csv, meters_csv, meters_text, unmet_text};
pub use check::summary_text;
pub use csv::guarded;
pub use diagnostics::{diagnostics_json, diagnostics_lines, diagnostics_text};
pub use files::{Folder, write_file};
pub use flow::{Length, flow_csv, flow_json, flow_text, loadability_text, no_solution_text};
pub use line::{construction_text, drop_text, json_rows, matrix_rows, rows_csv, sizes_text, wires_text};
pub use start::{cannot_start_text, start_csv, start_json, start_text, starters_text};
pub use table::{Align, Cell, Colour, Column, Table, WIDTH};
