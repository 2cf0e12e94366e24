//! What a feeder is made of: the records as written ([`Draft`]), the checked network
//! ([`Network`]), and the one way from the first to the second ([`build`]).

mod branches;
mod build;
mod capacitors;
mod carry;
mod conductor;
mod draft;
mod earth;
mod generator;
mod graph;
mod load;
mod meter;
mod metering;
mod model;
mod motor;
mod plausible;
mod profile;
mod regulator;
mod remainder;
mod ring;
mod shunts;
mod star_point;
mod study;
mod supply;
mod transformer;
mod validate;
mod zone;

pub use build::{Built, build};
pub use conductor::{Conductor, Conductors, Connection};
pub use draft::{
    Across, BankMode, CapacitorControl, CapacitorRecord, Construction, CurveRecord, Draft, FaultLevel,
    GeneratorRecord, LineRecord, LoadRecord, LoadSite, MotorRecord, Name, NodeRecord, ReactiveRecord,
    RegulatorControl, RegulatorRecord, ReverseFlow, Sense, SupplyRecord, SwitchRecord, SwitchState,
    TransformerRecord, Unread,
};
pub use generator::{Curve, CurvePoint, Generator, Limited, Output, Priority, Reactive};
pub use load::{Capacitor, CapacitorBank, CapacitorSwitch, Load, LoadModel, LoadPlace};
pub use meter::{
    Channel, Meter, MeterPlace, MeterRecord, MeterSite, ReactiveReading, Reading, Share, ShareBasis,
    ShareRecord,
};
pub use model::{
    Branch, BranchId, BranchKind, ConstructionId, End, Feed, Line, Network, Node, NodeId, SOLID_EARTH_OHM,
    Stay, StayPlace, Tie,
};
pub use motor::{Motor, MotorState};
pub use profile::{ProfileRecord, Profiles};
pub use regulator::{Regulator, RegulatorUnit, TapMode};
pub use star_point::{WeakStarPoint, weak_star_points};
pub use study::Study;
pub use supply::Supply;
pub use transformer::{BOND_OHM, NeutralPoint, Transformer, VectorGroup, Winding};
