//! What the columns of a file are: their names with units, whether they must be filled, and the
//! range that makes sense.

use crate::units::{METRES_PER_FOOT, METRES_PER_KILOFOOT, METRES_PER_KILOMETRE, METRES_PER_MILE};

/// A column name and the unit it stands for.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Header {
    /// Name in the header row, lower case.
    pub(crate) name: &'static str,
    /// SI units in one unit of the column.
    pub(crate) factor: f64,
    /// Unit as printed; empty for a plain number or text.
    pub(crate) unit: &'static str,
}

/// Range of a number, in the unit of its column.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Range {
    /// Any finite number.
    Any,
    /// Greater than zero.
    Positive,
    /// Zero or greater.
    NotNegative,
    /// Between two numbers, both allowed.
    Within(f64, f64),
    /// Greater than zero and up to a number.
    UpTo(f64),
}

/// Numbers beyond this in any unit are slips: nothing on a feeder is so large.
pub(crate) const LARGEST: f64 = 1e12;
/// Positive numbers below this in any unit are slips.
pub(crate) const SMALLEST: f64 = 1e-9;

impl Range {
    /// True where `value` is in the range.
    pub(crate) fn holds(self, value: f64) -> bool {
        value.abs() <= LARGEST
            && match self {
                Range::Any => true,
                Range::Positive => value >= SMALLEST,
                Range::NotNegative => value >= 0.0,
                Range::Within(low, high) => (low..=high).contains(&value),
                Range::UpTo(high) => value >= SMALLEST && value <= high,
            }
    }

    /// What the range asks for, with the unit.
    pub(crate) fn expected(self, unit: &str) -> String {
        let space = if unit.is_empty() { "" } else { " " };
        match self {
            Range::Any => format!("no larger than {LARGEST:e}{space}{unit}"),
            Range::Positive => "greater than zero".to_owned(),
            Range::NotNegative => "zero or greater".to_owned(),
            Range::Within(low, high) => format!("between {low} and {high}{space}{unit}"),
            Range::UpTo(high) => format!("greater than 0 and at most {high}{space}{unit}"),
        }
    }
}

/// Whether every row needs a value.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Need {
    /// Every row.
    Required,
    /// Every row in which none of these columns is filled.
    RequiredWithout(&'static [usize]),
    /// Blank means the default, or depends on other columns.
    Optional,
}

/// A column, under one name or under one name for each unit.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Column {
    first: Header,
    others: &'static [Header],
    /// What it holds, for messages: `the length`.
    pub(crate) what: &'static str,
    /// Whether every row needs it.
    pub(crate) need: Need,
    /// Range of its numbers.
    pub(crate) range: Range,
}

/// Name, in a schema, of columns whose names are the user's own; no header can be written so.
pub(crate) const OWN_NAMES: &str = "NAME OF A PROFILE";

impl Column {
    /// A column of text.
    pub(crate) const fn text(name: &'static str, what: &'static str) -> Column {
        Column::number(name, 1.0, "", what)
    }

    /// A column of numbers; `factor` takes them to SI.
    pub(crate) const fn number(
        name: &'static str,
        factor: f64,
        unit: &'static str,
        what: &'static str,
    ) -> Column {
        let first = Header { name, factor, unit };
        Column { first, others: &[], what, need: Need::Optional, range: Range::Any }
    }

    /// A quantity that may be given in any of several units, one column name a unit.
    pub(crate) const fn family(headers: &'static [Header], what: &'static str) -> Column {
        let (first, others): (Header, &'static [Header]) = match headers {
            [first, others @ ..] => (*first, others),
            [] => (Header { name: "", factor: 1.0, unit: "" }, &[]),
        };
        Column { first, others, what, need: Need::Optional, range: Range::Any }
    }

    /// The same column, needed in every row.
    pub(crate) const fn required(self) -> Column {
        Column { need: Need::Required, ..self }
    }

    /// The same column, needed in every row without any of these others.
    pub(crate) const fn required_without(self, others: &'static [usize]) -> Column {
        Column { need: Need::RequiredWithout(others), ..self }
    }

    /// The same column with a range.
    pub(crate) const fn range(self, range: Range) -> Column {
        Column { range, ..self }
    }

