//! One row of a table: its cells as names, numbers, words and conductors, every fault reported
//! where it stands.

use super::Intake;
use super::header::Layout;
use super::names::warn_of_mangled;
use super::number::{self, Marks, NumberFault, PercentSign, is_spreadsheet_error};
use super::phases;
use super::records::Cells;
use super::schema::{Column, Header, Need};
use super::text::trim;
use super::words::{explain, one_of, out_of_range_cure};
use crate::diagnostic::{Code, Origin, nearest};
use crate::network::{Conductors, Connection, Name, SwitchState};

/// A filled cell.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Cell<'r> {
    /// The column name it stands under.
    pub(crate) header: &'static Header,
    /// Its text, trimmed.
    pub(crate) text: &'r str,
}

/// What a cell of numbers holds.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Number {
    /// Nothing: the default.
    Blank,
    /// Something that was reported.
    Faulty,
    /// A number, in SI.
    Value(f64),
}

/// A row of data.
pub(crate) struct Row<'r> {
    layout: &'r Layout,
    cells: Cells<'r>,
    /// Where the row stands.
    pub(crate) origin: Origin,
    pub(super) intake: &'r mut Intake,
}

impl<'r> Row<'r> {
    pub(super) fn new(
        layout: &'r Layout,
        cells: Cells<'r>,
        origin: Origin,
        intake: &'r mut Intake,
    ) -> Row<'r> {
        Row { layout, cells, origin, intake }
    }

    fn column(&self, column: usize) -> &'static Column {
        self.layout.schema.column(column)
    }

    /// True where the header has the column, under any of its names.
    pub(crate) fn has_column(&self, column: usize) -> bool {
        self.layout.has(column)
    }

    /// True where the cell holds text, under any of the column's names.
    pub(crate) fn is_filled(&self, column: usize) -> bool {
        self.filled(column).next().is_some()
    }

    fn filled(&self, column: usize) -> impl Iterator<Item = Cell<'r>> + use<'r> {
        let cells = self.cells;
        let places: &'r [(usize, &'static Header)] =
            self.layout.cells.get(column).map(Vec::as_slice).unwrap_or_default();
        places
            .iter()
            .map(move |&(position, header)| Cell { header, text: trim(cells.get(position)) })
            .filter(|c| !c.text.is_empty())
    }

    /// Reports a fault of a filled cell, or of a blank one under the column's name.
    pub(crate) fn error(
        &mut self,
        code: Code,
        column: usize,
        message: impl Into<String>,
        cure: impl Into<String>,
    ) {
        let cell = self.filled(column).next();
        let name = match cell {
            Some(cell) => Some(cell.header.name),
            None => self.header_name(column),
        };
        let found = cell.map(|c| c.text);
        let place = self.intake.sources.place(self.origin, name, found);
        self.intake.diagnostics.error(code, place, message, cure);
    }

    /// Text of a cell as it stands, without a report.
    pub(crate) fn peek(&self, column: usize) -> Option<&'r str> {
        self.filled(column).next().map(|c| c.text)
    }

    /// Notes a branch that could not be read, by its ends where they are known.
    pub(crate) fn lose_branch(&mut self, from: usize, to: usize) {
        for end in [from, to] {
            match self.peek(end) {
                Some(name) => _ = self.intake.unread.nodes.insert(Name::from(name)),
                None => self.intake.unread.branches = true,
            }
        }
    }

    /// Errors told so far, of this row and all before it.
    pub(crate) fn faults(&self) -> usize {
        self.intake.diagnostics.counts().0
    }

    /// Notes a row that could not be read.
    pub(crate) fn lose(&mut self) {
        self.intake.lose(self.layout.schema.file);
    }

    /// Reports a filled cell that can be read but hardly meant so.
    pub(crate) fn warning(
        &mut self,
        code: Code,
        column: usize,
        message: impl Into<String>,
        cure: impl Into<String>,
    ) {
        let cell = self.filled(column).next();
        let place = self.intake.sources.place(self.origin, cell.map(|c| c.header.name), cell.map(|c| c.text));
        self.intake.diagnostics.warning(code, place, message, cure);
    }

    /// Reports a fault of the row as a whole.
    pub(crate) fn row_error(&mut self, code: Code, message: impl Into<String>, cure: impl Into<String>) {
        let place = self.intake.sources.place(self.origin, None, None);
        self.intake.diagnostics.error(code, place, message, cure);
    }

    /// The column's first name that stands in the header.
    fn header_name(&self, column: usize) -> Option<&'static str> {
        self.layout.cells.get(column).and_then(|c| c.first()).map(|(_, h)| h.name)
    }

    fn missing(&mut self, column: usize) {
        let spec = self.column(column);
        let message = format!("{} is missing", spec.what);
        let cure = match self.header_name(column) {
            Some(name) => format!("fill in `{name}`"),
            None => format!("add a column: {}", spec.names()),
        };
        self.error(Code::MissingValue, column, message, cure);
    }

    /// The cell of a column; blank gives `None`, and is reported where the column is required.
    fn cell(&mut self, column: usize) -> Option<Cell<'r>> {
        let mut filled = self.filled(column);
        match (filled.next(), filled.next()) {
            (None, _) => {
                // A required column that is not in the header was reported there.
                if self.column(column).need == Need::Required && self.layout.has(column) {
                    self.missing(column);
                }
                None
            }
            (Some(first), Some(second)) => {
                let what = self.column(column).what;
                let message = format!(
                    "{what} is given twice, as `{}` and as `{}`",
                    first.header.name, second.header.name
                );
                self.error(Code::Conflict, column, message, "keep one of them and clear the other cell");
                None
            }
            (Some(cell), None) => Some(cell),
        }
    }

    /// Text of a cell, without spreadsheet errors.
    pub(crate) fn text(&mut self, column: usize) -> Option<&'r str> {
        let cell = self.cell(column)?;
        if is_spreadsheet_error(cell.text) {
            self.spreadsheet_error(column);
            return None;
        }
        Some(cell.text)
    }

    /// Name of the row's own element.
    pub(crate) fn own_name(&mut self, column: usize) -> Option<Name> {
        let text = self.text(column)?;
        warn_of_mangled(self, column, text);
        Some(Name::from(text))
    }

    /// Name of a node, kept once for the whole network.
    pub(crate) fn node(&mut self, column: usize) -> Option<Name> {
        let text = self.text(column)?;
        let header = self.header_name(column).unwrap_or_default();
        if !self.intake.nodes.knows(text) {
            warn_of_mangled(self, column, text);
        }
        Some(self.intake.nodes.name(text, self.origin, header))
    }

    /// Name of something else that many rows name, kept once.
    pub(crate) fn shared_name(&mut self, column: usize) -> Option<Name> {
        let text = self.text(column)?;
        Some(self.intake.shared.name(text))
    }

    /// Positions of the columns with names of the user's own.
    pub(crate) fn own_positions(&self, column: usize) -> impl Iterator<Item = usize> + use<'r> {
        let places: &'r [(usize, &'static Header)] =
            self.layout.cells.get(column).map(Vec::as_slice).unwrap_or_default();
        places.iter().map(|(position, _)| *position)
    }

    /// The number in one of those columns, its range checked; a blank cell is a fault.
    pub(crate) fn own_number(&mut self, column: usize, position: usize) -> Option<f64> {
        let (spec, text) = (self.column(column), trim(self.cells.get(position)));
        let header = spec.headers().next()?;
        let (code, message, cure) = if text.is_empty() {
            let cure = "fill in the cell: 1 for full value, 0 for nothing".to_owned();
            (Code::MissingValue, format!("{} is missing", spec.what), cure)
        } else if is_spreadsheet_error(text) {
            let (message, cure) = spreadsheet_words(spec.what);
            (Code::SpreadsheetError, message, cure.to_owned())
        } else {
            match self.parse(text, PercentSign::Refused) {
                Ok(value) if spec.range.holds(value) => return Some(value),
                Ok(value) => {
                    let message = format!("{} must be {}", spec.what, spec.range.expected(header.unit));
                    (Code::OutOfRange, message, out_of_range_cure(value, spec, header.unit))
                }
                Err(fault) => explain(&fault, text, spec, header, self.layout.marks()),
            }
        };
        let columns = self.intake.sources.file(self.origin.file).map(|f| f.columns.as_slice());
        let name = columns.and_then(|c| c.get(position)).map(String::as_str);
        let place = self.intake.sources.place(self.origin, name, Some(text).filter(|t| !t.is_empty()));
        self.intake.diagnostics.error(code, place, message, cure);
        None
    }

    fn spreadsheet_error(&mut self, column: usize) {
        let (message, cure) = spreadsheet_words(self.column(column).what);
        self.error(Code::SpreadsheetError, column, message, cure);
    }

    /// A number in SI, its range checked.
    pub(crate) fn number(&mut self, column: usize) -> Number {
        let spec = self.column(column);
        match self.cell(column) {
            None if self.is_filled(column) => Number::Faulty,
            None => Number::Blank,
            Some(cell) => self.number_of(column, cell, spec, cell.header),
        }
    }

    /// The number in a cell of text, read as the quantity `spec`.
    pub(crate) fn number_as(&mut self, column: usize, spec: &Column) -> Number {
        let header = spec.headers().next().copied();
        match (self.cell(column), header) {
            (Some(cell), Some(header)) => self.number_of(column, cell, spec, &header),
            _ => Number::Blank,
        }
    }

    fn number_of(&mut self, column: usize, cell: Cell<'r>, spec: &Column, header: &Header) -> Number {
        if is_spreadsheet_error(cell.text) {
            self.spreadsheet_error(column);
            return Number::Faulty;
        }
        let percent = if header.unit.starts_with('%') { PercentSign::Allowed } else { PercentSign::Refused };
        let value = match self.parse(cell.text, percent) {
            Ok(value) => value,
            Err(fault) => {
                let (code, message, cure) = explain(&fault, cell.text, spec, header, self.layout.marks());
                self.error(code, column, message, cure);
                return Number::Faulty;
            }
        };
        if !spec.range.holds(value) {
            let unit = header.unit;
            let message = format!("{} must be {}", spec.what, spec.range.expected(unit));
            let cure = out_of_range_cure(value, spec, unit);
            self.error(Code::OutOfRange, column, message, cure);
            return Number::Faulty;
        }
        Number::Value(value * header.factor)
    }

    /// Reads a number; in a file with decimal commas, what else the file holds settles `1,234`.
    fn parse(&self, text: &str, percent: PercentSign) -> Result<f64, NumberFault> {
        let marks = self.layout.marks();
        let result = number::parse(text, marks, percent);
        if marks == Marks::Dot {
            return result;
        }
        match result {
            Err(NumberFault::Ambiguous { decimal, .. }) if number::is_group_of_three(text, ',') => {
                let evidence = self.layout.evidence();
                match decimal.parse() {
                    Ok(value) if evidence.comma && !evidence.dot => Ok(value),
                    _ => result_of_ambiguous(text, ','),
                }
            }
            Ok(_) if number::is_group_of_three(text, '.') && self.layout.evidence().comma => {
                Err(NumberFault::DotAmongCommas)
            }
            other => other,
        }
    }

    /// A number that blank cells leave at `default` (in SI); a faulty one too, after its report.
    pub(crate) fn number_or(&mut self, column: usize, default: f64) -> f64 {
        match self.number(column) {
            Number::Value(value) => value,
            Number::Blank | Number::Faulty => default,
        }
    }

    /// A number that may be left blank.
    pub(crate) fn optional_number(&mut self, column: usize) -> Option<f64> {
        match self.number(column) {
            Number::Value(value) => Some(value),
            Number::Blank | Number::Faulty => None,
        }
    }

    /// A whole number that may be left blank.
    pub(crate) fn whole_number(&mut self, column: usize) -> Option<i32> {
        let value = self.optional_number(column)?;
        if value.fract() == 0.0 && value.abs() <= f64::from(i32::MAX) {
            return Some(value as i32);
        }
        let message = format!("{} must be a whole number", self.column(column).what);
        self.error(Code::BadNumber, column, message, "round it, without decimals");
        None
    }

    /// One of a few words; blank gives `default`.
    pub(crate) fn word<T: Copy>(&mut self, column: usize, words: &[(&'static str, T)], default: T) -> T {
        let Some(text) = self.text(column) else { return default };
        if let Some((_, value)) = words.iter().find(|(word, _)| word.eq_ignore_ascii_case(text)) {
            return *value;
        }
        let all = one_of(words.iter().map(|(word, _)| *word));
        let near = nearest(text, words.iter().map(|(word, _)| *word));
        let message = format!("{} must be {}", self.column(column).what, all);
        let cure = match near {
            Some(near) => format!("did you mean `{near}`?"),
            None => "write one of these words, or leave the cell blank for the default".to_owned(),
        };
        self.error(Code::UnknownWord, column, message, cure);
        default
    }

    /// `closed` or `open`.
    pub(crate) fn state(&mut self, column: usize) -> SwitchState {
        self.word(
            column,
            &[("closed", SwitchState::Closed), ("open", SwitchState::Open)],
            SwitchState::Closed,
        )
    }

    /// A set of conductors.
    pub(crate) fn conductors(&mut self, column: usize) -> Option<Conductors> {
        let text = self.text(column)?;
        match phases::conductors(text) {
            Ok(set) => Some(set),
            Err(fault) => {
                let cure = "write the letters of the conductors, such as `abcn`, `an` or `L1 L2 L3 N`";
                self.error(Code::BadPhases, column, fault.text(), cure);
                None
            }
        }
    }

    /// Conductors of a branch: at least one phase.
    pub(crate) fn branch_conductors(&mut self, column: usize) -> Option<Conductors> {
        let set = self.conductors(column)?;
        if set.phases().is_empty() {
            let message = "a neutral alone carries no supply";
            self.error(Code::BadPhases, column, message, "name the phases as well, such as `an` or `abcn`");
            return None;
        }
        Some(set)
    }

    /// How a load or capacitor is joined.
    pub(crate) fn connection(&mut self, column: usize) -> Option<Connection> {
        let set = self.conductors(column)?;
        let connection = phases::connection(set);
        if connection.is_none() {
            let (message, cure) = if set.has_neutral() {
                (
                    "the neutral alone is no connection".to_owned(),
                    "name the phase as well, such as `an`".to_owned(),
                )
            } else {
                let message = format!("`{set}` is one conductor, and a connection needs two");
                (message, format!("write `{set}n` for phase to neutral, or name the second phase"))
            };
            self.error(Code::BadPhases, column, message, cure);
        }
        connection
    }
}

fn spreadsheet_words(what: &str) -> (String, &'static str) {
    let cure = "mend the formula in the spreadsheet, or write the value itself, and save the file again";
    (format!("this is an error value of the spreadsheet, not {what}"), cure)
}

fn result_of_ambiguous(text: &str, mark: char) -> Result<f64, NumberFault> {
    Err(NumberFault::Ambiguous { decimal: text.replace(mark, "."), thousands: text.replace(mark, "") })
}
