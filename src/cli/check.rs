//! `fourwire check`.

use super::args::{Check, CheckFormat};
use super::{Outcome, Screen};
use crate::diagnostic::Diagnostics;
use crate::import::{Reading, read_folder};
use crate::network::{Network, build};
use crate::output::{diagnostics_lines, diagnostics_text, summary_text};
use crate::study::summary::summary;

/// A folder read and joined: the network where nothing is wrong, all remarks in the order of the files.
pub(super) struct Loaded {
    pub network: Option<Network>,
    pub diagnostics: Diagnostics,
    pub input_sha256: String,
}

/// At which time of the profiles a network is taken.
#[derive(Debug, Clone, Copy)]
pub(super) enum Time<'a> {
    /// This one.
    At(&'a str),
    /// None: loads at full value, with a warning where there are profiles.
    Full,
    /// None, and nothing is solved, so nothing is said.
    Unasked,
}

/// Reads a folder and builds its network, gathering the faults of both.
pub(super) fn load(folder: &std::path::Path, time: Time<'_>, screen: &mut Screen) -> Loaded {
    screen.doing("reading");
    let Reading { draft, mut diagnostics, input_sha256, .. } = read_folder(folder);
    let unreadable = draft.sources.files().is_empty();
    let mut network = None;
    if !unreadable {
        let timed = match time {
            Time::At(time) => draft.at_time(time, &mut diagnostics),
            Time::Full => {
                draft.warn_of_no_time(&mut diagnostics);
                None
            }
            Time::Unasked => None,
        };
        let built = build(timed.as_ref().unwrap_or(&draft));
        diagnostics.append(built.diagnostics);
        diagnostics.sort_by_place(&draft.sources);
        network = built.network.filter(|_| !diagnostics.has_errors());
    }
    Loaded { network, diagnostics, input_sha256 }
}

/// Reads and builds; tells what is wrong. The network and the hash of its files, where it can be solved.
pub(super) fn load_sound(
    folder: &std::path::Path,
    time: Time<'_>,
    screen: &mut Screen,
) -> Option<(Network, String)> {
    let loaded = load(folder, time, screen);
    if !loaded.diagnostics.items().is_empty() {
        let text = diagnostics_text(&loaded.diagnostics, screen.colour_on_stderr());
        screen.tell(&text);
    }
    if loaded.network.is_none() {
        screen.tell(&verdict(&loaded.diagnostics));
    }
    Some((loaded.network?, loaded.input_sha256))
}

/// Prints faults and a summary of what was read.
pub(super) fn check(options: &Check, screen: &mut Screen) -> Outcome {
    let loaded = load(&options.folder, Time::Unasked, screen);
    let summary = loaded.network.as_ref().map(summary);
    match options.format {
        CheckFormat::Lines => {
            screen.print(&diagnostics_lines(&loaded.diagnostics));
            if loaded.diagnostics.items().is_empty() {
                screen.tell(&verdict(&loaded.diagnostics));
            }
        }
        CheckFormat::Json => {
            let object = serde_json::json!({
                "fourwire": env!("CARGO_PKG_VERSION"),
                "input_sha256": loaded.input_sha256,
                "diagnostics": loaded.diagnostics.items(),
                "summary": summary,
            });
            screen.print(&format!("{object:#}\n"));
        }
        CheckFormat::Text => {
            let mut text = diagnostics_text(&loaded.diagnostics, screen.colour_on_stdout());
            if let Some(summary) = &summary {
                text.push_str(&summary_text(summary));
            }
            text.push_str(&verdict(&loaded.diagnostics));
            screen.print(&text);
        }
    }
    if loaded.diagnostics.has_errors() { Outcome::WrongInput } else { Outcome::Done }
}

/// The last line: how many faults.
pub(super) fn verdict(diagnostics: &Diagnostics) -> String {
    let counted = |n: usize, one: &str| format!("{n} {one}{}", if n == 1 { "" } else { "s" });
    match diagnostics.counts() {
        (0, 0) => "Nothing wrong found.\n".to_string(),
        (0, warnings) => format!("No errors, {}.\n", counted(warnings, "warning")),
        (errors, 0) => format!("{}; nothing was solved or written.\n", counted(errors, "error")),
        (errors, warnings) => {
            format!(
                "{} and {}; nothing was solved or written.\n",
                counted(errors, "error"),
                counted(warnings, "warning")
            )
        }
    }
}
