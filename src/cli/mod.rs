//! The command line: arguments, one function a command, messages and exit codes.

mod allocate;
mod args;
mod check;
mod flow;
mod lengths;
mod line;
mod screen;
mod start;

use std::process::ExitCode;

use clap::Parser;

use args::{Arguments, Command};
pub use screen::Screen;

/// How a run ended; the exit status of the program.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Outcome {
    /// Done; results are good.
    Done,
    /// Solved, but a limit of the study is exceeded and `--strict` was given.
    LimitExceeded,
    /// The input or the command line is wrong.
    WrongInput,
    /// No solution.
    NoSolution,
}

impl From<Outcome> for ExitCode {
    fn from(outcome: Outcome) -> ExitCode {
        ExitCode::from(match outcome {
            Outcome::Done => 0,
            Outcome::LimitExceeded => 1,
            Outcome::WrongInput => 2,
            Outcome::NoSolution => 3,
        })
    }
}

/// Runs the command that the arguments name.
pub fn run() -> ExitCode {
    let arguments = match Arguments::try_parse() {
        Ok(arguments) => arguments,
        Err(message) => {
            let wrong = message.use_stderr();
            // A reader of a pipe may be gone; there is then nobody to tell.
            let _ = message.print();
            return if wrong { Outcome::WrongInput.into() } else { ExitCode::SUCCESS };
        }
    };
    let mut screen = Screen::new();
    let outcome = match arguments.command {
        Command::Check(options) => check::check(&options, &mut screen),
        Command::Flow(options) => flow::flow(&options, &mut screen),
        Command::Allocate(options) => allocate::allocate(&options, &mut screen),
        Command::Start(options) => start::start(&options, &mut screen),
        Command::Line(options) => line::line(&options, &mut screen),
    };
    if let Some(error) = screen.failure() {
        let text = format!("error: standard output cannot be written: {error}\n");
        screen.tell(&text);
        return Outcome::WrongInput.into();
    }
    outcome.into()
}
