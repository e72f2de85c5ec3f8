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
