//! Diagnostics for people, for editors and for programs.

use annotate_snippets::{AnnotationKind, Group, Level, Renderer, Snippet};

use super::table::{Colour, WIDTH, folded_to, printable};
use crate::diagnostic::{Diagnostic, Diagnostics, Place, Severity};

/// Diagnostics shown before the rest is counted.
const SHOWN: usize = 50;

/// Each diagnostic with its row and a mark under the cell; the first fifty, then how many more.
pub fn diagnostics_text(diagnostics: &Diagnostics, colour: Colour) -> String {
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

fn shown(diagnostic: &Diagnostic, colour: Colour) -> String {
    let level = match diagnostic.severity {
        Severity::Error => Level::ERROR,
        Severity::Warning => Level::WARNING,
    };
    let place = diagnostic.place.as_ref();
    let row = place.and_then(|p| p.row_text.as_deref());
    let path = place.map(|p| match &p.cell {
        Some(cell) => format!("{} (cell {cell})", p.file),
        None => p.file.clone(),
    });
    let code = diagnostic.code.text();
    let title = level.primary_title(paragraph(&diagnostic.message, code.len() + 12)).id(code);
    let mut group = match (place, row, &path) {
        (Some(place), Some(row), Some(path)) if !row.is_empty() => {
            let (start, end) = cell_span(place, row);
            let label = place.column.as_ref().map(|c| format!("column {c}"));
            let mut mark = AnnotationKind::Primary.span(start..end);
            if let Some(label) = label {
                mark = mark.label(label);
            }
            title.element(
                // A tab shown as a space keeps every byte in its place.
                Snippet::source(row.replace('\t', " "))
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
    group = group.element(Level::HELP.message(paragraph(&diagnostic.cure, 10)));
    let renderer = match colour {
        Colour::Styled => Renderer::styled(),
        Colour::Plain => Renderer::plain(),
    };
    renderer.term_width(WIDTH).render(&[group])
}

/// A text folded so that it fits beside what stands before its lines.
fn paragraph(text: &str, before: usize) -> String {
    let folded = folded_to(WIDTH.saturating_sub(before), "", text);
    folded.lines().map(str::trim).collect::<Vec<_>>().join("\n")
}

/// Bytes of the text found in its row: in its own cell where the row splits so, else where it first
/// stands, else the whole row.
fn cell_span(place: &Place, row: &str) -> (usize, usize) {
    let whole = (0, row.len());
    let Some(found) = place.found.as_deref() else { return name_span(place, row).unwrap_or(whole) };
    if found.is_empty() {
        return whole;
    }
    let within = |start: usize, cell: &str| {
        cell.find(found).map(|at| (cell.trim().len(), start + at, start + at + found.len()))
    };
    let own = place.cell.as_deref().map(column_index).and_then(|index| {
        // The separator is not known here: that which makes the cell shortest around the text.
        [',', ';', '\t']
            .into_iter()
            .filter_map(|separator| {
                let (start, cell) = cells(row, separator).nth(index)?;
                within(start, cell)
            })
            .min_by_key(|(length, ..)| *length)
            .map(|(_, start, end)| (start, end))
    });
    own.or_else(|| row.find(found).map(|at| (at, at + found.len()))).unwrap_or(whole)
}

/// Bytes of a column's name in a header row, where its cell holds just that.
fn name_span(place: &Place, row: &str) -> Option<(usize, usize)> {
    let (name, index) = (place.column.as_deref()?, place.cell.as_deref().map(column_index)?);
    [',', ';', '\t'].into_iter().find_map(|separator| {
        let (start, cell) = cells(row, separator).nth(index)?;
        let text = cell.trim().trim_matches('"').trim();
        let at = start + cell.find(text)?;
        (text.to_lowercase() == name.to_lowercase()).then_some((at, at + text.len()))
    })
}

/// Cells of a row with the byte each starts at; a separator within quotes does not part.
fn cells(row: &str, separator: char) -> impl Iterator<Item = (usize, &str)> {
    let mut quoted = false;
    let mut start = 0;
    row.split(move |c: char| {
        quoted ^= c == '"';
        c == separator && !quoted
    })
    .map(move |cell| {
        let this = (start, cell);
        start += cell.len() + separator.len_utf8();
        this
    })
}

/// Index of a spreadsheet cell's column: `A1` is 0, `AA7` is 26.
fn column_index(cell: &str) -> usize {
    let letters = cell.bytes().take_while(u8::is_ascii_uppercase);
    letters.fold(0, |sum, letter| sum * 26 + usize::from(letter - b'A') + 1).saturating_sub(1)
}

/// One line a diagnostic, all of them: for editors.
pub fn diagnostics_lines(diagnostics: &Diagnostics) -> String {
    diagnostics.items().iter().map(|d| format!("{}\n", printable(&d.to_string()))).collect()
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

    #[test]
    fn the_mark_finds_its_cell_whatever_parts_the_row() {
        // Decimal commas do not part a row of semicolons; quotes keep a separator within a cell.
        let row = "A;12,5;A";
        assert_eq!(cell_span(&place("A", "C3"), row), (7, 8));
        let row = "x,\"A,B\",A";
        assert_eq!(cell_span(&place("A,B", "B3"), row), (3, 6));
        assert_eq!(cell_span(&place("A", "C3"), row), (8, 9));
        let row = "Pump 1 east\tA\t1";
        assert_eq!(cell_span(&place("1", "C3"), row), (14, 15));
        // Bytes, not characters.
        let row = "泵站,10x";
        assert_eq!(cell_span(&place("10x", "B3"), row), (7, 10));
    }

    #[test]
    fn a_fault_of_a_column_marks_its_name_in_the_header() {
        let header = Place { found: None, column: Some("too".into()), ..place("", "C1") };
        assert_eq!(cell_span(&header, "line;from;\"Too\";x"), (11, 14));
        let row = "L1,A,B,12";
        assert_eq!(cell_span(&header, row), (0, row.len()), "a row of data holds no column name");
    }

    #[test]
    fn the_first_fifty_are_shown_and_the_rest_counted() {
        let mut all = Diagnostics::new();
        for i in 0..53 {
            all.error(crate::diagnostic::Code::NoLoad, None, format!("fault \u{1b}[31m{i}."), "mend it");
        }
        let text = diagnostics_text(&all, Colour::Plain);
        assert!(text.contains("31m49.") && !text.contains("31m50."), "{text}");
        assert!(text.contains("... and 3 more") && !text.contains('\u{1b}'), "{text}");
        assert_eq!(diagnostics_lines(&all).lines().count(), 53);
        assert!(!diagnostics_lines(&all).contains('\u{1b}'));
    }
}
