//! Cutting a file into statements, before any formula is read.
//!
//! Knows texts, comments and brackets, the rules by which a statement goes on over a line end, and the section
//! words. What a statement says is not looked at here, so that a fault in one hides none in another.

use super::fold::Folded;
use super::tree::{Section, SectionMark};
use crate::diagnostic::nearest::nearest;
use crate::diagnostic::{Diagnostic, Diagnostics, codes, safe::excerpt};

/// Deepest nesting of brackets and prefix operators.
pub(super) const DEEPEST: usize = 256;
/// Faults after which the rest of a file is not looked at.
pub(super) const MOST_FAULTS: usize = 500;

/// A file in statements.
#[derive(Debug, Default)]
pub(super) struct Cut {
    pub sections: Vec<SectionMark>,
    pub statements: Vec<Statement>,
}

/// Where a statement stands.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Home {
    /// Before the first section.
    Top,
    /// Under a word that is no section.
    Unknown,
    Section(Section),
}

/// A statement: a stretch of the folded text.
#[derive(Debug)]
pub(super) struct Statement {
    pub home: Home,
    pub start: usize,
    pub end: usize,
    /// Its brackets do not match, which has been reported.
    pub broken: bool,
}

/// A line of the folded text.
#[derive(Clone, Copy, Debug)]
pub(super) struct Line {
    /// Where it begins.
    pub start: usize,
    /// The first and the last place that are neither blank nor comment; equal if there is nothing.
    pub first: usize,
    pub last: usize,
    /// Where the comment begins, or the line's end.
    pub comment: usize,
    /// Where the line ends, without the line feed.
    pub end: usize,
}

impl Line {
    pub fn is_blank(&self) -> bool {
        self.first == self.last
    }
}

/// The lines of a text, with comments told from texts in quotes.
pub(super) fn lines(text: &str) -> Vec<Line> {
    let mut lines = Vec::new();
    let mut start = 0;
    for line in text.split('\n') {
        let end = start + line.len();
        let mut quoted = false;
        let comment = line.char_indices().find(|&(_, letter)| {
            quoted ^= letter == '"';
            letter == '#' && !quoted
        });
        let comment = comment.map_or(end, |(at, _)| start + at);
        let code = &text[start..comment];
        let last = start + code.trim_end().len();
        let first = (start + (code.len() - code.trim_start().len())).min(last);
        lines.push(Line { start, first, last, comment, end });
        start = end + 1;
    }
    lines
}

/// Cuts a folded text into statements; reports brackets and section words.
pub(super) fn cut(folded: &Folded, diagnostics: &mut Diagnostics) -> Cut {
    let lines = lines(&folded.text);
    let mut cutter = Cutter { folded, lines: &lines, home: Home::Top, cut: Cut::default(), diagnostics };
    let mut at = 0;
    while at < lines.len() && cutter.diagnostics.len() < MOST_FAULTS {
        at = cutter.step(at);
    }
    cutter.cut
}

struct Cutter<'a> {
    folded: &'a Folded,
    lines: &'a [Line],
    home: Home,
    cut: Cut,
    diagnostics: &'a mut Diagnostics,
}

