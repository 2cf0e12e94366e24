//! Finding a wire by the way people write it.

use std::fmt;

use super::conductor::{Conductor, Family, Material};
use crate::math::nearest_text;

/// Size of a wire.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Size {
    /// American wire gauge: 2 is 2, 1/0 is 0, 4/0 is -3.
    Awg(i32),
    /// Thousands of circular mils.
    Kcmil(f64),
    /// Square millimetres.
    Mm2(f64),
}

/// What a wire is looked up by.
#[derive(Debug, Clone, PartialEq, Default)]
pub(super) struct Key {
    pub size: Option<Size>,
    /// Stranding, e.g. `26/7`, or the number of strands.
    pub stranding: Option<String>,
    /// Code word, lower case.
    pub code: Option<String>,
}

/// Why a wire was not found.
#[derive(Debug, Clone, PartialEq)]
pub enum LookupFault {
    /// Nothing of that name; the nearest names.
    Unknown {
        /// The text looked for.
        text: String,
        /// Names that are near.
        near: Vec<String>,
    },
    /// Several wires fit.
    Ambiguous {
        /// The text looked for.
        text: String,
        /// Names of those that fit.
        choices: Vec<String>,
    },
}

impl LookupFault {
    /// How to mend it.
    pub fn cure(&self) -> String {
        match self {
            LookupFault::Unknown { near, .. } if near.is_empty() => {
                "list the table with `fourwire line --list`, or give the wire in conductors.csv".to_string()
            }
            LookupFault::Unknown { near, .. } => format!("did you mean {}?", quoted(near)),
            LookupFault::Ambiguous { choices, .. } => format!("write one of {}", quoted(choices)),
        }
    }
}

impl fmt::Display for LookupFault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            LookupFault::Unknown { text, .. } => write!(f, "no wire {text:?} is in the table"),
            LookupFault::Ambiguous { text, choices } => {
                write!(f, "{text:?} fits {} wires of the table", choices.len())
            }
        }
    }
}

fn quoted(names: &[String]) -> String {
    let shown: Vec<String> = names.iter().take(8).map(|n| format!("{n:?}")).collect();
    let more = names.len().saturating_sub(8);
    let tail = if more == 0 { String::new() } else { format!(" and {more} more") };
    format!("{}{tail}", shown.join(", "))
}

/// What a query says.
#[derive(Debug, Default)]
struct Query {
    key: Key,
    material: Option<Material>,
    family: Option<Family>,
}

/// Reads a query such as `4/0 AWG ACSR 6/1`, `#2 copper`, `95 mm² Al`, `336,400 26/7`, `Dove`.
fn parse(text: &str) -> Query {
    let lower = text.to_lowercase().replace('²', "2").replace("sq mm", "mm2").replace("sqmm", "mm2");
    // A hyphen or underscore joins words.
    let joined: String =
        plain_commas(&lower).chars().map(|c| if "-_()".contains(c) { ' ' } else { c }).collect();
    let spaced = joined
        .replace('#', " # ")
        .replace("no.", " # ")
        .replace("mm2", " mm2 ")
        .replace("kcmil", " kcmil ")
        .replace("mcm", " kcmil ")
        .replace("awg", " awg ");
    let words: Vec<&str> = spaced.split_whitespace().collect();
    let mut query = Query::default();
    let mut numbers: Vec<f64> = Vec::new();
    let (mut gauge, mut square) = (false, None);
    for word in words {
        match word {
            "#" | "awg" | "no" => gauge = true,
            "kcmil" => square = Some(false),
            "mm2" => square = Some(true),
            "cu" | "copper" => query.material = Some(Material::Copper),
            "al" | "aluminium" | "aluminum" => query.material = Some(Material::Aluminium),
            "steel" => query.family = Some(Family::Steel),
            "acsr" => query.family = Some(Family::Acsr),
            "aac" | "aa" => query.family = Some(Family::Aac),
            "solid" => query.key.stranding = Some("1".to_string()),
            "nec" | "building" => query.family = Some(Family::Building),
            "iec" => query.family = Some(Family::Iec),
            "bare" | "wire" | "strand" | "strands" | "stranded" | "cable" => {}
            other => read_word(other, &mut query, &mut numbers),
        }
    }
    for number in numbers {
        match query.key.size {
            None => query.key.size = Some(size(number, gauge, square)),
            Some(_) => query.key.stranding = query.key.stranding.or(Some(format!("{number}"))),
        }
    }
    query
}

/// Commas made plain: before three digits and no more it groups thousands (`336,400`) and goes; between
/// other digits it is a decimal comma (`2,5 mm2`); elsewhere it parts words.
fn plain_commas(text: &str) -> String {
    let chars: Vec<char> = text.chars().collect();
    let digit = |k: usize| chars.get(k).is_some_and(char::is_ascii_digit);
    let plain = |(k, c): (usize, &char)| match c {
        ',' if k > 0 && digit(k - 1) && digit(k + 1) => {
            let groups = digit(k + 2) && digit(k + 3) && !digit(k + 4);
            if groups { None } else { Some('.') }
        }
        ',' => Some(' '),
        other => Some(*other),
    };
    chars.iter().enumerate().filter_map(plain).collect()
}

