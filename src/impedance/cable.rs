//! Cables with a metallic screen: concentric strands or a tape.
//!
//! Kersting, Distribution System Modeling and Analysis, ch. 4: the screen is a conductor of its
//! own around its phase conductor, at the distance of its radius.

use super::layout::{Target, Wire};

/// A concentric-neutral cable.
#[derive(Debug, Clone, PartialEq)]
pub struct Concentric {
    /// Resistance of the phase conductor, ohms per metre.
    pub ohm_per_m: f64,
    /// GMR of the phase conductor, metres.
    pub gmr_m: f64,
    /// Diameter of the phase conductor, metres.
    pub diameter_m: f64,
    /// Diameter over the strands, metres.
    pub over_strands_m: f64,
    /// Number of strands.
    pub strands: usize,
    /// Diameter of a strand, metres.
    pub strand_diameter_m: f64,
    /// GMR of a strand, metres.
    pub strand_gmr_m: f64,
    /// Resistance of a strand, ohms per metre.
    pub strand_ohm_per_m: f64,
}

impl Concentric {
    /// Radius of the circle of strand centres: `(d_over - d_strand) / 2`.
    pub fn circle_radius_m(&self) -> f64 {
        (self.over_strands_m - self.strand_diameter_m) / 2.0
    }

    /// GMR of the strands together: `(GMR_s k R^(k-1))^(1/k)`.
    pub fn screen_gmr_m(&self) -> f64 {
        let k = self.strands as f64;
        let r = self.circle_radius_m();
        (self.strand_gmr_m * k * r.powf(k - 1.0)).powf(1.0 / k)
    }

    /// Resistance of the strands together: `r_s / k`.
    pub fn screen_ohm_per_m(&self) -> f64 {
        self.strand_ohm_per_m / self.strands as f64
    }
}

/// A tape-shielded cable.
#[derive(Debug, Clone, PartialEq)]
pub struct Tape {
    /// Resistance of the phase conductor, ohms per metre.
    pub ohm_per_m: f64,
    /// GMR of the phase conductor, metres.
    pub gmr_m: f64,
    /// Diameter of the phase conductor, metres.
    pub diameter_m: f64,
    /// Outer diameter of the tape, metres.
    pub over_tape_m: f64,
    /// Thickness of the tape, metres.
    pub thickness_m: f64,
    /// Resistivity of the tape, ohm metre.
    pub resistivity_ohm_m: f64,
}

impl Tape {
    /// Mean radius of the tape, which is also its GMR.
    pub fn shield_radius_m(&self) -> f64 {
        (self.over_tape_m - self.thickness_m) / 2.0
    }

    /// Resistance of the tape: `rho / (pi d T)`.
    pub fn shield_ohm_per_m(&self) -> f64 {
        self.resistivity_ohm_m / (std::f64::consts::PI * self.over_tape_m * self.thickness_m)
    }
}

/// Phase conductor and strands of a concentric cable at a place; the strands go to `screen`.
///
/// `first` is the index that the phase conductor will have among all wires.
pub fn concentric_wires(
    cable: &Concentric,
    letter: &str,
    slot: usize,
    place_m: [f64; 2],
    screen: Target,
    first: usize,
) -> [Wire; 2] {
    let radius = cable.circle_radius_m();
    [
        core(format!("phase {letter}"), cable.ohm_per_m, cable.gmr_m, cable.over_strands_m, place_m, slot),
        around(
            format!("concentric neutral {letter}"),
            cable.screen_ohm_per_m(),
            cable.screen_gmr_m(),
            cable.over_strands_m,
            place_m,
            screen,
            (first, radius),
        ),
    ]
}

/// Phase conductor and tape of a cable at a place; the tape goes to `screen`.
pub fn tape_wires(
    cable: &Tape,
    letter: &str,
    slot: usize,
    place_m: [f64; 2],
    screen: Target,
    first: usize,
) -> [Wire; 2] {
    let radius = cable.shield_radius_m();
    [
        core(format!("phase {letter}"), cable.ohm_per_m, cable.gmr_m, cable.over_tape_m, place_m, slot),
        around(
            format!("tape shield {letter}"),
            cable.shield_ohm_per_m(),
            radius,
            cable.over_tape_m,
            place_m,
            screen,
            (first, radius),
        ),
    ]
}

/// The phase conductor; its diameter is that of the whole cable, which its neighbours must keep clear of.
fn core(name: String, ohm_per_m: f64, gmr_m: f64, cable_m: f64, [x_m, y_m]: [f64; 2], slot: usize) -> Wire {
    Wire {
        name,
        ohm_per_m,
        gmr_m,
        diameter_m: Some(cable_m),
        x_m,
        y_m,
        own_distance_m: None,
        target: Target::Slot(slot),
    }
}

fn around(
    name: String,
    ohm_per_m: f64,
    gmr_m: f64,
    cable_m: f64,
    [x_m, y_m]: [f64; 2],
    target: Target,
    own: (usize, f64),
) -> Wire {
    Wire { name, ohm_per_m, gmr_m, diameter_m: Some(cable_m), x_m, y_m, own_distance_m: Some(own), target }
}
