//! Conditions that do not fit and models that are traps: each file says which codes must appear, and exactly those do.

use std::fs;
use std::path::{Path, PathBuf};

use rimstone::diagnostic::codes_conditions;
use rimstone::pipeline;

fn files() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/models/traps");
    let mut found: Vec<PathBuf> =
        fs::read_dir(folder).expect("traps").map(|entry| entry.expect("readable").path()).collect();
    found.sort();
    found
}

fn expected(text: &str) -> Vec<String> {
    text.lines()
        .filter_map(|line| line.strip_prefix("# expect: "))
        .map(|code| code.trim().to_owned())
        .collect()
}

#[test]
fn each_trap_is_seen_and_nothing_else() {
    let mut faults = Vec::new();
    for path in files() {
        let source = pipeline::read(&path).expect("readable");
        let wanted = expected(source.text());
        assert!(!wanted.is_empty(), "{} expects nothing", path.display());
        let checked = pipeline::check(&source);
        let mut found: Vec<String> =
            checked.diagnostics.iter().map(|one| one.code.as_str().to_owned()).collect();
        let mut sorted = wanted.clone();
        sorted.sort();
        found.sort();
        if found != sorted {
            let messages: Vec<String> =
                checked.diagnostics.iter().map(|one| format!("{} {}", one.code, one.message)).collect();
            faults.push(format!("{}: wanted {sorted:?}, found {messages:?}", path.display()));
        }
        let is_error = wanted.iter().any(|code| code.starts_with('E'));
        assert_eq!(
            checked.model.is_none(),
            is_error || !found.iter().all(|code| code.starts_with('W')),
            "{}",
            path.display()
        );
        for one in checked.diagnostics.iter() {
            assert!(one.span().end as usize <= source.text().len() && !one.message.is_empty());
            assert!(
                one.remedy.is_some() || !one.labels[0].text.is_empty(),
                "{}: {} says neither what was expected nor a remedy",
                path.display(),
                one.code
            );
        }
    }
    assert!(faults.is_empty(), "{}", faults.join("\n"));
}

#[test]
fn every_code_of_conditions_has_a_trap() {
    let all: Vec<String> =
        files().iter().flat_map(|path| expected(&fs::read_to_string(path).expect("readable"))).collect();
    let missing: Vec<&str> = codes_conditions::TABLE
        .iter()
        .map(|code| code.as_str())
        .filter(|code| !all.iter().any(|own| own == code))
        .collect();
    assert!(missing.is_empty(), "no trap for {missing:?}");
}
