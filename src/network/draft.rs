//! A network as it was written down: records with names instead of indices, not yet checked
//! against each other. Readers and programs fill a [`Draft`]; [`super::build`] turns it into a
//! [`super::Network`] or says all that is wrong with it.
//!
//! Quantities are SI (volts, amperes, ohms, siemens, watts, metres, radians, per unit as a plain
//! ratio). Each record keeps its [`Origin`] so that a fault can be shown where it was written.

use std::collections::HashSet;
use std::sync::Arc;

use super::conductor::{Conductors, Connection};
use super::generator::{CurvePoint, Priority};
use super::load::LoadModel;
use super::meter::{MeterRecord, ShareRecord};
use super::motor::MotorState;
use super::profile::Profiles;
use super::study::Study;
use super::transformer::VectorGroup;
use crate::diagnostic::{Origin, Sources};
use crate::machine::{FitItem, Motor as Machine, Starter};
use crate::math::{Complex64, PhaseMatrix};

/// A name from the user's files, trimmed; cheap to clone.
pub type Name = Arc<str>;

/// Everything read from one network folder.
#[derive(Debug, Clone, Default)]
pub struct Draft {
    /// Files the records came from; empty for a draft made in code.
    pub sources: Sources,
    /// Settings.
    pub study: Study,
    /// Supply points; a valid network has exactly one.
    pub supplies: Vec<SupplyRecord>,
    /// Nodes with data of their own.
    pub nodes: Vec<NodeRecord>,
    /// Line constructions: impedance and charging per metre for one set of conductors each.
    pub constructions: Vec<Construction>,
    /// Lines.
    pub lines: Vec<LineRecord>,
    /// Switches.
    pub switches: Vec<SwitchRecord>,
    /// Transformers.
    pub transformers: Vec<TransformerRecord>,
    /// Regulator units; those with the same ends form one bank.
    pub regulators: Vec<RegulatorRecord>,
    /// Loads.
    pub loads: Vec<LoadRecord>,
    /// Capacitors.
    pub capacitors: Vec<CapacitorRecord>,
    /// Meters: readings that loads with a share are allocated to meet.
    pub meters: Vec<MeterRecord>,
    /// Shares of loads, by their names.
    pub shares: Vec<ShareRecord>,
    /// True where rows of meters or loads had faults that were reported: what lacks because of
    /// them is then not reported as well.
    pub metering_faulty: bool,
    /// Generators.
    pub generators: Vec<GeneratorRecord>,
    /// Curves of generators.
    pub curves: Vec<CurveRecord>,
    /// Motors.
    pub motors: Vec<MotorRecord>,
    /// Profiles by time.
    pub profiles: Profiles,
    /// Time of the profiles that loads and capacitors are taken at; `None`: as their rows say.
    pub at: Option<Name>,
    /// What was given and could not be read.
    pub unread: Unread,
}

/// What was given but could not be read: each was told as a fault where it stands, and what is
/// missing for want of it is not told as well.
#[derive(Debug, Clone, Default)]
pub struct Unread {
    /// Nodes named by branches that could not be read.
    pub nodes: HashSet<Name>,
    /// True where the ends of such a branch are not known either.
    pub branches: bool,
    /// Lines that could not be read.
    pub lines: HashSet<Name>,
    /// True where a source could not be read.
    pub supply: bool,
    /// True where a load could not be read.
    pub loads: bool,
    /// True where a capacitor could not be read.
    pub capacitors: bool,
    /// True where the profiles could not be read.
    pub profiles: bool,
    /// True where a construction could not be read.
    pub constructions: bool,
}

impl Unread {
    /// True where a branch that could not be read may join the node.
    pub fn joins(&self, node: &str) -> bool {
        self.branches || self.nodes.contains(node)
    }

    /// True where there may be loads beyond those that were read and are fed.
    pub fn may_draw(&self) -> bool {
        self.loads || self.branches || !self.nodes.is_empty()
    }
}

/// Fault level of the supply, one kind of fault.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FaultLevel {
    /// Fault level `sqrt(3) U I` in volt-amperes, `U` nominal line-to-line, `I` fault current.
    pub volt_amperes: f64,
    /// X/R of the fault loop.
    pub x_over_r: f64,
}

