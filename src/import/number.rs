//! Numbers as people and spreadsheets write them. A number that can be read in two ways is an
//! error that shows both readings, never a guess.

/// What separates the columns, as far as it matters to numbers.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Marks {
    /// Commas separate columns: only a dot can be the decimal mark.
    Dot,
    /// Semicolons or tabs separate columns: a comma can be the decimal mark too.
    DotOrComma,
}

/// Whether a percent sign may follow.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum PercentSign {
    /// The column is in percent.
    Allowed,
    /// It is not.
    Refused,
}

/// Why a cell is not a number.
#[derive(Debug, Clone, PartialEq)]
pub(super) enum NumberFault {
    /// Not a number at all.
    NotNumber,
    /// Two readings: with the mark as decimal mark, and with the mark between groups of digits.
    Ambiguous {
        /// The mark taken as decimal mark.
        decimal: String,
        /// The mark taken as separator of thousands.
        thousands: String,
    },
    /// `1.234` in a file whose other numbers have a decimal comma.
    DotAmongCommas,
    /// A decimal comma where commas separate columns; the number with a dot.
    DecimalComma(String),
    /// Digits in groups; the number without.
    Grouped(String),
    /// A percent sign where the column is not in percent.
    Percent(f64),
    /// A number followed by letters.
    Unit(String),
    /// Not a number, infinity or too large.
    NotFinite,
    /// A hexadecimal number.
    Hexadecimal,
    /// A date, as spreadsheets make of `1-2`.
    Date,
}

/// True for the error values spreadsheets write, such as `#N/A`, `#REF!` or a row of `#`.
pub(super) fn is_spreadsheet_error(text: &str) -> bool {
    let Some(rest) = text.strip_prefix('#') else { return false };
    let rest = rest.to_ascii_uppercase();
    matches!(rest.as_str(), "N/A" | "N/V" | "NV" | "N/D" | "SPILL!" | "CALC!")
        || (rest.len() > 2 && rest.bytes().all(|b| b == b'#'))
        || (rest.len() > 2
            && rest.ends_with(['!', '?'])
            && rest.bytes().all(|b| b.is_ascii_uppercase() || matches!(b, b'/' | b'0' | b'!' | b'?')))
}

/// Reads a number from a trimmed, non-blank cell.
pub(super) fn parse(text: &str, marks: Marks, percent: PercentSign) -> Result<f64, NumberFault> {
    if text.bytes().all(|b| matches!(b, b'0'..=b'9' | b'.' | b'-' | b'+' | b'e' | b'E')) {
        return finite(text);
    }
    slow(text, marks, percent)
}

fn finite(plain: &str) -> Result<f64, NumberFault> {
    match plain.parse::<f64>() {
        Ok(value) if value.is_finite() => Ok(value),
        Ok(_) => Err(NumberFault::NotFinite),
        Err(_) if looks_like_date(plain) => Err(NumberFault::Date),
        Err(_) => Err(NumberFault::NotNumber),
    }
}

fn slow(text: &str, marks: Marks, percent: PercentSign) -> Result<f64, NumberFault> {
    let text: String = text.chars().map(plain_char).collect();
    let text = text.trim();
    let lower = text.to_ascii_lowercase();
    let unsigned = lower.trim_start_matches(['+', '-']);
    if matches!(unsigned, "nan" | "inf" | "infinity" | "∞") {
        return Err(NumberFault::NotFinite);
    }
    if unsigned.starts_with("0x") && unsigned.len() > 2 {
        return Err(NumberFault::Hexadecimal);
    }
    if let Some(body) = text.strip_suffix('%') {
        let value = with_marks(body.trim(), marks)?;
        return match percent {
            PercentSign::Allowed => Ok(value),
            PercentSign::Refused => Err(NumberFault::Percent(value)),
        };
    }
    with_marks(text, marks)
}

/// Typographic signs and spaces become those of the keyboard.
fn plain_char(c: char) -> char {
    match c {
        '\u{2212}' | '\u{2010}'..='\u{2013}' | '\u{fe63}' | '\u{ff0d}' => '-',
        '\u{2019}' => '\'',
        c if c.is_whitespace() => ' ',
        c => c,
    }
}

