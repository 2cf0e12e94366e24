//! Induction motors: from the nameplate to an equivalent circuit, running on unbalanced voltages, starting.
//!
//! | step | takes | gives |
//! |---|---|---|
//! | [`Nameplate::resolve`] | what stands on the plate | [`Ratings`], with the source of everything filled in |
//! | [`fit()`] | ratings | [`Circuit`], with the error of every rating |
//! | [`Circuit::phase_matrix`] | slip | admittances of the three phases for a network |
//! | [`run`] | terminal voltages | slip, currents, losses, unbalance, derating |
//! | [`Coupling::seen`] | speed, time, voltages | what the feeder sees of a motor behind its starter |
//! | [`run_up`] | a starter and terminal voltages | speed, currents, energies in time; stall told |
//!
//! ```
//! use fourwire::machine::{Nameplate, fit};
//!
//! let plate = Nameplate {
//!     frequency_hz: 60.0, hp: Some(100.0), volts: Some(460.0), rpm: Some(1780.0), ..Nameplate::default()
//! };
//! let ratings = plate.resolve().expect("nothing contradicts");
//! let fitted = fit(&ratings).expect("a circuit fits");
//! // NFPA 70 Table 430.251(B): 725 A at standstill.
//! let standstill = fitted.item("locked_rotor_amps").unwrap();
//! assert!((standstill.obtained - 725.0).abs() < 22.0);
//! ```

mod circuit;
mod fit;
mod full_load;
mod load;
mod nameplate;
mod ode;
mod progress;
mod resolve;
mod running;
mod runup;
mod single_phase;
mod starter;

pub use circuit::{
    Cage, Circuit, Matrix3, MechanicalLoss, Operation, Peak, Phases, SequencePart, sequence_matrix,
};
pub use fit::{Fit, FitFault, FitItem, REFUSED_ABOVE_PERCENT, fit};
pub use full_load::{balanced, check};
pub use load::{DrivenLoad, Shape};
pub use nameplate::{Design, Nameplate, NameplateFault, Origin, Rated, Ratings};
pub use ode::{Advance, Ode, OdeFault, StepControl, Stop};
pub use progress::{Condition, Progress, net_nm};
pub use running::{CannotRun, Motor, Running, Unbalance, run, running_slip, unbalance};
pub use runup::{
    Energies, Finish, Instant, Outcome, RunUp, RunUpFault, RunUpSettings, StiffBus, Terminals, run_up,
};
pub use single_phase::{SinglePhaseMotor, SinglePhasePlate};
pub use starter::{ChangeOver, Coupling, Seen, Stage, Starter};
