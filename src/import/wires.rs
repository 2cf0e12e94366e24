//! `conductors.csv` and `spacings.csv`: wires of the user's own, and where the wires of a line hang.

use std::collections::HashMap;

use super::Intake;
use super::row::Row;
use super::schema::{Column, Header, Range, Schema, per_length};
use super::table::read_table;
use crate::catalog::{Conductor, Current, Material, Resistance, at_temperature};
use crate::diagnostic::{Code, FileId};
use crate::impedance::Spacing;
use crate::network::Name;
use crate::units::{METRES_PER_FOOT, METRES_PER_INCH};

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
                Header { name: "x_m", factor: 1.0, unit: "m" },
                Header { name: "x_ft", factor: METRES_PER_FOOT, unit: "ft" },
            ],
            "the place across the line",
        )
        .required()
        .range(Range::Within(-100.0, 100.0)),
        Column::family(
            &[
                Header { name: "y_m", factor: 1.0, unit: "m" },
                Header { name: "y_ft", factor: METRES_PER_FOOT, unit: "ft" },
            ],
            "the height above earth",
        )
        .required()
        .range(Range::Within(-100.0, 500.0)),
    ],
};

pub(super) fn read_spacings(intake: &mut Intake, file: FileId) -> HashMap<Name, Spacing> {
    let mut spacings: HashMap<Name, Spacing> = HashMap::new();
    read_table(intake, file, &SPACINGS, |row| {
        let name = row.shared_name(PLACE_NAME);
        let position = row.conductors(POSITION);
        let (x, y) = (row.number_or(X, 0.0), row.number_or(Y, 1.0));
        let (Some(name), Some(position)) = (name, position) else {
            let name = row.peek(PLACE_NAME);
            row.intake.unread_spacings.add(name);
            return;
        };
        let mut letters = position.iter();
        let (Some(conductor), None) = (letters.next(), letters.next()) else {
            row.error(
                Code::BadPhases,
                POSITION,
                "expected one conductor: a, b, c or n",
                "give each conductor a row of its own",
            );
            row.intake.unread_spacings.add(Some(&name));
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
                Header { name: "diameter_mm", factor: 1e-3, unit: "mm" },
                Header { name: "diameter_in", factor: METRES_PER_INCH, unit: "in" },
            ],
            "the outer diameter",
        )
        .range(Range::Positive),
        Column::family(
            &[
                Header { name: "gmr_mm", factor: 1e-3, unit: "mm" },
                Header { name: "gmr_ft", factor: METRES_PER_FOOT, unit: "ft" },
                Header { name: "gmr_in", factor: METRES_PER_INCH, unit: "in" },
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

pub(super) fn read_conductors(intake: &mut Intake, file: FileId) -> Vec<Conductor> {
    let mut wires = Vec::new();
    read_table(intake, file, &CONDUCTORS, |row| match read_conductor(row) {
        Some(wire) => wires.push(wire),
        None => {
            let name = row.peek(WIRE);
            row.intake.unread_wires.add(name);
        }
    });
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
        if row.is_filled(R) || (row.is_filled(AREA) && area_m2.is_none()) {
            return None; // that cell was told as faulty
        }
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
