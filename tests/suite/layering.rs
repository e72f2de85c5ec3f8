//! House rules as tests: who may name whom, where external crates live, files that open with what they hold.

use std::fs;
use std::path::{Path, PathBuf};

/// For each room, the rooms that it may name. `lib` and `main` are the front door.
const MAY_NAME: [(&str, &[&str]); 14] = [
    ("exact", &[]),
    ("source", &[]),
    ("diagnostic", &["source"]),
    ("syntax", &["source", "diagnostic", "exact"]),
    ("model", &["source", "exact"]),
    ("check", &["syntax", "model", "diagnostic", "exact", "source"]),
    ("scheme", &["exact", "model"]),
    ("discretize", &["model", "scheme", "exact", "diagnostic"]),
    ("analysis", &["scheme", "model", "exact"]),
    ("kernel", &["scheme", "model", "exact"]),
    ("emit", &["kernel", "exact"]),
    ("verify", &["emit", "kernel", "model", "exact"]),
    (
        "pipeline",
        &[
            "exact",
            "source",
            "diagnostic",
            "syntax",
            "model",
            "check",
            "scheme",
            "discretize",
            "analysis",
            "kernel",
            "emit",
            "verify",
        ],
    ),
    ("cli", &["pipeline", "diagnostic", "source", "syntax", "emit", "verify", "model"]),
];

/// Crates that have one home each: (crate, path prefixes under src).
const HOMES: [(&str, &[&str]); 5] = [
    ("pest", &["syntax/parse"]),
    ("tera", &["emit"]),
    ("nalgebra", &["analysis/spectrum"]),
    ("clap", &["cli"]),
    ("annotate_snippets", &["diagnostic/terminal"]),
];

fn sources() -> Vec<(PathBuf, String)> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut found = Vec::new();
    let mut open = vec![root.clone()];
    while let Some(folder) = open.pop() {
        for entry in fs::read_dir(&folder).expect("src is readable") {
            let path = entry.expect("src is readable").path();
            if path.is_dir() {
                open.push(path);
            } else if path.extension().is_some_and(|ending| ending == "rs") {
                let text = fs::read_to_string(&path).expect("sources are UTF-8");
                found.push((path.strip_prefix(&root).expect("below src").to_path_buf(), text));
            }
        }
    }
    assert!(found.len() > 30, "the walk found the sources");
    found
}

fn room(path: &Path) -> String {
    let first = path.iter().next().and_then(|part| part.to_str()).unwrap_or_default();
    first.trim_end_matches(".rs").to_owned()
}

/// The rooms that a text names as `crate::room`.
fn named(text: &str) -> Vec<String> {
    let code: String =
        text.lines().filter(|line| !line.trim_start().starts_with("//")).collect::<Vec<_>>().join("\n");
    code.match_indices("crate::")
        .filter(|(at, _)| !code[..*at].ends_with(|letter: char| letter.is_alphanumeric() || letter == '_'))
        .map(|(at, marker)| {
            code[at + marker.len()..].chars().take_while(|c| c.is_alphanumeric() || *c == '_').collect()
        })
        .collect()
}

#[test]
fn rooms_name_only_those_they_may() {
    let rooms: Vec<&str> = MAY_NAME.iter().map(|(name, _)| *name).collect();
    let mut faults = Vec::new();
    for (path, text) in sources() {
        let own = room(&path);
        let Some((_, allowed)) = MAY_NAME.iter().find(|(name, _)| *name == own) else { continue };
        for other in named(&text) {
            if rooms.contains(&other.as_str()) && other != own && !allowed.contains(&other.as_str()) {
                faults.push(format!("{} names {other}", path.display()));
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn external_crates_stay_at_home() {
    let mut faults = Vec::new();
    for (path, text) in sources() {
        let place = path.to_string_lossy().replace('\\', "/");
        for (name, homes) in HOMES {
            let used = text.lines().any(|line| {
                !line.trim_start().starts_with("//")
                    && (line.contains(&format!("{name}::")) || line.contains(&format!("use {name};")))
            });
            if used && !homes.iter().any(|home| place.starts_with(home)) {
                faults.push(format!("{place} uses {name}"));
            }
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn the_net_catches_what_it_should() {
    assert_eq!(named("use crate::model::Axis;\nlet x = crate::exact::Rational::zero();"), ["model", "exact"]);
    assert!(named("// crate::cli is not named here").is_empty());
}

#[test]
fn every_file_says_what_it_holds() {
    let silent: Vec<String> = sources()
        .into_iter()
        .filter(|(_, text)| !text.starts_with("//!"))
        .map(|(path, _)| path.display().to_string())
        .collect();
    assert!(silent.is_empty(), "no `//!` at the top of {}", silent.join(", "));
}

#[test]
fn files_stay_readable() {
    let long: Vec<String> = sources()
        .into_iter()
        .filter(|(_, text)| text.lines().count() > 700)
        .map(|(path, text)| format!("{}: {} lines", path.display(), text.lines().count()))
        .collect();
    assert!(long.is_empty(), "over 700 lines: {}", long.join(", "));
}
