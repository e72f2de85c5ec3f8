//! The documents are true: README's model compiles, its commands are those of the program, its two commands are those of the gate.

use std::fs;
use std::path::Path;

fn read(name: &str) -> String {
    fs::read_to_string(Path::new(env!("CARGO_MANIFEST_DIR")).join(name)).expect("a file of the project")
}

/// Blocks of a fenced language.
fn blocks<'a>(text: &'a str, language: &str) -> Vec<&'a str> {
    let fence = format!("```{language}\n");
    text.split(&fence).skip(1).filter_map(|rest| rest.split("```").next()).collect()
}

#[test]
fn the_model_in_the_readme_is_the_demo_model() {
    let readme = read("README.md");
    let models = blocks(&readme, "rim");
    assert_eq!(models.len(), 1);
    let demo = read("demo-models/wire.rim");
    let body = |text: &str| -> Vec<String> {
        text.lines().filter(|line| !line.starts_with('#')).map(|line| line.trim_end().to_owned()).collect()
    };
    assert_eq!(body(models[0]), body(&demo));
}

#[test]
fn the_gate_runs_the_commands_of_the_readme() {
    let readme = read("README.md");
    let commands: Vec<&str> =
        blocks(&readme, "sh").into_iter().flat_map(str::lines).filter(|line| !line.is_empty()).collect();
    let gate = read(".ci/run").replace(" --locked", "");
    let run = commands
        .iter()
        .find(|line| line.contains(" run demo-models/vault_wall.rim"))
        .expect("a command that runs a demo");
    assert!(gate.contains(run.split(" --out").next().expect("a command")), "the gate does not run `{run}`");
    let test = commands.iter().find(|line| line.starts_with("cargo test")).expect("a command that tests");
    assert!(gate.lines().any(|line| line.trim() == *test), "the gate does not run `{test}`");
}

/// Every `cargo run … -- ARGUMENTS` of the README that needs no compiler and leaves nothing behind, with the program that this test belongs to.
#[test]
fn commands_of_the_readme_work() {
    let readme = read("README.md");
    let folder = tempfile::tempdir().expect("a temporary folder");
    let mut tried = 0;
    for line in blocks(&readme, "sh").into_iter().flat_map(str::lines) {
        let Some((_, arguments)) = line.split_once(" -- ") else { continue };
        let words: Vec<String> = arguments
            .split_whitespace()
            .map(|word| match word {
                "wall.run" | "wire-c" | "wire-150.run" => folder.path().join(word).display().to_string(),
                other => other.to_owned(),
            })
            .collect();
        let output = std::process::Command::new(env!("CARGO_BIN_EXE_rimstone"))
            .args(&words)
            .current_dir(env!("CARGO_MANIFEST_DIR"))
            .output()
            .expect("the program starts");
        assert!(output.status.success(), "`{line}`: {}", String::from_utf8_lossy(&output.stderr));
        tried += 1;
    }
    assert!(tried >= 6, "the README shows commands");
}
