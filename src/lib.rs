//! Unbalanced three-phase feeder studies: voltages, currents, neutral, losses, from a folder of CSV files.
//!
//! A network goes through these hands, each a module:
//!
//! | step | module | gives |
//! |---|---|---|
//! | wires and geometry to matrices | [`catalog`], [`impedance`] | ohms and siemens per metre |
//! | files to records | [`import`] | [`network::Draft`], with every fault of every cell |
//! | records to a checked network | [`network`] | [`network::Network`], with every fault of the whole |
//! | motor nameplate to circuit, running and run-up | [`machine`] | [`machine::Circuit`], [`machine::RunUp`] |
//! | network to phasors | [`solver`] | [`solver::Solution`], checked by code of its own |
//! | questions | [`study`] | result records: flow, loadability, line, summary |
//! | answers shown | [`output`], [`cli`] | text, JSON, CSV |
//!
//! ```
//! use fourwire::{import::read_files, network::build, solver::{Settings, Status, solve}};
//!
//! let files = [
//!     ("source.csv", "node,kv\nS,0.4\n"),
//!     ("constructions.csv", "construction,kind,phase_conductor,neutral_conductor,spacing\ncable,bundle,16 mm2 copper,16 mm2 copper,core\n"),
//!     ("spacings.csv", "spacing,position,x_m,y_m\ncore,a,0,-0.7\ncore,n,0.007,-0.7\n"),
//!     ("lines.csv", "line,from,to,phases,length_m,construction\nL1,S,house,an,60,cable\n"),
//!     ("loads.csv", "load,node,phases,kw,pf\nhouse,house,an,6,0.95\n"),
//! ];
//! let reading = read_files(files.map(|(name, text)| (name.to_string(), text.into())).to_vec());
//! let network = build(&reading.draft).network.expect("nothing is wrong with these files");
//! let solution = solve(&network, &Settings::default());
//! assert_eq!(solution.status, Status::Converged);
//! let [a, _, _, n]: [_; 4] = solution.volts[1].into();
//! assert!((a - n).norm() < 230.9 && (a - n).norm() > 220.0);
//! ```
//!
//! # Conventions
//!
//! Inside everything is SI: volts, amperes, ohms, siemens, watts, metres, radians; phasors are RMS.
//! Conductors stand in the order a, b, c, n in every vector and matrix; b lags a by 120 degrees.
//! Voltages are to remote earth. Currents are positive from `from` to `to`, at both ends. Inductive
//! reactive power is positive.
#![deny(clippy::print_stdout, clippy::print_stderr)]
#![cfg_attr(not(test), warn(clippy::unwrap_used))]

pub mod catalog;
pub mod cli;
pub mod diagnostic;
pub mod impedance;
pub mod import;
pub mod machine;
pub mod math;
pub mod network;
pub mod output;
pub mod solver;
pub mod study;
pub mod units;
