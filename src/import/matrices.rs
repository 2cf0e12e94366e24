//! `matrices.csv`: constructions given as impedance, one row an element.

use std::collections::HashMap;

use super::Intake;
use super::row::Row;
use super::schema::{Column, Schema, per_length};
use super::table::read_table;
use crate::diagnostic::{Code, FileId, Origin};
use crate::math::{Complex64, PhaseMatrix};
use crate::network::{Conductor, Conductors, Construction, Name};
use crate::units::SIEMENS_PER_MICROSIEMENS;

const CONSTRUCTION: usize = 0;
const ROW: usize = 1;
const COLUMN: usize = 2;
const R: usize = 3;
const X: usize = 4;
const B: usize = 5;

static MATRICES: Schema = Schema {
    file: "matrices.csv",
    columns: &[
        Column::text("construction", "the name of the construction").required(),
        Column::text("row", "the conductor of the row").required(),
        Column::text("column", "the conductor of the column").required(),
        Column::family(per_length!("r_ohm", "ohm", 1.0), "the resistance").required(),
        Column::family(per_length!("x_ohm", "ohm", 1.0), "the reactance").required(),
        Column::family(
            per_length!("b_us", "microsiemens", SIEMENS_PER_MICROSIEMENS),
            "the shunt susceptance",
        ),
    ],
};

/// A construction as its elements come in.
struct Matrix {
    name: Name,
    origin: Origin,
    conductors: Conductors,
    z_per_m: PhaseMatrix,
    y_per_m: PhaseMatrix,
    /// False where an element has a fault that was told.
    sound: bool,
    /// Where each element of the upper triangle was given.
    given: [[Option<Origin>; 4]; 4],
}

/// Reads `matrices.csv` into constructions; each must have every element of its upper triangle once.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<Construction> {
    let mut matrices: Vec<Matrix> = Vec::new();
    let mut index: HashMap<Name, usize> = HashMap::new();
    read_table(intake, file, &MATRICES, |row| read_row(row, &mut matrices, &mut index));
    for matrix in matrices.iter().filter(|m| m.sound) {
        if !intake.unread_elements {
            report_missing(intake, matrix);
        }
    }
    matrices.into_iter().map(Matrix::finish).collect()
}

fn read_row(row: &mut Row<'_>, matrices: &mut Vec<Matrix>, index: &mut HashMap<Name, usize>) {
    let name = row.shared_name(CONSTRUCTION);
    let element = single(row, ROW).zip(single(row, COLUMN));
    let (r, x) = (row.optional_number(R), row.optional_number(X));
    let b = row.number_or(B, 0.0);
    let Some(name) = name else { return row.lose() };
    let at = *index.entry(name.clone()).or_insert_with(|| {
        matrices.push(Matrix::new(name, row.origin));
        matrices.len() - 1
    });
    let Some(matrix) = matrices.get_mut(at) else { return };
    matrix.sound &= r.is_some() && x.is_some() && element.is_some();
    if let Some((i, j)) = element {
        let z = Complex64::new(r.unwrap_or(0.0), x.unwrap_or(0.0));
        matrix.put(row, i, j, z, Complex64::new(0.0, b));
    }
}

fn single(row: &mut Row<'_>, column: usize) -> Option<Conductor> {
    let set = row.conductors(column)?;
    let mut all = set.iter();
    match (all.next(), all.next()) {
        (Some(one), None) => Some(one),
        _ => {
            let message = "expected one conductor: a, b, c or n";
            let cure = "give each element of the matrix a row of its own, such as row `a`, column `b`";
            row.error(Code::BadPhases, column, message, cure);
            None
        }
    }
}

impl Matrix {
    fn new(name: Name, origin: Origin) -> Matrix {
        let (z_per_m, y_per_m) = (PhaseMatrix::zeros(), PhaseMatrix::zeros());
        let given = [[None; 4]; 4];
        Matrix { name, origin, conductors: Conductors::NONE, z_per_m, y_per_m, sound: true, given }
    }

    fn put(&mut self, row: &mut Row<'_>, i: Conductor, j: Conductor, z: Complex64, y: Complex64) {
        self.conductors = self.conductors.with(i).with(j);
        let (low, high) = (i.min(j), i.max(j));
        let Some(given) = self.given.get_mut(low.slot()).and_then(|r| r.get_mut(high.slot())) else { return };
        if let Some(first) = given {
            let message = format!(
                "element {low}-{high} of construction `{}` stands already in row {}",
                self.name, first.line
            );
            let cure = if i == j {
                "delete one of the two rows"
            } else {
                "delete one of the two rows; the matrix is symmetric, so one of a-b and b-a is enough"
            };
            row.error(Code::MatrixIncomplete, ROW, message, cure);
            return;
        }
        *given = Some(row.origin);
        for (k, m) in [(low.slot(), high.slot()), (high.slot(), low.slot())] {
            self.z_per_m[(k, m)] = z;
            self.y_per_m[(k, m)] = y;
        }
    }

    fn missing(&self) -> Vec<String> {
        let mut missing = Vec::new();
        for i in self.conductors.iter() {
            for j in self.conductors.iter().filter(|&j| j >= i) {
                let given =
                    self.given.get(i.slot()).and_then(|r| r.get(j.slot())).is_some_and(Option::is_some);
                if !given {
                    missing.push(format!("{i}-{j}"));
                }
            }
        }
        missing
    }

    /// One with a fault stands in with a likely impedance, so that it is not told as faulty again.
    fn finish(self) -> Construction {
        let mut z_per_m = self.z_per_m;
        if !self.sound || !self.missing().is_empty() {
            z_per_m = PhaseMatrix::zeros();
            self.conductors.iter().for_each(|c| z_per_m[(c.slot(), c.slot())] = Complex64::new(3e-4, 3e-4));
        }
        Construction {
            name: self.name,
            conductors: self.conductors,
            z_per_m,
            y_per_m: self.y_per_m,
            rating_amps: None,
            origin: Some(self.origin),
        }
    }
}

fn report_missing(intake: &mut Intake, matrix: &Matrix) {
    let missing = matrix.missing();
    if missing.is_empty() {
        return;
    }
    let plural = if missing.len() == 1 { "element" } else { "elements" };
    let message = format!(
        "construction `{}` has conductors {}, but its matrix lacks {plural} {}",
        matrix.name,
        matrix.conductors,
        missing.join(", ")
    );
    let cure = "add a row for each; mutual impedance that is really nothing is written as 0";
    let place = intake.sources.place(matrix.origin, Some("construction"), Some(&matrix.name));
    intake.diagnostics.error(Code::MatrixIncomplete, place, message, cure);
}
