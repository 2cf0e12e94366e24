//! A line construction laid open: matrices, sequence impedances, charging, rating, assumptions, sources.

use serde::Serialize;

use crate::impedance::{Computed, NEUTRAL};
use crate::math::{Complex64, PhaseMatrix};
use crate::units::{METRES_PER_KILOFOOT, METRES_PER_KILOMETRE, METRES_PER_MILE};

/// Length that impedances are given for.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
pub enum Per {
    /// Kilometre.
    #[serde(rename = "km")]
    Kilometre,
    /// Mile.
    #[serde(rename = "mi")]
    Mile,
    /// Thousand feet.
    #[serde(rename = "kft")]
    Kilofoot,
}

impl Per {
    /// Metres in it.
    pub fn metres(self) -> f64 {
        match self {
            Per::Kilometre => METRES_PER_KILOMETRE,
            Per::Mile => METRES_PER_MILE,
            Per::Kilofoot => METRES_PER_KILOFOOT,
        }
    }

    /// As printed.
    pub fn word(self) -> &'static str {
        match self {
            Per::Kilometre => "km",
            Per::Mile => "mi",
            Per::Kilofoot => "kft",
        }
    }
}

/// A square matrix with the names of its rows.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Matrix {
    /// Names of rows and columns.
    pub conductors: Vec<String>,
    /// Real part, rows first.
    pub re: Vec<Vec<f64>>,
    /// Imaginary part.
    pub im: Vec<Vec<f64>>,
}

/// Sequence impedances of the phases, the neutral taken in.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct SequencePair {
    /// Positive-sequence resistance.
    pub r1: f64,
    /// Positive-sequence reactance.
    pub x1: f64,
    /// Zero-sequence resistance.
    pub r0: f64,
    /// Zero-sequence reactance.
    pub x0: f64,
}

/// A construction laid open; ohms and microsiemens for the length `per`.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct ConstructionReport {
    /// Name, or what was asked for.
    pub construction: String,
    /// Conductors the line carries.
    pub conductors: String,
    /// Length that the numbers are for.
    pub per: Per,
    /// Impedance of every metallic conductor, ohms; none where impedances were given.
    pub primitive_ohm: Option<Matrix>,
    /// Impedance over the conductors carried, ohms.
    pub full_ohm: Matrix,
    /// With the neutral taken into the phases (Kron reduction), ohms; none without a neutral.
    pub reduced_ohm: Option<Matrix>,
    /// Sequence impedances, ohms; none for fewer than three phases.
    pub sequence_ohm: Option<SequencePair>,
    /// Shunt susceptance over the conductors carried, microsiemens.
    pub charging_us: Matrix,
    /// Rating of the phase conductors, amperes.
    pub rating_amps: Option<f64>,
    /// What was assumed.
    pub assumptions: Vec<String>,
    /// Where the data came from.
    pub sources: Vec<String>,
}

/// Impedance with the neutral held at earth by its ends' connection: `z - z_n z_n^T / z_nn`.
pub fn reduce_neutral(z: &PhaseMatrix) -> PhaseMatrix {
    let own = z[(NEUTRAL, NEUTRAL)];
    let mut reduced = PhaseMatrix::zeros();
    for i in 0..NEUTRAL {
        for j in 0..NEUTRAL {
            reduced[(i, j)] = z[(i, j)] - z[(i, NEUTRAL)] * z[(NEUTRAL, j)] / own;
        }
    }
    reduced
}

/// Positive- and zero-sequence impedance of three phases by the means of own and mutual elements.
pub fn sequence_means(z: &PhaseMatrix) -> (Complex64, Complex64) {
    let own = (z[(0, 0)] + z[(1, 1)] + z[(2, 2)]) / 3.0;
    let mutual = (z[(0, 1)] + z[(1, 2)] + z[(0, 2)]) / 3.0;
    (own - mutual, own + 2.0 * mutual)
}

impl ConstructionReport {
    /// Lays a computed construction open for the slots a line carries.
    pub fn new(name: &str, computed: &Computed, slots: &[usize], per: Per) -> ConstructionReport {
        let letters =
            |s: &[usize]| s.iter().map(|&k| ["a", "b", "c", "n"][k].to_string()).collect::<Vec<_>>();
        let matrix = |z: &PhaseMatrix, s: &[usize], factor: f64| {
            let part = |f: &dyn Fn(Complex64) -> f64| {
                s.iter().map(|&i| s.iter().map(|&j| f(z[(i, j)]) * factor).collect()).collect()
            };
            Matrix { conductors: letters(s), re: part(&|v| v.re), im: part(&|v| v.im) }
        };
        let phases: Vec<usize> = slots.iter().copied().filter(|&s| s != NEUTRAL).collect();
        let metres = per.metres();
        let reduced = slots.contains(&NEUTRAL).then(|| reduce_neutral(&computed.z_per_m));
        let of_phases = reduced.unwrap_or(computed.z_per_m);
        let sequence_ohm = (phases.len() == 3).then(|| {
            let (z1, z0) = sequence_means(&(of_phases * Complex64::from(metres)));
            SequencePair { r1: z1.re, x1: z1.im, r0: z0.re, x0: z0.im }
        });
        let primitive_ohm = computed.constants.as_ref().map(|c| {
            let part = |f: &dyn Fn(Complex64) -> f64| {
                (0..c.wires.len())
                    .map(|i| (0..c.wires.len()).map(|j| f(c.primitive[(i, j)]) * metres).collect())
                    .collect()
            };
            Matrix { conductors: c.wires.clone(), re: part(&|v| v.re), im: part(&|v| v.im) }
        });
        ConstructionReport {
            construction: name.to_string(),
            conductors: letters(slots).concat(),
            per,
            primitive_ohm,
            full_ohm: matrix(&computed.z_per_m, slots, metres),
            reduced_ohm: reduced.map(|z| matrix(&z, &phases, metres)),
            sequence_ohm,
            charging_us: matrix(&computed.y_per_m, slots, metres * 1e6),
            rating_amps: computed.rating_amps,
            assumptions: computed.assumptions.clone(),
            sources: computed.sources.clone(),
        }
    }
}
