//! Wrong input: every model under `tests/models/reject` has one fault, and exactly the expected diagnostics are given.
//!
//! The first line of a model names the codes of its errors, as many as one slip really makes. Models that would be large or are no
//! text are made here. Conditions at faces (E0501 to E0519 and their kin) are not among them yet.

use std::collections::{BTreeMap, BTreeSet};
use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

use rimstone::diagnostic::terminal::{Colour, render};
use rimstone::diagnostic::{Code, Diagnostic, Severity};
use rimstone::pipeline;
use rimstone::source::SourceFile;

fn folder() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/models/reject")
}

/// A model that must be refused.
struct Rejected {
    name: String,
    source: SourceFile,
    expected: Vec<String>,
}

fn written() -> Vec<Rejected> {
    let mut found: Vec<PathBuf> = fs::read_dir(folder())
        .expect("rejected models")
        .map(|entry| entry.expect("readable").path())
        .filter(|path| path.extension().is_some_and(|extension| extension == "rim"))
        .collect();
    found.sort();
    found
        .iter()
        .map(|path| {
            let name = path.file_name().expect("a file").to_string_lossy().into_owned();
            let text = fs::read_to_string(path).expect("text");
            let codes = text.lines().next().and_then(|line| line.strip_prefix("# expect:"));
            let codes = codes.unwrap_or_else(|| panic!("{name}: no line `# expect:`"));
            let expected = codes.split_whitespace().map(str::to_owned).collect();
            Rejected { source: SourceFile::new(name.clone(), text), name, expected }
        })
        .collect()
}

