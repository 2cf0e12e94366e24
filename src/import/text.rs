//! From the bytes of a file to text: byte-order marks, UTF-16 and the Windows code page that
//! spreadsheets still write.

use std::sync::Arc;

/// Why the bytes of a file are not text.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum EncodingFault {
    /// A zipped workbook under the name of a CSV file.
    Workbook,
    /// Control bytes no text file holds.
    Binary,
    /// UTF-16 with broken pairs.
    BrokenUtf16,
    /// Longer than positions in it can be counted.
    TooLong,
}

impl EncodingFault {
    /// Message and cure.
    pub(super) fn explain(self) -> (&'static str, &'static str) {
        match self {
            EncodingFault::Workbook => (
                "this is a spreadsheet workbook under the name of a CSV file",
                "open it in the spreadsheet and save it as CSV (UTF-8)",
            ),
            EncodingFault::Binary => (
                "the file holds bytes that are not text",
                "save it again as CSV (UTF-8) from the spreadsheet, or restore it from a good copy",
            ),
            EncodingFault::BrokenUtf16 => {
                ("the file begins as UTF-16 text but is damaged further on", "save it again as CSV (UTF-8)")
            }
            EncodingFault::TooLong => ("the file is longer than 4 GB", "split the network"),
        }
    }
}

/// Decodes a file: UTF-8 with or without byte-order mark, UTF-16, else Windows-1252.
pub(super) fn decode(bytes: &[u8]) -> Result<Arc<str>, EncodingFault> {
    if u32::try_from(bytes.len()).is_err() {
        return Err(EncodingFault::TooLong);
    }
    if bytes.starts_with(b"PK\x03\x04") || bytes.starts_with(&[0xD0, 0xCF, 0x11, 0xE0]) {
        return Err(EncodingFault::Workbook);
    }
    if let Some((encoding, mark)) = utf16(bytes) {
        let body = bytes.get(mark..).unwrap_or_default();
        let text = encoding
            .decode_without_bom_handling_and_without_replacement(body)
            .ok_or(EncodingFault::BrokenUtf16)?;
        return if text.contains('\0') { Err(EncodingFault::Binary) } else { Ok(text.into()) };
    }
    let body = bytes.strip_prefix(b"\xEF\xBB\xBF").unwrap_or(bytes);
    if body.contains(&0) {
        return Err(EncodingFault::Binary);
    }
    if let Ok(text) = std::str::from_utf8(body) {
        return Ok(text.into());
    }
    let control = |b: &u8| *b < 0x20 && !matches!(b, b'\t' | b'\n' | b'\r' | 0x0B | 0x0C);
    if body.iter().any(control) {
        return Err(EncodingFault::Binary);
    }
    Ok(encoding_rs::WINDOWS_1252.decode_without_bom_handling(body).0.into())
}

/// The kind of UTF-16, by its mark or by the zero bytes of its first letters, and the length of the mark.
fn utf16(bytes: &[u8]) -> Option<(&'static encoding_rs::Encoding, usize)> {
    match bytes {
        [0xFF, 0xFE, ..] => Some((encoding_rs::UTF_16LE, 2)),
        [0xFE, 0xFF, ..] => Some((encoding_rs::UTF_16BE, 2)),
        [1..=0x7F, 0, 1..=0x7F, 0, ..] => Some((encoding_rs::UTF_16LE, 0)),
        [0, 1..=0x7F, 0, 1..=0x7F, ..] => Some((encoding_rs::UTF_16BE, 0)),
        _ => None,
    }
}

/// White space at the ends of a cell: also no-break and zero-width spaces, and a stray byte-order mark.
pub(super) fn trim(text: &str) -> &str {
    let bytes = text.as_bytes();
    let plain = |b: Option<&u8>| b.is_none_or(|b| b.is_ascii_graphic());
    if plain(bytes.first()) && plain(bytes.last()) {
        return text;
    }
    text.trim_matches(|c: char| {
        c.is_whitespace() || matches!(c, '\u{feff}' | '\u{200b}' | '\u{200e}' | '\u{2060}')
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    fn utf16_bytes(text: &str, big: bool) -> Vec<u8> {
        text.encode_utf16().flat_map(|u| if big { u.to_be_bytes() } else { u.to_le_bytes() }).collect()
    }

    #[test]
    fn encodings_give_the_same_text() {
        let wanted = "node,x\nSüd,1\n";
        let with_mark = |mark: &[u8], body: Vec<u8>| [mark.to_vec(), body].concat();
        for bytes in [
            wanted.as_bytes().to_vec(),
            with_mark(b"\xEF\xBB\xBF", wanted.as_bytes().to_vec()),
            with_mark(&[0xFF, 0xFE], utf16_bytes(wanted, false)),
            with_mark(&[0xFE, 0xFF], utf16_bytes(wanted, true)),
            utf16_bytes(wanted, false),
            utf16_bytes(wanted, true),
            b"node,x\nS\xFCd,1\n".to_vec(),
        ] {
            assert_eq!(decode(&bytes).as_deref(), Ok(wanted));
        }
    }

    #[test]
    fn what_is_no_text_is_refused() {
        assert_eq!(decode(b"PK\x03\x04rest"), Err(EncodingFault::Workbook));
        assert_eq!(decode(b"node\0,x"), Err(EncodingFault::Binary));
        assert_eq!(decode(b"\xFCnode\x01,x"), Err(EncodingFault::Binary));
        assert_eq!(decode(&[0xFF, 0xFE, 0x00, 0xD8, 0x41, 0x00]), Err(EncodingFault::BrokenUtf16));
        assert_eq!(decode(b"").as_deref(), Ok(""));
    }

    #[test]
    fn hidden_spaces_are_trimmed() {
        assert_eq!(trim("\u{a0}650 \u{200b}"), "650");
        assert_eq!(trim("Pump house"), "Pump house");
        assert_eq!(trim(" \t"), "");
        assert_eq!(trim(""), "");
    }
}
