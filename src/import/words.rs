//! Words for cells that cannot be read.

use super::number::{Marks, NumberFault};
use super::schema::{Column, Header, Need, Range};
use crate::diagnostic::Code;

/// "`a`, `b` or `c`".
pub(super) fn one_of<'a>(words: impl Iterator<Item = &'a str>) -> String {
    let all: Vec<String> = words.map(|word| format!("`{word}`")).collect();
    match all.split_last() {
        Some((last, others)) if !others.is_empty() => format!("{} or {last}", others.join(", ")),
        _ => all.concat(),
    }
}

/// What a column expects: "the length in km".
fn quantity(spec: &Column, header: &Header) -> String {
    if header.unit.is_empty() { spec.what.to_owned() } else { format!("{} in {}", spec.what, header.unit) }
}

/// Code, message and cure for a cell that is no number.
pub(super) fn explain(
    fault: &NumberFault,
    text: &str,
    spec: &Column,
    header: &Header,
    marks: Marks,
) -> (Code, String, String) {
    let expected = quantity(spec, header);
    let not_number = |cure: String| (Code::BadNumber, format!("expected a number, {expected}"), cure);
    match fault {
        NumberFault::NotNumber => not_number("write digits with one decimal mark, such as 12.5".to_owned()),
        NumberFault::Ambiguous { decimal, thousands } => (
            Code::AmbiguousNumber,
            format!("can be read as {decimal} or as {thousands}; expected {expected}"),
            format!(
                "write {} or {thousands}, without a mark between thousands",
                unmistakable(decimal, marks)
            ),
        ),
        NumberFault::DotAmongCommas => {
            let thousands = text.replace('.', "");
            let message = format!(
                "can be read as {text} or as {thousands}, because other numbers in this file have a decimal comma"
            );
            (Code::AmbiguousNumber, message, format!("write {} or {thousands}", text.replace('.', ",")))
        }
        NumberFault::DecimalComma(dotted) => {
            let cure = format!("write {dotted}, or separate the columns with semicolons and keep the comma");
            (
                Code::BadNumber,
                "a decimal comma cannot be read where commas separate the columns".to_owned(),
                cure,
            )
        }
        NumberFault::Grouped(plain) => not_number(format!("write {plain}, without marks between thousands")),
        NumberFault::Percent(value) => {
            let message = format!("a percent sign where {expected} is expected");
            (
                Code::BadNumber,
                message,
                format!("write {} if a share is meant, else delete the sign", value / 100.0),
            )
        }
        NumberFault::Unit(unit) => {
            let number = text.strip_suffix(unit.as_str()).map(str::trim).filter(|n| !n.is_empty());
            let cure = match number {
                Some(number) => {
                    format!("write {number} alone, without letters; the unit stands in the column name")
                }
                None => "write digits alone; the unit stands in the column name".to_owned(),
            };
            not_number(cure)
        }
        NumberFault::NotFinite => {
            let cure = match spec.need {
                Need::Required | Need::RequiredWithout(_) => "write the value itself",
                Need::Optional => "write the value itself, or leave the cell blank",
            };
            (Code::BadNumber, format!("expected a finite number, {expected}"), cure.to_owned())
        }
        NumberFault::Hexadecimal => not_number("write the number in decimal digits".to_owned()),
        NumberFault::Date => {
            let message = format!("this is a date; expected {expected}");
            let cure = "set the cell's format to number or text in the spreadsheet and type the value again";
            (Code::BadNumber, message, cure.to_owned())
        }
    }
}

/// `1.200` as `1.2`; `1.234` as `1.2340` where a comma could be the decimal mark: with a fourth
/// decimal it cannot be read as thousands.
fn unmistakable(decimal: &str, marks: Marks) -> String {
    match decimal.split_once('.') {
        Some((head, tail)) => match tail.trim_end_matches('0') {
            "" => head.to_owned(),
            short if short.len() == 3 && marks == Marks::DotOrComma => format!("{decimal}0"),
            short => format!("{head}.{short}"),
        },
        None => decimal.to_owned(),
    }
}

/// What to do about a number beyond its range.
pub(super) fn out_of_range_cure(value: f64, spec: &Column, unit: &str) -> String {
    match spec.range {
        Range::Positive | Range::NotNegative if value < 0.0 => "check the sign".to_owned(),
        Range::Positive if value == 0.0 && spec.need == Need::Optional => {
            "write the value, or leave the cell blank for the default".to_owned()
        }
        Range::Within(low, high)
            if matches!(unit, "" | "per unit") && (low..=high).contains(&(value / 100.0)) =>
        {
            format!("write {} if {value} percent is meant", value / 100.0)
        }
        Range::UpTo(high) if unit.starts_with("kV") && value > high && value / 1000.0 <= high => {
            format!("write {} if {value} V is meant", value / 1000.0)
        }
        _ if unit.starts_with('%') && value > 0.0 && spec.range.holds(value * 100.0) => {
            format!("write {} if {value} is meant as a fraction", (value * 1e10).round() / 1e8)
        }
        _ if unit.is_empty() => "check the value".to_owned(),
        _ => format!("check the value; the column is in {unit}"),
    }
}
