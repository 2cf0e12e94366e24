//! Findings on the page: by rule, worst first, the first few of each.

use std::fmt::Write as _;

use anstyle::{AnsiColor, Style};

use super::Length;
use crate::output::table::{Colour, folded};
use crate::study::flow::{Finding, FindingSeverity, Rule};

/// Findings of one rule that are shown.
const SHOWN: usize = 5;

/// Writes the findings and after them the caution, if there is one.
pub(super) fn findings(text: &mut String, all: &[Finding], length: Length, colour: Colour) {
    let count = all.iter().filter(|f| f.rule != Rule::Caution).count();
    match count {
        0 => text.push_str("Findings: none, every limit of the study is kept.\n"),
        _ => {
            let _ = writeln!(text, "Findings: {count}");
        }
    }
    for group in all.chunk_by(|a, b| a.rule == b.rule) {
        let most = if length == Length::Full { group.len() } else { SHOWN };
        for finding in group.iter().take(most) {
            text.push_str(&shown(finding, colour));
        }
        if let Some(first) = group.first()
            && group.len() > most
        {
            let _ = writeln!(text, "  {}: and {} more (--all)", first.rule.text(), group.len() - most);
        }
    }
    text.push('\n');
}

/// One finding, folded to the width, its rule in colour.
fn shown(finding: &Finding, colour: Colour) -> String {
    if finding.rule == Rule::Caution {
        return folded("  ", &finding.text);
    }
    let rule = finding.rule.text();
    let lead = match finding.severity {
        FindingSeverity::Error => format!("error, {rule}:"),
        FindingSeverity::Warning | FindingSeverity::Note => format!("{rule}:"),
    };
    let plain = folded("  ", &format!("{lead} {}: {}", finding.place, finding.text));
    match plain.strip_prefix("  ").and_then(|rest| rest.strip_prefix(lead.as_str())) {
        Some(rest) if colour == Colour::Styled => {
            let style = style(finding.severity);
            format!("  {style}{lead}{style:#}{rest}")
        }
        _ => plain,
    }
}

fn style(severity: FindingSeverity) -> Style {
    match severity {
        FindingSeverity::Error => AnsiColor::Red.on_default().bold(),
        FindingSeverity::Warning => AnsiColor::Yellow.on_default(),
        FindingSeverity::Note => AnsiColor::Cyan.on_default(),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn finding(severity: FindingSeverity, rule: Rule, place: &str) -> Finding {
        Finding { severity, rule, place: place.into(), value: 1.0, limit: None, text: "so it is".into() }
    }

    fn page(all: &[Finding], length: Length, colour: Colour) -> String {
        let mut text = String::new();
        findings(&mut text, all, length, colour);
        text
    }

    #[test]
    fn a_rule_shows_its_first_few_and_counts_the_rest() {
        let low = |i: usize| finding(FindingSeverity::Warning, Rule::LowVoltage, &format!("node {i}, a"));
        let mut all: Vec<Finding> = (0..92).map(low).collect();
        all.push(finding(FindingSeverity::Note, Rule::NoEarth, "node D"));
        let short = page(&all, Length::Short, Colour::Plain);
        assert_eq!(short.lines().count(), 1 + 5 + 1 + 1 + 1, "{short}");
        assert!(short.contains("low voltage: and 87 more (--all)"), "{short}");
        assert!(
            short.starts_with("Findings: 93\n") && short.contains("no earth: node D: so it is"),
            "{short}"
        );
        let full = page(&all, Length::Full, Colour::Plain);
        assert!(full.contains("node 91, a") && !full.contains("more"), "{full}");
    }

    #[test]
    fn colour_adds_codes_and_takes_no_word_away() {
        let all = [
            finding(FindingSeverity::Error, Rule::Balance, "network"),
            finding(FindingSeverity::Warning, Rule::Overload, &"long name ".repeat(20)),
        ];
        let plain = page(&all, Length::Short, Colour::Plain);
        assert!(!plain.contains('\u{1b}') && plain.contains("error, power balance: network"), "{plain}");
        let styled = page(&all, Length::Short, Colour::Styled);
        assert!(styled.contains('\u{1b}'), "{styled}");
        assert_eq!(anstream::adapter::strip_str(&styled).to_string(), plain);
    }

    #[test]
    fn the_caution_is_no_finding() {
        let caution = [finding(FindingSeverity::Note, Rule::Caution, "network")];
        let text = page(&caution, Length::Short, Colour::Plain);
        assert_eq!(text, "Findings: none, every limit of the study is kept.\n  so it is\n\n");
    }
}
