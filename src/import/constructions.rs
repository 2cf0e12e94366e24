//! `constructions.csv`, `conductors.csv`, `spacings.csv`: constructions computed from wires and geometry.

use super::Intake;
use super::unsupported::is_used;
use crate::diagnostic::{Code, FileId};
use crate::network::Construction;

/// Reads the three files; each may be absent.
pub(super) fn read(
    intake: &mut Intake,
    constructions: Option<FileId>,
    conductors: Option<FileId>,
    spacings: Option<FileId>,
) -> Vec<Construction> {
    for file in [constructions, conductors, spacings].into_iter().flatten() {
        if is_used(intake, file) {
            let place = intake.whole_file(file);
            let message = "this version does not compute impedances from wires and spacings";
            let cure =
                "give the constructions as impedance in matrices.csv, and take this file out of the folder";
            intake.diagnostics.error(Code::NotSupported, place, message, cure);
        }
    }
    Vec::new()
}
