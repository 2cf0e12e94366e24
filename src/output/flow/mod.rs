//! Results of `flow`: text for people, JSON and CSV for programs.

mod files;
mod text;

pub use files::{flow_csv, flow_json};
pub use text::{Length, flow_text};