/// One row of `source.csv`.
#[derive(Debug, Clone)]
pub struct SupplyRecord {
    /// Node fed.
    pub node: Name,
    /// Nominal line-to-line voltage, volts.
    pub nominal_volts: f64,
    /// Held voltage of each phase behind the source impedance, per unit of nominal.
    pub held_pu: [f64; 3],
    /// Angle of phase a, radians.
    pub angle_rad: f64,
    /// Three-phase fault level; `None`: a stiff source.
    pub three_phase: Option<FaultLevel>,
    /// Single-phase-to-earth fault level; `None`: as three-phase.
    pub single_phase: Option<FaultLevel>,
    /// Earthing resistance of the source neutral, ohms.
    pub earth_ohm: f64,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// One row of `nodes.csv`.
#[derive(Debug, Clone)]
pub struct NodeRecord {
    /// Node.
    pub node: Name,
    /// Plane coordinates for drawing, any unit.
    pub xy: Option<[f64; 2]>,
    /// Resistance of an electrode from the node's neutral to remote earth, ohms.
    pub earth_ohm: Option<f64>,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// Impedance and charging of a line construction per metre, for one set of conductors.
#[derive(Debug, Clone)]
pub struct Construction {
    /// Name; several entries may share it with different `conductors`.
    pub name: Name,
    /// Conductors the matrices hold.
    pub conductors: Conductors,
    /// Series impedance, ohms per metre, conductor order a, b, c, n; zero outside `conductors`.
    pub z_per_m: PhaseMatrix,
    /// Shunt admittance, siemens per metre, same order.
    pub y_per_m: PhaseMatrix,
    /// Current rating of the phase conductors, amperes, where known.
    pub rating_amps: Option<f64>,
    /// Where it was written (its first row).
    pub origin: Option<Origin>,
}

/// Whether a switch or line is closed.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum SwitchState {
    /// Carries current.
    #[default]
    Closed,
    /// Carries none.
    Open,
}

/// One row of `lines.csv`.
#[derive(Debug, Clone)]
pub struct LineRecord {
    /// Name of the line.
    pub line: Name,
    /// Node at its from end.
    pub from: Name,
    /// Node at its to end.
    pub to: Name,
    /// Conductors carried.
    pub conductors: Conductors,
    /// Length, metres.
    pub length_m: f64,
    /// Construction by name.
    pub construction: Name,
    /// Equal circuits in parallel.
    pub sets: u32,
    /// Current rating of all sets together, amperes; `None`: the construction's.
    pub rating_amps: Option<f64>,
    /// Closed or open.
    pub state: SwitchState,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// One row of `switches.csv`.
#[derive(Debug, Clone)]
pub struct SwitchRecord {
    /// Name of the switch.
    pub switch: Name,
    /// Node at its from end.
    pub from: Name,
    /// Node at its to end.
    pub to: Name,
    /// Conductors switched.
    pub conductors: Conductors,
    /// Closed or open.
    pub state: SwitchState,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// One row of `transformers.csv`.
#[derive(Debug, Clone)]
pub struct TransformerRecord {
    /// Name of the transformer or bank.
    pub transformer: Name,
    /// Node at its from side.
    pub from: Name,
    /// Node at its to side.
    pub to: Name,
    /// Rating of the bank, volt-amperes.
    pub rated_va: f64,
    /// Rated voltage of the from side, volts: line-to-line, for a single-phase unit the winding's own.
    pub from_volts: f64,
    /// Rated voltage of the to side, volts, likewise.
    pub to_volts: f64,
    /// Winding connection.
    pub group: VectorGroup,
    /// Terminals of a single-phase unit on its from and its to side; `None` for a three-phase bank.
    pub terminals: Option<[Connection; 2]>,
    /// Short-circuit resistance, per unit on the rating.
    pub r_pu: f64,
    /// Short-circuit reactance, per unit on the rating.
    pub x_pu: f64,
    /// No-load losses of the bank, watts.
    pub no_load_watts: f64,
    /// Magnetising current (its reactive part), per unit of rated current.
    pub magnetizing_pu: f64,
    /// Raise of the to voltage by a tap on the to winding, per unit (0.025 for 2.5 percent).
    pub tap_pu: f64,
    /// Turns added by a tap on the from winding, per unit.
    pub from_tap_pu: f64,
    /// Earthing of the from-side neutral where its node has no `n`, ohms; `None`: not given (solid).
    pub from_earth_ohm: Option<Complex64>,
    /// Earthing of the to-side neutral where its node has no `n`, ohms; `None`: not given (solid).
    pub to_earth_ohm: Option<Complex64>,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// What a regulator unit is regulated against.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Across {
    /// The neutral, or earth where the node has none.
    Neutral,
    /// Another phase: a line-to-line unit.
    Phase(super::conductor::Conductor),
}

/// How the phases of one row move.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum BankMode {
    /// Each by its own control.
    #[default]
    Each,
    /// All by the control of this phase.
    Gang(super::conductor::Conductor),
}

/// What a control does while power flows from the regulated side to the source side.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub enum ReverseFlow {
    /// It stays where it is.
    #[default]
    Hold,
    /// It goes to neutral.
    Neutral,
    /// It regulates the source side, without compensation.
    Regulate {
        /// Voltage held at the relay then, volts.
        set_volts: f64,
    },
    /// It goes on as if power flowed forward.
    Ignore,
}

/// Line-drop compensation and set point of an automatic regulator, as on its panel.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct RegulatorControl {
    /// Voltage held at the relay, volts.
    pub set_volts: Option<f64>,
    /// Whole bandwidth at the relay, volts.
    pub band_volts: Option<f64>,
    /// Ratio of the potential transformer.
    pub pt_ratio: Option<f64>,
    /// Primary rating of the current transformer, amperes.
    pub ct_amps: Option<f64>,
    /// Compensator resistance setting, volts at rated current.
    pub r_volts: f64,
    /// Compensator reactance setting, volts at rated current.
    pub x_volts: f64,
    /// Highest voltage at the regulator's own terminals, for the first customer, volts at the relay.
    pub limit_volts: Option<f64>,
    /// How the phases of the row move.
    pub mode: BankMode,
    /// What the control does when power flows backwards.
    pub reverse: ReverseFlow,
}