    /// Its names.
    pub(crate) fn headers(&self) -> impl Iterator<Item = &Header> {
        std::iter::once(&self.first).chain(self.others)
    }

    /// Its names for a message: "`a`" or "one of `a`, `b`".
    pub(crate) fn names(&self) -> String {
        if self.others.is_empty() {
            return format!("`{}`", self.first.name);
        }
        let all: Vec<String> = self.headers().map(|h| format!("`{}`", h.name)).collect();
        format!("one of {}", all.join(", "))
    }

    /// First of its names.
    pub(crate) fn name(&self) -> &'static str {
        self.first.name
    }
}

/// The columns of one file.
#[derive(Debug)]
pub(crate) struct Schema {
    /// File name.
    pub(crate) file: &'static str,
    /// Columns; a reader names them by their index here.
    pub(crate) columns: &'static [Column],
}

impl Schema {
    /// Column of that index.
    ///
    /// Readers use constants of their own file, so the index is always there.
    pub(crate) fn column(&self, index: usize) -> &'static Column {
        &self.columns[index]
    }

    /// All column names.
    pub(crate) fn names(&self) -> impl Iterator<Item = &'static str> + use<> {
        self.columns.iter().flat_map(|c| c.headers()).map(|h| h.name)
    }
}

/// Lengths.
pub(crate) const LENGTH: &[Header] = &[
    Header { name: "length_m", factor: 1.0, unit: "m" },
    Header { name: "length_km", factor: METRES_PER_KILOMETRE, unit: "km" },
    Header { name: "length_ft", factor: METRES_PER_FOOT, unit: "ft" },
    Header { name: "length_kft", factor: METRES_PER_KILOFOOT, unit: "kft" },
    Header { name: "length_mi", factor: METRES_PER_MILE, unit: "mi" },
];

/// Column names of a quantity per length: `per_length!("r_ohm", "ohm", 1.0)` gives
/// `r_ohm_per_km`, `r_ohm_per_m`, `r_ohm_per_mi`, `r_ohm_per_kft`, `r_ohm_per_ft`.
macro_rules! per_length {
    ($name:literal, $unit:literal, $factor:expr) => {
        &[
            $crate::import::schema::Header {
                name: concat!($name, "_per_km"),
                factor: $factor / $crate::units::METRES_PER_KILOMETRE,
                unit: concat!($unit, " per km"),
            },
            $crate::import::schema::Header {
                name: concat!($name, "_per_m"),
                factor: $factor,
                unit: concat!($unit, " per m"),
            },
            $crate::import::schema::Header {
                name: concat!($name, "_per_mi"),
                factor: $factor / $crate::units::METRES_PER_MILE,
                unit: concat!($unit, " per mile"),
            },
            $crate::import::schema::Header {
                name: concat!($name, "_per_kft"),
                factor: $factor / $crate::units::METRES_PER_KILOFOOT,
                unit: concat!($unit, " per kft"),
            },
            $crate::import::schema::Header {
                name: concat!($name, "_per_ft"),
                factor: $factor / $crate::units::METRES_PER_FOOT,
                unit: concat!($unit, " per ft"),
            },
        ]
    };
}
pub(crate) use per_length;

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ranges() {
        assert!(Range::Positive.holds(1.0) && !Range::Positive.holds(0.0) && !Range::Positive.holds(1e-12));
        assert!(Range::NotNegative.holds(0.0) && !Range::NotNegative.holds(-1.0));
        assert!(Range::Within(0.0, 100.0).holds(100.0) && !Range::Within(0.0, 100.0).holds(100.1));
        assert!(Range::UpTo(1.0).holds(1.0) && !Range::UpTo(1.0).holds(0.0));
        assert!(!Range::Any.holds(1e13) && !Range::Any.holds(f64::NAN));
    }

    #[test]
    fn families_name_their_units() {
        const LENGTHS: Column = Column::family(LENGTH, "the length").required();
        assert_eq!(LENGTHS.headers().count(), 5);
        assert_eq!(LENGTHS.need, Need::Required);
        let r = Column::family(per_length!("r_ohm", "ohm", 1.0), "the resistance");
        let mile = r.headers().find(|h| h.name == "r_ohm_per_mi").map(|h| h.factor * 1609.344);
        assert!(mile.is_some_and(|f| (f - 1.0).abs() < 1e-15));
    }
}