impl<'a> Cutter<'a> {
    fn code(&self, at: usize) -> &'a str {
        &self.folded.text[self.lines[at].first..self.lines[at].last]
    }

    /// Reads a section word or a statement at a line; returns the line to go on at.
    fn step(&mut self, at: usize) -> usize {
        let line = self.lines[at];
        if line.is_blank() {
            return at + 1;
        }
        if let Some(section) = Section::from_word(self.code(at)) {
            self.open(section, line);
            return at + 1;
        }
        if line.first == line.start && is_lone_word(self.code(at)) {
            self.unknown_section(at);
            return at + 1;
        }
        self.statement(at)
    }

    fn open(&mut self, section: Section, line: Line) {
        let span = self.folded.original(line.first, line.last);
        self.home = Home::Section(section);
        match self.cut.sections.iter().find(|mark| mark.section == section) {
            None => self.cut.sections.push(SectionMark { section, span }),
            Some(mark) => self.diagnostics.push(
                Diagnostic::error(
                    codes::DUPLICATE_SECTION,
                    span,
                    format!("the section `{}` is opened a second time", section.word()),
                )
                .with_text("again here")
                .with_label(mark.span, "first opened here")
                .with_remedy("move these lines to the first; each section stands once"),
            ),
        }
    }

    fn unknown_section(&mut self, at: usize) {
        let line = self.lines[at];
        let word = self.code(at).trim_end_matches(':').trim_end();
        let span = self.folded.original(line.first, line.last);
        let words = Section::ALL.iter().map(|(_, word)| *word);
        let near = nearest(word, words).and_then(Section::from_word).or_else(|| meant_section(word));
        let mut fault = Diagnostic::error(
            codes::UNKNOWN_SECTION,
            span,
            format!("`{}` opens no section", excerpt(self.code(at), 40)),
        )
        .with_text("a word alone at the start of a line opens a section")
        .with_note(format!("sections are: {}", Section::ALL.map(|(_, word)| word).join(", ")));
        if let Some(section) = near {
            fault = fault.with_remedy(format!("write `{}`", section.word()));
        }
        self.diagnostics.push(fault);
        // The lines under it are read as what was likely meant, so that their faults show too.
        self.home = near.map_or(Home::Unknown, Home::Section);
        if let Some(section) = near
            && !self.cut.sections.iter().any(|mark| mark.section == section)
        {
            self.cut.sections.push(SectionMark { section, span });
        }
    }

    /// Takes the statement that begins at a line, with the lines on which it goes on.
    fn statement(&mut self, from: usize) -> usize {
        let mut open: Vec<usize> = Vec::new();
        let mut broken = false;
        let mut at = from;
        let mut too_deep = false;
        loop {
            broken |= self.brackets(at, &mut open);
            too_deep = too_deep || open.len() > DEEPEST;
            match self.next_line(at, open.is_empty()) {
                Some(next) if !too_deep => at = next,
                _ => break,
            }
        }
        if too_deep {
            // Reported when the statement is scanned: brackets that are closed again are no fault of cutting.
            self.push(from, at, broken);
            return at + 1;
        }
        let Some(&first_open) = open.first() else {
            self.push(from, at, broken);
            return at + 1;
        };
        self.report_open(first_open, at);
        let faulty = (from..=at).find(|&line| self.lines[line].end >= first_open).unwrap_or(at);
        self.push(from, faulty, true);
        self.after_indented(faulty, self.lines[from])
    }

    /// The first line after one that is not indented deeper than where the statement began.
    fn after_indented(&self, line: usize, from: Line) -> usize {
        let depth = from.first - from.start;
        let deeper = |line: &Line| line.is_blank() || line.first - line.start > depth;
        line + 1 + self.lines[line + 1..].iter().take_while(|line| deeper(line)).count()
    }

    fn push(&mut self, from: usize, to: usize, broken: bool) {
        let (start, end) = (self.lines[from].first, self.lines[to].last);
        self.cut.statements.push(Statement { home: self.home, start, end, broken });
    }

    /// Follows the brackets of a line; tells whether one closes what was not open.
    fn brackets(&mut self, at: usize, open: &mut Vec<usize>) -> bool {
        let first = self.lines[at].first;
        let mut quoted = false;
        let mut stray = None;
        for (offset, letter) in self.code(at).bytes().enumerate() {
            match letter {
                b'"' => quoted = !quoted,
                b'(' if !quoted => open.push(first + offset),
                b')' if !quoted && open.pop().is_none() => stray = stray.or(Some(first + offset)),
                _ => {}
            }
        }
        if let Some(place) = stray {
            let span = self.folded.original(place, place + 1);
            self.diagnostics.push(
                Diagnostic::error(codes::STRAY_BRACKET, span, "this bracket closes none that is open")
                    .with_text("no `(` before it")
                    .with_remedy("remove it, or open one before it"),
            );
        }
        stray.is_some()
    }

    fn report_open(&mut self, place: usize, last: usize) {
        let span = self.folded.original(place, place + 1);
        let end = self.lines[last].last;
        self.diagnostics.push(
            Diagnostic::error(codes::OPEN_BRACKET, span, "this bracket is never closed")
                .with_text("opened here")
                .with_label(self.folded.original(end, end), "the section or the file ends here")
                .with_remedy("close it with `)`"),
        );
    }

    /// The line on which a statement goes on after a line, if it does.
    fn next_line(&self, at: usize, balanced: bool) -> Option<usize> {
        let next = (at + 1..self.lines.len()).find(|&next| !self.lines[next].is_blank())?;
        if Section::from_word(self.code(next)).is_some() {
            return None;
        }
        let goes_on = !balanced || ends_open(self.code(at)) || begins_with_operator(self.code(next));
        goes_on.then_some(next)
    }
}

