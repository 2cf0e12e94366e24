//! Conductor letters as people write them: `abcn`, `L1 L2 L3 N`, `R-S-T`, `1,2`, in any case.

use crate::network::{Conductor, Conductors, Connection};

/// Why a text is no set of conductors.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) enum PhaseFault {
    /// A sign that names no conductor.
    Unknown(char),
    /// The same conductor twice.
    Twice(Conductor),
    /// Letters of two ways of naming in one cell, such as `aL2`.
    Mixed,
    /// Earth or protective conductor, which is not one of the four.
    Earth,
    /// A date, as spreadsheets make of `1-2`.
    Date,
    /// Nothing but separators.
    Nothing,
}

impl PhaseFault {
    /// What is wrong, as a part of a sentence.
    pub(super) fn text(&self) -> String {
        match self {
            PhaseFault::Unknown(c) => format!("`{c}` is no conductor; the conductors are a, b, c and n"),
            PhaseFault::Twice(c) => format!("conductor {c} stands there twice"),
            PhaseFault::Mixed => "two ways of naming the phases are mixed".to_owned(),
            PhaseFault::Earth => "earth is not one of the conductors a, b, c and n".to_owned(),
            PhaseFault::Date => "this is a date; a spreadsheet makes one of phases such as 1-2".to_owned(),
            PhaseFault::Nothing => "no conductor is named".to_owned(),
        }
    }
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Naming {
    Abc,
    Line,
    Rst,
    Digits,
}

/// Reads a set of conductors from a non-blank cell.
pub(super) fn conductors(text: &str) -> Result<Conductors, PhaseFault> {
    if is_date(text) {
        return Err(PhaseFault::Date);
    }
    if let Some(set) = split(text) {
        return set;
    }
    let mut set = Conductors::NONE;
    let mut naming = None;
    let mut after_l = false;
    for c in text.chars() {
        let c = c.to_ascii_lowercase();
        if c == 'l' {
            after_l = true;
            continue;
        }
        if is_separator(c) {
            continue;
        }
        let (conductor, found) = letter(c, after_l).ok_or(match c {
            'g' | 'e' | 'p' => PhaseFault::Earth,
            _ => PhaseFault::Unknown(c),
        })?;
        if let Some(found) = found {
            if naming.is_some_and(|n| n != found) {
                return Err(PhaseFault::Mixed);
            }
            naming = Some(found);
        }
        if set.has(conductor) {
            return Err(PhaseFault::Twice(conductor));
        }
        set = set.with(conductor);
    }
    if after_l && naming != Some(Naming::Line) {
        return Err(PhaseFault::Unknown('l'));
    }
    if set.is_empty() { Err(PhaseFault::Nothing) } else { Ok(set) }
}

/// Conductors behind a centre tap: `s1 n s2`; `None` where the text does not speak of these.
fn split(text: &str) -> Option<Result<Conductors, PhaseFault>> {
    let plain: String = text.chars().filter(|c| !is_separator(*c)).flat_map(char::to_lowercase).collect();
    if !plain.contains("s1") && !plain.contains("s2") || plain.contains(['r', 't']) {
        return None;
    }
    let mut set = Conductors::NONE;
    let mut rest = plain.as_str();
    while !rest.is_empty() {
        let known = [("s1", Conductor::S1), ("s2", Conductor::S2), ("n", Conductor::N)];
        let found = known.into_iter().find_map(|(name, c)| Some((rest.strip_prefix(name)?, c)));
        let Some((after, conductor)) = found else { return Some(Err(PhaseFault::Mixed)) };
        if set.has(conductor) {
            return Some(Err(PhaseFault::Twice(conductor)));
        }
        (set, rest) = (set.with(conductor), after);
    }
    Some(Ok(set))
}

/// A date as a whole, but not `1 - 2 - 3`.
fn is_date(text: &str) -> bool {
    let long = |p: &str| p.len() > 1 && p.bytes().all(|b| b.is_ascii_digit());
    super::number::looks_like_date(text)
        && (text.split(['.', '-', '/', ' ']).any(long) || text.chars().any(|c| c.is_alphabetic()))
}

fn is_separator(c: char) -> bool {
    c.is_whitespace()
        || matches!(c, '-' | ',' | ';' | '/' | '+' | '.' | '_' | ':' | '&' | '\u{2010}'..='\u{2013}')
}

fn letter(c: char, after_l: bool) -> Option<(Conductor, Option<Naming>)> {
    use Conductor::{A, B, C, N};
    let digits = if after_l { Naming::Line } else { Naming::Digits };
    Some(match c {
        'a' => (A, Some(Naming::Abc)),
        'b' => (B, Some(Naming::Abc)),
        'c' => (C, Some(Naming::Abc)),
        'r' => (A, Some(Naming::Rst)),
        's' => (B, Some(Naming::Rst)),
        't' => (C, Some(Naming::Rst)),
        '1' => (A, Some(digits)),
        '2' => (B, Some(digits)),
        '3' => (C, Some(digits)),
        'n' => (N, None),
        _ => return None,
    })
}

/// How a load on that set is joined: with `n` a star, two phases a phase-to-phase load, three a delta.
///
/// `None` for one conductor alone, or the neutral alone.
pub(super) fn connection(set: Conductors) -> Option<Connection> {
    let phases = set.phases();
    match (phases.count(), set.has_neutral()) {
        (1..=3, true) => Some(Connection::Star(phases)),
        (3, false) => Some(Connection::Delta(phases)),
        (2, false) => {
            let start = phases.iter().find(|c| phases.has(c.next()))?;
            Some(Connection::Delta(Conductors::NONE.with(start)))
        }
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn read(text: &str) -> Result<String, PhaseFault> {
        conductors(text).map(|c| c.to_string())
    }

    #[test]
    fn ways_of_naming() {
        for (text, set) in [
            ("abcn", "abcn"),
            ("NCBA", "abcn"),
            ("L1 L2 L3 N", "abcn"),
            ("l1-l2", "ab"),
            ("L123n", "abcn"),
            ("R S T N", "abcn"),
            ("r/t", "ac"),
            ("123", "abc"),
            ("12", "ab"),
            ("1,3", "ac"),
            ("3n", "cn"),
            ("a,b", "ab"),
            ("a\u{a0}+\u{a0}n", "an"),
            ("1-2", "ab"),
            ("1 - 2 - 3", "abc"),
            ("s1 n s2", "s1ns2"),
            ("S1-S2", "s1s2"),
            ("s2n", "s2n"),
            ("R-S-T", "abc"),
        ] {
            assert_eq!(read(text).as_deref(), Ok(set), "{text}");
        }
    }

    #[test]
    fn what_names_no_conductors() {
        for (text, fault) in [
            ("aa", PhaseFault::Twice(Conductor::A)),
            ("aL2", PhaseFault::Mixed),
            ("a2", PhaseFault::Mixed),
            ("s1a", PhaseFault::Mixed),
            ("s1s1", PhaseFault::Twice(Conductor::S1)),
            ("abx", PhaseFault::Unknown('x')),
            ("ag", PhaseFault::Earth),
            ("abc+PE", PhaseFault::Earth),
            ("L4", PhaseFault::Unknown('4')),
            ("la", PhaseFault::Unknown('l')),
            ("l", PhaseFault::Unknown('l')),
            ("01.02.2026", PhaseFault::Date),
            ("01. Feb", PhaseFault::Date),
            ("-", PhaseFault::Nothing),
        ] {
            assert_eq!(read(text), Err(fault), "{text}");
        }
    }

    #[test]
    fn connections() {
        let joined = |text: &str| conductors(text).ok().and_then(connection).map(|c| c.to_string());
        for (text, wanted) in [
            ("an", "an"),
            ("cn", "cn"),
            ("abn", "abn"),
            ("abcn", "abcn"),
            ("ba", "ab"),
            ("bc", "bc"),
            ("ac", "ca"),
            ("abc", "abc"),
            ("s1ns2", "s1ns2"),
            ("s1n", "s1n"),
            ("s1s2", "s1s2"),
        ] {
            assert_eq!(joined(text).as_deref(), Some(wanted), "{text}");
        }
        assert_eq!(joined("a"), None);
        assert_eq!(joined("n"), None);
    }
}