/// Models that are no text, or too long for a repository.
fn made() -> Vec<Rejected> {
    let sound = fs::read(Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-models/wire.rim")).expect("a demo");
    let make = |name: &str, bytes: Vec<u8>, expected: &[&str]| Rejected {
        name: name.to_owned(),
        source: SourceFile::from_bytes(name, bytes),
        expected: expected.iter().map(|code| (*code).to_owned()).collect(),
    };
    let with = |more: String| [sound.as_slice(), more.as_bytes()].concat();
    let mut faults = vec!["E0104"; 500];
    faults.push("E0110");
    let stray = format!("\nverification\n{}", "  exact $ = 1\n".repeat(600));
    vec![
        make("no_text", [sound.as_slice(), b"# caf\xe9\n"].concat(), &["E0102"]),
        make("too_large", with(format!("# {}\n", "x".repeat(1 << 20))), &["E0103"]),
        make(
            "too_long",
            with(format!("\nverification\n  exact u = 1{}\n", " + 1".repeat(20_000))),
            &["E0109"],
        ),
        make("too_many_faults", with(stray), &faults),
    ]
}

fn all() -> Vec<Rejected> {
    written().into_iter().chain(made()).collect()
}

fn errors(diagnostics: &rimstone::diagnostic::Diagnostics) -> Vec<String> {
    let errors = diagnostics.iter().filter(|one| one.severity == Severity::Error);
    let mut codes: Vec<String> = errors.map(|one| one.code.as_str().to_owned()).collect();
    codes.sort();
    codes
}

#[test]
fn each_model_has_exactly_the_expected_errors() {
    let models = all();
    assert!(models.len() >= 100, "{}", models.len());
    let mut wrong = Vec::new();
    for model in &models {
        let checked = pipeline::check(&model.source);
        let found = errors(&checked.diagnostics);
        let mut expected = model.expected.clone();
        expected.sort();
        assert!(!expected.is_empty(), "{}", model.name);
        if found != expected || checked.model.is_some() {
            let shown: String =
                render(&checked.diagnostics, &model.source, Colour::Plain).chars().take(3000).collect();
            wrong.push(format!("{}: expected {expected:?}, found {found:?}\n{shown}", model.name));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

fn well_made(one: &Diagnostic, text: &str) -> Result<(), String> {
    let inside = |start: u32, end: u32| text.get(start as usize..end as usize).is_some();
    if one.labels.is_empty() || !one.labels.iter().all(|label| inside(label.span.start, label.span.end)) {
        return Err("a place outside the file".to_owned());
    }
    if one.message.trim().is_empty() {
        return Err("an empty message".to_owned());
    }
    let helps = one.remedy.iter().chain(one.labels.iter().map(|label| &label.text)).chain(&one.notes);
    if !helps.into_iter().any(|text| !text.trim().is_empty()) {
        return Err("neither an expectation nor a remedy".to_owned());
    }
    Ok(())
}

#[test]
fn each_diagnostic_has_a_place_and_says_what_to_do() {
    let mut wrong = BTreeSet::new();
    for model in all() {
        for one in &pipeline::check(&model.source).diagnostics {
            if let Err(why) = well_made(one, model.source.text()) {
                wrong.insert(format!("{}: {} {}: {why}", model.name, one.code, one.message));
            }
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.into_iter().collect::<Vec<_>>().join("\n"));
}

/// Every expected code is in the registry, and every error code of the registry has a model, but for those of conditions at faces.
#[test]
fn every_code_has_a_model_and_conversely() {
    let mut seen: BTreeMap<String, String> = BTreeMap::new();
    for model in all() {
        for code in &model.expected {
            assert!(Code::find(code).is_some(), "{}: {code} is no code", model.name);
            seen.insert(code.clone(), model.name.clone());
        }
    }
    let later = |code: &str| {
        ("E0501".."E0520").contains(&code) || ("E0541".."E0550").contains(&code) || code.starts_with("E095")
    };
    let codes = Code::all();
    let lacking: Vec<&str> = codes
        .iter()
        .map(|code| code.as_str())
        .filter(|code| code.starts_with('E') && !later(code) && !seen.contains_key(*code))
        .collect();
    assert!(lacking.is_empty(), "codes without a rejected model: {lacking:?}");
}

#[test]
fn every_code_is_explained_with_a_wrong_and_a_right_example() {
    let codes = Code::all();
    for pair in codes.windows(2) {
        assert_ne!(pair[0], pair[1], "a code is given twice");
    }
    for code in codes {
        let entry = code.0;
        let shape = entry.code.len() == 5 && entry.code[1..].bytes().all(|byte| byte.is_ascii_digit());
        assert!(shape && entry.code.starts_with(['E', 'W']), "{code}");
        assert!(!entry.title.trim().is_empty() && !entry.title.ends_with('.'), "{code}: title");
        assert!(entry.explanation.len() > 15 && entry.explanation.ends_with('.'), "{code}: explanation");
        assert!(!entry.wrong.trim().is_empty() && !entry.right.trim().is_empty(), "{code}: examples");
        assert_ne!(entry.wrong, entry.right, "{code}: the examples are the same");
    }
}

/// What is only a warning does not refuse a model: an argument that a coefficient does not use.
#[test]
fn an_unused_argument_is_a_warning() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-models/vault_wall.rim");
    let text = fs::read_to_string(path).expect("a demo");
    let text = text.replace("\nfields\n", "\ncoefficients\n  q(x, t) = 1 + x / 1 m\n\nfields\n");
    let source = SourceFile::new("wall.rim", text);
    let checked = pipeline::check(&source);
    let warned: Vec<&Diagnostic> =
        checked.diagnostics.iter().filter(|one| one.code.as_str() == "W0201").collect();
    assert!(checked.model.is_some() && warned.len() == 1);
    assert_eq!((source.slice(warned[0].span()), warned[0].severity), ("t", Severity::Warning));
}

/// Formulas as deep and as wide as is allowed go through every stage.
#[test]
fn large_formulas_within_the_bounds_are_compiled() {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-models/vault_wall.rim");
    let text = fs::read_to_string(path).expect("a demo");
    let deep = format!("{}x / 1 m{}", "sin(1 + 2 * ".repeat(70), ")".repeat(70));
    let wide: Vec<String> = (1..700).map(|index| format!("sin({index} * x / 1 m)")).collect();
    for formula in [deep, format!("1000 + {}", wide.join(" + "))] {
        let text = text
            .replace("\nfields\n", &format!("\ncoefficients\n  q(x) = {formula}\n\nfields\n"))
            .replace("∂/∂x(k * ∂T/∂x)", "∂/∂x(k * q * ∂T/∂x)");
        let source = SourceFile::new("wall.rim", text);
        let checked = pipeline::check(&source);
        let shown = render(&checked.diagnostics, &source, Colour::Plain);
        assert!(checked.model.is_some(), "{}", shown.chars().take(2000).collect::<String>());
    }
}

/// Through the program, from an empty folder: status 1, words on standard error, and the folder stays empty.
#[test]
fn no_command_leaves_a_file_behind() {
    let folder_of_models = folder();
    for name in [
        "unknown_name.rim",
        "open_bracket.rim",
        "equation_units.rim",
        "too_few_nodes.rim",
        "order_not_reached.rim",
    ] {
        let model = folder_of_models.join(name);
        let model = model.to_str().expect("a path that is text");
        for words in [
            &["check", model][..],
            &["check", "--json", model],
            &["emit", model, "--target", "c", "--out", "program"],
            &["emit", model, "--target", "rust", "--out", "program"],
            &["run", model, "--out", "results"],
        ] {
            let empty = tempfile::tempdir().expect("a folder");
            let answer = Command::new(env!("CARGO_BIN_EXE_rimstone"))
                .args(words)
                .current_dir(empty.path())
                .stdin(Stdio::null())
                .output()
                .expect("the program starts");
            let said = [answer.stdout.as_slice(), &answer.stderr].concat();
            let said = String::from_utf8(said).expect("UTF-8");
            assert_eq!(answer.status.code(), Some(1), "{words:?}: {said}");
            let expected = fs::read_to_string(model).expect("text");
            let code = expected.split_whitespace().nth(2).expect("a code");
            assert!(said.contains(code) && !said.contains("panicked"), "{words:?}: {said}");
            let left = fs::read_dir(empty.path()).expect("readable").count();
            assert_eq!(left, 0, "{words:?} left a file behind");
        }
    }
}
