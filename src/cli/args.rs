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
#[allow(clippy::large_enum_variant)] // made once
pub(super) enum Command {
    /// Read a network folder and say all that is wrong with it, with file, row, column and mend.
    #[command(after_help = "Example: fourwire check networks/brindle-quarry\n\n\
        Exit status: 0 nothing is wrong (remarks are allowed), 2 something is.")]
    Check(Check),
    /// Solve a network: voltage at every node, current in every conductor, losses, limits exceeded.
    #[command(after_help = "Examples:\n  fourwire flow networks/brindle-quarry\n  \
        fourwire flow networks/brindle-quarry --format csv --out results\n\n\
        Exit status: 0 solved, 1 solved, --strict, a limit is exceeded or a control hunts,\n\
        2 the input or the command line is wrong, 3 no solution.")]
    Flow(Flow),
    /// Share metered demand over the loads that have a share, until the flow meets every meter.
    #[command(after_help = "Examples:\n  fourwire allocate networks/ferrow-lane\n  \
        fourwire allocate networks/ferrow-lane --out results\n\n\
        Exit status: 0 every meter is met, 2 the input or the command line is wrong,\n\
        3 no solution, or a meter that cannot be met.")]
    Allocate(Allocate),
    /// Start a motor: the dip at every node, the run-up, what holds and what fails.
    #[command(after_help = "Examples:\n  fourwire start networks/larkfoot-valley --motor \"Head pump\"\n  \
        fourwire start networks/larkfoot-valley --motor \"Head pump\" --compare\n\n\
        Exit status: 0 computed, 1 --strict and the start fails, 2 the input or the command line is\n\
        wrong, 3 no solution.")]
    Start(Start),
    /// Impedance from wires and geometry, the table of wires, and drop and loss of one circuit.
    #[command(after_help = "Examples:\n  fourwire line --list \"4/0\"\n  \
        fourwire line --construction trunk336 networks/larkfoot-valley\n  \
        fourwire line --phase \"336.4 26/7 ACSR\" --neutral \"4/0 6/1 ACSR\" --per mi \\\n    \
        --spacing \"a 0 29, b 2.5 29, c 7 29, n 4 25 ft\"\n  \
        fourwire line --phase \"1 AWG copper NEC\" --conduit aluminium --circuit three \\\n    \
        --volts 240 --amps 100 --pf 0.85 --length 150ft --limit 3")]
    Line(Line),
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

/// Options of `start`.
#[derive(Debug, Args)]
pub(super) struct Start {
    /// Folder of the network's CSV files
    pub folder: PathBuf,
    /// Name of the motor in motors.csv
    #[arg(long, value_name = "NAME")]
    pub motor: String,
    /// Another starter than that of motors.csv, with settings of common practice
    #[arg(long, value_enum)]
    pub starter: Option<StarterChoice>,
    /// All starters side by side
    #[arg(long, conflicts_with_all = ["starter", "format", "out", "strict"])]
    pub compare: bool,
    /// Form of the results
    #[arg(long, value_enum, default_value_t = FlowFormat::Text)]
    pub format: FlowFormat,
    /// Folder to write the results to (made where it is not there); needed for csv
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// End with status 1 where the motor does not get up to speed or a limit is exceeded
    #[arg(long)]
    pub strict: bool,
}

/// Starters that can be tried.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum StarterChoice {
    /// Straight on the line
    Direct,
    /// Star first, then delta, at 90 % of synchronous speed
    StarDelta,
    /// Autotransformer, 50 % tap
    #[value(name = "auto-50")]
    Auto50,
    /// Autotransformer, 65 % tap
    #[value(name = "auto-65")]
    Auto65,
    /// Autotransformer, 80 % tap
    #[value(name = "auto-80")]
    Auto80,
    /// Half of the winding first
    PartWinding,
    /// Soft starter, current limit 350 % of full load
    Soft,
    /// Variable-frequency drive, current limit 150 % of full load
    Drive,
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
    /// Solve this time of profiles.csv, written as there (without it: every load at full value)
    #[arg(long, value_name = "TIME")]
    pub at: Option<String>,
    /// End with status 1 where a limit of study.csv is exceeded, or a control hunts
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

/// Options of `allocate`.
#[derive(Debug, Args)]
pub(super) struct Allocate {
    /// Folder of the network's CSV files, with meters.csv
    pub folder: PathBuf,
    /// Form of the table that is printed
    #[arg(long, value_enum, default_value_t = FlowFormat::Text)]
    pub format: FlowFormat,
    /// Folder to write the loads (loads.csv, ready for a network) and the readings (meters.csv) to
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
}

