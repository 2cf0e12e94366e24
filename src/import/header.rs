//! The header row: which column stands where, what separates the cells, and every fault in it.

use std::cell::OnceCell;
use std::sync::Arc;

use super::number::{Evidence, Marks, evidence};
use super::schema::{Header, Need, OWN_NAMES, Schema};
use super::text::trim;
use crate::diagnostic::{Code, Diagnostics, Origin, Sources, nearest};

/// Where the columns of a file stand.
#[derive(Debug)]
pub(crate) struct Layout {
    /// The columns the file may have.
    pub(crate) schema: &'static Schema,
    /// For each column of the schema, the positions of its names in the header row.
    pub(crate) cells: Vec<Vec<(usize, &'static Header)>>,
    /// Number of cells of the header row.
    pub(crate) width: usize,
    /// Positions without a name.
    pub(crate) unnamed: Vec<usize>,
    /// Sign between cells.
    pub(crate) separator: u8,
    text: Arc<str>,
    evidence: OnceCell<Evidence>,
}

impl Layout {
    /// Decimal marks the separator leaves possible.
    pub(crate) fn marks(&self) -> Marks {
        if self.separator == b',' { Marks::Dot } else { Marks::DotOrComma }
    }

    /// What the other cells of the file say about its decimal mark.
    pub(crate) fn evidence(&self) -> Evidence {
        *self.evidence.get_or_init(|| match self.marks() {
            Marks::Dot => Evidence::default(),
            Marks::DotOrComma => evidence(&self.text, char::from(self.separator)),
        })
    }

    /// True where the header names the column in any unit.
    pub(crate) fn has(&self, column: usize) -> bool {
        self.cells.get(column).is_some_and(|c| !c.is_empty())
    }
}

/// The separator of a header row: the most frequent of semicolon, tab and comma outside quotes.
pub(super) fn find_separator(header: &[u8]) -> u8 {
    let mut counts = [(b';', 0u32), (b'\t', 0), (b',', 0)];
    let mut quoted = false;
    for &byte in header {
        quoted ^= byte == b'"';
        if let Some((_, count)) = counts.iter_mut().find(|(s, _)| !quoted && *s == byte) {
            *count += 1;
        }
    }
    // The first of equals wins; without any, it is a file of one column.
    let best = counts.into_iter().rev().max_by_key(|(_, count)| *count);
    best.filter(|(_, count)| *count > 0).map_or(b',', |(separator, _)| separator)
}

/// Header names as they are matched.
pub(super) fn normal_names<'a>(cells: impl Iterator<Item = &'a str>) -> Vec<String> {
    cells.map(|c| trim(c).to_lowercase()).collect()
}

/// Finds every column; `None` where the row is no header at all.
#[allow(clippy::too_many_arguments)] // one call, where all of them are at hand
pub(super) fn lay_out(
    schema: &'static Schema,
    names: &[String],
    typed: &[&str],
    separator: u8,
    text: Arc<str>,
    origin: Origin,
    sources: &Sources,
    diagnostics: &mut Diagnostics,
) -> Option<Layout> {
    let mut finder = Finder { schema, names, typed, origin, sources, diagnostics, suggested: Vec::new() };
    if !finder.is_header() {
        finder.no_header();
        return None;
    }
    let mut cells = vec![Vec::new(); schema.columns.len()];
    let mut unnamed = Vec::new();
    for (position, name) in names.iter().enumerate() {
        if name.is_empty() {
            unnamed.push(position);
        } else if names.iter().take(position).any(|n| n == name) {
            finder.duplicate(name);
        } else if let Some((column, header)) = find(schema, name).or_else(|| own(schema, name, names)) {
            if let Some(list) = cells.get_mut(column) {
                list.push((position, header));
            }
        } else if !name.starts_with("note") {
            finder.unknown(name, position);
        }
    }
    finder.missing(&cells);
    Some(Layout { schema, cells, width: names.len(), unnamed, separator, text, evidence: OnceCell::new() })
}

fn find(schema: &'static Schema, name: &str) -> Option<(usize, &'static Header)> {
    let columns = schema.columns.iter().enumerate();
    columns.flat_map(|(i, c)| c.headers().map(move |h| (i, h))).find(|(_, h)| h.name == name)
}

/// The column that takes names of the user's own, where the file has one; a name that must mean a
/// column which is not there is none of them.
fn own(schema: &'static Schema, name: &str, names: &[String]) -> Option<(usize, &'static Header)> {
    let slip = near(name, schema).is_some_and(|meant| !names.iter().any(|n| n == meant));
    if slip || name.starts_with("note") { None } else { find(schema, OWN_NAMES) }
}

