//! Unbalanced three-phase feeder studies.
#![deny(clippy::print_stdout, clippy::print_stderr)]
#![cfg_attr(not(test), warn(clippy::unwrap_used))]

pub mod catalog;
pub mod cli;
pub mod diagnostic;
pub mod impedance;
pub mod import;
pub mod math;
pub mod network;
pub mod output;
pub mod solver;
pub mod study;
pub mod units;
