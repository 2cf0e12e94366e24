//! Results of `flow`: text for people, JSON and CSV for programs.

mod files;
mod findings;
mod loadability;
mod text;
mod unsolved;

pub use files::{flow_csv, flow_json};
pub use loadability::loadability_text;
pub use text::{Length, flow_text};
pub use unsolved::no_solution_text;