/// Whether a line holds one word and nothing else but perhaps a colon.
fn is_lone_word(code: &str) -> bool {
    let word = code.trim_end_matches(':').trim_end();
    !word.is_empty()
        && word != "model"
        && word.chars().all(|letter| letter.is_alphanumeric() || letter == '_' || letter == '-')
}

/// Sections by the words that others would use.
fn meant_section(word: &str) -> Option<Section> {
    Some(match word.to_lowercase().as_str() {
        "grid" | "domain" | "axis" | "mesh" | "space" => Section::Axes,
        "parameters" | "parameter" | "constant" => Section::Constants,
        "coefficient" => Section::Coefficients,
        "variables" | "unknowns" | "field" => Section::Fields,
        "operator" => Section::Operators,
        "equation" | "pde" => Section::Equations,
        "boundary" | "initial" | "boundaries" | "condition" => Section::Conditions,
        "order" | "precision" => Section::Accuracy,
        "times" => Section::Time,
        "outputs" | "results" => Section::Output,
        "verify" => Section::Verification,
        _ => return None,
    })
}

/// Whether a line ends such that its statement must go on.
fn ends_open(code: &str) -> bool {
    code.ends_with(['+', '-', '*', '·', '/', '^', '=', '<', '>', '≤', '≥', ',', ':', 'Δ', '∇', '∂'])
}

/// Whether a line begins with an operator that stands between two operands.
fn begins_with_operator(code: &str) -> bool {
    code.starts_with(['+', '-', '*', '·', '/', '^', '=', '<', '>', '≤', '≥'])
}

#[cfg(test)]
mod tests {
    use super::super::fold::fold;
    use super::*;

    fn cut_of(text: &str) -> (Vec<String>, Diagnostics) {
        let mut diagnostics = Diagnostics::new();
        let folded = fold(text, &mut diagnostics);
        let cut = cut(&folded, &mut diagnostics);
        (cut.statements.iter().map(|one| folded.text[one.start..one.end].to_string()).collect(), diagnostics)
    }

    #[test]
    fn statements_go_on_where_they_must() {
        let (statements, faults) =
            cut_of("equations\n a = b +  # more\n\n c\n d = e\n  - f\n g = h(1,\n 2)\n i =\n j");
        assert_eq!(statements.len(), 4, "{statements:?}");
        assert!(faults.is_empty());
    }

    #[test]
    fn an_open_bracket_is_reported_once_and_hides_nothing() {
        let (statements, faults) = cut_of("constants\n  a = (1\n  b = 2)\n  c = 3\nfields\n  u on x");
        assert_eq!(statements, ["a = (1\n  b = 2)", "c = 3", "u on x"]);
        assert!(faults.is_empty());
        let (statements, faults) =
            cut_of("axes\n  x: 0 to (1, 9 nodes\n  y: 0 to 1, 9 nodes\nfields\n  u on x");
        assert_eq!(statements, ["x: 0 to (1, 9 nodes", "y: 0 to 1, 9 nodes", "u on x"]);
        assert!(faults.len() == 1 && faults.has(codes::OPEN_BRACKET));
    }

    #[test]
    fn section_words_are_told_from_misspelt_ones() {
        let (_, faults) = cut_of("constnats\n  k = 1\nboundary\nTime:\nqwerty\ntime\n  s\n");
        assert_eq!(faults.iter().filter(|fault| fault.code == codes::UNKNOWN_SECTION).count(), 4);
        assert!(faults.iter().any(|fault| fault.remedy.as_deref() == Some("write `constants`")));
        assert!(faults.iter().any(|fault| fault.remedy.as_deref() == Some("write `conditions`")));
    }

    #[test]
    fn brackets_in_texts_and_comments_do_not_count() {
        let (statements, faults) = cut_of("constants\n  a = 1 \"(\" # (\n  b = 2");
        assert_eq!(statements.len(), 2);
        assert!(faults.is_empty());
    }
}
