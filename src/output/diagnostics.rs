//! Diagnostics for people, for editors and for programs.

use annotate_snippets::{AnnotationKind, Group, Level, Renderer, Snippet};

use super::table::WIDTH;
use crate::diagnostic::{Diagnostic, Diagnostics, Place, Severity};

/// Diagnostics shown before the rest is counted.
const SHOWN: usize = 50;

/// Each diagnostic with its row and a mark under the cell; the first fifty, then how many more.
pub fn diagnostics_text(diagnostics: &Diagnostics, colour: bool) -> String {
    let mut text = String::new();
    for diagnostic in diagnostics.items().iter().take(SHOWN) {
        text.push_str(&shown(diagnostic, colour));
        text.push_str("\n\n");
    }
    if let Some(more) = diagnostics.items().len().checked_sub(SHOWN).filter(|&m| m > 0) {
        text.push_str(&format!("... and {more} more (fourwire check --format lines shows all)\n\n"));
    }
    text
}

fn shown(diagnostic: &Diagnostic, colour: bool) -> String {
    let level = match diagnostic.severity {
        Severity::Error => Level::ERROR,
        Severity::Warning => Level::WARNING,
    };
    let place = diagnostic.place.as_ref();
    let row = place.and_then(|p| p.row_text.as_deref()).map(|t| t.replace('\t', " "));
    let path = place.map(|p| match &p.cell {
        Some(cell) => format!("{} (cell {cell})", p.file),
        None => p.file.clone(),
    });
    let title = level.clone().primary_title(diagnostic.message.as_str()).id(diagnostic.code.text());
    let mut group = match (place, &row, &path) {
        (Some(place), Some(row), Some(path)) if !row.is_empty() => {
            let (start, end) = cell_span(place, row);
            let label = place.column.as_ref().map(|c| format!("column {c}"));
            let mut mark = AnnotationKind::Primary.span(start..end);
            if let Some(label) = label {
                mark = mark.label(label);
            }
            title.element(
                Snippet::source(row.clone())
                    .line_start(place.row as usize)
                    .path(path.clone())
                    .annotation(mark),
            )
        }
        _ => match place {
            Some(place) => title.element(Level::NOTE.message(format!("in {}", place.file))),
            None => Group::with_title(title),
        },
    };
    group = group.element(Level::HELP.message(diagnostic.cure.as_str()));
    let renderer = if colour { Renderer::styled() } else { Renderer::plain() };
    renderer.term_width(WIDTH).render(&[group])
}

/// Bytes of the cell in its row: where the text found stands as a whole cell, else the whole row.
fn cell_span(place: &Place, row: &str) -> (usize, usize) {
    let Some(found) = place.found.as_deref().filter(|f| !f.is_empty()) else { return (0, row.len()) };
    let index = place.cell.as_deref().map(column_index);
    let mut start = 0;
    for (i, cell) in row.split([',', ';', '\t']).enumerate() {
        if index.is_none_or(|wanted| wanted == i)
            && let Some(at) = cell.find(found)
        {
            return (start + at, start + at + found.len());
        }
        start += cell.len() + 1;
    }
    row.find(found).map_or((0, row.len()), |at| (at, at + found.len()))
}

/// Index of a spreadsheet cell's column: `A1` is 0, `AA7` is 26.
fn column_index(cell: &str) -> usize {
    let letters = cell.bytes().take_while(u8::is_ascii_uppercase);
    letters.fold(0, |sum, letter| sum * 26 + usize::from(letter - b'A') + 1).saturating_sub(1)
}

/// One line a diagnostic, all of them: for editors.
pub fn diagnostics_lines(diagnostics: &Diagnostics) -> String {
    diagnostics.items().iter().map(|d| format!("{d}\n")).collect()
}

/// All diagnostics as JSON.
///
/// # Errors
/// None that occur with these records.
pub fn diagnostics_json(diagnostics: &Diagnostics) -> serde_json::Result<String> {
    serde_json::to_string_pretty(diagnostics.items())
}

#[cfg(test)]
mod tests {
    use super::*;

    fn place(found: &str, cell: &str) -> Place {
        Place {
            file: "lines.csv".into(),
            row: 3,
            column: Some("length_m".into()),
            cell: Some(cell.into()),
            found: Some(found.into()),
            row_text: None,
        }
    }

    #[test]
    fn the_mark_stands_under_the_cell() {
        let row = "L1,A,B,an,A,x";
        assert_eq!(cell_span(&place("A", "E3"), row), (10, 11));
        assert_eq!(cell_span(&place("A", "B3"), row), (3, 4));
        assert_eq!(cell_span(&place("", "B3"), row), (0, row.len()));
        assert_eq!(column_index("AA7"), 26);
    }
}
