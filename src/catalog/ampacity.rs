//! Current ratings from tables, corrected for ambient temperature and grouping.

use super::conductor::Material;
use super::tables::{Cells, number, rows, text};

/// What the user must be told wherever a rating is shown.
pub const CAUTION: &str =
    "Ratings are a guide from published tables; the local code and a licensed engineer decide.";

/// Reference installation method of IEC 60364-5-52.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum IecMethod {
    /// Clipped direct.
    C,
    /// In free air.
    E,
    /// Single-core cables in conduit within an insulating wall.
    A1,
    /// A multi-core cable in conduit within an insulating wall.
    A2,
    /// Conduit on a wall, single-core.
    B1,
    /// Conduit on a wall, multi-core.
    B2,
}

impl IecMethod {
    fn word(self) -> &'static str {
        match self {
            IecMethod::C => "C",
            IecMethod::E => "E",
            IecMethod::A1 => "A1",
            IecMethod::A2 => "A2",
            IecMethod::B1 => "B1",
            IecMethod::B2 => "B2",
        }
    }
}

/// Rating of building wire, amperes: NEC Table 310.16 in the column of `insulation_c` (60, 75 or
/// 90 C), times the factor that Table 310.15(B)(1) prints for the ambient temperature, times the
/// factor for the number of current-carrying conductors (Table 310.15(C)(1)).
///
/// `None` where the table has no such size, or the ambient leaves nothing.
pub fn nec_rating_amps(
    size: &str,
    material: Material,
    insulation_c: u32,
    ambient_c: f64,
    conductors: u32,
) -> Option<f64> {
    let metal = match material {
        Material::Copper => "cu",
        Material::Aluminium => "al",
        Material::Steel => return None,
    };
    let row =
        rows(include_str!("data/ampacity_nec_310_16.csv")).find(|c| text(c, "size_awg_kcmil") == size)?;
    let base = number(&row, &format!("{metal}_{insulation_c}C"))?;
    Some(base * nec_ambient(insulation_c, ambient_c)? * nec_grouping(conductors)?)
}

/// Factor of the first range whose warm end is not below the ambient: between two ranges the warmer.
///
/// The table is taken rather than the formula it was made from, whose value at the cold end of each
/// range is above the printed one.
fn nec_ambient(insulation_c: u32, ambient_c: f64) -> Option<f64> {
    let row = rows(include_str!("data/ampacity_nec_temperature_factors.csv"))
        .filter(|c| text(c, "base") == "NEC 30 C base")
        .find(|c| warm_end(&text(c, "ambient_C")).is_some_and(|end| ambient_c <= end))?;
    number(&row, &format!("f_{insulation_c}C"))
}

/// Upper end of `31-35`, and 10 of `10 or less`.
fn warm_end(range: &str) -> Option<f64> {
    let last = range.split('-').next_back().unwrap_or(range);
    last.split_whitespace().next()?.parse().ok()
}

fn nec_grouping(conductors: u32) -> Option<f64> {
    rows(include_str!("data/ampacity_nec_bundling.csv")).find_map(|c| {
        let range = text(&c, "current_carrying_conductors");
        let digits: Vec<u32> =
            range.split(|ch: char| !ch.is_ascii_digit()).filter_map(|d| d.parse().ok()).collect();
        let within = match digits.as_slice() {
            [low, high] => (*low..=*high).contains(&conductors),
            [low] => conductors >= *low,
            _ => false,
        };
        if within { number(&c, "factor") } else { None }
    })
}

/// Rating of a cable with three loaded conductors, amperes: IEC 60364-5-52 tables for the insulation
/// temperature (70: PVC, 90: XLPE), times the ambient factor of Table B.52.14 and the factor
/// for circuits grouped enclosed.
///
/// `None` where a table has no such row.
pub fn iec_rating_amps(
    mm2: f64,
    material: Material,
    insulation_c: u32,
    method: IecMethod,
    ambient_c: f64,
    circuits: u32,
) -> Option<f64> {
    let metal = match material {
        Material::Copper => "Cu",
        Material::Aluminium => "Al",
        Material::Steel => return None,
    };
    let (insulation, column) = match insulation_c {
        70 => ("PVC 70C", "f_PVC_70C"),
        90 => ("XLPE 90C", "f_XLPE_90C"),
        _ => return None,
    };
    let fits = |c: &Cells| {
        text(c, "insulation") == insulation
            && text(c, "conductor") == metal
            && text(c, "method") == method.word()
            && text(c, "loaded_conductors") == "3"
            && number(c, "mm2") == Some(mm2)
    };
    let base = rows(include_str!("data/ampacity_iec60364_5_52.csv"))
        .find(fits)
        .and_then(|c| number(&c, "ampacity_A"))?;
    let ambient = rows(include_str!("data/ampacity_iec_temperature_factors.csv"))
        .filter(|c| number(c, "ambient_air_C").is_some_and(|t| t >= ambient_c))
        .find_map(|c| number(&c, column))?;
    let grouping = rows(include_str!("data/ampacity_iec_grouping.csv"))
        .filter(|c| text(c, "arrangement") == "Embedded or enclosed")
        .filter(|c| number(c, "circuits").is_some_and(|n| n >= f64::from(circuits)))
        .find_map(|c| number(&c, "factor"))?;
    Some(base * ambient * grouping)
}

