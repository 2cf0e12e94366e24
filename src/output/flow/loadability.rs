//! How far the loads can grow, in words.

use crate::output::table::folded;
use crate::study::loadability::Loadability;

/// The limit in words; where the study lets constant power end at a floor, that it does not here.
pub fn loadability_text(found: &Loadability, floor_percent: f64) -> String {
    let mut text = match found.factor {
        None => format!(
            "Loadability: all loads can grow to {} times and beyond; growth further than that was not tried.",
            found.solved_factor
        ),
        Some(factor) if factor <= 1e-5 => "Loadability: no share of the loads can be fed.".to_string(),
        Some(factor) => {
            let (word, then) = if factor < 1.0 {
                (format!("only {:.1} % of the loads can be fed", 100.0 * factor), "beyond that")
            } else {
                (format!("all loads can grow to {factor:.3} times"), "then")
            };
            match (&found.weakest_node, found.weakest_pu) {
                (Some(node), Some(pu)) => {
                    format!("Loadability: {word}; {then} node {node} gives way, at {pu:.3} pu.")
                }
                _ => format!("Loadability: {word}."),
            }
        }
    };
    if floor_percent > 0.0 {
        text.push_str(&format!(
            " Here constant power stays constant at any voltage: the floor of {floor_percent} % that eases loads on the page of results is left out, so a limit below 1 and a page with results may both be right."
        ));
    }
    folded("", &text)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn found(factor: Option<f64>) -> Loadability {
        Loadability { factor, solved_factor: 512.0, weakest_node: Some("Z".into()), weakest_pu: Some(0.5) }
    }

    #[test]
    fn words_fit_the_factor() {
        let grows = loadability_text(&found(Some(2.0)), 0.0);
        assert_eq!(
            grows,
            "Loadability: all loads can grow to 2.000 times; then node Z gives way, at 0.500 pu.\n"
        );
        let shrinks = loadability_text(&found(Some(0.54)), 70.0);
        assert!(
            shrinks.contains("only 54.0 % of the loads can be fed") && !shrinks.contains("grow"),
            "{shrinks}"
        );
        assert!(shrinks.contains("floor of 70 %"), "{shrinks}");
        assert!(loadability_text(&found(Some(0.0)), 0.0).contains("no share of the loads"));
        assert!(loadability_text(&found(None), 0.0).contains("512 times and beyond"));
    }
}
