//! The program as its users meet it: words, exit statuses, and what goes where.

use std::process::{Command, Output, Stdio};

fn rimstone(arguments: &[&str]) -> Output {
    program(arguments).output().expect("the program starts")
}

fn program(arguments: &[&str]) -> Command {
    let mut command = Command::new(env!("CARGO_BIN_EXE_rimstone"));
    command.args(arguments).stdin(Stdio::null());
    command
}

fn text(bytes: &[u8]) -> String {
    String::from_utf8(bytes.to_vec()).expect("UTF-8")
}

#[test]
fn help_is_a_result_and_teaches_by_example() {
    let page = rimstone(&["--help"]);
    assert_eq!(page.status.code(), Some(0));
    assert!(page.stderr.is_empty());
    let commands = text(&page.stdout);
    let listed: Vec<&str> = commands
        .lines()
        .skip_while(|line| *line != "Commands:")
        .skip(1)
        .take_while(|line| !line.is_empty())
        .filter_map(|line| line.split_whitespace().next())
        .filter(|word| *word != "help")
        .collect();
    assert!(listed.len() >= 3, "{commands}");
    for command in listed {
        let page = rimstone(&[command, "--help"]);
        assert_eq!(page.status.code(), Some(0), "{command}");
        let page = text(&page.stdout);
        assert!(
            page.contains("Examples:") && page.contains(&format!("rimstone {command}")),
            "{command}: {page}"
        );
        assert!(page.lines().all(|line| line.chars().count() <= 100), "{command}: {page}");
        // An example that the wrapping has cut stands on two lines, the second without the program's name.
        let examples =
            page.lines().skip_while(|line| *line != "Examples:").skip(1).take_while(|line| !line.is_empty());
        examples.for_each(|line| assert!(line.starts_with("  rimstone "), "{command}: {line}"));
    }
}

#[test]
fn faulty_words_end_with_one() {
    for words in [&["frobnicate"][..], &[], &["weights", "--sideways"]] {
        let answer = rimstone(words);
        assert_eq!(answer.status.code(), Some(1), "{words:?}");
        assert!(answer.stdout.is_empty() && !answer.stderr.is_empty(), "{words:?}");
        assert!(!answer.stderr.contains(&0x1b), "no colour without a terminal");
    }
}

#[test]
fn a_code_is_explained() {
    let list = rimstone(&["explain"]);
    let first = text(&list.stdout).split_whitespace().next().expect("a code").to_owned();
    let page = rimstone(&["explain", &first]);
    assert_eq!(page.status.code(), Some(0));
    assert!(text(&page.stdout).starts_with(&first));
    assert_eq!(rimstone(&["explain", "E9999"]).status.code(), Some(1));
}

#[cfg(unix)]
#[test]
fn a_reader_that_leaves_is_no_fault() {
    use std::io::Read;
    let mut child = program(&["weights", "--help"])
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .expect("it starts");
    drop(child.stdout.take());
    let mut errors = String::new();
    child.stderr.take().expect("piped").read_to_string(&mut errors).expect("UTF-8");
    assert_eq!((child.wait().expect("it ends").code(), errors.as_str()), (Some(0), ""));
}

/// The model that most tests run, from the repository's own demos.
const WALL: &str = concat!(env!("CARGO_MANIFEST_DIR"), "/demo-models/vault_wall.rim");

fn in_folder(folder: &std::path::Path, arguments: &[&str]) -> Output {
    program(arguments).current_dir(folder).output().expect("the program starts")
}

#[test]
fn a_sound_model_is_said_to_be_sound() {
    let answer = rimstone(&["check", WALL]);
    assert_eq!(answer.status.code(), Some(0), "{}", text(&answer.stderr));
    assert!(text(&answer.stdout).contains("no faults"));
    let missing = rimstone(&["check", "no_such_model.rim", WALL]);
    assert_eq!(missing.status.code(), Some(1));
    assert!(
        text(&missing.stderr).contains("no_such_model.rim") && text(&missing.stdout).contains("no faults")
    );
}

#[test]
fn a_package_is_written_whole_and_over_nothing_of_others() {
    let folder = tempfile::tempdir().expect("a folder");
    let words = ["emit", WALL, "--target", "c", "--out", "wall"];
    let first = in_folder(folder.path(), &words);
    assert_eq!(first.status.code(), Some(0), "{}", text(&first.stderr));
    for line in text(&first.stdout).lines() {
        assert!(folder.path().join(line).is_file(), "{line}");
    }
    assert!(text(&first.stdout).lines().any(|line| line == "wall/main.c"));
    let main = std::fs::read(folder.path().join("wall/main.c")).expect("there");
    assert_eq!(in_folder(folder.path(), &words).stdout, first.stdout, "an unchanged package is replaced");
    assert_eq!(std::fs::read(folder.path().join("wall/main.c")).expect("there"), main);
    std::fs::write(folder.path().join("wall/notes.txt"), "mine").expect("written");
    let refused = in_folder(folder.path(), &words);
    assert_eq!(refused.status.code(), Some(1));
    assert!(text(&refused.stderr).contains("notes.txt") && refused.stdout.is_empty());
    let library = in_folder(folder.path(), &["emit", WALL, "--target", "c", "--library", "--out", "kernel"]);
    assert!(!text(&library.stdout).contains("main.c"));
}

#[test]
fn a_run_in_c_and_in_rust_gives_the_same_results() {
    let folder = tempfile::tempdir().expect("a folder");
    let mut results = Vec::new();
    for target in ["c", "rust"] {
        let out = format!("{target}.run");
        let words = ["run", WALL, "--target", target, "--out", &out, "--steps", "3", "--quiet"];
        let run = in_folder(folder.path(), &words);
        assert_eq!(run.status.code(), Some(0), "{}", text(&run.stderr));
        assert_eq!(text(&run.stdout), format!("{out}\n"));
        let summary = std::fs::read(folder.path().join(&out).join("run.json")).expect("a summary");
        let summary: serde_json::Value = serde_json::from_slice(&summary).expect("JSON");
        assert_eq!((&summary["steps"], &summary["ended"]), (&3.into(), &"finished".into()));
        let path = |output: &serde_json::Value| output["path"].as_str().expect("a path").to_owned();
        let paths: Vec<String> = summary["outputs"].as_array().expect("a list").iter().map(path).collect();
        assert!(paths.len() >= 2);
        let read = |path: &String| std::fs::read(folder.path().join(&out).join(path)).expect("a file");
        results.push((paths.iter().map(read).collect::<Vec<_>>(), paths));
    }
    assert!(results[0] == results[1], "the bits differ");
}

#[test]
fn faults_of_a_run_keep_their_status() {
    let folder = tempfile::tempdir().expect("a folder");
    let refused =
        in_folder(folder.path(), &["run", WALL, "--out", "r", "--set", "no such=1", "--nodes", "x=1"]);
    assert_eq!(refused.status.code(), Some(1));
    let said = text(&refused.stderr);
    assert!(said.contains("no such") && said.contains("--nodes x=1"), "{said}");
    let without = in_folder(folder.path(), &["run", WALL, "--out", "r", "--cc", "no-such-compiler"]);
    assert_eq!(without.status.code(), Some(2));
    assert!(
        text(&without.stderr).contains("no-such-compiler: not found")
            && text(&without.stderr).contains("--cc")
    );
    assert!(!folder.path().join("r").exists());
}
