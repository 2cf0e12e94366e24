//! The compiled-in tables, read once.

use std::collections::HashMap;
use std::sync::OnceLock;

use super::cables::{self, ConcentricCable, ConduitKind, ConduitRow, TapeCable};
use super::conductor::{Conductor, Current, Family, Material, Resistance};
use super::lookup::{self, Key, LookupFault, Size};
use crate::units::{
    METRES_PER_FOOT, METRES_PER_INCH, METRES_PER_KILOFOOT, METRES_PER_KILOMETRE, METRES_PER_MILE,
    SQUARE_METRES_PER_CIRCULAR_MIL,
};

/// All wires and cables: the built-in ones and the user's.
#[derive(Debug, Clone)]
pub struct Catalog {
    conductors: Vec<Conductor>,
}

/// Cells of a row by column name.
pub(super) type Cells = HashMap<String, String>;

/// Rows of a compiled-in table.
pub(super) fn rows(text: &'static str) -> impl Iterator<Item = Cells> {
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let header = reader.headers().cloned().unwrap_or_default();
    reader
        .into_records()
        .flatten()
        .map(move |r| header.iter().zip(r.iter()).map(|(h, c)| (h.to_string(), c.to_string())).collect())
}

pub(super) fn number(cells: &Cells, column: &str) -> Option<f64> {
    cells.get(column)?.trim().parse().ok()
}

pub(super) fn text(cells: &Cells, column: &str) -> String {
    cells.get(column).cloned().unwrap_or_default()
}

/// AWG and kcmil sizes as the tables write them: `2`, `1/0`, `336.4`.
pub(super) fn awg_or_kcmil(text: &str) -> Option<Size> {
    if let Some(zeros) = text.strip_suffix("/0") {
        return zeros.parse::<i32>().ok().map(|n| Size::Awg(1 - n));
    }
    let number: f64 = text.parse().ok()?;
    Some(if number < 50.0 { Size::Awg(number as i32) } else { Size::Kcmil(number) })
}

/// The size as printed: `4/0 AWG`, `2 AWG`, `336.4 kcmil`.
pub(super) fn size_label(text: &str) -> String {
    match awg_or_kcmil(text) {
        Some(Size::Awg(_)) => format!("{text} AWG"),
        Some(Size::Kcmil(_)) => format!("{text} kcmil"),
        _ => text.to_string(),
    }
}

/// Area of a size, square metres: circular mils, and for a gauge `d = 0.005 in 92^((36-n)/39)` (ASTM B258).
fn area_m2(size: Size) -> f64 {
    match size {
        Size::Kcmil(k) => k * 1000.0 * SQUARE_METRES_PER_CIRCULAR_MIL,
        Size::Mm2(a) => a * 1e-6,
        Size::Awg(n) => {
            let mils = 5.0 * 92f64.powf(f64::from(36 - n) / 39.0);
            mils * mils * SQUARE_METRES_PER_CIRCULAR_MIL
        }
    }
}