/// Current that heats a conductor from one temperature to another in a short time, amperes: IEC 60949,
/// `I = K S sqrt(ln((b + to)/(b + from)) / t)`, `K` 226 copper, 148 aluminium in A s^1/2 per mm2, `b`
/// 234.5 and 228; times `sqrt(1 + X sqrt(t/S) + Y t/S)`, `X` 0.41 and `Y` 0.12 for copper, 0.57 and 0.16
/// for aluminium in cross-linked polyethylene, for the heat that the insulation takes (from memory).
///
/// `None` for steel, or a time or temperatures that make no sense.
pub fn short_time_amps(
    mm2: f64,
    material: Material,
    from_c: f64,
    to_c: f64,
    seconds: f64,
) -> Option<(f64, f64)> {
    let (k, x, y) = match material {
        Material::Copper => (226.0, 0.41, 0.12),
        Material::Aluminium => (148.0, 0.57, 0.16),
        Material::Steel => return None,
    };
    let beta = material.zero_resistance_k();
    let ratio = (beta + to_c) / (beta + from_c);
    if !(ratio > 1.0 && seconds > 0.0 && mm2 > 0.0) {
        return None;
    }
    let adiabatic = k * mm2 * (ratio.ln() / seconds).sqrt();
    let share = seconds / mm2;
    Some((adiabatic, adiabatic * (1.0 + x * share.sqrt() + y * share).sqrt()))
}

#[cfg(test)]
mod tests {
    use super::*;

    /// NEC Table 310.16: 4/0 copper 230 A at 75 C; factor 0.8 for 4 to 6 conductors.
    #[test]
    fn nec_ratings() {
        assert_eq!(nec_rating_amps("4/0", Material::Copper, 75, 30.0, 3), Some(230.0));
        let four = nec_rating_amps("4/0", Material::Copper, 75, 30.0, 4).unwrap();
        assert!((four - 184.0).abs() < 1e-9);
        // Printed factors at 75 C: 0.88 for 36 to 40 C, 1.20 for 10 C or less, 0.33 for 66 to 70 C, none above.
        let at = |ambient: f64| nec_rating_amps("4/0", Material::Copper, 75, ambient, 3).map(|a| a / 230.0);
        for (ambient, factor) in [(40.0, 0.88), (36.0, 0.88), (35.5, 0.88), (-40.0, 1.20), (70.0, 0.33)] {
            assert!(at(ambient).is_some_and(|f| (f - factor).abs() < 1e-9), "{ambient} C: {:?}", at(ambient));
        }
        assert_eq!((at(70.5), at(f64::NAN)), (None, None));
        assert_eq!(nec_rating_amps("4/0", Material::Copper, 75, 80.0, 3), None);
        assert_eq!(nec_rating_amps("77", Material::Copper, 75, 30.0, 3), None);
    }

    /// IEC 60364-5-52 Table B.52.4, method C, three loaded copper conductors in PVC: 16 mm2 76 A (from memory).
    #[test]
    fn iec_ratings() {
        assert_eq!(iec_rating_amps(16.0, Material::Copper, 70, IecMethod::C, 30.0, 1), Some(76.0));
        let two = iec_rating_amps(16.0, Material::Copper, 70, IecMethod::C, 30.0, 2).unwrap();
        assert!((two - 76.0 * 0.8).abs() < 1e-9);
        assert_eq!(iec_rating_amps(16.0, Material::Steel, 70, IecMethod::C, 30.0, 1), None);
        assert_eq!(iec_rating_amps(16.0, Material::Copper, 60, IecMethod::C, 30.0, 1), None);
    }

    /// The printed ambient factors of both NEC tables are `sqrt((Tc - Ta) / (Tc - base))` with the warm end of each
    /// range for `Ta`, rounded: within 0.006 (the coldest range is open, and stands at 10 C).
    #[test]
    fn nec_ambient_factors_follow_their_formula() {
        let mut checked = 0;
        for row in rows(include_str!("data/ampacity_nec_temperature_factors.csv")) {
            let base = if text(&row, "base") == "NEC 30 C base" { 30.0 } else { 40.0 };
            let end = warm_end(&text(&row, "ambient_C")).unwrap();
            for limit in [60.0f64, 75.0, 90.0] {
                let Some(printed) = number(&row, &format!("f_{limit}C")) else { continue };
                let formula = ((limit - end) / (limit - base)).sqrt();
                assert!((printed - formula).abs() < 0.006, "{limit} C at {end}: {printed}, {formula:.4}");
                checked += 1;
            }
        }
        assert!(checked > 70, "{checked}");
    }
}
