//! Modules depend one way. Reads every `use crate::` of `src` and refuses a wrong direction.

use std::collections::HashMap;
use std::fs;
use std::path::{Path, PathBuf};

/// What each module may use, besides itself.
fn allowed() -> HashMap<&'static str, &'static [&'static str]> {
    let below_import: &[&str] =
        &["math", "units", "diagnostic", "catalog", "impedance", "machine", "network"];
    HashMap::from([
        ("math", &["units"] as &[&str]),
        ("units", &[]),
        ("diagnostic", &[]),
        ("catalog", &["math", "units"]),
        ("impedance", &["catalog", "math", "units"]),
        ("machine", &["math", "units", "catalog", "diagnostic"]),
        ("network", &["math", "units", "diagnostic", "machine"]),
        ("import", below_import),
        ("solver", &["math", "units", "machine", "network"]),
        ("study", &["math", "units", "diagnostic", "catalog", "impedance", "machine", "network", "solver"]),
        (
            "output",
            &["math", "units", "diagnostic", "catalog", "impedance", "machine", "network", "solver", "study"],
        ),
        (
            "cli",
            &[
                "math",
                "units",
                "diagnostic",
                "catalog",
                "impedance",
                "machine",
                "network",
                "import",
                "solver",
                "study",
                "output",
            ],
        ),
    ])
}

fn rust_files(folder: &Path, found: &mut Vec<PathBuf>) {
    for entry in fs::read_dir(folder).expect("src can be read") {
        let path = entry.expect("entry can be read").path();
        if path.is_dir() {
            rust_files(&path, found);
        } else if path.extension().is_some_and(|e| e == "rs") {
            found.push(path);
        }
    }
}

/// Names of the top-level modules that a line of code uses by `crate::`.
fn used(line: &str) -> Vec<String> {
    line.split("crate::")
        .skip(1)
        .map(|rest| rest.chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect())
        .collect()
}

#[test]
fn modules_depend_one_way() {
    let src = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let allowed = allowed();
    let mut files = Vec::new();
    rust_files(&src, &mut files);
    assert!(files.len() > 30, "only {} files found", files.len());
    let mut wrong = Vec::new();
    for file in files {
        let relative = file.strip_prefix(&src).expect("file is in src");
        let first = relative.components().next().and_then(|c| c.as_os_str().to_str()).expect("a name");
        let module = first.trim_end_matches(".rs");
        let Some(may) = allowed.get(module) else { continue };
        let text = fs::read_to_string(&file).expect("file can be read");
        for (number, line) in text.lines().enumerate() {
            if line.trim_start().starts_with("//") {
                continue;
            }
            for other in used(line).iter().filter(|m| allowed.contains_key(m.as_str())) {
                if other != module && !may.contains(&other.as_str()) {
                    wrong.push(format!(
                        "{}:{}: {module} must not use {other}",
                        relative.display(),
                        number + 1
                    ));
                }
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn the_reader_of_lines_sees_a_use() {
    assert_eq!(used("use crate::network::{Network}; crate::math::ZERO"), ["network", "math"]);
}
