//! Diagnostics for people: `file:line:col: error[E0101]: message`, the lines in question with marks, notes and remedy.
//!
//! The only user of the snippet renderer. Texts from the model are made safe before they are shown.

use annotate_snippets::renderer::DecorStyle;
use annotate_snippets::{Annotation, AnnotationKind, Group, Level, Renderer, Snippet};
use std::io::IsTerminal;

use super::safe::is_unsafe;
use super::{Diagnostic, Diagnostics, Label, Rank, Severity, safe::safe};
use crate::source::{SourceFile, Span};

/// Most diagnostics that are shown in full; the rest are counted.
const MOST_SHOWN: usize = 100;
/// Longest stretch of the source, in lines, that one diagnostic shows.
const MOST_LINES: usize = 12;
/// Longest line that is shown, in bytes; a longer one is cut around the mark.
const LONGEST_LINE: usize = 400;

/// Whether text is coloured.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Colour {
    Plain,
    Styled,
}

impl Colour {
    /// Colour for standard error: none without a terminal or with `NO_COLOR` set.
    pub fn for_standard_error() -> Colour {
        let refused = std::env::var_os("NO_COLOR").is_some_and(|value| !value.is_empty());
        if refused || !std::io::stderr().is_terminal() { Colour::Plain } else { Colour::Styled }
    }
}

/// All diagnostics of a file, and a last line that counts them.
pub fn render(diagnostics: &Diagnostics, source: &SourceFile, colour: Colour) -> String {
    let mut text = String::new();
    for diagnostic in diagnostics.iter().take(MOST_SHOWN) {
        text.push_str(&render_one(diagnostic, source, colour));
        text.push('\n');
    }
    if diagnostics.len() > MOST_SHOWN {
        text.push_str(&format!("… and {} more\n", diagnostics.len() - MOST_SHOWN));
    }
    if !diagnostics.is_empty() {
        text.push_str(&summary(diagnostics, source));
    }
    text
}

fn summary(diagnostics: &Diagnostics, source: &SourceFile) -> String {
    let errors = diagnostics.iter().filter(|one| one.severity == Severity::Error).count();
    let warnings = diagnostics.len() - errors;
    let count = |number: usize, word: &str| match number {
        0 => None,
        1 => Some(format!("1 {word}")),
        _ => Some(format!("{number} {word}s")),
    };
    let counts: Vec<String> =
        [count(errors, "error"), count(warnings, "warning")].into_iter().flatten().collect();
    format!("{}: {}\n", safe(source.name()), counts.join(", "))
}

/// One diagnostic, ending in a line end.
pub fn render_one(diagnostic: &Diagnostic, source: &SourceFile, colour: Colour) -> String {
    let position = source.position(diagnostic.span().start);
    let header = format!(
        "{}:{}:{}: {}[{}]: {}\n",
        safe(source.name()),
        position.line,
        position.column,
        diagnostic.severity.word(),
        diagnostic.code,
        safe(&diagnostic.message)
    );
    let renderer = match colour {
        Colour::Plain => Renderer::plain(),
        Colour::Styled => Renderer::styled(),
    };
    let renderer = renderer.decor_style(DecorStyle::Ascii).term_width(120);
    let body = renderer.render(&[body(diagnostic, source)]);
    let header = match colour {
        Colour::Plain => header,
        Colour::Styled => styled(&header, diagnostic.severity),
    };
    format!("{header}{}\n", body.trim_end_matches('\n'))
}

fn styled(header: &str, severity: Severity) -> String {
    let colour = match severity {
        Severity::Error => "31",
        Severity::Warning => "33",
    };
    format!("\u{1b}[1;{colour}m{}\u{1b}[0m\n", header.trim_end())
}

/// The lines with their marks, then notes and remedy.
fn body<'a>(diagnostic: &Diagnostic, source: &SourceFile) -> Group<'a> {
    let mut group = Group::with_level(Level::ERROR);
    if !source.text().is_empty() {
        group = group.element(snippet(diagnostic, source));
    }
    for note in &diagnostic.notes {
        group = group.element(Level::NOTE.message(safe(note)));
    }
    if let Some(remedy) = &diagnostic.remedy {
        group = group.element(Level::HELP.message(safe(remedy)));
    }
    group
}

/// The stretch of source that the primary label is in, with all labels that fall into it.
fn snippet<'a>(diagnostic: &Diagnostic, source: &SourceFile) -> Snippet<'a, Annotation<'a>> {
    let primary = diagnostic.span();
    let stretch = diagnostic.labels.iter().fold(primary, |stretch, label| {
        let wider = stretch.to(label.span);
        if lines_of(wider, source) <= MOST_LINES { wider } else { stretch }
    });
    let text = source.text();
    let start = text[..floor(text, stretch.start as usize)].rfind('\n').map_or(0, |end| end + 1);
    let end = clipped_end(source, start, stretch);
    let shown = Shown::new(text, start, end, primary);
    let line = source.position(shown.start as u32).line as usize;
    let marks =
        diagnostic.labels.iter().filter(|label| shown.holds(label.span)).map(|label| shown.mark(label));
    Snippet::source(shown.text.clone()).line_start(line).annotations(marks.collect::<Vec<_>>())
}

