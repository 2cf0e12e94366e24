//! All files of a network folder together.

use std::fs;
use std::path::Path;

use sha2::{Digest, Sha256};

use super::constructions::DescribedConstruction;
use super::text::decode;
use super::{
    Intake, Reading, capacitors, constructions, curves, generators, lines, loads, matrices, meters, motors,
    nodes, place_of_file, profiles, regulators, source, study, switches, transformers,
};
use crate::catalog::Catalog;
use crate::diagnostic::{Code, Diagnostics, FileId, SourceFile, nearest};
use crate::network::Draft;

/// Files of the format, in the order they are read and reported.
const KNOWN: [&str; 18] = [
    "study.csv",
    "source.csv",
    "nodes.csv",
    "conductors.csv",
    "spacings.csv",
    "constructions.csv",
    "matrices.csv",
    "lines.csv",
    "switches.csv",
    "transformers.csv",
    "regulators.csv",
    "loads.csv",
    "capacitors.csv",
    "motors.csv",
    "profiles.csv",
    "meters.csv",
    "generators.csv",
    "curves.csv",
];

/// Endings of files people save instead of CSV.
const OTHER_ENDINGS: [&str; 6] = ["xlsx", "xls", "ods", "txt", "tsv", "csv.txt"];

/// Reads every file of a network folder.
///
/// Files that are not CSV are left alone, as are hidden files and the lock files of spreadsheets.
pub fn read_folder(folder: &Path) -> Reading {
    let mut diagnostics = Diagnostics::new();
    let (files, others) = match list_folder(folder, &mut diagnostics) {
        Ok(listed) => listed,
        Err((message, cure)) => {
            diagnostics.error(Code::FolderUnreadable, None, message, cure);
            return Reading {
                draft: Draft::default(),
                diagnostics,
                input_sha256: hash(&[]),
                described: Vec::new(),
                catalog: Catalog::built_in().clone(),
            };
        }
    };
    let none = files.is_empty() && diagnostics.items().is_empty();
    let within = if none { networks_within(folder) } else { Vec::new() };
    if !within.is_empty() {
        let message =
            format!("the folder `{}` holds no CSV file, only folders of networks", folder.display());
        let cure = format!("name one of them: {}", within.join(", "));
        diagnostics.error(Code::MissingFile, None, message, cure);
    }
    read(files, &others, diagnostics)
}

/// Folders within a folder that hold a `source.csv`, by name, the first few.
fn networks_within(folder: &Path) -> Vec<String> {
    let Ok(entries) = fs::read_dir(folder) else { return Vec::new() };
    let mut found: Vec<String> = entries
        .filter_map(Result::ok)
        .filter(|e| e.path().join("source.csv").is_file())
        .map(|e| e.path().display().to_string())
        .collect();
    found.sort_unstable();
    found.truncate(10);
    found
}

/// Reads files given as name and bytes, as [`read_folder`] does those of a folder.
pub fn read_files(files: Vec<(String, Vec<u8>)>) -> Reading {
    read(files, &[], Diagnostics::new())
}

type Listed = (Vec<(String, Vec<u8>)>, Vec<String>);

fn list_folder(folder: &Path, diagnostics: &mut Diagnostics) -> Result<Listed, (String, String)> {
    let shown = folder.display();
    if folder.is_file() {
        let cure = "name the folder that holds the CSV files, not a file in it";
        return Err((format!("`{shown}` is a file, not a folder"), cure.to_owned()));
    }
    let entries = fs::read_dir(folder).map_err(|e| {
        let cure = "check the path, and that you may read the folder";
        (format!("the folder `{shown}` cannot be read: {e}"), cure.to_owned())
    })?;
    let (mut files, mut others) = (Vec::new(), Vec::new());
    for entry in entries {
        let entry = entry.map_err(|e| {
            let cure = "check that you may read the folder, then try again";
            (format!("the folder `{shown}` cannot be listed: {e}"), cure.to_owned())
        })?;
        let name = entry.file_name().to_string_lossy().into_owned();
        if name.starts_with(['.', '~']) || entry.path().is_dir() {
            continue;
        }
        if !is_csv(&name) {
            others.push(name);
            continue;
        }
        match fs::read(entry.path()) {
            Ok(bytes) => files.push((name, bytes)),
            Err(e) => {
                let cure = "close it in other programs, and check that you may read it";
                let message = format!("the file cannot be read: {e}");
                diagnostics.error(Code::FileUnreadable, Some(place_of_file(&name)), message, cure);
            }
        }
    }
    Ok((files, others))
}

