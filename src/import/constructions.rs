//! `constructions.csv`: constructions described by wires and geometry, and what they come to.

use std::collections::{HashMap, HashSet};

use super::Intake;
use super::row::Row;
use super::schema::{Column, Range, Schema, per_length};
use super::table::read_table;
use super::wires::{read_conductors, read_spacings};
use crate::catalog::{Catalog, ConduitKind};
use crate::diagnostic::{Code, FileId, Origin, nearest};
use crate::impedance::{Conditions, EPSILON_0, Kind, Recipe, RecipeFault, Sequence, Spacing, evaluate};
use crate::math::{Complex64, PhaseMatrix};
use crate::network::{Conductors, Construction, LineRecord, Name, Study};
use crate::units::SIEMENS_PER_MICROSIEMENS;

/// A construction as described, and where.
struct Described {
    name: Name,
    recipe: Recipe,
    /// Temperature given in its row; the study's otherwise.
    own_temperature: bool,
    /// False where its row has a fault that was told: it then stands in with a placeholder.
    sound: bool,
    origin: Origin,
}

/// What the three files hold, before it is known which conductors lines want.
pub(super) struct Descriptions {
    described: Vec<Described>,
    catalog: Catalog,
}

/// Reads the three files; each may be absent.
pub(super) fn read(
    intake: &mut Intake,
    constructions: Option<FileId>,
    conductors: Option<FileId>,
    spacings: Option<FileId>,
) -> Descriptions {
    let own = conductors.map(|file| read_conductors(intake, file)).unwrap_or_default();
    let spacings = spacings.map(|file| read_spacings(intake, file)).unwrap_or_default();
    let mut described: Vec<Described> = Vec::new();
    if let Some(file) = constructions {
        let mut first: HashMap<Name, u32> = HashMap::new();
        read_table(intake, file, &CONSTRUCTIONS, |row| {
            let Some(one) = read_construction(row, &spacings) else { return row.lose() };
            if let Some(line) = first.insert(one.name.clone(), one.origin.line) {
                let message = format!("construction `{}` stands already in row {line}", one.name);
                row.error(Code::DuplicateName, CONSTRUCTION, message, "give each its own name");
                return;
            }
            described.push(one);
        });
    }
    Descriptions { described, catalog: Catalog::with(own) }
}

impl Descriptions {
    /// Matrices of each described construction for every set of conductors that a line wants of it.
    ///
    /// `given` are the constructions of `matrices.csv`, whose names must be others.
    pub(super) fn compute(
        mut self,
        intake: &mut Intake,
        study: &Study,
        lines: &[LineRecord],
        given: &[Construction],
    ) -> Computed {
        let conditions = Conditions {
            frequency_hz: study.frequency_hz,
            earth_resistivity_ohm_m: study.earth_resistivity_ohm_m,
            permittivity_f_per_m: EPSILON_0,
        };
        let mut computed = Vec::new();
        for one in &mut self.described {
            if !one.own_temperature {
                one.recipe.temperature_c = study.conductor_temperature_c;
            }
            if given.iter().any(|c| c.name == one.name) {
                let place = intake.sources.place(one.origin, Some("construction"), Some(&one.name));
                let message = format!("construction `{}` is given in matrices.csv as well", one.name);
                intake.diagnostics.error(Code::Conflict, place, message, "keep it in one of the two files");
                continue;
            }
            let mut told = HashSet::new();
            for conductors in wanted(one, lines) {
                if !one.sound {
                    computed.push(placeholder(one, conductors));
                    continue;
                }
                match evaluate_for(one, &self.catalog, conductors, &conditions) {
                    Ok(construction) => computed.push(construction),
                    Err(faults) => {
                        report(intake, one, conductors, faults, &mut told);
                        computed.push(placeholder(one, conductors));
                    }
                }
            }
        }
        let described =
            self.described.into_iter().map(|d| DescribedConstruction { name: d.name, recipe: d.recipe });
        Computed { constructions: computed, described: described.collect(), catalog: self.catalog }
    }
}

/// Stands in for a construction with a fault, so that its lines are not told as faulty too.
fn placeholder(one: &Described, conductors: Conductors) -> Construction {
    let mut z_per_m = PhaseMatrix::zeros();
    for c in conductors.iter() {
        z_per_m[(c.slot(), c.slot())] = Complex64::new(3e-4, 3e-4);
    }
    let y_per_m = PhaseMatrix::zeros();
    Construction {
        name: one.name.clone(),
        conductors,
        z_per_m,
        y_per_m,
        rating_amps: None,
        origin: Some(one.origin),
    }
}

/// What the descriptions came to.
pub(super) struct Computed {
    pub constructions: Vec<Construction>,
    pub described: Vec<DescribedConstruction>,
    pub catalog: Catalog,
}

