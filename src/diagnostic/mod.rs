//! Diagnostics: what is wrong with a model, where, what was expected, and the remedy.
//!
//! Holds the facts of a diagnostic, the registry of codes ([`codes`], [`codes_check`]), their rendering for
//! people ([`terminal`]) and programs ([`json`]) and the search for a nearest name ([`nearest`]). It decides
//! nothing about models.

pub mod code;
pub mod codes;
pub mod codes_check;
pub mod codes_conditions;
pub mod codes_scheme;
pub mod json;
pub mod nearest;
pub mod safe;
pub mod terminal;

pub use code::{Code, Entry};

use crate::source::Span;

/// How bad it is.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Severity {
    /// Nothing is emitted.
    Error,
    /// The model is well formed but likely not what was meant.
    Warning,
}

impl Severity {
    /// The word in messages and in JSON.
    pub fn word(self) -> &'static str {
        match self {
            Severity::Error => "error",
            Severity::Warning => "warning",
        }
    }
}

/// Whether a label marks the place of the fault or one that explains it.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Rank {
    Primary,
    Secondary,
}

/// A marked place in the source.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Label {
    pub span: Span,
    pub text: String,
    pub rank: Rank,
}

/// One fault or warning. The first label is the primary one.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Diagnostic {
    pub code: Code,
    pub severity: Severity,
    pub message: String,
    pub labels: Vec<Label>,
    pub notes: Vec<String>,
    pub remedy: Option<String>,
}

impl Diagnostic {
    /// A fault at a place. The label says what was expected there; it may be empty.
    pub fn error(code: Code, span: Span, message: impl Into<String>) -> Diagnostic {
        Diagnostic::new(code, Severity::Error, span, message.into())
    }

    /// A warning at a place.
    pub fn warning(code: Code, span: Span, message: impl Into<String>) -> Diagnostic {
        Diagnostic::new(code, Severity::Warning, span, message.into())
    }

    fn new(code: Code, severity: Severity, span: Span, message: String) -> Diagnostic {
        let label = Label { span, text: String::new(), rank: Rank::Primary };
        Diagnostic { code, severity, message, labels: vec![label], notes: Vec::new(), remedy: None }
    }

    /// Sets the text under the primary place: what was expected, or what was found.
    pub fn with_text(mut self, text: impl Into<String>) -> Diagnostic {
        if let Some(label) = self.labels.first_mut() {
            label.text = text.into();
        }
        self
    }

    /// Marks one more place.
    pub fn with_label(mut self, span: Span, text: impl Into<String>) -> Diagnostic {
        self.labels.push(Label { span, text: text.into(), rank: Rank::Secondary });
        self
    }

    /// Adds a remark.
    pub fn with_note(mut self, note: impl Into<String>) -> Diagnostic {
        self.notes.push(note.into());
        self
    }

    /// Says what to do.
    pub fn with_remedy(mut self, remedy: impl Into<String>) -> Diagnostic {
        self.remedy = Some(remedy.into());
        self
    }

    /// The place of the fault.
    pub fn span(&self) -> Span {
        self.labels.first().map_or_else(Span::default, |label| label.span)
    }
}

/// All faults and warnings of a file, in the order of their places. Equal ones are kept once.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Diagnostics {
    sorted: Vec<Diagnostic>,
}

impl Diagnostics {
    /// None.
    pub fn new() -> Diagnostics {
        Diagnostics::default()
    }

    /// Adds one at its place in the order.
    pub fn push(&mut self, diagnostic: Diagnostic) {
        let key = order(&diagnostic);
        let first = self.sorted.partition_point(|known| order(known) < key);
        let last = self.sorted.partition_point(|known| order(known) <= key);
        if !self.sorted[first..last].contains(&diagnostic) {
            self.sorted.insert(last, diagnostic);
        }
    }

    /// Adds all of another collection.
    pub fn append(&mut self, other: Diagnostics) {
        self.extend(other);
    }

    /// Whether there is none, not even a warning.
    pub fn is_empty(&self) -> bool {
        self.sorted.is_empty()
    }

    /// How many faults and warnings.
    pub fn len(&self) -> usize {
        self.sorted.len()
    }

    /// Whether one of them is an error.
    pub fn has_errors(&self) -> bool {
        self.iter().any(|diagnostic| diagnostic.severity == Severity::Error)
    }

    /// Whether one of them has the code.
    pub fn has(&self, code: Code) -> bool {
        self.iter().any(|diagnostic| diagnostic.code == code)
    }

    /// In the order of their places.
    pub fn iter(&self) -> std::slice::Iter<'_, Diagnostic> {
        self.sorted.iter()
    }
}

/// By place, then code; a total order on what differs is not needed, as insertion keeps ties in order.
fn order(diagnostic: &Diagnostic) -> (Span, &'static str) {
    (diagnostic.span(), diagnostic.code.as_str())
}

impl Extend<Diagnostic> for Diagnostics {
    fn extend<I: IntoIterator<Item = Diagnostic>>(&mut self, diagnostics: I) {
        for diagnostic in diagnostics {
            self.push(diagnostic);
        }
    }
}

impl FromIterator<Diagnostic> for Diagnostics {
    fn from_iter<I: IntoIterator<Item = Diagnostic>>(diagnostics: I) -> Diagnostics {
        let mut collected = Diagnostics::new();
        collected.extend(diagnostics);
        collected
    }
}

impl From<Diagnostic> for Diagnostics {
    fn from(diagnostic: Diagnostic) -> Diagnostics {
        Diagnostics { sorted: vec![diagnostic] }
    }
}

impl IntoIterator for Diagnostics {
    type Item = Diagnostic;
    type IntoIter = std::vec::IntoIter<Diagnostic>;
    fn into_iter(self) -> Self::IntoIter {
        self.sorted.into_iter()
    }
}

impl<'a> IntoIterator for &'a Diagnostics {
    type Item = &'a Diagnostic;
    type IntoIter = std::slice::Iter<'a, Diagnostic>;
    fn into_iter(self) -> Self::IntoIter {
        self.sorted.iter()
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn faults_come_in_the_order_of_their_places_and_once() {
        let at = |start| Diagnostic::error(codes::UNEXPECTED, Span::new(start, start + 1), "m");
        let all: Diagnostics = [at(5), at(1), at(5), at(3)].into_iter().collect();
        let places: Vec<u32> = all.iter().map(|diagnostic| diagnostic.span().start).collect();
        assert_eq!(places, [1, 3, 5]);
        assert!(all.has_errors() && all.has(codes::UNEXPECTED) && !all.has(codes::NOT_UTF8));
    }
}
