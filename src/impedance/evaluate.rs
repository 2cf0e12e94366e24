//! What a recipe comes to: wires looked up, placed, and handed to the computations.

use super::cable::{Concentric, Tape, concentric_wires, tape_wires};
use super::carson::{Conditions, EarthReturn};
use super::given::{conduit, sequence};
use super::layout::{Layout, Target, Wire, compute};
use super::recipe::{Computed, Kind, Recipe, RecipeFault};
use super::shunt::{concentric_siemens_per_m, tape_siemens_per_m};
use super::{LineConstants, NEUTRAL};
use crate::catalog::{Catalog, ConcentricCable, Conductor, Family, LookupFault, TapeCable};
use crate::math::{Complex64, PhaseMatrix};

/// Relative permittivity of cable insulation, cross-linked polyethylene (Kersting, ch. 5; from memory).
const INSULATION_PERMITTIVITY: f64 = 2.3;
/// Resistivity of copper tape at 50 C as the textbook takes it, ohm metre (Kersting, ch. 4; from memory).
const TAPE_OHM_M: f64 = 2.3715e-8;
/// Depth of a cable whose spacing is not given, metres: the modified equations do not depend on it.
const DEPTH_M: f64 = -0.9;

/// Works out a recipe for the phase slots a line carries, with the neutral explicit where it carries `n`.
///
/// # Errors
/// Every fault of the recipe.
pub fn evaluate(
    recipe: &Recipe,
    catalog: &Catalog,
    phases: &[usize],
    neutral: bool,
    conditions: &Conditions,
) -> Result<Computed, Vec<RecipeFault>> {
    let mut workings = Workings {
        recipe,
        catalog,
        phases,
        neutral,
        conditions,
        faults: Vec::new(),
        assumptions: Vec::new(),
        sources: Vec::new(),
        rating: None,
    };
    let computed_all = match recipe.kind {
        Kind::Overhead | Kind::Bundle => workings.wires(),
        Kind::Concentric => workings.concentric(),
        Kind::Tape => workings.tape(),
        Kind::Conduit => workings.conduit(),
        Kind::Sequence => workings.sequence(),
    };
    match computed_all {
        Some((z_per_m, y_per_m, constants)) if workings.faults.is_empty() => Ok(Computed {
            z_per_m,
            y_per_m,
            constants,
            rating_amps: workings.rating,
            assumptions: workings.assumptions,
            sources: workings.sources,
        }),
        _ => Err(workings.faults),
    }
}

type Matrices = Option<(PhaseMatrix, PhaseMatrix, Option<LineConstants>)>;

struct Workings<'a> {
    recipe: &'a Recipe,
    catalog: &'a Catalog,
    phases: &'a [usize],
    neutral: bool,
    conditions: &'a Conditions,
    faults: Vec<RecipeFault>,
    assumptions: Vec<String>,
    sources: Vec<String>,
    rating: Option<f64>,
}

const LETTERS: [&str; 4] = ["a", "b", "c", "n"];