impl Catalog {
    /// The built-in tables.
    pub fn built_in() -> &'static Catalog {
        static CATALOG: OnceLock<Catalog> = OnceLock::new();
        CATALOG.get_or_init(|| Catalog { conductors: [bare(), code_words(), building(), iec()].concat() })
    }

    /// The built-in tables with wires of the user's own, which win over built-in ones of the same name.
    pub fn with(own: Vec<Conductor>) -> Catalog {
        let mut catalog = Catalog::built_in().clone();
        catalog.conductors.extend(own);
        catalog
    }

    /// The wire that a text means.
    ///
    /// # Errors
    /// No wire of that name (with the nearest), or several that fit.
    pub fn find(&self, text: &str) -> Result<&Conductor, LookupFault> {
        lookup::find(&self.conductors, text)
    }

    /// The wire that a text means where it is pulled into conduit: building wire where the table has it, so
    /// that `4/0 copper` is not in doubt; any other wire that the text means otherwise.
    ///
    /// # Errors
    /// As [`Catalog::find`].
    pub fn find_building(&self, text: &str) -> Result<&Conductor, LookupFault> {
        match lookup::find(&self.conductors, text) {
            Ok(own) if own.family == Family::Own => Ok(own),
            _ => lookup::find_building(&self.conductors, text),
        }
    }

    /// Wires that a text could mean; all for an empty text.
    pub fn search(&self, text: &str) -> Vec<&Conductor> {
        lookup::search(&self.conductors, text)
    }

    /// Concentric-neutral cables.
    pub fn concentric(&self) -> &'static [ConcentricCable] {
        cables::concentric()
    }

    /// Tape-shielded cables.
    pub fn tape(&self) -> &'static [TapeCable] {
        cables::tape()
    }

    /// Wires in conduit, by size, metal and conduit.
    pub fn conduit(
        &self,
        size: &str,
        material: Material,
        conduit: ConduitKind,
    ) -> Option<&'static ConduitRow> {
        cables::conduit().iter().find(|r| r.size == size && r.material == material && r.conduit == conduit)
    }

    /// All rows of wires in conduit.
    pub fn conduit_rows(&self) -> &'static [ConduitRow] {
        cables::conduit()
    }
}

/// Bare overhead and copper wires with GMR and alternating-current resistance at 50 C, 60 Hz.
fn bare() -> Vec<Conductor> {
    let codes: HashMap<[String; 3], String> = rows(include_str!("data/code_words.csv"))
        .map(|c| (wire_kind(&c), text(&c, "code_word").to_lowercase()))
        .collect();
    let read = |cells: Cells| {
        let (size, stranding) = (text(&cells, "size_awg_kcmil"), text(&cells, "stranding"));
        let (family, material) = match text(&cells, "material").as_str() {
            "ACSR" => (Family::Acsr, Material::Aluminium),
            "AAC" => (Family::Aac, Material::Aluminium),
            "Cu" => (Family::BareCopper, Material::Copper),
            _ => (Family::Steel, Material::Steel),
        };
        let strands = match stranding.strip_prefix("class A ") {
            Some(n) => n.to_string(),
            None if stranding == "solid" => "1".to_string(),
            None => stranding.clone(),
        };
        let words = match family {
            Family::Acsr if stranding.is_empty() => format!("{} ACSR", size_label(&size)),
            Family::Acsr => format!("{} {stranding} ACSR", size_label(&size)),
            Family::Aac => format!("{} AAC", size_label(&size)),
            Family::BareCopper if stranding == "solid" => format!("{} solid copper", size_label(&size)),
            Family::BareCopper => format!("{} {stranding}-strand copper", size_label(&size)),
            _ => format!("{size} steel strand"),
        };
        let parsed = awg_or_kcmil(&size);
        Conductor {
            name: words,
            family,
            material,
            area_m2: parsed.map(area_m2),
            resistances: number(&cells, "r_ohm_per_mile_60Hz_50C")
                .map(|r| alternating(r / METRES_PER_MILE, 50.0))
                .into_iter()
                .collect(),
            diameter_m: number(&cells, "diameter_in").map(|d| d * METRES_PER_INCH),
            gmr_m: number(&cells, "gmr_ft").map(|g| g * METRES_PER_FOOT),
            gmr_note: None,
            rating_amps: number(&cells, "ampacity_A"),
            source: text(&cells, "source"),
            provenance: text(&cells, "provenance"),
            key: Key { size: parsed, stranding: Some(strands), code: codes.get(&wire_kind(&cells)).cloned() },
        }
    };
    rows(include_str!("data/acsr.csv")).map(read).collect()
}

/// Size, stranding and material as the tables of bare wires write them.
fn wire_kind(cells: &Cells) -> [String; 3] {
    ["size_awg_kcmil", "stranding", "material"].map(|column| text(cells, column))
}