/// A number with decimal mark and perhaps groups of digits, its signs already plain.
fn with_marks(text: &str, marks: Marks) -> Result<f64, NumberFault> {
    let (mantissa, exponent) = match text.find(['e', 'E']) {
        Some(at) => text.split_at(at),
        None => (text, ""),
    };
    let sign_end = mantissa.len() - mantissa.trim_start_matches(['+', '-']).len();
    let (sign, digits) = mantissa.split_at(sign_end);
    let digits = digits.trim();
    if digits.is_empty() || !digits.chars().all(|c| c.is_ascii_digit() || matches!(c, '.' | ',' | ' ' | '\''))
    {
        return Err(not_number(text));
    }
    let rebuilt = |digits: &str| format!("{sign}{digits}{exponent}");
    let ungrouped = match without_group_spaces(digits) {
        Some(plain) => plain,
        None => return Err(not_number(text)),
    };
    let digits = ungrouped.as_str();
    let commas = digits.matches(',').count();
    let dots = digits.matches('.').count();
    match (commas, dots) {
        (0, _) => finite(&rebuilt(digits)),
        (1, 0) if is_group_of_three(digits, ',') => Err(NumberFault::Ambiguous {
            decimal: rebuilt(&digits.replace(',', ".")),
            thousands: rebuilt(&digits.replace(',', "")),
        }),
        (1, 0) => {
            let dotted = rebuilt(&digits.replace(',', "."));
            let value = finite(&dotted)?;
            if marks == Marks::DotOrComma { Ok(value) } else { Err(NumberFault::DecimalComma(dotted)) }
        }
        (1, 1) => Err(two_marks(digits, rebuilt)),
        (_, 0) => Err(NumberFault::Grouped(rebuilt(&digits.replace(',', "")))),
        _ => Err(not_number(text)),
    }
}

/// `1.234,5` and `1,234.5`: the later mark is the decimal mark for one reader, a slip for another.
fn two_marks(digits: &str, rebuilt: impl Fn(&str) -> String) -> NumberFault {
    let decimal_is_comma = digits.find('.') < digits.find(',');
    let (group, decimal) = if decimal_is_comma { ('.', ',') } else { (',', '.') };
    NumberFault::Ambiguous {
        thousands: rebuilt(&digits.replace(group, "").replace(decimal, ".")),
        decimal: rebuilt(&digits.replace(decimal, "").replace(group, ".")),
    }
}

/// True for one to three digits (not a lone 0), the mark, and exactly three digits.
pub(super) fn is_group_of_three(digits: &str, mark: char) -> bool {
    let digits = digits.trim_start_matches(['+', '-', '\u{2212}']);
    let Some((head, tail)) = digits.split_once(mark) else { return false };
    let all_digits = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
    (1..=3).contains(&head.len())
        && tail.len() == 3
        && all_digits(head)
        && all_digits(tail)
        && !head.starts_with('0')
}

/// Removes spaces or apostrophes between groups of three digits; `None` where the groups are not of three.
fn without_group_spaces(digits: &str) -> Option<String> {
    if !digits.contains([' ', '\'']) {
        return Some(digits.to_owned());
    }
    let whole_end = digits.find(['.', ',']).unwrap_or(digits.len());
    let (whole, rest) = digits.split_at(whole_end);
    let mut groups = whole.split([' ', '\'']);
    let first = groups.next()?;
    let good = (1..=3).contains(&first.len()) && groups.all(|g| g.len() == 3) && !rest.contains([' ', '\'']);
    good.then(|| digits.replace([' ', '\''], ""))
}

fn not_number(text: &str) -> NumberFault {
    if looks_like_date(text) {
        return NumberFault::Date;
    }
    let letters =
        text.trim_start_matches(|c: char| c.is_ascii_digit() || matches!(c, '.' | ',' | '+' | '-' | ' '));
    let unit = letters.len() < text.len()
        && letters.chars().count() <= 8
        && letters.starts_with(|c: char| c.is_alphabetic());
    if unit { NumberFault::Unit(letters.to_owned()) } else { NumberFault::NotNumber }
}

/// `03.04.2026`, `2026-04-03`, `3/4/26`, `03. Apr`, `3-Apr`.
pub(super) fn looks_like_date(text: &str) -> bool {
    const MONTHS: [&str; 16] = [
        "jan", "feb", "mar", "apr", "may", "jun", "jul", "aug", "sep", "oct", "nov", "dec", "mai", "okt",
        "dez", "mrz",
    ];
    let parts: Vec<&str> = text.split(['.', '-', '/', ' ']).filter(|p| !p.is_empty()).collect();
    let number = |p: &str| p.len() <= 4 && p.bytes().all(|b| b.is_ascii_digit());
    let month = |p: &str| {
        let lower = p.to_lowercase();
        lower.chars().all(char::is_alphabetic) && MONTHS.iter().any(|m| lower.starts_with(m))
    };
    let marked = text.contains(['.', '-', '/', ' ']);
    let numeric = parts.len() == 3 && parts.iter().all(|p| number(p)) && !text.starts_with(['-', '.']);
    let worded = (2..=3).contains(&parts.len())
        && parts.iter().filter(|p| month(p)).count() == 1
        && parts.iter().all(|p| number(p) || month(p));
    marked && (numeric || worded)
}

/// What the other cells of a file say about its decimal mark.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub(super) struct Evidence {
    /// A number such as `12,5` that only a decimal comma explains.
    pub(super) comma: bool,
    /// A number such as `12.5` that only a decimal dot explains.
    pub(super) dot: bool,
}

