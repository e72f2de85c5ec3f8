//! `rimstone explain CODE`: a diagnostic in full; without a code, the list of all.

use std::io::{ErrorKind, Write};
use std::process::ExitCode;

use crate::diagnostic::{Code, nearest::nearest, safe::safe};

/// Explains a diagnostic.
#[derive(clap::Args, Debug)]
#[command(
    after_help = "Examples:\n  rimstone explain            list all codes\n  rimstone explain E0121      explain one"
)]
pub struct Arguments {
    /// The code, as it stands in brackets after `error` or `warning`
    code: Option<String>,
}

/// Prints the explanation, or the list; 1 for a code that there is not.
pub fn run(arguments: Arguments) -> ExitCode {
    match arguments.code {
        None => print(&list()),
        Some(wanted) => match Code::find(&wanted) {
            Some(code) => print(&explanation(code)),
            None => {
                eprintln!("error: there is no code `{}`{}", safe(&wanted), suggestion(&wanted));
                ExitCode::from(1)
            }
        },
    }
}

/// Writes to standard output; a reader that has seen enough and left is no fault.
fn print(text: &str) -> ExitCode {
    let mut output = std::io::stdout().lock();
    match output.write_all(text.as_bytes()).and_then(|()| output.flush()) {
        Err(fault) if fault.kind() != ErrorKind::BrokenPipe => {
            eprintln!("error: standard output cannot be written: {fault}");
            ExitCode::from(2)
        }
        _ => ExitCode::SUCCESS,
    }
}

fn suggestion(wanted: &str) -> String {
    match nearest(wanted, Code::all().into_iter().map(Code::as_str)) {
        Some(near) => format!("; did you mean `{near}`? (`rimstone explain` lists all)"),
        None => "; `rimstone explain` lists all".into(),
    }
}

/// One line a code.
pub fn list() -> String {
    Code::all().iter().map(|code| format!("{code}  {}\n", code.0.title)).collect()
}

/// Title, explanation, and both examples.
pub fn explanation(code: Code) -> String {
    let entry = code.0;
    let indented = |text: &str| text.lines().map(|line| format!("    {line}\n")).collect::<String>();
    format!(
        "{}: {}\n\n{}\n\nWrong:\n\n{}\nRight:\n\n{}",
        entry.code,
        entry.title,
        wrapped(entry.explanation, 96),
        indented(entry.wrong),
        indented(entry.right)
    )
}

/// Lines of at most `width` characters.
fn wrapped(text: &str, width: usize) -> String {
    let mut lines = vec![String::new()];
    for word in text.split_whitespace() {
        let last = lines.last_mut().expect("there is a first line");
        if !last.is_empty() && last.chars().count() + 1 + word.chars().count() > width {
            lines.push(word.to_string());
        } else {
            if !last.is_empty() {
                last.push(' ');
            }
            last.push_str(word);
        }
    }
    lines.join("\n")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_code_is_explained_with_both_examples() {
        for code in Code::all() {
            let text = explanation(code);
            assert!(text.starts_with(code.as_str()) && text.contains("Wrong:") && text.contains("Right:"));
            let entry = code.0;
            assert!(
                !entry.title.is_empty() && entry.explanation.ends_with('.') && entry.wrong != entry.right,
                "{code}"
            );
            assert!(text.lines().all(|line| line.chars().count() <= 110), "{code}");
        }
        assert_eq!(list().lines().count(), Code::all().len());
    }

    #[test]
    fn codes_are_unique_and_of_one_form() {
        let all = Code::all();
        for pair in all.windows(2) {
            assert!(pair[0].as_str() < pair[1].as_str(), "{} stands twice", pair[0]);
        }
        for code in all {
            let (kind, number) = code.as_str().split_at(1);
            assert!(
                ["E", "W"].contains(&kind) && number.len() == 4 && number.bytes().all(|b| b.is_ascii_digit())
            );
        }
        assert_eq!(Code::find("e0121").map(Code::as_str), Some("E0121"));
        assert!(Code::find("E9999").is_none());
    }
}