/// One row of `regulators.csv`.
#[derive(Debug, Clone)]
pub struct RegulatorRecord {
    /// Name of the unit or bank.
    pub regulator: Name,
    /// Node at its source side.
    pub from: Name,
    /// Node at its regulated side.
    pub to: Name,
    /// Phases regulated.
    pub phases: Conductors,
    /// What each of them is regulated against.
    pub across: Across,
    /// Tap position of phases a, b, c in steps; `None`: automatic.
    pub taps: [Option<i32>; 3],
    /// Change of voltage of one step, per unit.
    pub step_pu: f64,
    /// Steps each way.
    pub steps: u32,
    /// Control settings for automatic taps.
    pub control: RegulatorControl,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// Where a load was written to be.
#[derive(Debug, Clone)]
pub enum LoadSite {
    /// At a node.
    Node(Name),
    /// Spread evenly along a line: half at each end.
    Line(Name),
}

/// One row of `loads.csv`.
#[derive(Debug, Clone)]
pub struct LoadRecord {
    /// Name of the load.
    pub load: Name,
    /// Node or line.
    pub site: LoadSite,
    /// Between which conductors.
    pub connection: Connection,
    /// Active power of the row, watts.
    pub watts: f64,
    /// Reactive power of the row, vars, positive inductive.
    pub vars: f64,
    /// How it changes with voltage.
    pub model: LoadModel,
    /// Name of its profile.
    pub profile: Option<Name>,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// What switches a capacitor.
#[derive(Debug, Clone, PartialEq, Default)]
pub enum CapacitorControl {
    /// Nothing: it stays as written.
    #[default]
    Fixed,
    /// Voltage at its node: on below `on_volts`, off above `off_volts`, both at the relay.
    Voltage {
        /// Switches on below this, volts at the relay.
        on_volts: f64,
        /// Switches off above this, volts at the relay.
        off_volts: f64,
        /// Ratio of the potential transformer; 1 for none.
        pt_ratio: f64,
        /// One phase (to the neutral, or to earth without one) or two (across).
        across: Connection,
    },
    /// Reactive power into a line at its source end: on above `on_vars`, off below `off_vars`.
    Kvar {
        /// Switches on above this, vars.
        on_vars: f64,
        /// Switches off below this, vars.
        off_vars: f64,
        /// Where it is measured.
        sense: Sense,
    },
    /// Current in a line at its source end: on above `on_amps`, off below `off_amps`.
    Current {
        /// Switches on above this, amperes.
        on_amps: f64,
        /// Switches off below this, amperes.
        off_amps: f64,
        /// Where it is measured.
        sense: Sense,
    },
    /// A profile, by name: closed where its value is 0.5 or more.
    Profile(Name),
}

/// Where a capacitor's control measures.
#[derive(Debug, Clone, PartialEq)]
pub struct Sense {
    /// Line.
    pub line: Name,
    /// Phases: their reactive powers are added up, of their currents the greatest counts.
    pub phases: Conductors,
}

/// What sets the reactive power of a generator, as written.
#[derive(Debug, Clone, PartialEq)]
pub enum ReactiveRecord {
    /// Constant, vars, positive where delivered.
    Held(f64),
    /// In proportion to the active power.
    PerWatt(f64),
    /// By a curve of that name.
    VoltVar(Name),
}

/// One row of `generators.csv`.
#[derive(Debug, Clone)]
pub struct GeneratorRecord {
    /// Name of the generator.
    pub generator: Name,
    /// Node.
    pub node: Name,
    /// Between which conductors.
    pub connection: Connection,
    /// Active power it could deliver, watts.
    pub watts: f64,
    /// What sets the reactive power.
    pub reactive: ReactiveRecord,
    /// Volt-watt curve by name.
    pub volt_watt: Option<Name>,
    /// Rating, volt-amperes.
    pub rated_va: Option<f64>,
    /// What gives way at the rating.
    pub priority: Priority,
    /// Closed or open.
    pub state: SwitchState,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// A curve of `curves.csv`.
#[derive(Debug, Clone)]
pub struct CurveRecord {
    /// Name of the curve.
    pub curve: Name,
    /// Its points, rising in voltage and not in output.
    pub points: Vec<CurvePoint>,
    /// Where its first point was written.
    pub origin: Option<Origin>,
}

/// One row of `motors.csv`, its circuit found.
#[derive(Debug, Clone)]
pub struct MotorRecord {
    /// Name of the motor.
    pub motor: Name,
    /// Node.
    pub node: Name,
    /// Equal motors side by side.
    pub count: u32,
    /// The machine and its load.
    pub machine: Machine,
    /// How it is started.
    pub starter: Starter,
    /// Whether it runs.
    pub state: MotorState,
    /// Starts an hour that are planned.
    pub starts_per_hour: Option<f64>,
    /// Longest time at standstill under full voltage, seconds.
    pub locked_rotor_limit_s: Option<f64>,
    /// What tables filled in: quantity, value, source.
    pub filled: Vec<(&'static str, f64, String)>,
    /// How well the circuit meets the ratings.
    pub fit: Vec<FitItem>,
    /// Where it was written.
    pub origin: Option<Origin>,
}

/// One row of `capacitors.csv`.
#[derive(Debug, Clone)]
pub struct CapacitorRecord {
    /// Name of the capacitor.
    pub capacitor: Name,
    /// Node.
    pub node: Name,
    /// Between which conductors.
    pub connection: Connection,
    /// Reactive power of the row at rated voltage, vars, positive.
    pub vars: f64,
    /// Rated voltage across each unit, volts; `None`: the node's nominal.
    pub rated_volts: Option<f64>,
    /// Closed or open; of a switched one the state it is found in.
    pub state: SwitchState,
    /// What switches it.
    pub control: CapacitorControl,
    /// Delay of the control, seconds: of several that would switch the shortest goes first.
    pub delay_s: f64,
    /// Where it was written.
    pub origin: Option<Origin>,
}