fn lines_of(span: Span, source: &SourceFile) -> usize {
    (source.position(span.end).line - source.position(span.start).line) as usize + 1
}

/// The end of the last line of a stretch, at most so many lines on.
fn clipped_end(source: &SourceFile, start: usize, stretch: Span) -> usize {
    let text = source.text();
    let last = floor(text, stretch.end as usize).max(start);
    let wanted = text[last..].find('\n').map_or(text.len(), |end| last + end);
    let most =
        text[start..].match_indices('\n').nth(MOST_LINES - 1).map_or(text.len(), |(end, _)| start + end);
    wanted.min(most)
}

fn floor(text: &str, at: usize) -> usize {
    let at = at.min(text.len());
    (0..=at).rev().find(|&at| text.is_char_boundary(at)).unwrap_or(0)
}

/// A stretch of source made safe, with the way from its bytes to those shown.
struct Shown {
    start: usize,
    end: usize,
    text: String,
    /// For each byte of the stretch (and its end) the byte of the text shown.
    places: Vec<usize>,
}

impl Shown {
    fn new(source: &str, start: usize, end: usize, primary: Span) -> Shown {
        let (start, end) = window(source, start, end, primary);
        let mut text = String::new();
        let mut places = Vec::with_capacity(end - start + 1);
        for letter in source[start..end].chars() {
            places.extend(std::iter::repeat_n(text.len(), letter.len_utf8()));
            match letter {
                '\n' => text.push('\n'),
                '\t' => text.push(' '),
                '\r' | '\u{feff}' => {}
                _ if is_unsafe(letter) => text.extend(letter.escape_unicode()),
                _ => text.push(letter),
            }
        }
        places.push(text.len());
        Shown { start, end, text, places }
    }

    fn holds(&self, span: Span) -> bool {
        self.start <= span.start as usize && span.start as usize <= self.end
    }

    fn mark<'a>(&self, label: &Label) -> Annotation<'a> {
        let place = |at: u32| self.places[(at as usize).clamp(self.start, self.end) - self.start];
        let kind = match label.rank {
            Rank::Primary => AnnotationKind::Primary,
            Rank::Secondary => AnnotationKind::Context,
        };
        let mark = kind.span(place(label.span.start)..place(label.span.end));
        if label.text.is_empty() { mark } else { mark.label(safe(&label.text)) }
    }
}

/// The stretch itself, or a window around the mark where it is one very long line or more.
fn window(source: &str, start: usize, end: usize, primary: Span) -> (usize, usize) {
    if end - start <= LONGEST_LINE * MOST_LINES
        && source[start..end].lines().all(|line| line.len() <= LONGEST_LINE)
    {
        return (start, end);
    }
    let from = floor(source, (primary.start as usize).saturating_sub(LONGEST_LINE / 4)).max(start);
    let from =
        source[from..(primary.start as usize).max(from)].rfind('\n').map_or(from, |line| from + line + 1);
    let to = floor(source, from + LONGEST_LINE).min(end).max(from);
    let to = source[from..to].find('\n').map_or(to, |line| from + line);
    (from, to)
}

#[cfg(test)]
mod tests {
    use super::super::codes;
    use super::*;

    fn fault(start: u32, end: u32) -> Diagnostic {
        Diagnostic::error(codes::UNEXPECTED, Span::new(start, end), "a \u{1b} cannot stand here")
            .with_text("expected another")
            .with_note("a note")
            .with_remedy("a remedy")
    }

    #[test]
    fn the_first_line_is_one_that_editors_read() {
        let source = SourceFile::new("w.rim", "ρ = 1\nk = = 2\n");
        let text = render(&Diagnostics::from(fault(11, 12)), &source, Colour::Plain);
        assert!(text.starts_with("w.rim:2:5: error[E0101]: a \\u{1b} cannot stand here\n"), "{text}");
        for part in ["2 | k = = 2", "^ expected another", "a note", "a remedy", "w.rim: 1 error"] {
            assert!(text.contains(part), "{part} in\n{text}");
        }
        assert!(!text.contains('\u{1b}'));
    }

    #[test]
    fn no_span_and_no_text_makes_it_stumble() {
        let long = format!("{}\u{1b}é\r\n{}", "x".repeat(5000), "y\n".repeat(50));
        for source in [SourceFile::new("a", ""), SourceFile::new("a", "é"), SourceFile::new("a", long)] {
            for (start, end) in
                [(0, 0), (0, 1), (1, 2), (5000, 5003), (4000, 5100), (9, 99999), (77777, 99999)]
            {
                let text = render_one(&fault(start, end), &source, Colour::Plain);
                assert!(text.contains("E0101") && text.len() < 20_000);
            }
        }
    }
}
