//! Writes a generated feeder as a network folder: `cargo bench --bench generate -- 100000 FOLDER`.
#![allow(clippy::print_stdout, clippy::print_stderr)]

#[path = "../tests/support/feeder.rs"]
mod feeder;

use std::path::Path;
use std::process::ExitCode;

fn main() -> ExitCode {
    let arguments: Vec<String> = std::env::args().skip(1).filter(|a| a != "--bench").collect();
    let [count, folder] = arguments.as_slice() else {
        println!("cargo bench --bench generate -- NODES FOLDER writes a generated feeder");
        return ExitCode::SUCCESS;
    };
    let Ok(nodes) = count.parse::<usize>() else {
        eprintln!("{count} is no number of nodes");
        return ExitCode::FAILURE;
    };
    match feeder::write_folder(&feeder::feeder(nodes), Path::new(folder)) {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("{folder}: {error}");
            ExitCode::FAILURE
        }
    }
}
