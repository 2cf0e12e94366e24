//! What is wrong with an input, where, and how to mend it.
//!
//! Reading and building never stop at the first fault: they gather every [`Diagnostic`] in a
//! [`Diagnostics`] collection. A diagnostic names its place as the user sees it (file, row,
//! column, spreadsheet cell, the text found) and always carries a cure.

use std::collections::HashMap;
use std::fmt;
use std::sync::Arc;

/// How bad a diagnostic is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, serde::Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Severity {
    /// The network can be solved, but something deserves a look.
    Warning,
    /// The network cannot be built from this input.
    Error,
}

impl Severity {
    /// Lower-case word for the severity.
    pub fn word(self) -> &'static str {
        match self {
            Severity::Warning => "warning",
            Severity::Error => "error",
        }
    }
}

/// One file of a network folder as it was read, kept so that a diagnostic can show its row.
#[derive(Debug, Clone, Default)]
pub struct SourceFile {
    /// File name without its folder, e.g. `lines.csv`.
    pub name: String,
    /// Column names of the header row in file order, as they are matched (lower case, trimmed).
    pub columns: Vec<String>,
    /// Whole text after decoding, with line ends as found.
    pub text: Arc<str>,
}

/// Index of a [`SourceFile`] in [`Sources`].
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct FileId(pub u16);

/// Where a record came from: the file, its row, and the byte where the record starts.
///
/// `line` counts text lines from 1; `sheet_row` counts spreadsheet rows from 1 (a cell with a
/// line break inside quotes is one spreadsheet row, but several lines).
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Origin {
    /// The file.
    pub file: FileId,
    /// Line in the file, from 1.
    pub line: u32,
    /// Row as a spreadsheet shows it, from 1.
    pub sheet_row: u32,
    /// Byte offset of the record in [`SourceFile::text`].
    pub offset: u32,
}

/// The files a network was read from. Empty for a network built in code.
#[derive(Debug, Clone, Default)]
pub struct Sources {
    files: Vec<SourceFile>,
}

impl Sources {
    /// Adds a file and returns its index.
    pub fn add(&mut self, file: SourceFile) -> FileId {
        let id = FileId(u16::try_from(self.files.len()).unwrap_or(u16::MAX));
        self.files.push(file);
        id
    }

    /// The file of that index.
    pub fn file(&self, id: FileId) -> Option<&SourceFile> {
        self.files.get(usize::from(id.0))
    }

    /// Sets the header columns of a file once its header row has been read.
    pub fn set_columns(&mut self, id: FileId, columns: Vec<String>) {
        if let Some(file) = self.files.get_mut(usize::from(id.0)) {
            file.columns = columns;
        }
    }

    /// All files, in the order they were added.
    pub fn files(&self) -> &[SourceFile] {
        &self.files
    }

    /// The place of a record, or of one of its cells when `column` is a header of its file and
    /// `found` is the text of that cell.
    pub fn place(&self, origin: Origin, column: Option<&str>, found: Option<&str>) -> Option<Place> {
        let file = self.file(origin.file)?;
        let index = column.and_then(|c| file.columns.iter().position(|k| k == c));
        let start = (origin.offset as usize).min(file.text.len());
        let row_text = file.text.get(start..).unwrap_or("").split(['\n', '\r']).next().unwrap_or("");
        // What is found is shown as it was typed: `L2 N` where the network says `bn`.
        let typed = index.and_then(|i| cell_of(row_text, file.columns.len(), i));
        let found = match (found, typed) {
            (Some(found), Some(typed)) if found.is_empty() || !typed.contains(found) => Some(typed),
            (found, _) => found.map(str::to_owned),
        };
        Some(Place {
            file: file.name.clone(),
            row: origin.line,
            column: column.map(str::to_owned),
            cell: index.map(|i| format!("{}{}", sheet_column(i), origin.sheet_row)),
            found,
            row_text: Some(row_text.to_owned()),
        })
    }
}

/// Text of a cell of a row without quotes, by the separator that gives as many cells as the header
/// has; `None` where none does, or where the cell is blank.
fn cell_of(row: &str, width: usize, index: usize) -> Option<String> {
    if row.contains('"') {
        return None;
    }
    let separator = [',', ';', '\t'].into_iter().find(|s| row.split(*s).count() == width)?;
    row.split(separator).nth(index).map(|c| c.trim().to_owned()).filter(|c| !c.is_empty())
}

