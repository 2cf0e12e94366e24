//! Arguments as typed.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand, ValueEnum};

/// Unbalanced feeder studies from a folder of CSV files: voltages, currents, neutral, losses.
#[derive(Debug, Parser)]
#[command(name = "fourwire", version, about, max_term_width = 100)]
pub(super) struct Arguments {
    #[command(subcommand)]
    pub command: Command,
}

/// What to do.
#[derive(Debug, Subcommand)]
pub(super) enum Command {
    /// Read a network folder and say all that is wrong with it, with file, row, column and mend.
    #[command(after_help = "Example: fourwire check networks/brindle-quarry\n\n\
        Exit status: 0 nothing is wrong (remarks are allowed), 2 something is.")]
    Check(Check),
    /// Solve a network: voltage at every node, current in every conductor, losses, limits exceeded.
    #[command(after_help = "Examples:\n  fourwire flow networks/brindle-quarry\n  \
        fourwire flow networks/brindle-quarry --format csv --out results\n\n\
        Exit status: 0 solved, 1 solved but a limit is exceeded and --strict was given,\n\
        2 the input or the command line is wrong, 3 no solution.")]
    Flow(Flow),
}

/// Options of `check`.
#[derive(Debug, Args)]
pub(super) struct Check {
    /// Folder of the network's CSV files
    pub folder: PathBuf,
    /// How to print what is wrong
    #[arg(long, value_enum, default_value_t = CheckFormat::Text)]
    pub format: CheckFormat,
}

/// Looks of `check`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum CheckFormat {
    /// With the row and a mark under the cell, and a summary of what was read
    Text,
    /// One line a fault, for editors
    Lines,
    /// Faults and summary as one JSON object
    Json,
}

/// Options of `flow`.
#[derive(Debug, Args)]
pub(super) struct Flow {
    /// Folder of the network's CSV files
    pub folder: PathBuf,
    /// Form of the results
    #[arg(long, value_enum, default_value_t = FlowFormat::Text)]
    pub format: FlowFormat,
    /// Folder to write the results to (made where it is not there); needed for csv
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// End with status 1 where a limit of study.csv is exceeded
    #[arg(long)]
    pub strict: bool,
    /// Show every node, branch and finding instead of the worst
    #[arg(long)]
    pub all: bool,
    /// Find how far all loads can grow until there is no solution, and where the feeder gives way
    #[arg(long)]
    pub loadability: bool,
}

/// Forms of the results of `flow`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum FlowFormat {
    /// A page for people
    Text,
    /// One JSON object
    Json,
    /// One CSV file a list
    Csv,
}