/// Options of `line`.
#[derive(Debug, Args)]
pub(super) struct Line {
    /// Folder of the network whose construction is meant
    pub folder: Option<PathBuf>,
    /// Search the table of wires; alone it lists all. With a folder, its conductors.csv too
    #[arg(long, value_name = "TEXT", num_args = 0..=1, default_missing_value = "")]
    pub list: Option<String>,
    /// Construction of the folder's constructions.csv
    #[arg(long, value_name = "ID")]
    pub construction: Option<String>,
    /// Conductors carried, such as abcn or an
    #[arg(long, value_name = "LETTERS")]
    pub phases: Option<String>,
    /// Wire or cable of the phases, as in the table
    #[arg(long, value_name = "WIRE")]
    pub phase: Option<String>,
    /// Wire of the neutral
    #[arg(long, value_name = "WIRE")]
    pub neutral: Option<String>,
    /// Places of the conductors, such as "a 0 29, b 2.5 29, c 7 29, n 4 25 ft" (or m)
    #[arg(long, value_name = "PLACES")]
    pub spacing: Option<String>,
    /// Kind of construction (default: conduit with --conduit, else overhead)
    #[arg(long, value_enum)]
    pub kind: Option<KindWord>,
    /// Conduit around building wire
    #[arg(long, value_enum)]
    pub conduit: Option<ConduitWord>,
    /// Frequency, hertz
    #[arg(long, default_value_t = 60.0, value_name = "HZ", value_parser = above_zero)]
    pub frequency: f64,
    /// Earth resistivity, ohm metre
    #[arg(long, default_value_t = 100.0, value_name = "OHM_M", value_parser = above_zero)]
    pub earth: f64,
    /// Conductor temperature, degrees Celsius (default 50; 75 in conduit)
    #[arg(long, value_name = "C", allow_negative_numbers = true)]
    pub temperature: Option<f64>,
    /// Length that impedances are shown for
    #[arg(long, value_enum, default_value_t = PerWord::Km)]
    pub per: PerWord,
    /// Current of the circuit, amperes
    #[arg(long, allow_negative_numbers = true)]
    pub amps: Option<f64>,
    /// Length of the circuit one way, with its unit: 150ft, 60m, 1.2km
    #[arg(long, value_name = "LENGTH")]
    pub length: Option<String>,
    /// Voltage at the sending end (line to line for three phases)
    #[arg(long, allow_negative_numbers = true)]
    pub volts: Option<f64>,
    /// Power factor, lagging
    #[arg(long, default_value_t = 0.85, allow_negative_numbers = true)]
    pub pf: f64,
    /// How the circuit returns
    #[arg(long, value_enum, default_value_t = CircuitWord::Single)]
    pub circuit: CircuitWord,
    /// Drop limit, percent: shows all sizes and the least that will do
    #[arg(long, value_name = "PERCENT", value_parser = above_zero)]
    pub limit: Option<f64>,
    /// Ambient temperature for the ratings of sizes, degrees Celsius
    #[arg(long, default_value_t = 30.0, value_name = "C", allow_negative_numbers = true)]
    pub ambient: f64,
    /// Circuits grouped together, for the ratings of sizes
    #[arg(long, default_value_t = 1, value_name = "N", value_parser = clap::value_parser!(u32).range(1..=100))]
    pub grouped: u32,
    /// Price of a kilowatt-hour, for the cost of the loss
    #[arg(long, value_name = "PRICE", value_parser = above_zero)]
    pub price: Option<f64>,
    /// Form of the result
    #[arg(long, value_enum, default_value_t = LineFormat::Text)]
    pub format: LineFormat,
}

/// A number above zero.
fn above_zero(text: &str) -> Result<f64, String> {
    match text.parse::<f64>() {
        Ok(number) if number.is_finite() && number > 0.0 => Ok(number),
        _ => Err("expected a number above zero".to_string()),
    }
}

/// Kinds of construction.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum KindWord {
    /// Bare wires in the air
    Overhead,
    /// Concentric-neutral cables
    Concentric,
    /// Tape-shielded cables
    Tape,
    /// Building wire in conduit
    Conduit,
    /// Insulated cores by their spacing
    Bundle,
}

/// Conduits.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum ConduitWord {
    /// Plastic
    Pvc,
    /// Aluminium
    Aluminium,
    /// Steel
    Steel,
}

/// Lengths that impedances are shown for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum PerWord {
    /// Kilometre
    Km,
    /// Mile
    Mi,
    /// Thousand feet
    Kft,
}

/// Circuits of the desk calculation.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum CircuitWord {
    /// Single-phase, out and back
    Single,
    /// Three-phase, balanced
    Three,
    /// Direct current, out and back
    Dc,
}

impl From<CircuitWord> for crate::study::line::Circuit {
    fn from(word: CircuitWord) -> Self {
        match word {
            CircuitWord::Single => Self::Single,
            CircuitWord::Three => Self::Three,
            CircuitWord::Dc => Self::Dc,
        }
    }
}

/// Forms of the result of `line`.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum LineFormat {
    /// A page for people
    Text,
    /// One JSON object
    Json,
    /// One table: the last one asked for (sizes, drop, matrices or wires)
    Csv,
}
