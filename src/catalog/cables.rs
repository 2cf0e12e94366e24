//! Cables of the tables: concentric neutral, tape shield, and wires in conduit.

use std::sync::OnceLock;

use super::conductor::Material;
use super::tables::{number, rows, size_label, text};
use crate::units::{METRES_PER_INCH, METRES_PER_KILOFOOT};

/// A 15 kV concentric-neutral cable.
#[derive(Debug, Clone, PartialEq)]
pub struct ConcentricCable {
    /// Name, e.g. `250 kcmil AA CN one-third`.
    pub name: String,
    /// Phase conductor as looked up among wires.
    pub phase: String,
    /// Diameter over the strands, metres.
    pub over_strands_m: f64,
    /// Number of strands.
    pub strands: usize,
    /// Strand as looked up among wires.
    pub strand: String,
    /// Rating in a duct, amperes.
    pub rating_amps: Option<f64>,
    /// Published source.
    pub source: String,
    /// Provenance.
    pub provenance: String,
}

/// A 15 kV tape-shielded cable.
#[derive(Debug, Clone, PartialEq)]
pub struct TapeCable {
    /// Name, e.g. `1/0 AWG AA tape`.
    pub name: String,
    /// Phase conductor as looked up among wires.
    pub phase: String,
    /// Diameter over the tape, metres.
    pub over_tape_m: f64,
    /// Thickness of the tape, metres.
    pub thickness_m: f64,
    /// Rating in a duct, amperes.
    pub rating_amps: Option<f64>,
    /// Published source.
    pub source: String,
    /// Provenance.
    pub provenance: String,
}

/// Conduit around building wires.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum ConduitKind {
    /// Plastic.
    Pvc,
    /// Aluminium.
    Aluminium,
    /// Steel.
    Steel,
}

/// Alternating-current resistance and reactance to neutral of building wire in conduit, 75 C, 60 Hz.
#[derive(Debug, Clone, PartialEq)]
pub struct ConduitRow {
    /// Size as in the table: `250`, `4/0`.
    pub size: String,
    /// Metal.
    pub material: Material,
    /// Conduit.
    pub conduit: ConduitKind,
    /// Resistance, ohms per metre.
    pub r_ohm_per_m: f64,
    /// Reactance to neutral, ohms per metre.
    pub x_ohm_per_m: f64,
    /// Effective impedance at power factor 0.85 as printed, ohms per metre.
    pub effective_ohm_per_m: Option<f64>,
    /// Published source.
    pub source: String,
    /// Provenance.
    pub provenance: String,
}

pub(super) fn concentric() -> &'static [ConcentricCable] {
    static TABLE: OnceLock<Vec<ConcentricCable>> = OnceLock::new();
    TABLE.get_or_init(|| {
        rows(include_str!("data/concentric_neutral_15kv.csv"))
            .filter_map(|c| {
                let size = text(&c, "size_awg_kcmil");
                Some(ConcentricCable {
                    name: format!("{} AA CN {}", size_label(&size), text(&c, "neutral")),
                    phase: format!("{} AAC", size_label(&size)),
                    over_strands_m: number(&c, "outside_diam_in")? * METRES_PER_INCH,
                    strands: number(&c, "neutral_strands")? as usize,
                    strand: format!("{} AWG solid copper", text(&c, "neutral_awg")),
                    rating_amps: number(&c, "ampacity_4in_duct_A"),
                    source: text(&c, "source"),
                    provenance: text(&c, "provenance"),
                })
            })
            .collect()
    })
}

pub(super) fn tape() -> &'static [TapeCable] {
    static TABLE: OnceLock<Vec<TapeCable>> = OnceLock::new();
    TABLE.get_or_init(|| {
        rows(include_str!("data/tape_shield_15kv.csv"))
            .filter_map(|c| {
                let size = text(&c, "size_awg_kcmil");
                Some(TapeCable {
                    name: format!("{} AA tape", size_label(&size)),
                    phase: format!("{} AAC", size_label(&size)),
                    over_tape_m: number(&c, "diam_over_screen_in")? * METRES_PER_INCH,
                    thickness_m: number(&c, "tape_thickness_mils")? * METRES_PER_INCH / 1000.0,
                    rating_amps: number(&c, "ampacity_duct_A"),
                    source: text(&c, "source"),
                    provenance: text(&c, "provenance"),
                })
            })
            .collect()
    })
}

pub(super) fn conduit() -> &'static [ConduitRow] {
    static TABLE: OnceLock<Vec<ConduitRow>> = OnceLock::new();
    TABLE.get_or_init(|| {
        let cells: Vec<_> = rows(include_str!("data/conductors_nec_table9.csv")).collect();
        let value = |size: &str, quantity: &str, conductor: &str, conduit: &str| {
            let row = cells.iter().find(|c| {
                text(c, "size_awg_kcmil") == size
                    && text(c, "quantity") == quantity
                    && text(c, "conductor") == conductor
                    && text(c, "conduit") == conduit
            })?;
            Some(number(row, "value")? / METRES_PER_KILOFOOT)
        };
        let kinds =
            [("PVC", ConduitKind::Pvc), ("aluminum", ConduitKind::Aluminium), ("steel", ConduitKind::Steel)];
        let mut found = Vec::new();
        for row in cells.iter().filter(|c| text(c, "quantity") == "R") {
            let (size, metal, tube) =
                (text(row, "size_awg_kcmil"), text(row, "conductor"), text(row, "conduit"));
            let material = if metal == "Cu" { Material::Copper } else { Material::Aluminium };
            let Some((_, conduit)) = kinds.into_iter().find(|(word, _)| *word == tube) else { continue };
            let (Some(r), Some(x)) = (value(&size, "R", &metal, &tube), value(&size, "XL", "all", &tube))
            else {
                continue;
            };
            found.push(ConduitRow {
                effective_ohm_per_m: value(&size, "Zeff_0.85pf", &metal, &tube),
                size,
                material,
                conduit,
                r_ohm_per_m: r,
                x_ohm_per_m: x,
                source: text(row, "source"),
                provenance: text(row, "provenance"),
            });
        }
        found
    })
}