fn is_csv(name: &str) -> bool {
    name.to_ascii_lowercase().ends_with(".csv")
}

fn read(mut files: Vec<(String, Vec<u8>)>, others: &[String], diagnostics: Diagnostics) -> Reading {
    files.sort();
    let mut intake = Intake { diagnostics, ..Intake::default() };
    let known = sort_out(files, others, &mut intake.diagnostics);
    if !known.iter().any(|(i, ..)| KNOWN.get(*i) == Some(&"source.csv")) {
        intake.unread.supply = true;
    }
    // A file of a name that is nearly right was told; what it holds is missed in vain.
    let near: Vec<&str> =
        intake.diagnostics.items().iter().filter_map(|d| nearest(&d.place.as_ref()?.file, KNOWN)).collect();
    for name in near.into_iter().filter(|n| !known.iter().any(|(i, ..)| KNOWN.get(*i) == Some(n))) {
        intake.lose(name);
    }
    let input_sha256 = hash(&known);
    let (draft, described, catalog) = fill(&mut intake, known);
    let Intake { mut diagnostics, nodes, .. } = intake;
    nodes.warn_of_similar(&draft.sources, &mut diagnostics);
    diagnostics.sort_by_place(&draft.sources);
    Reading { draft, diagnostics, input_sha256, described, catalog }
}

/// Known files by their index in [`KNOWN`]; reports the others, and what is missing.
fn sort_out(
    files: Vec<(String, Vec<u8>)>,
    others: &[String],
    diagnostics: &mut Diagnostics,
) -> Vec<(usize, String, Vec<u8>)> {
    let none = files.is_empty() && diagnostics.items().is_empty();
    let mut known: Vec<(usize, String, Vec<u8>)> = Vec::new();
    for (name, bytes) in files {
        let lower = name.to_lowercase();
        match KNOWN.iter().position(|k| *k == lower) {
            None => unknown_file(&name, diagnostics),
            Some(index) => match known.iter().find(|(i, ..)| *i == index) {
                Some((_, first, _)) => {
                    let message = format!("the folder holds both `{first}` and `{name}`");
                    let cure = "keep one of the two";
                    diagnostics.error(Code::DuplicateName, Some(place_of_file(&name)), message, cure);
                }
                None => known.push((index, name, bytes)),
            },
        }
    }
    known.sort_by_key(|(index, ..)| *index);
    for other in others {
        other_ending(other, &known, diagnostics);
    }
    // Unreadable or misspelt: that was said already.
    let unread = |d: &crate::diagnostic::Diagnostic| {
        d.place.as_ref().is_some_and(|p| nearest(&p.file, KNOWN) == Some("source.csv"))
    };
    let told = diagnostics.items().iter().any(|d| d.code == Code::MissingFile);
    if !known.iter().any(|(i, ..)| KNOWN.get(*i) == Some(&"source.csv"))
        && !told
        && !diagnostics.items().iter().any(unread)
    {
        let (message, cure) = if none {
            ("the folder holds no CSV file", "name the folder of a network; it needs at least a source.csv")
        } else {
            (
                "the folder has no source.csv, so nothing feeds the network",
                "add a source.csv with the columns `node` and `kv` and one row: the node fed and its nominal line-to-line voltage",
            )
        };
        diagnostics.error(Code::MissingFile, None, message, cure);
    }
    known
}

fn unknown_file(name: &str, diagnostics: &mut Diagnostics) {
    let (message, cure) = match nearest(name, KNOWN) {
        Some(near) => (
            format!("the format has no file `{name}`"),
            format!("did you mean `{near}`? Rename it, or take it out of the folder"),
        ),
        None => (
            format!("the format has no file `{name}`"),
            format!("take it out of the folder; the files of a network are {}", KNOWN.join(", ")),
        ),
    };
    diagnostics.error(Code::UnknownFile, Some(place_of_file(name)), message, cure);
}