fn alternating(ohm_per_m: f64, temperature_c: f64) -> Resistance {
    Resistance { ohm_per_m, temperature_c, current: Current::Alternating }
}

fn direct(ohm_per_m: f64, temperature_c: f64) -> Resistance {
    Resistance { ohm_per_m, temperature_c, current: Current::Direct }
}

/// ACSR by code word, with resistance at three temperatures, 60 Hz.
fn code_words() -> Vec<Conductor> {
    let read = |cells: Cells| {
        let (code, kcmil, stranding) =
            (text(&cells, "code_name"), text(&cells, "kcmil"), text(&cells, "stranding"));
        let each = [(25.0, "rac25_mohm_per_km"), (50.0, "rac50_mohm_per_km"), (75.0, "rac75_mohm_per_km")];
        let at = |(t, column): (f64, &str)| {
            Some(alternating(number(&cells, column)? * 1e-3 / METRES_PER_KILOMETRE, t))
        };
        Conductor {
            name: format!("{code} ({kcmil} kcmil {stranding} ACSR)"),
            family: Family::Acsr,
            material: Material::Aluminium,
            area_m2: kcmil.parse().ok().map(|k| area_m2(Size::Kcmil(k))),
            resistances: each.into_iter().filter_map(at).collect(),
            diameter_m: number(&cells, "diameter_mm").map(|d| d * 1e-3),
            gmr_m: number(&cells, "gmr_mm").map(|g| g * 1e-3),
            gmr_note: None,
            rating_amps: number(&cells, "ampacity_A"),
            source: text(&cells, "source"),
            provenance: text(&cells, "provenance"),
            // By code word alone: sizes there are rounded, and the other table has them.
            key: Key { size: None, stranding: None, code: Some(code.to_lowercase()) },
        }
    };
    rows(include_str!("data/acsr_metric_handbook.csv")).map(read).collect()
}

/// GMR over radius of concentric strands (Westinghouse T&D Reference Book, ch. 3; from memory).
fn gmr_over_radius(strands: u32) -> Option<f64> {
    match strands {
        1 => Some(0.7788),
        7 => Some(0.7256),
        19 => Some(0.7577),
        37 => Some(0.7678),
        61 => Some(0.7722),
        _ => None,
    }
}

/// Building wire: direct-current resistance at 75 C, copper and aluminium.
fn building() -> Vec<Conductor> {
    let ratings: HashMap<String, Cells> =
        rows(include_str!("data/ampacity_nec_310_16.csv")).map(|c| (text(&c, "size_awg_kcmil"), c)).collect();
    let mut wires = Vec::new();
    for cells in rows(include_str!("data/conductors_nec.csv")) {
        let size = text(&cells, "size_awg_kcmil");
        let strands = number(&cells, "strands").map_or(1, |n| n as u32);
        let diameter_m = number(&cells, "overall_diam_in").map(|d| d * METRES_PER_INCH);
        let ratio = gmr_over_radius(strands);
        let kinds = [
            (Material::Copper, "rdc75_cu_uncoated_ohm_per_kft", "cu_75C"),
            (Material::Aluminium, "rdc75_al_ohm_per_kft", "al_75C"),
        ];
        for (material, column, rating) in kinds {
            let Some(r) = number(&cells, column) else { continue };
            let solid = if strands == 1 && number(&cells, "area_cmil").is_some_and(|a| a < 20_000.0) {
                " solid"
            } else {
                ""
            };
            wires.push(Conductor {
                name: format!("{}{solid} {} NEC", size_label(&size), material.word()),
                family: Family::Building,
                material,
                area_m2: number(&cells, "area_cmil").map(|a| a * SQUARE_METRES_PER_CIRCULAR_MIL),
                resistances: vec![direct(r / METRES_PER_KILOFOOT, 75.0)],
                diameter_m,
                gmr_m: diameter_m.zip(ratio).map(|(d, k)| k * d / 2.0),
                gmr_note: Some("GMR from diameter and number of strands"),
                rating_amps: ratings.get(&size).and_then(|c| number(c, rating)),
                source: text(&cells, "source"),
                provenance: text(&cells, "provenance"),
                key: Key { size: awg_or_kcmil(&size), stranding: Some(strands.to_string()), code: None },
            });
        }
    }
    wires
}

