//! Values that cannot be: impedances without sense, wrong units, fault levels that contradict.

use super::conductor::Conductors;
use super::draft::{Construction, Draft, SupplyRecord};
use super::graph::place;
use super::supply::sequence_impedance;
use crate::diagnostic::{Code, Diagnostics};
use crate::math::PhaseMatrix;

/// A conductor's own reactance cannot reach this at 50 Hz, ohms per kilometre: even a hair-thin
/// wire over an earth of 10 000 ohm metre stays below 1.5 (Carson's equations).
const REACTANCE_TOO_HIGH: f64 = 3.0;
/// Below this, ohms per kilometre at 50 Hz, a reactance that is not zero is a hundredth of a cable's.
const REACTANCE_TOO_LOW: f64 = 0.003;
/// The thinnest wire in use is below this, ohms per kilometre.
const RESISTANCE_TOO_HIGH: f64 = 100.0;

/// Checks every construction for symmetry of sense: positive definite R, reactances of a likely size.
pub(super) fn constructions(draft: &Draft, diagnostics: &mut Diagnostics) {
    for construction in &draft.constructions {
        resistance(draft, construction, diagnostics);
        reactance(draft, construction, diagnostics);
    }
}

fn resistance(draft: &Draft, construction: &Construction, diagnostics: &mut Diagnostics) {
    let name = &construction.name;
    let at = || place(draft, construction.origin, "construction", name);
    let largest = diagonal(construction, |z| z.re).fold(0.0, f64::max) * 1e3;
    if !is_positive_definite(&construction.z_per_m, construction.conductors) {
        diagnostics.error(
            Code::NotPositiveDefinite,
            at(),
            format!("the resistance matrix of construction {name} is not positive definite: some pattern of currents would generate power"),
            "check its rows: each own resistance must be positive and greater than the mutual ones allow",
        );
    } else if largest > RESISTANCE_TOO_HIGH {
        diagnostics.error(
            Code::SuspectUnit,
            at(),
            format!("construction {name} has {largest:.3} ohm/km of resistance; the thinnest wire has less than {RESISTANCE_TOO_HIGH}"),
            "check the unit in the column name (per km, per mi, per kft)",
        );
    }
}

fn reactance(draft: &Draft, construction: &Construction, diagnostics: &mut Diagnostics) {
    let name = &construction.name;
    let at = || place(draft, construction.origin, "construction", name);
    let scale = draft.study.frequency_hz / 50.0;
    let own = || diagonal(construction, |z| z.im * 1e3 / scale);
    let (lowest, highest) = (own().fold(f64::INFINITY, f64::min), own().fold(0.0, f64::max));
    if lowest < 0.0 {
        diagnostics.error(
            Code::OutOfRange,
            at(),
            format!("construction {name} has a negative own reactance ({:.4} ohm/km)", lowest * scale),
            "give inductive reactance as a positive number",
        );
    } else if highest > REACTANCE_TOO_HIGH {
        diagnostics.error(
            Code::SuspectUnit,
            at(),
            format!(
                "construction {name} has {:.3} ohm/km of own reactance; real lines have 0.05 to 1.2",
                highest * scale
            ),
            "check the unit in the column name (per km, per mi, per kft), or the decimal point",
        );
    } else if lowest > 0.0 && lowest < REACTANCE_TOO_LOW {
        diagnostics.error(
            Code::SuspectUnit,
            at(),
            format!(
                "construction {name} has only {:.6} ohm/km of own reactance; real lines have 0.05 to 1.2",
                lowest * scale
            ),
            "check the unit in the column name (per km, per mi, per kft), or the decimal point; 0 leaves reactance out",
        );
    }
}

fn diagonal(
    construction: &Construction,
    part: impl Fn(num_complex::Complex64) -> f64,
) -> impl Iterator<Item = f64> {
    construction.conductors.iter().map(move |c| part(construction.z_per_m[(c.slot(), c.slot())]))
}

/// Cholesky's test on the real part, over the conductors carried.
fn is_positive_definite(z: &PhaseMatrix, conductors: Conductors) -> bool {
    let slots: Vec<usize> = conductors.iter().map(|c| c.slot()).collect();
    let r = nalgebra::DMatrix::from_fn(slots.len(), slots.len(), |i, j| z[(slots[i], slots[j])].re);
    r.iter().all(|x| x.is_finite()) && nalgebra::Cholesky::new(r).is_some()
}

/// Checks that the fault levels of a supply give an impedance with positive resistance and reactance.
pub(super) fn supply(draft: &Draft, record: &SupplyRecord, diagnostics: &mut Diagnostics) {
    let Some((_, z0)) = sequence_impedance(record) else {
        if record.single_phase.is_some() {
            diagnostics.error(
                Code::BadFaultLevel,
                place(draft, record.origin, "mva_1ph", ""),
                "a single-phase fault level is given without a three-phase one",
                "give mva_3ph and x_over_r_3ph as well, or leave both blank for a stiff source",
            );
        }
        return;
    };
    if z0.re < 0.0 || z0.im < 0.0 {
        let found = record.single_phase.map_or(0.0, |l| l.volt_amperes / 1e6);
        diagnostics.error(
            Code::BadFaultLevel,
            place(draft, record.origin, "mva_1ph", &found.to_string()),
            format!(
                "the fault levels give a zero-sequence impedance of {:.4} {} j{:.4} ohm, which cannot be: the single-phase level is too high for the three-phase one",
                z0.re,
                if z0.im < 0.0 { '-' } else { '+' },
                z0.im.abs()
            ),
            "it may be at most 1.5 times the three-phase level; both as sqrt(3) x line voltage x fault current",
        );
    }
}