/// `lines.xlsx` without a `lines.csv` is most likely meant to be read.
fn other_ending(name: &str, known: &[(usize, String, Vec<u8>)], diagnostics: &mut Diagnostics) {
    let lower = name.to_lowercase();
    let Some((stem, ending)) = lower.split_once('.') else { return };
    let meant = KNOWN.iter().position(|k| k.strip_suffix(".csv") == Some(stem));
    let Some(meant) =
        meant.filter(|m| OTHER_ENDINGS.contains(&ending) && !known.iter().any(|(i, ..)| i == m))
    else {
        return;
    };
    let wanted = KNOWN.get(meant).copied().unwrap_or_default();
    let message = format!("`{name}` is not read, and there is no `{wanted}`");
    let cure = format!("save it as `{wanted}` (CSV, UTF-8), or take it out of the folder");
    diagnostics.warning(Code::UnknownFile, Some(place_of_file(name)), message, cure);
}

/// SHA-256 over name, length and bytes of each file, in the order of the names.
fn hash(known: &[(usize, String, Vec<u8>)]) -> String {
    let mut sorted: Vec<_> =
        known.iter().filter_map(|(index, _, bytes)| KNOWN.get(*index).map(|name| (*name, bytes))).collect();
    sorted.sort();
    let mut hasher = Sha256::new();
    for (name, bytes) in sorted {
        hasher.update(name.as_bytes());
        hasher.update((bytes.len() as u64).to_le_bytes());
        hasher.update(bytes);
    }
    hasher.finalize().iter().map(|byte| format!("{byte:02x}")).collect()
}

fn fill(
    intake: &mut Intake,
    known: Vec<(usize, String, Vec<u8>)>,
) -> (Draft, Vec<DescribedConstruction>, Catalog) {
    let mut ids: [Option<FileId>; KNOWN.len()] = [None; KNOWN.len()];
    for (index, name, bytes) in known {
        match decode(&bytes) {
            Ok(text) => {
                let id = intake.sources.add(SourceFile { name, columns: Vec::new(), text });
                if let Some(slot) = ids.get_mut(index) {
                    *slot = Some(id);
                }
            }
            Err(fault) => {
                let (message, cure) = fault.explain();
                intake.sources.add(SourceFile { name: name.clone(), ..SourceFile::default() });
                intake.diagnostics.error(Code::BadEncoding, Some(place_of_file(&name)), message, cure);
                intake.lose(KNOWN.get(index).copied().unwrap_or_default());
            }
        }
    }
    let [study, source, nodes, conductors, spacings, constructions, matrices, rest @ ..] = ids;
    let [
        lines,
        switches,
        transformers,
        regulators,
        loads,
        capacitors,
        motor_file,
        profile_file,
        meters,
        others @ ..,
    ] = rest;
    let [generators, curves] = others;
    let mut draft = Draft {
        study: with(intake, study, study::read),
        supplies: with(intake, source, source::read),
        nodes: with(intake, nodes, nodes::read),
        ..Draft::default()
    };
    let described = constructions::read(intake, constructions, conductors, spacings);
    draft.constructions = with(intake, matrices, matrices::read);
    draft.lines = with(intake, lines, lines::read);
    let computed = described.compute(intake, &draft.study, &draft.lines, &draft.constructions);
    draft.constructions.extend(computed.constructions);
    draft.switches = with(intake, switches, switches::read);
    draft.transformers = with(intake, transformers, transformers::read);
    draft.regulators = with(intake, regulators, regulators::read);
    let before = intake.diagnostics.counts().0;
    (draft.loads, draft.shares) = with(intake, loads, loads::read);
    draft.meters = with(intake, meters, meters::read);
    draft.metering_faulty = intake.diagnostics.counts().0 > before;
    draft.capacitors = with(intake, capacitors, capacitors::read);
    draft.generators = with(intake, generators, generators::read);
    draft.curves = with(intake, curves, curves::read);
    let frequency_hz = draft.study.frequency_hz;
    draft.motors = motor_file.map(|id| motors::read(intake, id, frequency_hz)).unwrap_or_default();
    draft.profiles = with(intake, profile_file, profiles::read);
    draft.sources = std::mem::take(&mut intake.sources);
    draft.unread = std::mem::take(&mut intake.unread);
    (draft, computed.described, computed.catalog)
}

/// Reads a file with its reader; what an absent file gives is the default.
fn with<T: Default>(intake: &mut Intake, file: Option<FileId>, reader: fn(&mut Intake, FileId) -> T) -> T {
    file.map(|id| reader(intake, id)).unwrap_or_default()
}