fn read_word(word: &str, query: &mut Query, numbers: &mut Vec<f64>) {
    // The old way to write 1/0 to 4/0: as many zeros.
    if (1..=4).contains(&word.len()) && word.chars().all(|c| c == '0') {
        query.key.size = Some(Size::Awg(1 - word.len() as i32));
        return;
    }
    if let Ok(number) = word.parse::<f64>() {
        numbers.push(number);
        return;
    }
    if let Some((first, second)) = word.split_once('/')
        && let (Ok(a), Ok(b)) = (first.parse::<u32>(), second.parse::<u32>())
    {
        if b == 0 && (1..=4).contains(&a) {
            query.key.size = Some(Size::Awg(1 - a as i32));
        } else {
            query.key.stranding = Some(format!("{a}/{b}"));
        }
        return;
    }
    if word.chars().all(char::is_alphabetic) && word.len() > 2 {
        let code = query.key.code.take().map_or(word.to_string(), |c| format!("{c} {word}"));
        query.key.code = Some(code);
    }
}

fn size(number: f64, gauge: bool, square: Option<bool>) -> Size {
    match square {
        Some(true) => Size::Mm2(number),
        Some(false) => Size::Kcmil(number),
        None if number >= 10_000.0 => Size::Kcmil(number / 1000.0),
        None if gauge || (number <= 40.0 && number.fract() == 0.0) => Size::Awg(number as i32),
        None => Size::Kcmil(number),
    }
}

fn same_size(a: Size, b: Size) -> bool {
    let near = |x: f64, y: f64| (x / y - 1.0).abs() < 0.0025;
    match (a, b) {
        (Size::Awg(x), Size::Awg(y)) => x == y,
        (Size::Kcmil(x), Size::Kcmil(y)) | (Size::Mm2(x), Size::Mm2(y)) => near(x, y),
        _ => false,
    }
}

fn fits(query: &Query, wire: &Conductor) -> bool {
    let key = &wire.key;
    let size = query.key.size.is_none_or(|s| key.size.is_some_and(|k| same_size(s, k)));
    let stranding = query.key.stranding.as_ref().is_none_or(|s| key.stranding.as_ref() == Some(s));
    let code = query.key.code.as_ref().is_none_or(|c| key.code.as_ref() == Some(c));
    let material = query.material.is_none_or(|m| wire.material == m && wire.family != Family::Acsr);
    let family = query.family.is_none_or(|f| wire.family == f);
    size && stranding && code && material && family
}

/// The wire that a text means.
pub(super) fn find<'a>(wires: &'a [Conductor], text: &str) -> Result<&'a Conductor, LookupFault> {
    let trimmed = text.trim();
    // The user's own wires stand last and win.
    if let Some(exact) = wires.iter().rev().find(|w| w.name.eq_ignore_ascii_case(trimmed)) {
        return Ok(exact);
    }
    let query = parse(trimmed);
    let says_something = query.key.size.is_some() || query.key.code.is_some();
    let found: Vec<&Conductor> = if says_something {
        wires.iter().filter(|w| w.family != Family::Own && fits(&query, w)).collect()
    } else {
        Vec::new()
    };
    match found.as_slice() {
        [one] => Ok(own_instead(wires, one)),
        [] => {
            let names = wires.iter().map(|w| w.name.as_str());
            let mut near: Vec<String> =
                nearest_text(trimmed, names).into_iter().map(str::to_string).collect();
            let same_size: Vec<String> = wires
                .iter()
                .filter(|w| query.key.size.is_some_and(|s| w.key.size.is_some_and(|k| self::same_size(s, k))))
                .map(|w| w.name.clone())
                .collect();
            near.extend(same_size.into_iter().filter(|n| !near.contains(n)).collect::<Vec<_>>());
            Err(LookupFault::Unknown { text: trimmed.to_string(), near })
        }
        many => Err(LookupFault::Ambiguous {
            text: trimmed.to_string(),
            choices: many.iter().map(|w| w.name.clone()).collect(),
        }),
    }
}

/// The user's own wire that stands for a built-in one: its name means that one alone. The last wins.
fn own_instead<'a>(wires: &'a [Conductor], built_in: &'a Conductor) -> &'a Conductor {
    let stands_for = |own: &&Conductor| {
        let query = parse(&own.name);
        let mut meant = wires.iter().filter(|w| w.family != Family::Own && fits(&query, w));
        (query.key.size.is_some() || query.key.code.is_some())
            && meant.next().is_some_and(|w| w.name == built_in.name)
            && meant.next().is_none()
    };
    wires.iter().rev().filter(|w| w.family == Family::Own).find(stands_for).unwrap_or(built_in)
}

/// The building wire that a text means; of several strandings of one size and metal the stranded.
pub(super) fn find_building<'a>(wires: &'a [Conductor], text: &str) -> Result<&'a Conductor, LookupFault> {
    let query = parse(text);
    let found: Vec<&Conductor> = wires
        .iter()
        .filter(|w| w.family == Family::Building && query.key.size.is_some() && fits(&query, w))
        .collect();
    let Some(first) = found.first() else { return find(wires, text) };
    if found.iter().all(|w| w.material == first.material && w.key.size == first.key.size) {
        let stranded = found.iter().find(|w| w.key.stranding.as_deref() != Some("1"));
        return Ok(stranded.unwrap_or(first));
    }
    let choices = found.iter().map(|w| w.name.clone()).collect();
    Err(LookupFault::Ambiguous { text: text.trim().to_string(), choices })
}

/// Wires that a text could mean, or whose name contains it; all for an empty text.
pub(super) fn search<'a>(wires: &'a [Conductor], text: &str) -> Vec<&'a Conductor> {
    let trimmed = text.trim();
    let lower = trimmed.to_lowercase();
    let query = parse(trimmed);
    let says_something = query.key.size.is_some()
        || query.key.code.is_some()
        || query.family.is_some()
        || query.material.is_some();
    wires
        .iter()
        .filter(|w| {
            trimmed.is_empty()
                || w.name.to_lowercase().contains(&lower)
                || (says_something && fits(&query, w))
        })
        .collect()
}
