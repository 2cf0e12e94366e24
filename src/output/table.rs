//! A table: columns with units, rows of cells, and its look on a terminal.

use std::borrow::Cow;
use std::fmt::Write as _;

use comfy_table::{CellAlignment, ContentArrangement, LineStyle, Table as Grid, TableStyle};

/// Columns of a terminal that every text fits.
pub const WIDTH: usize = 100;

/// Whether words carry colour; what colour says, a word says too.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Colour {
    /// None.
    Plain,
    /// Escape codes of a terminal.
    Styled,
}

/// Which side of its column a cell stands on.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Align {
    /// Text.
    Left,
    /// Numbers.
    Right,
}

/// A column: heading, unit, and decimals of its numbers.
#[derive(Debug, Clone, Copy)]
pub struct Column {
    /// Heading.
    pub name: &'static str,
    /// Unit, empty for none.
    pub unit: &'static str,
    /// Digits after the point.
    pub decimals: usize,
    /// Side.
    pub align: Align,
}

impl Column {
    /// A column of text.
    pub const fn text(name: &'static str) -> Column {
        Column { name, unit: "", decimals: 0, align: Align::Left }
    }

    /// A column of numbers.
    pub const fn number(name: &'static str, unit: &'static str, decimals: usize) -> Column {
        Column { name, unit, decimals, align: Align::Right }
    }
}

/// One cell.
#[derive(Debug, Clone, PartialEq)]
pub enum Cell {
    /// Text.
    Text(String),
    /// A number, shown with the column's decimals.
    Number(f64),
    /// Nothing to show.
    Blank,
}

impl From<Option<f64>> for Cell {
    fn from(value: Option<f64>) -> Cell {
        value.filter(|v| v.is_finite()).map_or(Cell::Blank, Cell::Number)
    }
}

/// Columns and rows.
#[derive(Debug, Clone, Default)]
pub struct Table {
    /// Columns.
    pub columns: Vec<Column>,
    /// Rows, a cell a column.
    pub rows: Vec<Vec<Cell>>,
}

impl Table {
    /// A table without rows.
    pub fn new(columns: &[Column]) -> Table {
        Table { columns: columns.to_vec(), rows: Vec::new() }
    }

    /// The table as text, at most [`WIDTH`] columns wide: headings with units, a rule, rows.
    pub fn text(&self) -> String {
        let mut grid = Grid::new();
        grid.load_style(TableStyle::new().header_separator(LineStyle::new('─', '─', '─', '─')));
        grid.set_content_arrangement(ContentArrangement::Dynamic).set_width(WIDTH as u16 - 2);
        let units = self.columns.iter().any(|c| !c.unit.is_empty());
        grid.set_header(
            self.columns
                .iter()
                .map(|c| if units { format!("{}\n{}", c.name, c.unit) } else { c.name.into() }),
        );
        for row in &self.rows {
            grid.add_row(row.iter().zip(&self.columns).map(|(cell, column)| shown(cell, column)));
        }
        for (index, column) in self.columns.iter().enumerate() {
            if let Some(c) = grid.column_mut(index) {
                c.set_padding((0, 2));
                c.set_cell_alignment(match column.align {
                    Align::Left => CellAlignment::Left,
                    Align::Right => CellAlignment::Right,
                });
            }
        }
        let mut text = String::new();
        for line in grid.lines() {
            let _ = writeln!(text, "  {}", line.trim_end());
        }
        text
    }
}

fn shown(cell: &Cell, column: &Column) -> String {
    match cell {
        Cell::Text(text) => printable(text).into_owned(),
        Cell::Number(value) => number(*value, column.decimals),
        Cell::Blank => "-".to_string(),
    }
}

/// Text that no terminal takes for a command and that stays on its line: control characters as spaces.
pub(super) fn printable(text: &str) -> Cow<'_, str> {
    if text.chars().any(char::is_control) {
        Cow::Owned(text.chars().map(|c| if c.is_control() { ' ' } else { c }).collect())
    } else {
        Cow::Borrowed(text)
    }
}

/// Indent of the lines that follow the first of a folded text.
const HANGING: &str = "      ";