impl Workings<'_> {
    fn find(&mut self, text: &str) -> Option<Conductor> {
        match self.catalog.find(text) {
            Ok(wire) => {
                let source = format!("{}: {} ({})", wire.name, wire.source, wire.provenance);
                if !self.sources.contains(&source) {
                    self.sources.push(source);
                }
                Some(wire.clone())
            }
            Err(fault) => {
                self.faults.push(RecipeFault::Wire(fault));
                None
            }
        }
    }

    fn datum(&mut self, wire: &Conductor, datum: &'static str, value: Option<f64>) -> Option<f64> {
        if value.is_none() {
            self.faults.push(RecipeFault::MissingDatum { wire: wire.name.clone(), datum });
        }
        value
    }

    /// Resistance at the recipe's temperature, and GMR.
    fn metal(&mut self, wire: &Conductor) -> Option<(f64, f64)> {
        let resistance = wire.ohm_per_m(self.recipe.temperature_c, self.conditions.frequency_hz);
        let r = self.datum(wire, "the resistance", resistance);
        let gmr = self.datum(wire, "the GMR", wire.gmr_m);
        if let Some(note) = wire.gmr_note {
            self.assume(format!("{}: {note}", wire.name));
        }
        Some((r?, gmr?))
    }

    fn assume(&mut self, text: String) {
        if !self.assumptions.contains(&text) {
            self.assumptions.push(text);
        }
    }

    /// Places of the carried phases: by their letters, or in order where the spacing has just as many.
    fn places(&mut self) -> Option<Vec<(usize, [f64; 2])>> {
        let Some(spacing) = &self.recipe.spacing else {
            if self.phases.len() == 1 && matches!(self.recipe.kind, Kind::Concentric | Kind::Tape) {
                return Some(vec![(self.phases[0], [0.0, DEPTH_M])]);
            }
            let conductors = self.phases.iter().map(|&s| LETTERS[s]).collect::<Vec<_>>().join(", ");
            self.faults.push(RecipeFault::NoPlace { conductors });
            return None;
        };
        let given: Vec<(usize, [f64; 2])> =
            spacing.places.iter().copied().filter(|(s, _)| *s != NEUTRAL).collect();
        let by_letter: Vec<_> =
            self.phases.iter().filter_map(|s| given.iter().find(|(g, _)| g == s).copied()).collect();
        if by_letter.len() == self.phases.len() {
            return Some(by_letter);
        }
        if given.len() == self.phases.len() {
            let pair =
                |(&s, (g, _)): (&usize, &(usize, _))| format!("{} at place {}", LETTERS[s], LETTERS[*g]);
            let pairs: Vec<String> = self.phases.iter().zip(&given).map(pair).collect();
            self.assume(format!("the spacing names other phases; taken in order: {}", pairs.join(", ")));
            return Some(self.phases.iter().copied().zip(given.into_iter().map(|(_, p)| p)).collect());
        }
        let missing = self.phases.iter().filter(|s| given.iter().all(|(g, _)| g != *s));
        let conductors = missing.map(|&s| LETTERS[s]).collect::<Vec<_>>().join(", ");
        self.faults.push(RecipeFault::NoPlace { conductors });
        None
    }

    fn neutral_target(&self) -> Target {
        if self.neutral { Target::Slot(NEUTRAL) } else { Target::Earth }
    }

    /// The separate neutral wire, where the construction has one.
    fn neutral_wire(&mut self) -> Option<Option<Wire>> {
        let Some(text) = self.recipe.neutral.clone() else {
            let screened = matches!(self.recipe.kind, Kind::Concentric);
            if self.neutral && !screened {
                self.faults.push(RecipeFault::NoNeutral);
                return None;
            }
            return Some(None);
        };
        let wire = self.find(&text)?;
        let place =
            self.recipe.spacing.as_ref().and_then(|s| s.places.iter().find(|(slot, _)| *slot == NEUTRAL));
        let Some(&(_, place)) = place else {
            self.faults.push(RecipeFault::NoPlace { conductors: "n".to_string() });
            return None;
        };
        let (r, gmr) = self.metal(&wire)?;
        if !self.neutral {
            self.assume(
                "the neutral is taken into the phases (Kron reduction): it is earthed along the line"
                    .to_string(),
            );
        }
        Some(Some(bare("neutral", &wire, r, gmr, place, self.neutral_target())))
    }

    fn wires(&mut self) -> Matrices {
        let places = self.places();
        let neutral = self.neutral_wire();
        let wire = self.find(&self.recipe.phase.clone())?;
        self.rating = wire.rating_amps;
        let (r, gmr) = self.metal(&wire)?;
        let mut wires: Vec<Wire> = places?
            .into_iter()
            .map(|(slot, place)| {
                bare(&format!("phase {}", LETTERS[slot]), &wire, r, gmr, place, Target::Slot(slot))
            })
            .collect();
        wires.extend(neutral?);
        let bundle = self.recipe.kind == Kind::Bundle;
        if bundle {
            self.assume("cores by their spacing, with Carson's earth return; charging of the low-voltage cable left out".to_string());
        }
        self.computed(Layout { wires, shunt: bundle.then(PhaseMatrix::zeros) })
    }

    fn computed(&mut self, layout: Layout) -> Matrices {
        match compute(&layout, EarthReturn::Modified, self.conditions) {
            Ok(constants) => {
                let series = match constants.series_difference_percent {
                    Some(percent) => format!("the series to the fourth power differs by at most {percent:.2} %"),
                    None => "too conductive for wires so high: the series for a check does not hold, treat with caution".to_string(),
                };
                self.assume(format!(
                    "Carson's equations, modified form, earth {} ohm m; {series}",
                    self.conditions.earth_resistivity_ohm_m
                ));
                self.assume(format!("conductors at {} C", self.recipe.temperature_c));
                if constants.y_per_m.is_none() {
                    self.assume("charging left out: a diameter is not known".to_string());
                }
                let y = constants.y_per_m.unwrap_or_else(PhaseMatrix::zeros);
                Some((constants.z_per_m, y, Some(constants)))
            }
            Err(faults) => {
                self.faults.extend(faults.into_iter().map(RecipeFault::Geometry));
                None
            }
        }
    }

    fn concentric(&mut self) -> Matrices {
        let places = self.places();
        let neutral = self.neutral_wire();
        let cable = self.cable(self.catalog.concentric(), |c: &ConcentricCable| &c.name)?;
        self.rating = cable.rating_amps;
        self.sources.push(format!("{}: {} ({})", cable.name, cable.source, cable.provenance));
        let (phase, strand) = (self.find(&cable.phase), self.find(&cable.strand));
        let (phase, strand) = (phase?, strand?);
        let (metal, strand_metal) = (self.metal(&phase)?, self.metal(&strand)?);
        let data = Concentric {
            ohm_per_m: metal.0,
            gmr_m: metal.1,
            diameter_m: self.datum(&phase, "the diameter", phase.diameter_m)?,
            over_strands_m: cable.over_strands_m,
            strands: cable.strands,
            strand_diameter_m: self.datum(&strand, "the diameter", strand.diameter_m)?,
            strand_gmr_m: strand_metal.1,
            strand_ohm_per_m: strand_metal.0,
        };
        let y = concentric_siemens_per_m(
            data.circle_radius_m(),
            data.diameter_m / 2.0,
            data.strand_diameter_m / 2.0,
            data.strands,
            INSULATION_PERMITTIVITY,
            self.conditions,
        );
        let mut wires = Vec::new();
        for (slot, place) in places? {
            let first = wires.len();
            wires.extend(concentric_wires(&data, LETTERS[slot], slot, place, self.neutral_target(), first));
        }
        wires.extend(neutral?);
        self.screened(wires, y)
    }

    fn tape(&mut self) -> Matrices {
        let places = self.places();
        let neutral = self.neutral_wire();
        let cable = self.cable(self.catalog.tape(), |c: &TapeCable| &c.name)?;
        self.rating = cable.rating_amps;
        self.sources.push(format!("{}: {} ({})", cable.name, cable.source, cable.provenance));
        let phase = self.find(&cable.phase)?;
        let metal = self.metal(&phase)?;
        let data = Tape {
            ohm_per_m: metal.0,
            gmr_m: metal.1,
            diameter_m: self.datum(&phase, "the diameter", phase.diameter_m)?,
            over_tape_m: cable.over_tape_m,
            thickness_m: cable.thickness_m,
            resistivity_ohm_m: TAPE_OHM_M,
        };
        let y = tape_siemens_per_m(
            data.shield_radius_m(),
            data.diameter_m / 2.0,
            INSULATION_PERMITTIVITY,
            self.conditions,
        );
        self.assume("the tape is earthed along the line".to_string());
        let mut wires = Vec::new();
        for (slot, place) in places? {
            let first = wires.len();
            wires.extend(tape_wires(&data, LETTERS[slot], slot, place, Target::Earth, first));
        }
        wires.extend(neutral?);
        self.screened(wires, y)
    }

    /// Cables with a screen: charging from each phase to its screen, which is earthed or part of `n`.
    fn screened(&mut self, wires: Vec<Wire>, y: Complex64) -> Matrices {
        self.assume(format!("insulation of relative permittivity {INSULATION_PERMITTIVITY}, screens taken at earth for charging"));
        let mut shunt = PhaseMatrix::zeros();
        for &slot in self.phases {
            shunt[(slot, slot)] = y;
        }
        self.computed(Layout { wires, shunt: Some(shunt) })
    }

    /// The cable of a table that a text means: by its whole name, or by the words of it.
    fn cable<C: Clone>(&mut self, table: &[C], name: impl Fn(&C) -> &String) -> Option<C> {
        let text = self.recipe.phase.trim().to_lowercase();
        let words: Vec<&str> = text.split_whitespace().collect();
        let fits = |c: &&C| {
            let full = name(c).to_lowercase();
            let own: Vec<&str> = full.split_whitespace().collect();
            words.iter().all(|w| own.contains(w))
        };
        let found: Vec<&C> = if words.is_empty() { Vec::new() } else { table.iter().filter(fits).collect() };
        let text = self.recipe.phase.trim().to_string();
        match found.as_slice() {
            [one] => return Some((*one).clone()),
            [] => {
                let near = table.iter().map(|c| name(c).clone()).collect();
                self.faults.push(RecipeFault::Wire(LookupFault::Unknown { text, near }));
            }
            many => {
                let choices = many.iter().map(|c| name(c).clone()).collect();
                self.faults.push(RecipeFault::Wire(LookupFault::Ambiguous { text, choices }));
            }
        }
        None
    }

    fn conduit(&mut self) -> Matrices {
        let phase = self.conduit_z(&self.recipe.phase.clone());
        let neutral = match (self.neutral, self.recipe.neutral.clone()) {
            (true, Some(text)) => Some(self.conduit_z(&text)?),
            (true, None) => {
                self.assume("the neutral wire is as the phase wires".to_string());
                phase
            }
            (false, _) => None,
        };
        self.assume("NEC table 9: wires in one conduit at 75 C, 60 Hz; charging left out; current that returns through earth meets the earth return of wires 20 mm apart".to_string());
        let z = conduit(phase?, neutral, self.phases, self.conditions);
        Some((z, PhaseMatrix::zeros(), None))
    }

    /// Impedance to neutral of building wire in the conduit, at the study's frequency.
    fn conduit_z(&mut self, text: &str) -> Option<Complex64> {
        let wire = match self.catalog.find_building(text) {
            Ok(wire) => wire,
            Err(fault) => {
                self.faults.push(RecipeFault::Wire(fault));
                return None;
            }
        };
        // Sizes in mm2 share numbers with AWG and kcmil: only building wire is looked for in the table.
        let size = wire.name.split_whitespace().next().filter(|_| wire.family == Family::Building);
        let row = size.and_then(|s| self.catalog.conduit(s, wire.material, self.recipe.conduit));
        let Some(row) = row else {
            self.faults.push(RecipeFault::NotInConduit { wire: wire.name.clone() });
            return None;
        };
        self.rating = self.rating.or(wire.rating_amps);
        let r =
            crate::catalog::at_temperature(row.r_ohm_per_m, 75.0, self.recipe.temperature_c, row.material);
        self.sources.push(format!("{}: {} ({})", wire.name, row.source, row.provenance));
        Some(Complex64::new(r, row.x_ohm_per_m * self.conditions.frequency_hz / 60.0))
    }

    fn sequence(&mut self) -> Matrices {
        let Some(values) = self.recipe.sequence else {
            self.faults.push(RecipeFault::NoSequence);
            return None;
        };
        if self.neutral && values.z0.re < values.z1.re {
            self.faults.push(RecipeFault::NegativeReturn);
            return None;
        }
        if self.neutral {
            self.assume("zero-sequence current is taken to return in the neutral; current that returns through earth meets the earth return of wires 20 mm apart".to_string());
        }
        if self.phases.len() < 3 {
            self.assume(
                "own and mutual impedance of the three-phase line are used for fewer phases".to_string(),
            );
        }
        let (z, y) = sequence(&values, self.phases, self.neutral, self.conditions);
        Some((z, y, None))
    }
}

fn bare(
    name: &str,
    wire: &Conductor,
    ohm_per_m: f64,
    gmr_m: f64,
    [x_m, y_m]: [f64; 2],
    target: Target,
) -> Wire {
    Wire {
        name: format!("{name} ({})", wire.name),
        ohm_per_m,
        gmr_m,
        diameter_m: wire.diameter_m,
        x_m,
        y_m,
        own_distance_m: None,
        target,
    }
}