/// The known name a misspelt one must mean; very short names are near to everything.
fn near(name: &str, schema: &'static Schema) -> Option<&'static str> {
    if name.chars().count() < 3 { None } else { nearest(name, schema.names()) }
}

/// `w` and `mw` where the file has `kw`: its name, and what to do with the numbers.
fn in_kilo(name: &str, schema: &'static Schema) -> Option<(&'static str, &'static str)> {
    let (unit, how) = match name {
        "w" | "watt" | "watts" => ("kw", "divide"),
        "var" | "vars" => ("kvar", "divide"),
        "va" => ("kva", "divide"),
        "v" | "volt" | "volts" => ("kv", "divide"),
        "mw" => ("kw", "multiply"),
        "mvar" => ("kvar", "multiply"),
        "mva" => ("kva", "multiply"),
        _ => return None,
    };
    schema.names().find(|known| *known == unit).map(|known| (known, how))
}

struct Finder<'a> {
    schema: &'static Schema,
    names: &'a [String],
    typed: &'a [&'a str],
    origin: Origin,
    sources: &'a Sources,
    diagnostics: &'a mut Diagnostics,
    suggested: Vec<&'static str>,
}

impl Finder<'_> {
    fn error(&mut self, code: Code, column: Option<&str>, message: String, cure: String) {
        let place = self.sources.place(self.origin, column, None);
        self.diagnostics.error(code, place, message, cure);
    }

    /// A header row has at least one name that is known or nearly so.
    fn is_header(&self) -> bool {
        let known = |n: &str| {
            n.starts_with("note") || find(self.schema, n).is_some() || in_kilo(n, self.schema).is_some()
        };
        self.names.iter().any(|n| known(n) || near(n, self.schema).is_some())
    }

    fn no_header(&mut self) {
        let known = list(self.schema.names());
        let cure = match self.names {
            [only] if only.contains(['|', ' ', ':']) => {
                "separate the cells with commas, semicolons or tabs".to_owned()
            }
            _ => format!("put a header row first, with column names of {}: {known}", self.schema.file),
        };
        let message = "the first row holds no column name that this file knows".to_owned();
        self.error(Code::MissingColumn, None, message, cure);
    }

    fn duplicate(&mut self, name: &str) {
        let message = format!("the header names the column `{name}` twice");
        let cure = "delete one of the two, or rename one so that it begins with `note`".to_owned();
        self.error(Code::DuplicateColumn, Some(name), message, cure);
    }

    fn unknown(&mut self, name: &str, position: usize) {
        let file = self.schema.file;
        let typed = self.typed.get(position).copied().unwrap_or(name);
        let family: Vec<&str> = self.schema.names().filter(|k| is_unit_of(name, k)).collect();
        let (message, cure) = if !family.is_empty() {
            self.suggested.extend(self.schema.names().filter(|k| is_unit_of(name, k)));
            let message = format!("the column name `{typed}` does not say its unit");
            (message, format!("put the unit into the name: {}", list(family.into_iter())))
        } else if let Some((kilo, how)) = in_kilo(name, self.schema) {
            self.suggested.push(kilo);
            (
                format!("{file} has no column `{typed}`"),
                format!("rename it `{kilo}` and {how} its numbers by 1000"),
            )
        } else if let Some(near) = near(name, self.schema) {
            self.suggested.push(near);
            let cure = format!(
                "did you mean `{near}`? Rename it, or let its name begin with `note` to have it ignored"
            );
            (format!("{file} has no column `{typed}`"), cure)
        } else {
            let message = format!("{file} has no column `{typed}`");
            let known = list(self.schema.names());
            (message, format!("let its name begin with `note` to have it ignored; the columns are {known}"))
        };
        self.error(Code::UnknownColumn, Some(name), message, cure);
    }

    fn missing(&mut self, cells: &[Vec<(usize, &'static Header)>]) {
        for (column, found) in self.schema.columns.iter().zip(cells) {
            let misspelt = column.headers().any(|h| self.suggested.contains(&h.name));
            let needed = match column.need {
                Need::Required => true,
                Need::RequiredWithout(others) => {
                    others.iter().all(|&other| cells.get(other).is_none_or(Vec::is_empty))
                }
                Need::Optional => false,
            };
            if needed && found.is_empty() && !misspelt {
                let message = format!("the column for {} is missing", column.what);
                let cure = format!("add a column: {}", column.names());
                self.error(Code::MissingColumn, None, message, cure);
            }
        }
    }
}

/// `length` against `length_km`, `r_ohm` or `r` against `r_ohm_per_km`.
fn is_unit_of(name: &str, known: &str) -> bool {
    known.strip_prefix(name).is_some_and(|rest| rest.starts_with('_'))
}

/// Names for a message: `a`, `b`, `c`; families of units shortened to their first three.
fn list<'a>(names: impl Iterator<Item = &'a str>) -> String {
    let mut shown: Vec<String> = Vec::new();
    for name in names {
        // A quantity per length has five spellings; three tell the pattern.
        let skip = ["_per_kft", "_per_ft", "_per_m"].iter().any(|tail| name.ends_with(tail));
        if !skip {
            shown.push(format!("`{name}`"));
        }
    }
    shown.join(", ")
}