/// One paragraph on lines of at most [`WIDTH`] columns, wide characters counted as the terminal
/// does; words longer than a line are cut. The first line begins with `indent`.
pub(super) fn folded(indent: &str, text: &str) -> String {
    folded_to(WIDTH, indent, text)
}

/// [`folded`] to another width.
pub(super) fn folded_to(width: usize, indent: &str, text: &str) -> String {
    let text = printable(text);
    // No character has fewer bytes than columns, so most lines need no measuring.
    if indent.len() + text.len() <= width {
        return format!("{indent}{text}\n");
    }
    let mut grid = Grid::new();
    grid.load_style(TableStyle::new());
    grid.set_content_arrangement(ContentArrangement::Dynamic).set_width((width - HANGING.len()) as u16);
    grid.add_row([text.as_ref()]);
    if let Some(column) = grid.column_mut(0) {
        column.set_padding((0, 0));
    }
    let mut lines = String::new();
    for (i, line) in grid.lines().enumerate() {
        let start = if i == 0 { indent } else { HANGING };
        let _ = writeln!(lines, "{start}{}", line.trim());
    }
    lines
}

/// A number with so many decimals, thousands set apart by a space; no negative zero.
pub(super) fn number(value: f64, decimals: usize) -> String {
    let plain = format!("{value:.decimals$}");
    let (sign, digits) = match plain.strip_prefix('-') {
        Some(rest) if rest.bytes().any(|b| b.is_ascii_digit() && b != b'0') => ("-", rest),
        Some(rest) => ("", rest),
        None => ("", plain.as_str()),
    };
    let (whole, fraction) = digits.split_once('.').map_or((digits, None), |(w, f)| (w, Some(f)));
    let mut grouped = String::new();
    for (i, digit) in whole.chars().enumerate() {
        if i > 0 && (whole.len() - i).is_multiple_of(3) && whole.len() > 4 {
            grouped.push(' ');
        }
        grouped.push(digit);
    }
    match fraction {
        Some(fraction) => format!("{sign}{grouped}.{fraction}"),
        None => format!("{sign}{grouped}"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_read_well() {
        assert_eq!(number(-0.0004, 2), "0.00");
        assert_eq!(number(1234.5, 1), "1234.5");
        assert_eq!(number(-1234567.25, 1), "-1 234 567.2");
        assert_eq!(number(12345.0, 0), "12 345");
    }

    #[test]
    fn a_table_fits_and_aligns() {
        let mut table =
            Table::new(&[Column::text("node"), Column::number("a", "V", 1), Column::number("b", "V", 1)]);
        table.rows.push(vec![Cell::Text("pump".into()), Cell::Number(230.04), Cell::Blank]);
        table.rows.push(vec![Cell::Text("x".repeat(150)), Cell::Number(1.0), Cell::Number(2.0)]);
        let text = table.text();
        assert!(text.lines().all(|l| l.chars().count() <= WIDTH), "{text}");
        assert!(text.contains("230.0"));
    }

    #[test]
    fn folding_keeps_every_word_and_the_width() {
        assert_eq!(folded("  ", "short"), "  short\n");
        let words = "node feeder ".repeat(30);
        let text = folded("  ", &words);
        assert!(text.lines().count() > 3 && text.lines().all(|l| l.len() <= WIDTH), "{text}");
        let joined: Vec<&str> = text.split_whitespace().collect();
        assert_eq!(joined, words.split_whitespace().collect::<Vec<_>>());
    }

    #[test]
    fn folding_cuts_long_names_and_counts_wide_characters_twice() {
        let text = folded("  ", &format!("low voltage: node {}, a: low", "x".repeat(250)));
        assert!(text.lines().all(|l| l.len() <= WIDTH), "{text}");
        assert_eq!(text.matches('x').count(), 250);
        let text = folded("  ", &"泵".repeat(120));
        assert!(text.lines().all(|l| 2 * l.trim().chars().count() + 6 <= WIDTH), "{text}");
        assert_eq!(text.matches('泵').count(), 120);
    }

    #[test]
    fn control_characters_do_not_reach_the_terminal() {
        assert_eq!(printable("red\u{1b}[31m\nnode"), "red [31m node");
        assert!(!folded("", &"\u{1b}]0;x\u{7} ".repeat(40)).contains('\u{1b}'));
    }
}
