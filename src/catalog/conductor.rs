//! One wire: its resistance, size and rating, and where the numbers come from.

/// Metal that carries the current.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Material {
    /// Copper.
    Copper,
    /// Aluminium; steel-reinforced wires count as aluminium.
    Aluminium,
    /// Steel.
    Steel,
}

impl Material {
    /// Lower-case word.
    pub fn word(self) -> &'static str {
        match self {
            Material::Copper => "copper",
            Material::Aluminium => "aluminium",
            Material::Steel => "steel",
        }
    }

    /// Temperature below 0 C at which resistance would vanish, kelvin: 234.5 copper, 228 aluminium
    /// (IEC 60287-1-1, NEC Chapter 9 Table 8; from memory). Steel is taken as aluminium.
    pub fn zero_resistance_k(self) -> f64 {
        match self {
            Material::Copper => 234.5,
            Material::Aluminium | Material::Steel => 228.0,
        }
    }

    /// Resistivity at 20 C, ohm metre: copper 1.7241e-8 (IEC 60028), aluminium 2.8264e-8 (IEC 60889; from memory).
    /// `None` for steel, which the tables do not give.
    pub fn resistivity_ohm_m(self) -> Option<f64> {
        match self {
            Material::Copper => Some(1.7241e-8),
            Material::Aluminium => Some(2.8264e-8),
            Material::Steel => None,
        }
    }
}

/// Kind of wire as catalogues name it.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Family {
    /// Aluminium conductor, steel reinforced.
    Acsr,
    /// All-aluminium bare conductor.
    Aac,
    /// Bare copper.
    BareCopper,
    /// Steel strand.
    Steel,
    /// Building wire (NEC Chapter 9 Table 8).
    Building,
    /// Cable conductor of an IEC 60228 class.
    Iec,
    /// Given by the user.
    Own,
}

/// Whether a resistance holds for direct current or at a frequency.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Current {
    /// Direct current: skin effect is to be added.
    Direct,
    /// Alternating current at power frequency: skin effect is in it.
    Alternating,
}

/// A resistance as tabulated.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Resistance {
    /// Ohms per metre.
    pub ohm_per_m: f64,
    /// At this conductor temperature, degrees Celsius.
    pub temperature_c: f64,
    /// For direct or alternating current.
    pub current: Current,
}

/// A wire.
#[derive(Debug, Clone, PartialEq)]
pub struct Conductor {
    /// Full name, e.g. `336.4 kcmil 26/7 ACSR`.
    pub name: String,
    /// Kind.
    pub family: Family,
    /// Metal.
    pub material: Material,
    /// Cross-section of the current-carrying metal, square metres.
    pub area_m2: Option<f64>,
    /// Resistances, one a tabulated temperature.
    pub resistances: Vec<Resistance>,
    /// Outer diameter, metres.
    pub diameter_m: Option<f64>,
    /// Geometric mean radius, metres.
    pub gmr_m: Option<f64>,
    /// How the GMR was had, where not from the table.
    pub gmr_note: Option<&'static str>,
    /// Current rating, amperes, where the table gives one for the wire as it is used.
    pub rating_amps: Option<f64>,
    /// Published source.
    pub source: String,
    /// `read`, `memory`, `mixed` or `recomputed`.
    pub provenance: String,
    /// Size, stranding and code word for lookup.
    pub(super) key: super::lookup::Key,
}

impl Conductor {
    /// A wire of the user's own: resistance at a temperature, and what is known of its size.
    pub fn own(name: &str, material: Material, resistance: Resistance) -> Conductor {
        Conductor {
            name: name.trim().to_string(),
            family: Family::Own,
            material,
            area_m2: None,
            resistances: vec![resistance],
            diameter_m: None,
            gmr_m: None,
            gmr_note: None,
            rating_amps: None,
            source: "conductors.csv".to_string(),
            provenance: "given".to_string(),
            key: super::lookup::Key::default(),
        }
    }

    /// Alternating-current resistance at a temperature and frequency, ohms per metre.
    ///
    /// From the tabulated value nearest in temperature, corrected by `R2 = R1 (T0 + t2)/(T0 + t1)`
    /// and, where it holds for direct current, by the skin effect of IEC 60287-1-1, 2.1.2:
    /// `y = x^4 / (192 + 0.8 x^4)`, `x^2 = 8 pi f 1e-7 / R_dc` (round stranded, valid for x up to 2.8;
    /// beyond, the standard's other two ranges).
    pub fn ohm_per_m(&self, temperature_c: f64, frequency_hz: f64) -> Option<f64> {
        let away = |r: &&Resistance| (r.temperature_c - temperature_c).abs();
        let nearest = self.resistances.iter().min_by(|a, b| away(a).total_cmp(&away(b)))?;
        let r = at_temperature(nearest.ohm_per_m, nearest.temperature_c, temperature_c, self.material);
        Some(match nearest.current {
            Current::Alternating => r,
            Current::Direct => r * (1.0 + skin_effect(r, frequency_hz)),
        })
    }
}

/// Resistance at `to_c` from that at `from_c`: `R (T0 + to) / (T0 + from)`.
pub fn at_temperature(ohm: f64, from_c: f64, to_c: f64, material: Material) -> f64 {
    let zero = material.zero_resistance_k();
    ohm * (zero + to_c) / (zero + from_c)
}

/// Skin-effect factor of IEC 60287-1-1, 2.1.2, with `ks` = 1.
fn skin_effect(dc_ohm_per_m: f64, frequency_hz: f64) -> f64 {
    let x2 = 8.0 * std::f64::consts::PI * frequency_hz * 1e-7 / dc_ohm_per_m;
    let x = x2.sqrt();
    if x <= 2.8 {
        x2 * x2 / (192.0 + 0.8 * x2 * x2)
    } else if x <= 3.8 {
        -0.136 - 0.0177 * x + 0.0563 * x2
    } else {
        0.354 * x - 0.733
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// NEC Chapter 9 Table 8, note 2: 0.00323 per kelvin for copper and 0.00330 for aluminium at 75 C.
    #[test]
    fn temperature_coefficients_at_75_c() {
        for (material, alpha) in [(Material::Copper, 0.00323), (Material::Aluminium, 0.00330)] {
            let per_kelvin = at_temperature(1.0, 75.0, 76.0, material) - 1.0;
            assert!((per_kelvin - alpha).abs() < 5e-6, "{material:?} {per_kelvin}");
        }
    }

    /// Skin effect of a 1000 kcmil copper conductor at 60 Hz and 75 C is about 7 % (common practice, no source).
    #[test]
    fn skin_effect_of_a_large_conductor() {
        let dc = 0.0129 / 304.8;
        let y = skin_effect(dc, 60.0);
        assert!((0.05..0.08).contains(&y), "{y}");
        assert!(skin_effect(1.0 / 304.8, 60.0) < 1e-4);
    }
}
