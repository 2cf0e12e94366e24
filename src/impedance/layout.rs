//! Wires in their places, the faults of a layout, and its matrices.

use std::fmt;

use nalgebra::DMatrix;

use super::carson::{Conditions, EarthReturn, earth_return_ohm_per_m, series_parameter};
use super::reduce::to_slots;
use super::shunt::overhead;
use crate::math::{Complex64, PhaseMatrix};

/// Where a primitive conductor goes.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Target {
    /// Slot 0 to 3 (a, b, c, n) of the line.
    Slot(usize),
    /// Held at earth along the line and taken out.
    Earth,
}

/// One metallic conductor.
#[derive(Debug, Clone, PartialEq)]
pub struct Wire {
    /// What messages call it, e.g. `phase a` or `concentric neutral b`.
    pub name: String,
    /// Resistance at operating temperature, ohms per metre.
    pub ohm_per_m: f64,
    /// Geometric mean radius, metres.
    pub gmr_m: f64,
    /// Outer diameter, metres, where known: shunt admittance needs it.
    pub diameter_m: Option<f64>,
    /// Horizontal place, metres.
    pub x_m: f64,
    /// Height above earth, metres; negative below.
    pub y_m: f64,
    /// Distance to another wire that its place does not give: a screen around its own conductor
    /// shares its place. Index of that wire and the distance, metres.
    pub own_distance_m: Option<(usize, f64)>,
    /// Where it goes.
    pub target: Target,
}

/// All conductors of a line, and how they lie.
#[derive(Debug, Clone, PartialEq)]
pub struct Layout {
    /// Conductors.
    pub wires: Vec<Wire>,
    /// Shunt admittance that the construction gives itself (cables), siemens per metre over slots;
    /// `None`: from potential coefficients of the bare wires.
    pub shunt: Option<PhaseMatrix>,
}

/// What cannot be about a layout.
#[derive(Debug, Clone, PartialEq)]
pub enum GeometryFault {
    /// Two wires at one place, or nearer than their radii allow.
    Touching {
        /// The two wires.
        wires: [String; 2],
        /// Distance of their centres, metres.
        distance_m: f64,
        /// Least distance their diameters allow, metres.
        least_m: f64,
    },
    /// A bare overhead wire at or below the surface.
    BelowEarth {
        /// The wire.
        wire: String,
        /// Its height, metres.
        height_m: f64,
    },
    /// A datum that must be positive is not.
    NotPositive {
        /// The wire.
        wire: String,
        /// The datum.
        datum: &'static str,
    },
    /// The matrices have no inverse.
    Singular,
}

impl GeometryFault {
    /// How to mend it.
    pub fn cure(&self) -> &'static str {
        match self {
            GeometryFault::Touching { .. } => "check x and y of the spacing, and their unit",
            GeometryFault::BelowEarth { .. } => "give its height above earth as a positive number",
            GeometryFault::NotPositive { .. } => "give it in conductors.csv",
            GeometryFault::Singular => "check the wires' data",
        }
    }
}

impl fmt::Display for GeometryFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            GeometryFault::Touching { wires: [a, b], distance_m, least_m } if *distance_m == 0.0 => {
                write!(f, "{a} and {b} are in one place; their diameters need {least_m:.4} m between centres")
            }
            GeometryFault::Touching { wires: [a, b], distance_m, least_m } => {
                write!(f, "{a} and {b} are {distance_m:.4} m apart, but their diameters need {least_m:.4} m")
            }
            GeometryFault::BelowEarth { wire, height_m } => {
                write!(f, "{wire} is called overhead, but hangs at {height_m} m")
            }
            GeometryFault::NotPositive { wire, datum } => write!(f, "{datum} of {wire} is not positive"),
            GeometryFault::Singular => f.write_str("the wires' impedance matrix has no inverse"),
        }
    }
}

/// Matrices of a line construction, per metre.
#[derive(Debug, Clone, PartialEq)]
pub struct LineConstants {
    /// Names of the primitive conductors, in the order of `primitive`.
    pub wires: Vec<String>,
    /// Primitive series impedance, ohms per metre.
    pub primitive: DMatrix<Complex64>,
    /// Series impedance over slots a, b, c, n, ohms per metre.
    pub z_per_m: PhaseMatrix,
    /// Shunt admittance over slots, siemens per metre; `None` where a diameter is missing.
    pub y_per_m: Option<PhaseMatrix>,
    /// Greatest difference that the higher-order series makes to an element of `z_per_m`, percent of that element;
    /// `None` where the series does not hold: an image too far away for the earth's resistivity (`k` above 1).
    pub series_difference_percent: Option<f64>,
}