/// Looks through all cells of a file for numbers with one mark that cannot separate thousands.
pub(super) fn evidence(text: &str, separator: char) -> Evidence {
    let mut found = Evidence::default();
    for cell in text.split([separator, '\n', '\r']) {
        let cell = cell.trim_matches([' ', '"']).trim_start_matches(['-', '+', '\u{2212}']);
        for (mark, seen) in [(',', &mut found.comma), ('.', &mut found.dot)] {
            let Some((head, tail)) = cell.split_once(mark) else { continue };
            let all_digits = |s: &str| !s.is_empty() && s.bytes().all(|b| b.is_ascii_digit());
            *seen |= all_digits(head) && all_digits(tail) && !is_group_of_three(cell, mark);
        }
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    fn dot(text: &str) -> Result<f64, NumberFault> {
        parse(text, Marks::Dot, PercentSign::Refused)
    }

    fn comma(text: &str) -> Result<f64, NumberFault> {
        parse(text, Marks::DotOrComma, PercentSign::Allowed)
    }

    fn ambiguous(decimal: &str, thousands: &str) -> Result<f64, NumberFault> {
        Err(NumberFault::Ambiguous { decimal: decimal.into(), thousands: thousands.into() })
    }

    #[test]
    fn plain_numbers() {
        for (text, value) in
            [("12", 12.0), ("-0.5", -0.5), ("1E5", 1e5), (".5", 0.5), ("1.00E+05", 1e5), ("+3", 3.0)]
        {
            assert_eq!(dot(text), Ok(value), "{text}");
        }
    }

    #[test]
    fn typographic_numbers() {
        assert_eq!(dot("\u{2212}12.5"), Ok(-12.5));
        assert_eq!(dot("1\u{a0}234.5"), Ok(1234.5));
        assert_eq!(comma("1\u{202f}234,5"), Ok(1234.5));
        assert_eq!(dot("1'234"), Ok(1234.0));
        assert_eq!(dot("12 5"), Err(NumberFault::NotNumber));
        assert_eq!(comma("85 %"), Ok(85.0));
        assert_eq!(comma("85,5%"), Ok(85.5));
        assert_eq!(dot("85 %"), Err(NumberFault::Percent(85.0)));
    }

    #[test]
    fn decimal_commas() {
        assert_eq!(comma("12,5"), Ok(12.5));
        assert_eq!(comma("0,156"), Ok(0.156));
        assert_eq!(comma("1,2340"), Ok(1.234));
        assert_eq!(comma("1,5e3"), Ok(1500.0));
        assert_eq!(dot("12,5"), Err(NumberFault::DecimalComma("12.5".into())));
        assert_eq!(comma("1,234"), ambiguous("1.234", "1234"));
        assert_eq!(dot("-1,234"), ambiguous("-1.234", "-1234"));
        assert_eq!(comma("1.234,5"), ambiguous("1.2345", "1234.5"));
        assert_eq!(dot("1,234.5"), ambiguous("1.2345", "1234.5"));
        assert_eq!(dot("1,234,567"), Err(NumberFault::Grouped("1234567".into())));
    }

    #[test]
    fn what_is_no_number() {
        for text in ["nan", "NaN", "inf", "-Infinity", "1e999"] {
            assert_eq!(dot(text), Err(NumberFault::NotFinite), "{text}");
        }
        assert_eq!(dot("0x1F"), Err(NumberFault::Hexadecimal));
        assert_eq!(dot("12x"), Err(NumberFault::Unit("x".into())));
        assert_eq!(dot("12.5 km"), Err(NumberFault::Unit("km".into())));
        for text in ["1.2.3.4", "--5", "e5", "-", "x", "1-2", "½"] {
            assert_eq!(dot(text), Err(NumberFault::NotNumber), "{text}");
        }
        for text in ["03.04.2026", "2026-04-03", "3-Apr", "03. Apr", "3/4/26"] {
            assert_eq!(dot(text), Err(NumberFault::Date), "{text}");
        }
    }

    #[test]
    fn spreadsheet_errors() {
        for text in ["#N/A", "#REF!", "#VALUE!", "#DIV/0!", "#NAME?", "#####", "#BEZUG!", "#NV"] {
            assert!(is_spreadsheet_error(text), "{text}");
        }
        for text in ["#", "# N/A", "#1", "#a comment!", "N/A", "##"] {
            assert!(!is_spreadsheet_error(text), "{text}");
        }
    }

    #[test]
    fn a_file_tells_its_decimal_mark() {
        assert_eq!(evidence("a;1,234\nb;12,5", ';'), Evidence { comma: true, dot: false });
        assert_eq!(evidence("a;1,234\nb;1.234", ';'), Evidence::default());
        assert_eq!(evidence("a;0,156\nb;-0.5", ';'), Evidence { comma: true, dot: true });
    }
}