/// Cable conductors of IEC 60228 class 2: greatest direct-current resistance at 20 C.
fn iec() -> Vec<Conductor> {
    let mut wires = Vec::new();
    for cells in rows(include_str!("data/conductors_iec60228.csv")) {
        let Some(mm2) = number(&cells, "mm2") else { continue };
        let (strands, diameter_m) = concentric_strands(mm2);
        for (material, column) in [
            (Material::Copper, "rdc20_cu_plain_class2_ohm_per_km"),
            (Material::Aluminium, "rdc20_al_class2_ohm_per_km"),
        ] {
            let Some(r) = number(&cells, column) else { continue };
            wires.push(Conductor {
                name: format!("{mm2} mm2 {}", material.word()),
                family: Family::Iec,
                material,
                area_m2: Some(mm2 * 1e-6),
                resistances: vec![direct(r / METRES_PER_KILOMETRE, 20.0)],
                diameter_m: Some(diameter_m),
                gmr_m: gmr_over_radius(strands).map(|k| k * diameter_m / 2.0),
                gmr_note: Some("diameter and GMR of concentric round strands of that area, not compacted"),
                rating_amps: None,
                source: text(&cells, "source"),
                provenance: text(&cells, "provenance"),
                key: Key { size: Some(Size::Mm2(mm2)), stranding: None, code: None },
            });
        }
    }
    wires
}