/// Matrices of a layout.
///
/// # Errors
/// Every fault of the layout.
pub fn compute(
    layout: &Layout,
    form: EarthReturn,
    conditions: &Conditions,
) -> Result<LineConstants, Vec<GeometryFault>> {
    let faults = faults(layout);
    if !faults.is_empty() {
        return Err(faults);
    }
    let targets: Vec<Target> = layout.wires.iter().map(|w| w.target).collect();
    let primitive = primitive(&layout.wires, form, conditions);
    let slots = |p: &DMatrix<Complex64>| to_slots(p, &targets).ok_or_else(|| vec![GeometryFault::Singular]);
    let z_per_m = slots(&primitive)?;
    let other = match form {
        EarthReturn::Modified => EarthReturn::Series,
        EarthReturn::Series => EarthReturn::Modified,
    };
    let z_other = if series_holds(&layout.wires, conditions) {
        slots(&self::primitive(&layout.wires, other, conditions)).ok()
    } else {
        None
    };
    let y_per_m = match &layout.shunt {
        Some(y) => Some(*y),
        None => overhead(&layout.wires, &targets, conditions),
    };
    Ok(LineConstants {
        wires: layout.wires.iter().map(|w| w.name.clone()).collect(),
        primitive,
        z_per_m,
        y_per_m,
        series_difference_percent: z_other.map(|other| difference_percent(&z_per_m, &other)),
    })
}

/// True where `k` is at most 1 for the image farthest away.
fn series_holds(wires: &[Wire], conditions: &Conditions) -> bool {
    let images = wires.iter().flat_map(|a| wires.iter().map(|b| (a.x_m - b.x_m).hypot(a.y_m + b.y_m)));
    series_parameter(images.fold(0.0, f64::max), conditions) <= 1.0
}

fn difference_percent(a: &PhaseMatrix, b: &PhaseMatrix) -> f64 {
    let each = a.iter().zip(b.iter()).filter(|(x, _)| x.norm() > 0.0);
    each.map(|(x, y)| 100.0 * (x - y).norm() / x.norm()).fold(0.0, f64::max)
}

/// Primitive series impedance, ohms per metre.
fn primitive(wires: &[Wire], form: EarthReturn, conditions: &Conditions) -> DMatrix<Complex64> {
    DMatrix::from_fn(wires.len(), wires.len(), |i, j| {
        let (a, b) = (&wires[i], &wires[j]);
        let distance = if i == j { a.gmr_m } else { distance_m(wires, i, j) };
        let earth = earth_return_ohm_per_m(form, distance, a.x_m - b.x_m, a.y_m + b.y_m, conditions);
        if i == j { earth + a.ohm_per_m } else { earth }
    })
}

/// Distance of two wires: by their places, or the one a screen keeps to its own conductor.
fn distance_m(wires: &[Wire], i: usize, j: usize) -> f64 {
    let own =
        |from: usize, to: usize| wires[from].own_distance_m.filter(|(other, _)| *other == to).map(|(_, d)| d);
    own(i, j).or_else(|| own(j, i)).unwrap_or_else(|| {
        let (a, b) = (&wires[i], &wires[j]);
        (a.x_m - b.x_m).hypot(a.y_m - b.y_m)
    })
}

fn faults(layout: &Layout) -> Vec<GeometryFault> {
    let mut faults = Vec::new();
    for wire in &layout.wires {
        for (datum, value) in [("the resistance", wire.ohm_per_m), ("the GMR", wire.gmr_m)] {
            if !(value.is_finite() && value > 0.0) {
                faults.push(GeometryFault::NotPositive { wire: wire.name.clone(), datum });
            }
        }
        if layout.shunt.is_none() && wire.y_m <= 0.0 {
            faults.push(GeometryFault::BelowEarth { wire: wire.name.clone(), height_m: wire.y_m });
        }
    }
    for i in 0..layout.wires.len() {
        for j in i + 1..layout.wires.len() {
            let (a, b) = (&layout.wires[i], &layout.wires[j]);
            let screened = |w: &Wire, other: usize| w.own_distance_m.is_some_and(|(o, _)| o == other);
            // A screen lies around its conductor, and its cable is judged by that conductor alone.
            if screened(a, j) || screened(b, i) || a.own_distance_m.is_some() || b.own_distance_m.is_some() {
                continue;
            }
            let least = (a.diameter_m.unwrap_or(0.0) + b.diameter_m.unwrap_or(0.0)) / 2.0;
            let distance = (a.x_m - b.x_m).hypot(a.y_m - b.y_m);
            if distance < least * (1.0 - 1e-6) || distance == 0.0 {
                let wires = [a.name.clone(), b.name.clone()];
                faults.push(GeometryFault::Touching { wires, distance_m: distance, least_m: least });
            }
        }
    }
    faults
}