/// A construction of `constructions.csv`, its temperature settled.
#[derive(Debug, Clone)]
pub struct DescribedConstruction {
    /// Name.
    pub name: Name,
    /// How it is described.
    pub recipe: Recipe,
}

/// Sets of conductors that lines carry with this construction; one likely set where none uses it.
fn wanted(one: &Described, lines: &[LineRecord]) -> Vec<Conductors> {
    let mut sets: Vec<Conductors> = Vec::new();
    for line in lines.iter().filter(|l| l.construction == one.name) {
        if !sets.contains(&line.conductors) {
            sets.push(line.conductors);
        }
    }
    if sets.is_empty() {
        // Unused: its wires are looked up all the same, so that a slip shows.
        let slots = one.recipe.spacing.iter().flat_map(|s| s.places.iter().map(|(slot, _)| *slot));
        let letters: Conductors =
            slots.filter_map(|s| crate::network::Conductor::ALL.get(s).copied()).collect();
        sets.push(if letters.phases().is_empty() { Conductors::ABC } else { letters.phases() });
    }
    sets
}

fn evaluate_for(
    one: &Described,
    catalog: &Catalog,
    conductors: Conductors,
    conditions: &Conditions,
) -> Result<Construction, Vec<RecipeFault>> {
    let phases: Vec<usize> = conductors.phases().iter().map(|c| c.slot()).collect();
    let computed = evaluate(&one.recipe, catalog, &phases, conductors.has_neutral(), conditions)?;
    Ok(Construction {
        name: one.name.clone(),
        conductors,
        z_per_m: computed.z_per_m,
        y_per_m: computed.y_per_m,
        rating_amps: computed.rating_amps,
        origin: Some(one.origin),
    })
}

fn report(
    intake: &mut Intake,
    one: &Described,
    conductors: Conductors,
    faults: Vec<RecipeFault>,
    told: &mut HashSet<String>,
) {
    for fault in faults {
        let (code, column) = match &fault {
            RecipeFault::Wire(_) => (Code::UnknownConductor, "phase_conductor"),
            RecipeFault::Geometry(_) => (Code::BadGeometry, "spacing"),
            RecipeFault::MissingDatum { .. } => (Code::MissingDatum, "phase_conductor"),
            RecipeFault::NotInConduit { .. } => (Code::UnknownConductor, "phase_conductor"),
            RecipeFault::NegativeReturn => (Code::Conflict, "kind"),
            RecipeFault::NoPlace { .. } => (Code::UnknownSpacing, "spacing"),
            RecipeFault::NoNeutral => (Code::ConductorMismatch, "neutral_conductor"),
            RecipeFault::NoSequence => (Code::MissingValue, "kind"),
        };
        let text = fault.to_string();
        if is_told(intake, one, &fault) {
            continue;
        }
        if !told.insert(text.clone()) {
            continue;
        }
        let found = match (&fault, column) {
            (RecipeFault::Wire(f), _) => Some(looked_for(f)),
            (_, "phase_conductor") => Some(one.recipe.phase.clone()),
            (_, "spacing") => one.recipe.spacing.as_ref().map(|s| s.name.clone()),
            _ => None,
        };
        // The wire that is not found may be the neutral's.
        let column = match (&found, &one.recipe.neutral) {
            (Some(f), Some(n)) if f == n && column == "phase_conductor" && *f != one.recipe.phase => {
                "neutral_conductor"
            }
            _ => column,
        };
        let place = intake.sources.place(one.origin, Some(column), found.as_deref());
        let message = format!("construction `{}` for conductors {conductors}: {text}", one.name);
        intake.diagnostics.error(code, place, message, fault.cure());
    }
}

/// True where the wire or spacing it wants was told as faulty in its own file.
fn is_told(intake: &Intake, one: &Described, fault: &RecipeFault) -> bool {
    match fault {
        RecipeFault::Wire(wire) => intake.unread_wires.has(&looked_for(wire)),
        RecipeFault::NoPlace { .. } => {
            one.recipe.spacing.as_ref().is_some_and(|s| intake.unread_spacings.has(&s.name))
        }
        _ => false,
    }
}

fn looked_for(fault: &crate::catalog::LookupFault) -> String {
    match fault {
        crate::catalog::LookupFault::Unknown { text, .. }
        | crate::catalog::LookupFault::Ambiguous { text, .. } => text.clone(),
    }
}

const CONSTRUCTION: usize = 0;
const KIND: usize = 1;
const PHASE: usize = 2;
const NEUTRAL: usize = 3;
const SPACING: usize = 4;
const TEMPERATURE: usize = 5;
const CONDUIT: usize = 6;
const SEQUENCE: [usize; 6] = [7, 8, 9, 10, 11, 12];

