//! `curves.csv`: curves of output against voltage, one row a point.

use std::collections::HashMap;

use super::Intake;
use super::row::Row;
use super::schema::{Column, Range, Schema};
use super::table::read_table;
use crate::diagnostic::{Code, FileId, Origin};
use crate::network::{CurvePoint, CurveRecord, Name};

const CURVE: usize = 0;
const PU: usize = 1;
const PERCENT: usize = 2;

static CURVES: Schema = Schema {
    file: "curves.csv",
    columns: &[
        Column::text("curve", "the name of the curve").required(),
        Column::number("pu", 1.0, "per unit", "the voltage").required().range(Range::Within(0.3, 2.0)),
        Column::number("percent", 1.0, "%", "the share of the rating")
            .required()
            .range(Range::Within(-100.0, 100.0)),
    ],
};

/// A curve as its points come in, with the row of its last good point.
struct Growing {
    record: CurveRecord,
    last: Option<(CurvePoint, Origin)>,
}

/// Reads the rows of `curves.csv`; the points of a curve stand in order of rising voltage.
pub(super) fn read(intake: &mut Intake, file: FileId) -> Vec<CurveRecord> {
    let mut curves: Vec<Growing> = Vec::new();
    let mut index: HashMap<Name, usize> = HashMap::new();
    read_table(intake, file, &CURVES, |row| read_row(row, &mut curves, &mut index));
    curves.into_iter().map(|c| c.record).collect()
}

fn read_row(row: &mut Row<'_>, curves: &mut Vec<Growing>, index: &mut HashMap<Name, usize>) {
    let name = row.shared_name(CURVE);
    let pu = row.optional_number(PU);
    let percent = row.optional_number(PERCENT);
    let Some(name) = name else { return };
    let at = *index.entry(name.clone()).or_insert_with(|| {
        let record = CurveRecord { curve: name, points: Vec::new(), origin: Some(row.origin) };
        curves.push(Growing { record, last: None });
        curves.len() - 1
    });
    let (Some(pu), Some(percent), Some(curve)) = (pu, percent, curves.get_mut(at)) else { return };
    let point = CurvePoint { pu, percent };
    if let Some((last, first)) = &curve.last
        && !follows(row, &curve.record.curve, *last, *first, point)
    {
        return;
    }
    curve.last = Some((point, row.origin));
    curve.record.points.push(point);
}

/// Whether a point may stand after the last one; reports why not.
fn follows(row: &mut Row<'_>, curve: &Name, last: CurvePoint, at: Origin, point: CurvePoint) -> bool {
    if point.pu <= last.pu {
        let message = format!(
            "the points of curve `{curve}` must rise in voltage, but this one is at {} pu and the one in row {} at {} pu",
            point.pu, at.line, last.pu
        );
        let cure = if point.pu == last.pu {
            "keep one of the two rows; a step is written as two points a little apart"
        } else {
            "put the rows in order of rising voltage, or give the second curve a name of its own"
        };
        row.error(Code::BadCurve, PU, message, cure);
        return false;
    }
    if point.percent > last.percent {
        let message = format!(
            "curve `{curve}` rises from {} % in row {} to {} % at a higher voltage, which would drive the voltage up further",
            last.percent, at.line, point.percent
        );
        let cure = "let it fall or stay level with voltage: positive is delivered, negative is taken in";
        row.error(Code::BadCurve, PERCENT, message, cure);
        return false;
    }
    true
}
