//! `constructions.csv`, `conductors.csv`, `spacings.csv`: constructions computed from wires and geometry.

use std::collections::{HashMap, HashSet};

use super::Intake;
use super::row::Row;
use super::schema::{Column, Range, Schema, per_length};
use super::table::read_table;
use crate::catalog::{Catalog, Conductor, ConduitKind, Current, Material, Resistance, at_temperature};
use crate::diagnostic::{Code, FileId, Origin, nearest};
use crate::impedance::{Conditions, EPSILON_0, Kind, Recipe, RecipeFault, Sequence, Spacing, evaluate};
use crate::math::{Complex64, PhaseMatrix};
use crate::network::{Conductors, Construction, LineRecord, Name, Study};
use crate::units::{METRES_PER_FOOT, METRES_PER_INCH, SIEMENS_PER_MICROSIEMENS};

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
            let Some(one) = read_construction(row, &spacings) else { return };
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
            RecipeFault::NoPlace { .. } => (Code::UnknownSpacing, "spacing"),
            RecipeFault::NoNeutral => (Code::ConductorMismatch, "neutral_conductor"),
            RecipeFault::NoSequence => (Code::MissingValue, "kind"),
        };
        let text = fault.to_string();
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
    if found.is_none() {
        let cure = match nearest(name, spacings.keys().map(|n| &**n)) {
            Some(near) => format!("did you mean `{near}`?"),
            None => "give its positions in spacings.csv".to_owned(),
        };
        row.error(Code::UnknownSpacing, SPACING, format!("there is no spacing `{name}`"), cure);
    }
    found
}

const PLACE_NAME: usize = 0;
const POSITION: usize = 1;
const X: usize = 2;
const Y: usize = 3;

static SPACINGS: Schema = Schema {
    file: "spacings.csv",
    columns: &[
        Column::text("spacing", "the name of the spacing").required(),
        Column::text("position", "the conductor").required(),
        Column::family(
            &[
                super::schema::Header { name: "x_m", factor: 1.0, unit: "m" },
                super::schema::Header { name: "x_ft", factor: METRES_PER_FOOT, unit: "ft" },
            ],
            "the place across the line",
        )
        .required()
        .range(Range::Within(-100.0, 100.0)),
        Column::family(
            &[
                super::schema::Header { name: "y_m", factor: 1.0, unit: "m" },
                super::schema::Header { name: "y_ft", factor: METRES_PER_FOOT, unit: "ft" },
            ],
            "the height above earth",
        )
        .required()
        .range(Range::Within(-100.0, 500.0)),
    ],
};

fn read_spacings(intake: &mut Intake, file: FileId) -> HashMap<Name, Spacing> {
    let mut spacings: HashMap<Name, Spacing> = HashMap::new();
    read_table(intake, file, &SPACINGS, |row| {
        let name = row.shared_name(PLACE_NAME);
        let position = row.conductors(POSITION);
        let (x, y) = (row.number_or(X, 0.0), row.number_or(Y, 1.0));
        let (Some(name), Some(position)) = (name, position) else { return };
        let mut letters = position.iter();
        let (Some(conductor), None) = (letters.next(), letters.next()) else {
            row.error(
                Code::BadPhases,
                POSITION,
                "expected one conductor: a, b, c or n",
                "give each conductor a row of its own",
            );
            return;
        };
        let spacing = spacings
            .entry(name.clone())
            .or_insert_with(|| Spacing { name: name.to_string(), places: Vec::new() });
        if spacing.places.iter().any(|(slot, _)| *slot == conductor.slot()) {
            let message = format!("spacing `{name}` has a place for {conductor} already");
            row.error(Code::DuplicateName, POSITION, message, "delete one of the two rows");
            return;
        }
        spacing.places.push((conductor.slot(), [x, y]));
    });
    spacings
}

const WIRE: usize = 0;
const MATERIAL: usize = 1;
const AREA: usize = 2;
const R: usize = 3;
const R_AT: usize = 4;
const DIAMETER: usize = 5;
const GMR: usize = 6;
const RATING: usize = 7;

static CONDUCTORS: Schema = Schema {
    file: "conductors.csv",
    columns: &[
        Column::text("conductor", "the name of the wire").required(),
        Column::text("material", "the metal").required(),
        Column::number("area_mm2", 1e-6, "mm2", "the cross-section").range(Range::Positive),
        Column::family(per_length!("r_ohm", "ohm", 1.0), "the resistance").range(Range::Positive),
        Column::number("r_at_c", 1.0, "C", "the temperature of the resistance")
            .range(Range::Within(-60.0, 250.0)),
        Column::family(
            &[
                super::schema::Header { name: "diameter_mm", factor: 1e-3, unit: "mm" },
                super::schema::Header { name: "diameter_in", factor: METRES_PER_INCH, unit: "in" },
            ],
            "the outer diameter",
        )
        .range(Range::Positive),
        Column::family(
            &[
                super::schema::Header { name: "gmr_mm", factor: 1e-3, unit: "mm" },
                super::schema::Header { name: "gmr_ft", factor: METRES_PER_FOOT, unit: "ft" },
                super::schema::Header { name: "gmr_in", factor: METRES_PER_INCH, unit: "in" },
            ],
            "the geometric mean radius",
        )
        .range(Range::Positive),
        Column::number("rating_a", 1.0, "A", "the current rating").range(Range::Positive),
        Column::family(per_length!("price", "", 1.0), "the price").range(Range::NotNegative),
    ],
};

const MATERIALS: &[(&str, Material)] = &[
    ("copper", Material::Copper),
    ("cu", Material::Copper),
    ("aluminium", Material::Aluminium),
    ("aluminum", Material::Aluminium),
    ("al", Material::Aluminium),
    ("steel", Material::Steel),
];

fn read_conductors(intake: &mut Intake, file: FileId) -> Vec<Conductor> {
    let mut wires = Vec::new();
    read_table(intake, file, &CONDUCTORS, |row| wires.extend(read_conductor(row)));
    wires
}

fn read_conductor(row: &mut Row<'_>) -> Option<Conductor> {
    let name = row.own_name(WIRE);
    let material = row.is_filled(MATERIAL).then(|| row.word(MATERIAL, MATERIALS, Material::Copper));
    let (area_m2, r) = (row.optional_number(AREA), row.optional_number(R));
    let at_c = row.optional_number(R_AT).unwrap_or(20.0);
    let (diameter_m, gmr_m) = (row.optional_number(DIAMETER), row.optional_number(GMR));
    let rating_amps = row.optional_number(RATING);
    let (name, material) = (name?, material?);
    let by_area = || Some(at_temperature(material.resistivity_ohm_m()? / area_m2?, 20.0, at_c, material));
    let Some(ohm_per_m) = r.or_else(by_area) else {
        let message = format!("neither the resistance nor the cross-section of wire `{name}` is given");
        row.error(Code::MissingDatum, R, message, "fill in `r_ohm_per_km` (with `r_at_c`), or `area_mm2`");
        return None;
    };
    let resistance = Resistance { ohm_per_m, temperature_c: at_c, current: Current::Direct };
    let mut wire = Conductor::own(&name, material, resistance);
    wire.area_m2 = area_m2;
    wire.diameter_m = diameter_m;
    wire.gmr_m = gmr_m.or(diameter_m.map(|d| 0.7788 * d / 2.0));
    wire.gmr_note = (gmr_m.is_none() && diameter_m.is_some())
        .then_some("GMR as of a solid round wire, 0.7788 times its radius");
    wire.rating_amps = rating_amps;
    Some(wire)
}
