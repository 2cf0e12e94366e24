//! A CSV file as a table whose cells know their file, line, spreadsheet row and column.

use std::sync::Arc;

use super::Intake;
use super::header::{Layout, find_separator, lay_out, normal_names};
use super::records::{Cells, QuoteFault, Records};
use super::row::Row;
use super::schema::Schema;
use super::text::trim;
use crate::diagnostic::{Code, FileId, Origin};

/// Reading of a file stops after this many broken quotes: the rest would be noise.
const MAX_BROKEN_QUOTES: usize = 20;

/// Reads a file of the network folder, calling `each` for every row of data.
///
/// Faults of the header, of quotes and of row lengths are reported here; a row with one of
/// them is not passed on. Returns the number of rows of data, faulty ones included.
pub(crate) fn read_table(
    intake: &mut Intake,
    file: FileId,
    schema: &'static Schema,
    mut each: impl FnMut(&mut Row<'_>),
) -> usize {
    let Some(text) = intake.sources.file(file).map(|f| Arc::clone(&f.text)) else { return 0 };
    let Some((layout, mut records)) = open(intake, file, schema, &text) else {
        intake.lose(schema.file);
        return 0;
    };
    let mut rows = 0;
    let mut broken = 0;
    let mut wrong_separator = false;
    while let Some(origin) = records.next(file) {
        // Before the look for comments: an open quote there would swallow the rest unseen.
        if let Some(fault) = records.quote_fault() {
            report_quote(intake, origin, layout.width, fault);
            intake.lose(schema.file);
            rows += 1;
            broken += 1;
            if broken >= MAX_BROKEN_QUOTES {
                break;
            }
            records.resume_at_next_line(origin);
            continue;
        }
        let cells = records.cells();
        if cells.is_blank_or_comment() {
            continue;
        }
        rows += 1;
        if let Some(other) = other_separator(&layout, cells) {
            if !std::mem::replace(&mut wrong_separator, true) {
                report_separator(intake, origin, &layout, other);
                intake.lose(schema.file);
            }
            continue;
        }
        if has_fitting_length(intake, origin, &layout, cells) {
            each(&mut Row::new(&layout, cells, origin, intake));
        } else {
            intake.lose(schema.file);
        }
    }
    rows
}

fn open<'t>(
    intake: &mut Intake,
    file: FileId,
    schema: &'static Schema,
    text: &'t Arc<str>,
) -> Option<(Layout, Records<'t>)> {
    let mut records = Records::new(text);
    let given = records.skip_separator_line();
    loop {
        records.separator = given.unwrap_or_else(|| find_separator(records.line_at_record()));
        let Some(origin) = records.next(file) else {
            let place = intake.whole_file(file);
            let message = "the file is empty: it has no header row";
            let cure = format!(
                "put the column names in its first row, or delete the file; {} needs at least: {}",
                schema.file,
                schema
                    .columns
                    .iter()
                    .filter(|c| c.need != super::schema::Need::Optional)
                    .map(|c| format!("`{}`", c.name()))
                    .collect::<Vec<_>>()
                    .join(", ")
            );
            intake.diagnostics.error(Code::EmptyFile, place, message, cure);
            return None;
        };
        if let Some(fault) = records.quote_fault() {
            report_quote(intake, origin, 0, fault);
            return None;
        }
        if records.cells().is_blank_or_comment() {
            continue;
        }
        let typed: Vec<&str> = records.cells().iter().map(trim).collect();
        let names = normal_names(typed.iter().copied());
        intake.sources.set_columns(file, names.clone());
        let (sources, diagnostics) = (&intake.sources, &mut intake.diagnostics);
        let layout = lay_out(
            schema,
            &names,
            &typed,
            records.separator,
            Arc::clone(text),
            origin,
            sources,
            diagnostics,
        )?;
        return Some((layout, records));
    }
}

/// The separator that parts a row into as many cells as the header has, where its own leaves it in one.
fn other_separator(layout: &Layout, cells: Cells<'_>) -> Option<char> {
    let row = cells.get(0);
    if layout.width < 2 || cells.len() > layout.width || row.len() < 2 {
        return None;
    }
    // Decimal commas may have parted a row of semicolons once more.
    let count = |c: char| cells.iter().map(|cell| cell.matches(c).count()).sum::<usize>();
    [',', ';', '\t']
        .into_iter()
        .filter(|c| u32::from(*c) != u32::from(layout.separator))
        .find(|c| count(*c) + 1 == layout.width && (cells.len() == 1 || row.contains(*c)))
}

/// One message for a file whose rows are separated in another way than its header.
fn report_separator(intake: &mut Intake, origin: Origin, layout: &Layout, other: char) {
    let word = |c: char| match c {
        ';' => "semicolons",
        '\t' => "tabs",
        _ => "commas",
    };
    let (header, rows) = (word(char::from(layout.separator)), word(other));
    let place = intake.sources.place(origin, None, None);
    let message = format!("the cells of the header are separated by {header}, those of the rows by {rows}");
    let cure = format!("separate the header by {rows} too, or save the file again as CSV");
    intake.diagnostics.error(Code::RowLength, place, message, cure);
}

fn has_fitting_length(intake: &mut Intake, origin: Origin, layout: &Layout, cells: Cells<'_>) -> bool {
    let surplus = first_filled(cells, layout.width..cells.len());
    let unnamed = first_filled(cells, layout.unnamed.iter().copied());
    let message = if surplus.is_some() {
        format!("the row has {} cells, the header has {}", cells.len(), layout.width)
    } else if cells.len() < layout.width {
        format!("the row has only {} of the {} cells of the header", cells.len(), layout.width)
    } else if let Some(position) = unnamed {
        let letter = crate::diagnostic::sheet_column(position);
        format!("column {letter} has no name in the header, but this row has text in it")
    } else {
        return true;
    };
    let cure = match surplus {
        Some(_) if layout.separator == b',' => {
            "look for a comma inside a number or a name: write 12.5, not 12,5, or put the cell in quotes"
        }
        Some(_) => "delete the cells beyond the header, or name their columns",
        None if cells.len() < layout.width => {
            "look whether the row is cut off; blank cells need their separators too"
        }
        None => "name the column (begin with `note` to have it ignored), or clear the cell",
    };
    let found = unnamed.filter(|_| surplus.is_none()).map(|i| trim(cells.get(i)).to_owned());
    let place = intake.sources.place(origin, None, found.as_deref());
    intake.diagnostics.error(Code::RowLength, place, message, cure);
    false
}

fn first_filled(cells: Cells<'_>, mut positions: impl Iterator<Item = usize>) -> Option<usize> {
    positions.find(|&i| !trim(cells.get(i)).is_empty())
}

fn report_quote(intake: &mut Intake, origin: Origin, width: usize, fault: QuoteFault) {
    let (position, message, cure) = match fault {
        QuoteFault::NotClosed(position) => (
            position,
            "a quoted cell begins here and is never closed",
            "add the closing quote, or delete the opening one",
        ),
        QuoteFault::TextAfter(position) => (
            position,
            "text follows the closing quote of a cell",
            "put the whole cell in quotes; a quote inside a quoted cell is written twice",
        ),
        QuoteFault::SpaceBefore(position) => {
            (position, "a space stands before the opening quote of a cell", "delete the space")
        }
    };
    let name = intake.sources.file(origin.file).and_then(|f| f.columns.get(position)).cloned();
    let name = name.filter(|n| !n.is_empty() && position < width);
    let place = intake.sources.place(origin, name.as_deref(), None);
    intake.diagnostics.error(Code::BadQuote, place, message, cure);
}
