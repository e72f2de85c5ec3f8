//! Diagnostics for programs: one JSON object a line.
//!
//! Keys: `code`, `severity`, `message`, `file`, `line`, `column`, `end_line`, `end_column`, `labels`, `notes`,
//! `remedy` (a string or null). Lines and columns count from 1; columns count characters; an end is not included.

use serde::Serialize;

use super::{Diagnostic, Diagnostics, Label, Rank};
use crate::source::{SourceFile, Span};

#[derive(Serialize)]
struct Line<'a> {
    code: &'a str,
    severity: &'a str,
    message: &'a str,
    file: &'a str,
    #[serde(flatten)]
    place: Place,
    labels: Vec<LabelLine<'a>>,
    notes: &'a [String],
    remedy: Option<&'a str>,
}

#[derive(Serialize)]
struct Place {
    line: u32,
    column: u32,
    end_line: u32,
    end_column: u32,
}

#[derive(Serialize)]
struct LabelLine<'a> {
    text: &'a str,
    primary: bool,
    #[serde(flatten)]
    place: Place,
}

impl Place {
    fn of(span: Span, source: &SourceFile) -> Place {
        let (start, end) = (source.position(span.start), source.position(span.end));
        Place { line: start.line, column: start.column, end_line: end.line, end_column: end.column }
    }
}

/// All diagnostics, one object a line.
pub fn render(diagnostics: &Diagnostics, source: &SourceFile) -> String {
    diagnostics.iter().map(|diagnostic| render_one(diagnostic, source) + "\n").collect()
}

/// One diagnostic as an object on one line, without a line end.
pub fn render_one(diagnostic: &Diagnostic, source: &SourceFile) -> String {
    let label = |label: &'_ Label| Place::of(label.span, source);
    let line = Line {
        code: diagnostic.code.as_str(),
        severity: diagnostic.severity.word(),
        message: &diagnostic.message,
        file: source.name(),
        place: Place::of(diagnostic.span(), source),
        labels: diagnostic
            .labels
            .iter()
            .map(|one| LabelLine { text: &one.text, primary: one.rank == Rank::Primary, place: label(one) })
            .collect(),
        notes: &diagnostic.notes,
        remedy: diagnostic.remedy.as_deref(),
    };
    serde_json::to_string(&line).expect("a diagnostic is made of strings and numbers, which JSON can hold")
}

#[cfg(test)]
mod tests {
    use super::super::codes;
    use super::*;

    #[test]
    fn every_key_is_there() {
        let source = SourceFile::new("w.rim", "ρ = 1\nk = = 2\n");
        let fault =
            Diagnostic::error(codes::UNEXPECTED, Span::new(11, 12), "m \"q\" \u{1b}").with_remedy("r");
        let line = render_one(&fault.with_label(Span::new(0, 2), "here"), &source);
        assert!(!line.contains('\n') && !line.contains('\u{1b}'));
        let value: serde_json::Value = serde_json::from_str(&line).expect("the line is JSON");
        assert_eq!(value["code"], "E0101");
        assert_eq!(value["line"], 2);
        assert_eq!(value["column"], 5);
        assert_eq!(value["end_column"], 6);
        assert_eq!(value["labels"][1]["text"], "here");
        assert_eq!(value["labels"][1]["end_column"], 2);
        assert_eq!(value["remedy"], "r");
        for key in ["severity", "message", "file", "end_line", "notes"] {
            assert!(!value[key].is_null(), "{key}");
        }
    }
}