/// Strands of a class 2 conductor (7 to 35 mm2, 19 to 95, 37 to 240, 61 above: IEC 60228 Table 2) and
/// the diameter of so many round ones in concentric layers, metres.
fn concentric_strands(mm2: f64) -> (u32, f64) {
    let (strands, across) = match mm2 {
        a if a <= 35.0 => (7, 3.0),
        a if a <= 95.0 => (19, 5.0),
        a if a <= 240.0 => (37, 7.0),
        _ => (61, 9.0),
    };
    let strand_m = (4.0 * mm2 * 1e-6 / (f64::from(strands) * std::f64::consts::PI)).sqrt();
    (strands, across * strand_m)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn found(text: &str) -> String {
        Catalog::built_in().find(text).map_or_else(|e| format!("{e}; {}", e.cure()), |w| w.name.clone())
    }

    #[test]
    fn every_row_can_be_read() {
        let all = Catalog::built_in().search("");
        assert!(all.len() > 180, "{}", all.len());
        for wire in all {
            assert!(!wire.resistances.is_empty() && !wire.source.is_empty(), "{}", wire.name);
            assert!(wire.resistances.iter().all(|r| r.ohm_per_m > 0.0 && r.ohm_per_m < 1.0), "{}", wire.name);
        }
        assert_eq!(Catalog::built_in().concentric().len(), 19);
        assert_eq!(Catalog::built_in().tape().len(), 9);
        assert!(Catalog::built_in().conduit_rows().len() > 100);
    }

    #[test]
    fn wires_are_found_however_written() {
        for text in ["4/0 AWG ACSR 6/1", "4/0 6/1 ACSR", "4/0 ACSR"] {
            assert_eq!(found(text), "4/0 AWG 6/1 ACSR", "{text}");
        }
        for text in ["336.4 26/7 ACSR", "336,400 26/7", "336.4 kcmil 26/7 acsr", "336.4 MCM 26/7"] {
            assert_eq!(found(text), "336.4 kcmil 26/7 ACSR", "{text}");
        }
        for text in ["95 mm² Cu", "95mm2 copper", "95 mm2 cu", "95 MM2 Copper"] {
            assert_eq!(found(text), "95 mm2 copper", "{text}");
        }
        assert_eq!(found("dove"), "Dove (556 kcmil 26/7 ACSR)");
        assert_eq!(found("Linnet"), "336.4 kcmil 26/7 ACSR");
        assert_eq!(found("Tulip AAC"), "336.4 kcmil AAC");
        assert_eq!(found("1/0 AA"), "1/0 AWG AAC");
        assert_eq!(found("#2 6/1"), "2 AWG 6/1 ACSR");
        assert_eq!(found("250 kcmil aluminium NEC"), "250 kcmil aluminium NEC");
        assert_eq!(found("10 awg SOLID copper"), "10 AWG solid copper");
        assert!(found("No. 10 solid copper").contains("10 AWG solid copper NEC"), "both tables have it");
    }

    /// A comma is a decimal sign unless three digits follow; zeros in a row are the old gauge names.
    #[test]
    fn commas_and_zeros_keep_their_size() {
        assert_eq!(found("2,5 mm² Cu"), "2.5 mm2 copper");
        assert_eq!(found("1,5mm2 Cu"), "1.5 mm2 copper");
        assert_eq!(found("336,4 kcmil 26/7"), "336.4 kcmil 26/7 ACSR");
        assert_eq!(found("ACSR, 26/7, 336.4"), "336.4 kcmil 26/7 ACSR");
        for (zeros, size) in [("0", "1/0"), ("00", "2/0"), ("000", "3/0"), ("0000", "4/0")] {
            assert_eq!(found(&format!("{zeros} 6/1 ACSR")), format!("{size} AWG 6/1 ACSR"));
        }
    }

    #[test]
    fn code_words_name_wires_of_the_table() {
        for cells in rows(include_str!("data/code_words.csv")) {
            let code = text(&cells, "code_word");
            let wire = Catalog::built_in().find(&code).expect("a wire");
            assert!(
                wire.name.starts_with(&size_label(&text(&cells, "size_awg_kcmil"))),
                "{code}: {}",
                wire.name
            );
        }
    }

    /// A user's wire stands for the built-in one that its name means, however either is written.
    #[test]
    fn own_wires_add_and_override() {
        let own = |name: &str| Conductor::own(name, Material::Aluminium, direct(1e-3, 20.0));
        let catalog = Catalog::with(vec![own("4/0 AWG 6/1 ACSR"), own("Blue cable"), own("linnet")]);
        let family = |text: &str| catalog.find(text).expect("a wire").family;
        for text in ["4/0 ACSR", "4/0 6/1 acsr", "Penguin", "blue CABLE", "336.4 26/7 ACSR"] {
            assert_eq!(family(text), Family::Own, "{text}");
        }
        assert_eq!(family("3/0 ACSR"), Family::Acsr);
    }

    #[test]
    fn conduit_takes_building_wire_before_others() {
        let name = |text: &str| Catalog::built_in().find_building(text).map(|w| w.name.clone());
        assert_eq!(name("4/0 copper").as_deref(), Ok("4/0 AWG copper NEC"));
        assert_eq!(name("#12 Cu").as_deref(), Ok("12 AWG copper NEC"));
        assert_eq!(name("10 mm2 Cu").as_deref(), Ok("10 mm2 copper"));
        assert!(matches!(name("250 MCM"), Err(LookupFault::Ambiguous { choices, .. }) if choices.len() == 2));
    }

    #[test]
    fn doubtful_and_unknown_wires_say_what_there_is() {
        let Err(LookupFault::Ambiguous { choices, .. }) = Catalog::built_in().find("#2") else {
            panic!("many fit")
        };
        assert!(choices.len() > 3, "{choices:?}");
        let Err(fault @ LookupFault::Unknown { .. }) = Catalog::built_in().find("Dofe") else {
            panic!("none fits")
        };
        assert!(fault.cure().contains("Dove"), "{}", fault.cure());
        assert!(Catalog::built_in().find("").is_err());
    }
}