/// Spreadsheet letters of the column with this index: 0 is `A`, 25 is `Z`, 26 is `AA`.
pub fn sheet_column(mut index: usize) -> String {
    let mut letters = Vec::new();
    loop {
        letters.push(b'A' + (index % 26) as u8);
        if index < 26 {
            break;
        }
        index = index / 26 - 1;
    }
    letters.iter().rev().map(|&b| char::from(b)).collect()
}

/// A place in the input, in the user's terms.
#[derive(Debug, Clone, PartialEq, serde::Serialize)]
pub struct Place {
    /// File name without its folder.
    pub file: String,
    /// Line in the file, from 1; 0 for the file as a whole.
    pub row: u32,
    /// Column name as in the header.
    pub column: Option<String>,
    /// Spreadsheet cell, e.g. `D14`.
    pub cell: Option<String>,
    /// Text found there.
    pub found: Option<String>,
    /// The whole row as it stands in the file, for showing.
    #[serde(skip)]
    pub row_text: Option<String>,
}

macro_rules! codes {
    ($($(#[$doc:meta])* $variant:ident => $text:literal,)*) => {
        /// Stable name of a kind of fault. Scripts may rely on the text of [`Code::text`].
        #[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
        pub enum Code { $($(#[$doc])* $variant,)* }

        impl Code {
            /// Every code, in the order of the list in the documentation.
            pub const ALL: &'static [Code] = &[$(Code::$variant,)*];

            /// The code as printed, e.g. `unknown-column`.
            pub fn text(self) -> &'static str {
                match self { $(Code::$variant => $text,)* }
            }
        }
    };
}

codes! {
    /// The folder does not exist or cannot be read.
    FolderUnreadable => "folder-unreadable",
    /// A file cannot be read.
    FileUnreadable => "file-unreadable",
    /// A file that every network needs is not there.
    MissingFile => "missing-file",
    /// A CSV file of a name the format does not know.
    UnknownFile => "unknown-file",
    /// A file without a header row.
    EmptyFile => "empty-file",
    /// A file whose bytes are not text in a known encoding.
    BadEncoding => "bad-encoding",
    /// A column name the file does not know.
    UnknownColumn => "unknown-column",
    /// The same column, or the same quantity in two units, twice in a header.
    DuplicateColumn => "duplicate-column",
    /// A column that must be there is not.
    MissingColumn => "missing-column",
    /// A row with more or fewer cells than the header.
    RowLength => "row-length",
    /// A quote that is not closed, or text around a quoted cell.
    BadQuote => "bad-quote",
    /// A cell that must be filled is blank.
    MissingValue => "missing-value",
    /// A cell that should hold a number does not.
    BadNumber => "bad-number",
    /// A number that can be read in two ways, such as `1,234`.
    AmbiguousNumber => "ambiguous-number",
    /// A spreadsheet error value such as `#N/A`.
    SpreadsheetError => "spreadsheet-error",
    /// A number outside the range that makes sense.
    OutOfRange => "out-of-range",
    /// A word that is not one of those allowed.
    UnknownWord => "unknown-word",
    /// A curve whose points do not make one.
    BadCurve => "bad-curve",
    /// A curve that is not defined.
    UnknownCurve => "unknown-curve",
    /// Conductor letters that cannot be read.
    BadPhases => "bad-phases",
    /// A quantity given in two units, or two quantities that exclude each other.
    Conflict => "conflict",
    /// A setting of `study.csv` that does not exist.
    UnknownSetting => "unknown-setting",
    /// The same name used twice.
    DuplicateName => "duplicate-name",
    /// Names that differ only by case or spaces.
    SimilarName => "similar-name",
    /// Two supply points.
    TwoSources => "two-sources",
    /// No supply point.
    NoSource => "no-source",
    /// A node named where nothing connects it.
    UnknownNode => "unknown-node",
    /// A line named that does not exist.
    UnknownLine => "unknown-line",
    /// A construction named that does not exist.
    UnknownConstruction => "unknown-construction",
    /// A vector group that is not known.
    UnknownGroup => "unknown-group",
    /// A branch whose two ends are the same node.
    SelfLoop => "self-loop",
    /// A node that no closed path joins to the source.
    NotFed => "not-fed",
    /// Part of the network without supply because of an open switch or line.
    SwitchedOff => "switched-off",
    /// A closed ring, or two paths to one node.
    ClosedRing => "closed-ring",
    /// A conductor used where the node does not carry it.
    PhaseNotCarried => "phase-not-carried",
    /// A construction whose conductors are not those of the line.
    ConductorMismatch => "conductor-mismatch",
    /// A matrix element missing or given twice.
    MatrixIncomplete => "matrix-incomplete",
    /// A resistance matrix that is not positive definite.
    NotPositiveDefinite => "not-positive-definite",
    /// An impedance so far from any real one that its unit must be wrong.
    SuspectUnit => "suspect-unit",
    /// Voltages that do not fit across an element.
    VoltageMismatch => "voltage-mismatch",
    /// A switch that leads nowhere.
    IsolatedSwitch => "isolated-switch",
    /// A regulator bank whose rows do not fit together.
    RegulatorBank => "regulator-bank",
    /// A tap beyond the end of its range.
    TapRange => "tap-range",
    /// A fault level that gives no positive impedance.
    BadFaultLevel => "bad-fault-level",
    /// A neutral, or a whole side, that is earthed nowhere.
    NotEarthed => "not-earthed",
    /// An electrode or earthing given where there is no neutral to earth.
    NoNeutral => "no-neutral",
    /// Current drawn to earth where nothing can carry it back.
    NoReturnPath => "no-return-path",
    /// A feature of the format that this version does not solve yet.
    NotSupported => "not-supported",
    /// A row that cannot belong to the network, such as a load at neither node nor line.
    NoPlace => "no-place",
    /// A conductor name that is not in the table.
    UnknownConductor => "unknown-conductor",
    /// A spacing named that does not exist or lacks a position.
    UnknownSpacing => "unknown-spacing",
    /// Positions of wires that cannot be.
    BadGeometry => "bad-geometry",
    /// A wire's datum that the computation needs and neither the table nor the folder gives.
    MissingDatum => "missing-datum",
    /// A meter in a part that is not fed.
    MeterNotFed => "meter-not-fed",
    /// A load that shares a reading no meter gives.
    NoReading => "no-reading",
    /// A meter whose reading no load shares.
    NoShare => "no-share",
    /// Known loads and inner meters take more than a meter reads.
    NegativeRemainder => "negative-remainder",
    /// A profile named that does not exist.
    UnknownProfile => "unknown-profile",
    /// A profile that nothing uses.
    UnusedProfile => "unused-profile",
    /// A time that no row of the profiles has.
    UnknownTime => "unknown-time",
    /// Profiles are given and used, but no time is asked for.
    NoTime => "no-time",
    /// Nothing draws power.
    NoLoad => "no-load",
    /// A name that looks as if a spreadsheet had made a date or a rounded number of it.
    MangledName => "mangled-name",
}

impl serde::Serialize for Code {
    fn serialize<S: serde::Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.serialize_str(self.text())
    }
}

/// One fault or remark, with its place and its cure.
#[derive(Debug, Clone, PartialEq, serde::Serialize)]
pub struct Diagnostic {
    /// How bad it is.
    pub severity: Severity,
    /// Stable name of the kind of fault.
    pub code: Code,
    /// Where, if it belongs to one place.
    pub place: Option<Place>,
    /// What is wrong, one sentence, with what was expected.
    pub message: String,
    /// How to mend it.
    pub cure: String,
}

/// Longest piece of a cell that a message shows, in characters.
const SHOWN_LETTERS: usize = 60;

impl fmt::Display for Place {
    /// `lines.csv:14`, or `lines.csv` for the file as a whole.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.file)?;
        if self.row > 0 { write!(f, ":{}", self.row) } else { Ok(()) }
    }
}

impl fmt::Display for Diagnostic {
    /// One line: `lines.csv:14: error[bad-number] length_km (cell D14) "12x": message; cure`.
    ///
    /// Parts that the place does not have are left out.
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        if let Some(place) = &self.place {
            write!(f, "{place}: ")?;
        }
        write!(f, "{}[{}]", self.severity.word(), self.code.text())?;
        if let Some(place) = &self.place {
            if let Some(column) = &place.column {
                write!(f, " {column}")?;
            }
            if let Some(cell) = &place.cell {
                write!(f, " (cell {cell})")?;
            }
            if let Some(found) = place.found.as_deref().filter(|f| !f.is_empty()) {
                write!(f, " \"{}\"", one_line(found))?;
            }
        }
        write!(f, ": {}; {}", self.message.trim_end_matches('.'), self.cure.trim_end_matches('.'))
    }
}

/// Text fit for one line: control characters shown as spaces, long text cut.
fn one_line(text: &str) -> String {
    let plain = |c: char| if c.is_control() { ' ' } else { c };
    let mut shown: String = text.chars().take(SHOWN_LETTERS).map(plain).collect();
    if text.chars().nth(SHOWN_LETTERS).is_some() {
        shown.push('…');
    }
    shown
}

/// All diagnostics of one run, in the order they were found.
#[derive(Debug, Clone, Default)]
pub struct Diagnostics {
    items: Vec<Diagnostic>,
}

impl Diagnostics {
    /// An empty collection.
    pub fn new() -> Self {
        Self::default()
    }

    /// Adds an error.
    pub fn error(
        &mut self,
        code: Code,
        place: Option<Place>,
        message: impl Into<String>,
        cure: impl Into<String>,
    ) {
        self.push(Severity::Error, code, place, message.into(), cure.into());
    }

    /// Adds a warning.
    pub fn warning(
        &mut self,
        code: Code,
        place: Option<Place>,
        message: impl Into<String>,
        cure: impl Into<String>,
    ) {
        self.push(Severity::Warning, code, place, message.into(), cure.into());
    }

    fn push(&mut self, severity: Severity, code: Code, place: Option<Place>, message: String, cure: String) {
        self.items.push(Diagnostic { severity, code, place, message, cure });
    }

    /// All diagnostics, in the order found.
    pub fn items(&self) -> &[Diagnostic] {
        &self.items
    }

    /// Takes all diagnostics of another collection.
    pub fn append(&mut self, mut other: Diagnostics) {
        self.items.append(&mut other.items);
    }

    /// True where at least one error was found.
    pub fn has_errors(&self) -> bool {
        self.items.iter().any(|d| d.severity == Severity::Error)
    }

    /// Number of errors and of warnings.
    pub fn counts(&self) -> (usize, usize) {
        let errors = self.items.iter().filter(|d| d.severity == Severity::Error).count();
        (errors, self.items.len() - errors)
    }

    /// Sorts by file (in `order` of appearance), then row; network-wide ones come last.
    pub fn sort_by_place(&mut self, sources: &Sources) {
        let rank: HashMap<&str, usize> =
            sources.files().iter().enumerate().map(|(i, f)| (f.name.as_str(), i)).collect();
        self.items.sort_by_key(|d| match &d.place {
            Some(p) => (rank.get(p.file.as_str()).copied().unwrap_or(usize::MAX - 1), p.row),
            None => (usize::MAX, 0),
        });
    }
}

/// The candidate nearest to `text`, if near enough to be a slip of the keyboard.
///
/// Spelling is compared without regard to case by the Damerau-Levenshtein distance; at most a
/// third of the letters may differ, and one of three; names of one or two letters only by case.
pub fn nearest<'a>(text: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let wanted = text.trim().to_lowercase();
    let letters = wanted.chars().count();
    let limit = if letters < 3 { 0 } else { letters / 3 };
    candidates
        .into_iter()
        .map(|c| (strsim::damerau_levenshtein(&wanted, &c.to_lowercase()), c))
        .filter(|(distance, _)| *distance <= limit)
        .min_by_key(|(distance, _)| *distance)
        .map(|(_, c)| c)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn spreadsheet_letters() {
        for (index, letters) in
            [(0, "A"), (3, "D"), (25, "Z"), (26, "AA"), (51, "AZ"), (52, "BA"), (701, "ZZ"), (702, "AAA")]
        {
            assert_eq!(sheet_column(index), letters);
        }
    }

    #[test]
    fn nearest_name_is_near() {
        let known = ["length_m", "length_km", "construction"];
        assert_eq!(nearest("lenght_km", known), Some("length_km"));
        assert_eq!(nearest("Construcion", known), Some("construction"));
        assert_eq!(nearest("kvar", known), None);
        assert_eq!(nearest("L2", ["L1", "l2"]), Some("l2"));
        assert_eq!(nearest("L3", ["L1", "l2"]), None);
    }

    #[test]
    fn codes_are_unique() {
        let mut texts: Vec<_> = Code::ALL.iter().map(|c| c.text()).collect();
        texts.sort_unstable();
        texts.dedup();
        assert_eq!(texts.len(), Code::ALL.len());
    }
}
