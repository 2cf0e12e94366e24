//! The desk calculation of one circuit: drop, loss, and the least size that will do.

use serde::Serialize;

/// How a circuit returns.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Circuit {
    /// Single-phase, out and back on equal wires.
    Single,
    /// Three-phase, balanced.
    Three,
    /// Direct current, out and back.
    Dc,
}

/// A circuit: what it carries, and over what.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Case {
    /// How it returns.
    pub circuit: Circuit,
    /// Voltage at the sending end, volts; line-to-line for three phases.
    pub volts: f64,
    /// Current, amperes.
    pub amps: f64,
    /// Power factor, lagging; of no meaning for direct current.
    pub pf: f64,
    /// Length one way, metres.
    pub length_m: f64,
}

/// Impedance of one wire per metre, ohms: for three phases that to neutral (positive sequence).
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Wire {
    /// Resistance.
    pub r_ohm_per_m: f64,
    /// Reactance.
    pub x_ohm_per_m: f64,
}

/// Drop and loss of a circuit.
#[derive(Debug, Clone, Copy, PartialEq, Serialize)]
pub struct Drop {
    /// Drop by `I (R cos + X sin)`, volts (line-to-line for three phases).
    pub volts: f64,
    /// The same by the exact phasors at that sending-end voltage, volts.
    pub exact_volts: f64,
    /// Drop of the approximate form as a share of the sending-end voltage, percent.
    pub percent: f64,
    /// Loss of all wires, watts.
    pub loss_watts: f64,
}

/// Drop and loss of one circuit.
///
/// `u = b I L (R cos + X sin)`, `b` = 2 out and back, sqrt(3) line-to-line for three phases (UFC
/// 3-520-01 B-2.1; NEC Chapter 9 Table 9; IEC 60364-5-52 Annex G). Exact (IEEE Std 141):
/// `u = E + I R cos + I X sin - sqrt(E^2 - (I X cos - I R sin)^2)`. Loss `n I^2 R L`, `n` wires that
/// carry current.
pub fn drop(case: &Case, wire: &Wire) -> Drop {
    let (cos, x) = match case.circuit {
        Circuit::Dc => (1.0, 0.0),
        _ => (case.pf, wire.x_ohm_per_m),
    };
    let sin = (1.0 - cos * cos).max(0.0).sqrt();
    let (factor, wires, base) = match case.circuit {
        Circuit::Single | Circuit::Dc => (2.0, 2.0, case.volts),
        Circuit::Three => (crate::units::SQRT_3, 3.0, case.volts / crate::units::SQRT_3),
    };
    // Per loop for two wires, per phase for three.
    let paths = if case.circuit == Circuit::Three { 1.0 } else { 2.0 };
    let (ir, ix) =
        (paths * case.amps * wire.r_ohm_per_m * case.length_m, paths * case.amps * x * case.length_m);
    let across = ix * cos - ir * sin;
    let exact = base + ir * cos + ix * sin - (base * base - across * across).max(0.0).sqrt();
    let volts = factor * case.amps * case.length_m * (wire.r_ohm_per_m * cos + x * sin);
    Drop {
        volts,
        exact_volts: exact * factor / paths,
        percent: 100.0 * volts / case.volts,
        loss_watts: wires * case.amps * case.amps * wire.r_ohm_per_m * case.length_m,
    }
}

/// A size that may be chosen.
#[derive(Debug, Clone, PartialEq)]
pub struct Candidate {
    /// Name of the wire.
    pub name: String,
    /// Its impedance.
    pub wire: Wire,
    /// Its rating, amperes, where known.
    pub rating_amps: Option<f64>,
}

/// One size in the table.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct SizeRow {
    /// Name of the wire.
    pub size: String,
    /// Drop, percent.
    pub drop_percent: f64,
    /// Loss, watts.
    pub loss_watts: f64,
    /// Rating, amperes.
    pub rating_amps: Option<f64>,
    /// Cost of the loss in a year of 8760 hours at this current, where a price is given.
    pub loss_cost_per_year: Option<f64>,
    /// Why it will not do; `None` where it will.
    pub refused: Option<String>,
}

/// The table of sizes and the least that will do.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct Sizes {
    /// Rows in the order of the candidates.
    pub rows: Vec<SizeRow>,
    /// Index of the first row without refusal.
    pub least: Option<usize>,
}

/// Judges sizes, smallest first, against a drop limit in percent and the current.
pub fn sizes(case: &Case, candidates: &[Candidate], limit_percent: f64, price_per_kwh: Option<f64>) -> Sizes {
    let row = |candidate: &Candidate| {
        let d = drop(case, &candidate.wire);
        let mut reasons = Vec::new();
        if d.percent > limit_percent {
            reasons.push(format!("drop {:.2} % above {limit_percent} %", d.percent));
        }
        match candidate.rating_amps {
            Some(rating) if rating < case.amps => {
                reasons.push(format!("rated {rating} A, below {} A", case.amps))
            }
            None => reasons.push("no rating in the table".to_string()),
            _ => {}
        }
        SizeRow {
            size: candidate.name.clone(),
            drop_percent: d.percent,
            loss_watts: d.loss_watts,
            rating_amps: candidate.rating_amps,
            loss_cost_per_year: price_per_kwh.map(|p| d.loss_watts / 1e3 * 8760.0 * p),
            refused: (!reasons.is_empty()).then(|| reasons.join("; ")),
        }
    };
    let rows: Vec<SizeRow> = candidates.iter().map(row).collect();
    let least = rows.iter().position(|r| r.refused.is_none());
    Sizes { rows, least }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn two_wires_of_pure_resistance() {
        let case = Case { circuit: Circuit::Dc, volts: 48.0, amps: 10.0, pf: 1.0, length_m: 30.0 };
        let d = drop(&case, &Wire { r_ohm_per_m: 3.27e-3, x_ohm_per_m: 0.0 });
        assert!(
            (d.volts - 2.0 * 3.27e-3 * 30.0 * 10.0).abs() < 1e-12 && (d.exact_volts - d.volts).abs() < 1e-9
        );
        assert!((d.loss_watts - d.volts * 10.0).abs() < 1e-9);
    }

    #[test]
    fn the_least_size_is_the_first_without_refusal() {
        let case = Case { circuit: Circuit::Single, volts: 230.0, amps: 50.0, pf: 1.0, length_m: 40.0 };
        let of = |name: &str, r: f64, rating: Option<f64>| Candidate {
            name: name.into(),
            wire: Wire { r_ohm_per_m: r, x_ohm_per_m: 0.0 },
            rating_amps: rating,
        };
        let all = [
            of("thin", 5e-3, Some(30.0)),
            of("middle", 1.5e-3, Some(60.0)),
            of("unrated", 1e-3, None),
            of("thick", 1e-3, Some(80.0)),
        ];
        let found = sizes(&case, &all, 3.0, Some(0.2));
        assert_eq!(found.least, Some(3));
        assert!(found.rows[0].refused.as_deref().is_some_and(|r| r.contains("drop") && r.contains("rated")));
        assert!(
            found.rows[3]
                .loss_cost_per_year
                .is_some_and(|c| (c - 2.0 * 2500.0 * 0.04 / 1e3 * 8760.0 * 0.2).abs() < 1e-9)
        );
    }
}
