//! Splits a text into records and keeps count of lines and spreadsheet rows.
//!
//! The splitting of cells is that of `csv-core`; this module finds where each record starts and
//! counts lines and spreadsheet rows itself, because comments, blank rows, CRLF and line breaks
//! inside quotes each count differently in an editor and in a spreadsheet.

use super::number::is_spreadsheet_error;
use super::text::trim;
use crate::diagnostic::{FileId, Origin};

/// The cells of one record.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Cells<'r> {
    text: &'r str,
    ends: &'r [usize],
}

impl<'r> Cells<'r> {
    /// Number of cells.
    pub(crate) fn len(&self) -> usize {
        self.ends.len()
    }

    /// Text of a cell as it stands; empty beyond the last.
    pub(crate) fn get(&self, position: usize) -> &'r str {
        let start = match position.checked_sub(1) {
            Some(before) => self.ends.get(before).copied(),
            None => Some(0),
        };
        let end = self.ends.get(position).copied();
        start.zip(end).and_then(|(s, e)| self.text.get(s..e)).unwrap_or("")
    }

    /// True for a row of nothing but separators, and for a comment that a spreadsheet has put in quotes.
    pub(super) fn is_blank_or_comment(&self) -> bool {
        let first = trim(self.get(0));
        if first.is_empty() {
            return self.iter().all(|c| trim(c).is_empty());
        }
        first.starts_with('#') && !is_spreadsheet_error(first)
    }

    /// All cells.
    pub(super) fn iter(&self) -> impl Iterator<Item = &'r str> + use<'r> {
        let cells = *self;
        (0..cells.len()).map(move |i| cells.get(i))
    }
}

/// A broken quote, with the position of its cell.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum QuoteFault {
    NotClosed(usize),
    TextAfter(usize),
    SpaceBefore(usize),
}

/// Walks through the records of a text.
pub(super) struct Records<'t> {
    text: &'t str,
    pub(super) separator: u8,
    core: csv_core::Reader,
    core_separator: u8,
    /// Start of the next record, and its line and spreadsheet row.
    at: usize,
    line: u32,
    sheet_row: u32,
    /// The present record: where it starts in the text, its cells joined, and where each ends.
    start: usize,
    joined: Vec<u8>,
    ends: Vec<usize>,
    count: usize,
    length: usize,
}

impl<'t> Records<'t> {
    pub(super) fn new(text: &'t str) -> Self {
        Records {
            text,
            separator: b',',
            core: csv_core::Reader::new(),
            core_separator: b',',
            at: 0,
            line: 1,
            sheet_row: 1,
            start: 0,
            joined: vec![0; 1024],
            ends: vec![0; 64],
            count: 0,
            length: 0,
        }
    }

