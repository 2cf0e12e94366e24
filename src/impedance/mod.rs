//! From wires and geometry to impedance and admittance matrices per metre.
//!
//! A [`Layout`] lists every metallic conductor of a line with its place and data; [`compute`]
//! gives the primitive matrices by Carson's equations and brings them to the conductors a, b, c, n
//! (slots 0 to 3) that the line carries. Cables, conduit, bundles and sequence impedances are
//! brought to such a layout or straight to matrices in files of their own.

mod cable;
mod carson;
mod evaluate;
mod given;
mod layout;
mod recipe;
mod reduce;
mod shunt;

pub use cable::{Concentric, Tape, concentric_wires, tape_wires};
pub use carson::{Conditions, EarthReturn, earth_return_ohm_per_m, equivalent_depth_m};
pub use evaluate::evaluate;
pub use given::{Sequence, conduit, sequence};
pub use layout::{GeometryFault, Layout, LineConstants, Target, Wire, compute};
pub use recipe::{Computed, Kind, Recipe, RecipeFault, Spacing};
pub use reduce::to_slots;
pub use shunt::{EPSILON_0, concentric_siemens_per_m, tape_siemens_per_m};

/// Slot of the neutral in matrices over a, b, c, n.
pub const NEUTRAL: usize = 3;
