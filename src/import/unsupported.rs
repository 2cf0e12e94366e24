//! Files the format knows and this version does not use yet.

use super::Intake;
use super::table::has_rows;
use crate::diagnostic::{Code, FileId};

/// `profiles.csv`: loads are taken at their full value.
pub(super) fn profiles(intake: &mut Intake, file: FileId) {
    if is_used(intake, file) {
        let place = intake.whole_file(file);
        let message = "this version does not use profiles: every load is taken at the kW of its row";
        let cure = "if full load is what you want, take the file out of the folder to be rid of this warning";
        intake.diagnostics.warning(Code::NotSupported, place, message, cure);
    }
}

/// True where the file has rows below its header.
pub(super) fn is_used(intake: &Intake, file: FileId) -> bool {
    intake.sources.file(file).is_some_and(|f| has_rows(&f.text))
}