    fn bytes(&self) -> &'t [u8] {
        self.text.as_bytes()
    }

    /// The rest of the text from `at`.
    fn rest(&self) -> &'t [u8] {
        self.bytes().get(self.at..).unwrap_or_default()
    }

    /// The line at which the next record begins, without its end.
    pub(super) fn line_at_record(&mut self) -> &'t [u8] {
        self.skip_blank_and_comment_lines();
        first_line(self.rest())
    }

    /// Takes a first line `sep=;`, which spreadsheets use and do not show as a row.
    pub(super) fn skip_separator_line(&mut self) -> Option<u8> {
        let line = first_line(self.rest());
        let plain = line.strip_prefix(b"\"").and_then(|l| l.strip_suffix(b"\"")).unwrap_or(line);
        let separator = match plain {
            [s, e, p, b'=', separator] if [*s, *e, *p].eq_ignore_ascii_case(b"sep") => *separator,
            _ => return None,
        };
        self.at += line.len();
        self.take_line_end();
        self.sheet_row = 1;
        matches!(separator, b',' | b';' | b'\t').then_some(separator)
    }

    /// Moves over one line end, if there is one here.
    fn take_line_end(&mut self) -> bool {
        let length = match self.rest() {
            [b'\r', b'\n', ..] => 2,
            [b'\r' | b'\n', ..] => 1,
            _ => return false,
        };
        self.at += length;
        self.line += 1;
        self.sheet_row += 1;
        true
    }

    fn skip_blank_and_comment_lines(&mut self) {
        loop {
            let blanks = self.rest().iter().take_while(|b| matches!(b, b' ')).count();
            let after = self.rest().get(blanks..).unwrap_or_default();
            match after.first() {
                Some(b'\r' | b'\n') => self.at += blanks,
                Some(b'#') if !self.begins_with_error_value(after) => {
                    self.at += blanks + first_line(after).len()
                }
                None => {
                    self.at += blanks;
                    return;
                }
                _ => return,
            }
            if !self.take_line_end() {
                return;
            }
        }
    }

    /// `#REF!` in the first cell is a fault to report, not a comment to skip.
    fn begins_with_error_value(&self, line: &[u8]) -> bool {
        let cell = line.split(|b| matches!(b, b'\r' | b'\n') || *b == self.separator).next();
        cell.and_then(|c| std::str::from_utf8(c).ok()).is_some_and(|c| is_spreadsheet_error(trim(c)))
    }

    /// Reads the next record; `None` at the end of the text.
    pub(super) fn next(&mut self, file: FileId) -> Option<Origin> {
        self.skip_blank_and_comment_lines();
        if self.rest().is_empty() {
            return None;
        }
        self.start = self.at;
        let offset = u32::try_from(self.start).unwrap_or(u32::MAX);
        let origin = Origin { file, line: self.line, sheet_row: self.sheet_row, offset };
        self.split();
        self.count_lines();
        Some(origin)
    }

    /// Splits the record that starts here and moves past it and its line end.
    fn split(&mut self) {
        if self.core_separator != self.separator {
            self.core = csv_core::ReaderBuilder::new().delimiter(self.separator).build();
            self.core_separator = self.separator;
        }
        self.core.reset();
        (self.length, self.count) = (0, 0);
        let mut input = self.rest();
        loop {
            let output = self.joined.get_mut(self.length..).unwrap_or_default();
            let ends = self.ends.get_mut(self.count..).unwrap_or_default();
            let (result, taken, written, ended) = self.core.read_record(input, output, ends);
            input = input.get(taken..).unwrap_or_default();
            self.at += taken;
            self.length += written;
            self.count += ended;
            match result {
                csv_core::ReadRecordResult::OutputFull => self.joined.resize(self.joined.len() * 2, 0),
                csv_core::ReadRecordResult::OutputEndsFull => self.ends.resize(self.ends.len() * 2, 0),
                csv_core::ReadRecordResult::InputEmpty => {}
                csv_core::ReadRecordResult::Record | csv_core::ReadRecordResult::End => break,
            }
        }
        if self.raw().ends_with(b"\r") && self.rest().starts_with(b"\n") {
            self.at += 1;
        }
    }

    /// Raw bytes of the present record, its line end included.
    fn raw(&self) -> &'t [u8] {
        self.bytes().get(self.start..self.at).unwrap_or_default()
    }

    fn count_lines(&mut self) {
        let raw = self.raw();
        self.line += if raw.contains(&b'"') { line_ends(raw) } else { 1 };
        self.sheet_row += 1;
    }

    pub(super) fn cells(&self) -> Cells<'_> {
        let joined = self.joined.get(..self.length).unwrap_or_default();
        let text = std::str::from_utf8(joined).unwrap_or("");
        Cells { text, ends: self.ends.get(..self.count).unwrap_or_default() }
    }

    pub(super) fn quote_fault(&self) -> Option<QuoteFault> {
        let raw = self.raw();
        if raw.contains(&b'"') { find_quote_fault(raw, self.separator) } else { None }
    }

    /// After a broken quote: goes on at the line after the one where the record began.
    pub(super) fn resume_at_next_line(&mut self, origin: Origin) {
        self.at = self.start + first_line(self.raw()).len();
        self.line = origin.line;
        self.sheet_row = origin.sheet_row;
        self.take_line_end();
    }
}

fn first_line(bytes: &[u8]) -> &[u8] {
    let end = bytes.iter().position(|b| matches!(b, b'\r' | b'\n')).unwrap_or(bytes.len());
    bytes.get(..end).unwrap_or_default()
}

/// Number of line ends: LF, CRLF, or CR alone.
fn line_ends(bytes: &[u8]) -> u32 {
    let mut count = 0;
    let mut before = 0;
    for &byte in bytes {
        count += u32::from(byte == b'\r' || (byte == b'\n' && before != b'\r'));
        before = byte;
    }
    count
}

/// Follows the quotes of one raw record.
fn find_quote_fault(raw: &[u8], separator: u8) -> Option<QuoteFault> {
    enum State {
        Start,
        Spaces,
        Plain,
        Quoted,
        Closed,
    }
    let mut state = State::Start;
    let mut position = 0;
    for &byte in raw {
        let ends_cell = byte == separator || matches!(byte, b'\r' | b'\n');
        state = match (state, byte) {
            (State::Quoted, b'"') => State::Closed,
            (State::Quoted, _) => State::Quoted,
            (State::Closed, b'"') => State::Quoted,
            (State::Start, b'"') => State::Quoted,
            (State::Spaces, b'"') => return Some(QuoteFault::SpaceBefore(position)),
            (State::Closed, _) if !ends_cell => return Some(QuoteFault::TextAfter(position)),
            (_, _) if ends_cell => {
                position += usize::from(byte == separator);
                State::Start
            }
            (State::Start | State::Spaces, b' ') => State::Spaces,
            _ => State::Plain,
        };
    }
    matches!(state, State::Quoted).then_some(QuoteFault::NotClosed(position))
}
