//! Lengths and places as typed on the command line.

use crate::units::{METRES_PER_FOOT, METRES_PER_KILOFOOT, METRES_PER_KILOMETRE, METRES_PER_MILE};

/// A message and how to mend it.
pub(super) type Fault = (String, String);
/// Slot of a conductor, and its place across and height, metres.
pub(super) type Place = (usize, [f64; 2]);

/// A length with its unit: `150ft`, `60 m`, `1.2km`, `0.5 mi`, `2kft`; metres.
pub(super) fn parse_length(text: &str) -> Result<f64, Fault> {
    let trimmed = text.trim().to_lowercase();
    let split = trimmed.find(|c: char| c.is_alphabetic()).unwrap_or(trimmed.len());
    let (digits, unit) = trimmed.split_at(split);
    let metres = match unit {
        "m" => 1.0,
        "km" => METRES_PER_KILOMETRE,
        "ft" => METRES_PER_FOOT,
        "kft" => METRES_PER_KILOFOOT,
        "mi" => METRES_PER_MILE,
        _ => {
            return Err((
                format!("{text:?} is no length"),
                "write a number and its unit (m, km, ft, kft or mi), such as 150ft".into(),
            ));
        }
    };
    match digits.trim().parse::<f64>() {
        Ok(number) if number.is_finite() => Ok(number * metres),
        _ => Err((
            format!("{text:?} is no length"),
            "write a number and its unit, such as 150ft or 60m".into(),
        )),
    }
}

/// Places such as `a 0 9.2, b 0.9 9.2, n 1.3 7.9 m` (or `ft` at the end): slot, across and height in metres.
pub(super) fn parse_spacing(text: &str) -> Result<Vec<Place>, Fault> {
    let cure = || {
        "write conductor, place across and height for each, such as \"a 0 29, b 2.5 29, n 4 25 ft\""
            .to_string()
    };
    let trimmed = text.trim().to_lowercase();
    let (body, metres) = match (trimmed.strip_suffix("ft"), trimmed.strip_suffix('m')) {
        (Some(body), _) => (body, METRES_PER_FOOT),
        (None, Some(body)) => (body, 1.0),
        (None, None) => {
            return Err((
                format!("the spacing {text:?} does not say its unit"),
                "end it with m or ft".into(),
            ));
        }
    };
    let mut places = Vec::new();
    for part in body.split(',') {
        let words: Vec<&str> = part.split_whitespace().collect();
        let [letter, x, y] = words.as_slice() else {
            return Err((format!("{:?} is no place of a conductor", part.trim()), cure()));
        };
        let slot = if letter.len() == 1 { "abcn".find(letter) } else { None };
        let (Some(slot), Ok(x), Ok(y)) = (slot, x.parse::<f64>(), y.parse::<f64>()) else {
            return Err((format!("{:?} is no place of a conductor", part.trim()), cure()));
        };
        if places.iter().any(|(s, _)| *s == slot) {
            return Err((format!("conductor {letter} has two places"), cure()));
        }
        places.push((slot, [x * metres, y * metres]));
    }
    Ok(places)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lengths_need_their_unit() {
        assert_eq!(parse_length("60 m"), Ok(60.0));
        assert_eq!(parse_length("0.5km"), Ok(500.0));
        assert!((parse_length("100ft").unwrap() - 30.48).abs() < 1e-12);
        for text in ["60", "m", "6o m", "", "5 miles", "nanm"] {
            assert!(parse_length(text).is_err(), "{text}");
        }
    }

    #[test]
    fn spacings_read() {
        let places = parse_spacing("a 0 29, b 2.5 29,n 4 25 ft").unwrap();
        assert_eq!(places.len(), 3);
        assert!((places[1].1[0] - 0.762).abs() < 1e-12 && places[2].0 == 3);
        for text in ["a 0 29", "a 0, b 1 m", "a 0 1, a 1 1 m", "x 0 1 m", "ab 0 1 m", ""] {
            assert!(parse_spacing(text).is_err(), "{text}");
        }
    }
}
