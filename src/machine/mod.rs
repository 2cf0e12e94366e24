//! Induction motors: from the nameplate to an equivalent circuit, running on unbalanced voltages, starting.
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
mod load;
mod nameplate;
mod resolve;

pub use circuit::{Cage, Circuit, Matrix3, MechanicalLoss, Operation, Peak, Phases, SequencePart, sequence_matrix};
pub use fit::{Fit, FitFault, FitItem, REFUSED_ABOVE_PERCENT, balanced, check, fit};
pub use load::{DrivenLoad, Shape};
pub use nameplate::{Design, Nameplate, NameplateFault, Origin, Rated, Ratings};
