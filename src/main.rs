//! Command line of fourwire: arguments to exit status.

use std::process::ExitCode;

fn main() -> ExitCode {
    fourwire::cli::run()
}