static CONSTRUCTIONS: Schema = Schema {
    file: "constructions.csv",
    columns: &[
        Column::text("construction", "the name of the construction").required(),
        Column::text("kind", "the kind of construction").required(),
        Column::text("phase_conductor", "the wire or cable of the phases"),
        Column::text("neutral_conductor", "the wire of the neutral"),
        Column::text("spacing", "the spacing"),
        Column::number("temperature_c", 1.0, "C", "the conductor temperature")
            .range(Range::Within(-60.0, 250.0)),
        Column::text("conduit", "the conduit"),
        Column::family(per_length!("r1_ohm", "ohm", 1.0), "the positive-sequence resistance")
            .range(Range::NotNegative),
        Column::family(per_length!("x1_ohm", "ohm", 1.0), "the positive-sequence reactance")
            .range(Range::NotNegative),
        Column::family(per_length!("r0_ohm", "ohm", 1.0), "the zero-sequence resistance")
            .range(Range::NotNegative),
        Column::family(per_length!("x0_ohm", "ohm", 1.0), "the zero-sequence reactance")
            .range(Range::NotNegative),
        Column::family(
            per_length!("b1_us", "microsiemens", SIEMENS_PER_MICROSIEMENS),
            "the positive-sequence susceptance",
        )
        .range(Range::NotNegative),
        Column::family(
            per_length!("b0_us", "microsiemens", SIEMENS_PER_MICROSIEMENS),
            "the zero-sequence susceptance",
        )
        .range(Range::NotNegative),
    ],
};

const KINDS: &[(&str, Kind)] = &[
    ("overhead", Kind::Overhead),
    ("concentric", Kind::Concentric),
    ("tape", Kind::Tape),
    ("conduit", Kind::Conduit),
    ("sequence", Kind::Sequence),
    ("bundle", Kind::Bundle),
];

const CONDUITS: &[(&str, ConduitKind)] =
    &[("pvc", ConduitKind::Pvc), ("aluminium", ConduitKind::Aluminium), ("steel", ConduitKind::Steel)];

fn read_construction(row: &mut Row<'_>, spacings: &HashMap<Name, Spacing>) -> Option<Described> {
    let name = row.own_name(CONSTRUCTION);
    let kind = row.is_filled(KIND).then(|| row.word(KIND, KINDS, Kind::Overhead));
    if kind.is_none() {
        row.error(
            Code::MissingValue,
            KIND,
            "the kind of construction is missing",
            "fill in overhead, concentric, tape, conduit, bundle or sequence",
        );
    }
    let phase = row.text(PHASE).map(str::to_owned);
    let neutral = row.text(NEUTRAL).map(str::to_owned);
    let spacing_name = row.shared_name(SPACING);
    let spacing = spacing_name.as_ref().and_then(|s| find_spacing(row, spacings, s));
    let temperature = row.optional_number(TEMPERATURE);
    let conduit = row.word(CONDUIT, CONDUITS, ConduitKind::Pvc);
    let values: Vec<Option<f64>> = SEQUENCE.iter().map(|&c| row.optional_number(c)).collect();
    let mut sound = spacing_name.is_none() || spacing.is_some();
    sound &= kind.is_some();
    let kind = kind.unwrap_or(Kind::Sequence);
    if kind != Kind::Sequence && phase.is_none() {
        row.error(
            Code::MissingValue,
            PHASE,
            "the wire or cable of the phases is missing",
            "fill in `phase_conductor`",
        );
        sound = false;
    }
    let sequence = match values.as_slice() {
        [Some(r1), Some(x1), Some(r0), Some(x0), b1, b0] => Some(Sequence {
            z1: Complex64::new(*r1, *x1),
            z0: Complex64::new(*r0, *x0),
            b1: b1.unwrap_or(0.0),
            b0: b0.unwrap_or(0.0),
        }),
        _ => None,
    };
    let recipe = Recipe {
        kind,
        phase: phase.unwrap_or_default(),
        neutral,
        spacing,
        conduit,
        sequence,
        temperature_c: temperature.unwrap_or(75.0),
    };
    Some(Described { name: name?, recipe, own_temperature: temperature.is_some(), sound, origin: row.origin })
}

fn find_spacing(row: &mut Row<'_>, spacings: &HashMap<Name, Spacing>, name: &Name) -> Option<Spacing> {
    let found = spacings.get(name).cloned();
    if found.is_none() && !row.intake.unread_spacings.has(name) {
        let cure = match nearest(name, spacings.keys().map(|n| &**n)) {
            Some(near) => format!("did you mean `{near}`?"),
            None => "give its positions in spacings.csv".to_owned(),
        };
        row.error(Code::UnknownSpacing, SPACING, format!("there is no spacing `{name}`"), cure);
    }
    found
}
