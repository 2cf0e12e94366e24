//! CSV writing: text guarded against being taken for a formula, numbers in full.

use std::borrow::Cow;

/// Text of a cell that no spreadsheet takes for a formula: one that begins with `=`, `+`, `-`,
/// `@`, a tab or a line end gets an apostrophe in front.
pub fn guarded(text: &str) -> Cow<'_, str> {
    if text.starts_with(['=', '+', '-', '@', '\t', '\r', '\n']) {
        Cow::Owned(format!("'{text}"))
    } else {
        Cow::Borrowed(text)
    }
}

/// Field of a CSV row.
pub(super) enum Field<'a> {
    Text(&'a str),
    Number(f64),
    Missing,
    Flag(bool),
    Whole(i64),
}

impl From<Option<f64>> for Field<'_> {
    fn from(value: Option<f64>) -> Self {
        value.map_or(Field::Missing, Field::Number)
    }
}

/// Writes one row; numbers in the shortest form that reads back the same.
pub(super) fn write_row<W: std::io::Write>(writer: &mut csv::Writer<W>, fields: &[Field]) -> csv::Result<()> {
    use std::io::Write as _;
    let mut buffer = [0u8; 40];
    for field in fields {
        match field {
            Field::Text(text) => writer.write_field(guarded(text).as_bytes())?,
            Field::Missing => writer.write_field("")?,
            Field::Flag(flag) => writer.write_field(if *flag { "true" } else { "false" })?,
            Field::Number(value) => {
                let mut rest = &mut buffer[..];
                let written = match write!(rest, "{value}") {
                    Ok(()) => 40 - rest.len(),
                    Err(_) => {
                        // Very small and very large numbers are long without an exponent.
                        let mut rest = &mut buffer[..];
                        write!(rest, "{value:e}")?;
                        40 - rest.len()
                    }
                };
                writer.write_field(&buffer[..written])?;
            }
            Field::Whole(value) => writer.write_field(value.to_string())?,
        }
    }
    writer.write_record(None::<&[u8]>)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn formulas_are_guarded_and_numbers_are_not() {
        let mut writer = csv::Writer::from_writer(Vec::new());
        let fields = [
            Field::Text("=1+2"),
            Field::Text("pump, east"),
            Field::Number(-1.5),
            Field::Number(1e-60),
            Field::Missing,
        ];
        write_row(&mut writer, &fields).unwrap();
        let text = String::from_utf8(writer.into_inner().unwrap()).unwrap();
        assert_eq!(text, "'=1+2,\"pump, east\",-1.5,1e-60,\n");
    }
}
