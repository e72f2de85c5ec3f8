//! Statements → tree, by one entry rule of the grammar for each kind of statement.
//!
//! The only user of the parser generator. Cutting, folding and scanning come before ([`super::cut`],
//! [`super::fold`], [`super::scan`]); names are looked up only where a slip in notation can be told from them.

mod derivative;
mod expression;
mod fault;
mod statement;
mod unit;

use std::collections::HashMap;
use std::num::NonZeroUsize;
use std::sync::Once;

use pest::Parser;
use pest::iterators::Pair;
use pest_derive::Parser;

use super::cut::{Cut, Home, MOST_FAULTS, Statement};
use super::fold::Folded;
use super::names::canonical;
use super::scan::scan;
use super::tree::{Expression, ExpressionKind, Faulty, ModelFile, Name, Section, Text, Whole};
use crate::diagnostic::{Code, Diagnostic, Diagnostics, codes};
use crate::exact::Rational;
use crate::source::{SourceFile, Span};

#[derive(Parser)]
#[grammar = "grammar/model.pest"]
struct Grammar;

/// Counted calls after which the parser gives up on a statement; far beyond what a statement within the bounds of
/// [`super::scan`] takes. The parser keeps it for the whole process, so it is set once and never changed.
const CALL_LIMIT: usize = 70_000_000;

/// The names that a file declares, gathered before any formula is read, each with the first section that does.
#[derive(Debug, Default)]
pub(super) struct Declared {
    names: HashMap<String, Section>,
}

impl Declared {
    fn gather(cut: &Cut, folded: &Folded) -> Declared {
        let mut names = HashMap::new();
        for statement in &cut.statements {
            if let Home::Section(section) = statement.home
                && let Some(name) = leading_name(section, &folded.text[statement.start..statement.end])
            {
                names.entry(canonical(name)).or_insert(section);
            }
        }
        Declared { names }
    }

    /// The section that declares a name.
    fn section(&self, name: &str) -> Option<Section> {
        self.names.get(name).copied()
    }
}

/// The name with which a statement of a declaring section begins.
fn leading_name(section: Section, text: &str) -> Option<&str> {
    let declares = matches!(
        section,
        Section::Axes | Section::Constants | Section::Coefficients | Section::Fields | Section::Operators
    );
    let word = declares.then(|| Grammar::parse(Rule::name, text).ok()?.next()).flatten()?;
    Some(word.as_str())
}

/// Reads all statements of a cut file.
pub(super) fn read(
    source: &SourceFile,
    folded: &Folded,
    cut: Cut,
    diagnostics: &mut Diagnostics,
) -> ModelFile {
    static LIMIT: Once = Once::new();
    LIMIT.call_once(|| pest::set_call_limit(NonZeroUsize::new(CALL_LIMIT)));

    let declared = Declared::gather(&cut, folded);
    let mut file = ModelFile { sections: cut.sections, ..ModelFile::default() };
    for (place, statement) in cut.statements.iter().enumerate() {
        if diagnostics.len() >= MOST_FAULTS {
            break;
        }
        let mut reader = Reader {
            source,
            folded,
            declared: &declared,
            offset: statement.start,
            home: statement.home,
            diagnostics,
            file: &mut file,
        };
        reader.statement(place, statement);
    }
    let tried = cut.statements.first().is_some_and(|first| is_header(&folded.text[first.start..first.end]));
    if !tried && !diagnostics.has(codes::NO_HEADER) && diagnostics.len() < MOST_FAULTS {
        let end = folded.text.find('\n').unwrap_or(folded.text.len());
        diagnostics.push(no_header(folded.original(0, end)));
    }
    if diagnostics.len() >= MOST_FAULTS {
        report_too_many(folded, diagnostics);
    }
    file
}

/// Whether a statement is (or tries to be) the first line of a file.
fn is_header(text: &str) -> bool {
    let rest = text.strip_prefix("model");
    rest.is_some_and(|rest| {
        (rest.is_empty() || rest.starts_with([' ', '"'])) && !rest.trim_start().starts_with('=')
    })
}

fn no_header(span: Span) -> Diagnostic {
    Diagnostic::error(codes::NO_HEADER, span, "the file does not begin with its name")
        .with_text("expected `model NAME \"TITLE\"` before this")
        .with_remedy("begin the file with a line such as `model vault_wall \"Temperature of a wall\"`")
}

fn report_too_many(folded: &Folded, diagnostics: &mut Diagnostics) {
    let end = folded.text.len();
    diagnostics.push(
        Diagnostic::error(
            codes::TOO_MANY_FAULTS,
            folded.original(end, end),
            format!("{MOST_FAULTS} faults or more; the rest is not read"),
        )
        .with_remedy("is this a model file?"),
    );
}

/// Reads one statement into the file.
struct Reader<'a> {
    source: &'a SourceFile,
    folded: &'a Folded,
    declared: &'a Declared,
    /// Where the statement begins in the folded text.
    offset: usize,
    home: Home,
    diagnostics: &'a mut Diagnostics,
    file: &'a mut ModelFile,
}

impl Reader<'_> {
    fn statement(&mut self, place: usize, statement: &Statement) {
        let raw = &self.folded.text[statement.start..statement.end];
        let text = blanked(raw);
        if is_header(&text) {
            if place == 0 {
                return self.read(Rule::header, &text, statement);
            }
            let span = self.folded.original(statement.start, statement.end);
            let remedy = "make it the first line, and the only one of its kind";
            let message = "the model's name stands on the first line of the file";
            self.diagnostics.push(Diagnostic::error(codes::NO_HEADER, span, message).with_remedy(remedy));
            return self.faulty(statement);
        }
        match statement.home {
            Home::Section(section) => self.read(entry_rule(section), &text, statement),
            Home::Unknown => self.faulty(statement),
            Home::Top => {
                self.report_outside(place, statement);
                self.faulty(statement);
            }
        }
    }

    fn report_outside(&mut self, place: usize, statement: &Statement) {
        let span = self.folded.original(statement.start, statement.end);
        if place == 0 && self.file.header.is_none() {
            self.diagnostics.push(no_header(span));
        } else if !self.diagnostics.has(codes::OUTSIDE_SECTION) {
            self.diagnostics.push(
                Diagnostic::error(codes::OUTSIDE_SECTION, span, "this statement stands in no section")
                    .with_text("before the first section word")
                    .with_remedy(
                        "put a section word alone on a line above it, such as `axes` or `constants`",
                    ),
            );
        }
    }

    fn read(&mut self, rule: Rule, text: &str, statement: &Statement) {
        let known = self.diagnostics.len();
        let (start, end) = (statement.start as u32, statement.end as u32);
        let refused = self.folded.refused.iter().any(|&at| start <= at && at < end.max(start + 1));
        let sound = scan(text, statement.start, self.folded, self.diagnostics);
        if statement.broken || refused || !sound {
            return self.faulty(statement);
        }
        match Grammar::parse(rule, text) {
            Err(error) => {
                let fault = fault::diagnostic(&error, rule, text, self.offset, self.folded);
                self.diagnostics.push(fault);
                self.faulty(statement);
            }
            Ok(mut pairs) => {
                let Some(pair) = pairs.next() else { return };
                let mark = self.file.clone_lengths();
                self.entry(rule, pair, self.folded.original(statement.start, statement.end));
                if self.diagnostics.len() > known {
                    self.file.truncate(&mark);
                    self.faulty(statement);
                }
            }
        }
    }

    fn faulty(&mut self, statement: &Statement) {
        let section = match statement.home {
            Home::Section(section) => Some(section),
            _ => None,
        };
        let text = &self.folded.text[statement.start..statement.end];
        let declares = section.and_then(|section| leading_name(section, text)).map(|name| Name {
            text: canonical(name),
            span: self.folded.original(statement.start, statement.start + name.len()),
        });
        let span = self.folded.original(statement.start, statement.end);
        self.file.faulty.push(Faulty { section, declares, span });
    }

    fn span(&self, pair: &Pair<'_, Rule>) -> Span {
        let span = pair.as_span();
        // Rules that end in something optional may have taken the blanks before it.
        let end = span.start() + pair.as_str().trim_end().len();
        self.folded.original(self.offset + span.start(), self.offset + end)
    }

    fn report(
        &mut self,
        code: Code,
        span: Span,
        message: impl Into<String>,
        text: &str,
        remedy: impl Into<String>,
    ) {
        self.diagnostics.push(Diagnostic::error(code, span, message).with_text(text).with_remedy(remedy));
    }

    fn name(&self, pair: &Pair<'_, Rule>) -> Name {
        Name { text: canonical(pair.as_str().trim_end()), span: self.span(pair) }
    }

    /// A name that a statement declares.
    fn declared_name(&mut self, pair: &Pair<'_, Rule>) -> Name {
        let name = self.name(pair);
        if let Some(reserved) = super::names::reserved(&name.text) {
            let message = format!("`{}` cannot be declared: it is {}", name.text, reserved.meaning());
            self.report(codes::RESERVED_NAME, name.span, message, "declared here", "choose another name");
        }
        name
    }

    fn names(&self, pair: Pair<'_, Rule>) -> Vec<Name> {
        pair.into_inner().filter(|part| part.as_rule() == Rule::name).map(|part| self.name(&part)).collect()
    }

    fn text(&self, pair: &Pair<'_, Rule>) -> Text {
        let span = self.span(pair);
        let written = self.source.slice(span);
        let text = written.strip_prefix('"').unwrap_or(written);
        Text { text: text.strip_suffix('"').unwrap_or(text).to_string(), span }
    }

    fn whole(&mut self, pair: &Pair<'_, Rule>) -> Whole {
        let span = self.span(pair);
        let value = pair.as_str().parse().unwrap_or_else(|_| {
            let message = format!("`{}` is too large a whole number", pair.as_str());
            self.report(codes::NUMBER_TOO_LARGE, span, message, "", "give a number below 10¹⁸");
            0
        });
        Whole { value, span }
    }

    fn rational(&mut self, pair: &Pair<'_, Rule>) -> Rational {
        pair.as_str().parse().unwrap_or_else(|_| {
            let span = self.span(pair);
            let message = format!("`{}` cannot be kept exactly", pair.as_str());
            self.report(codes::NUMBER_TOO_LARGE, span, message, "", "choose other units");
            Rational::zero()
        })
    }
}

/// What stands for a part that is missing although the grammar asks for it: a fault of the program's, not of
/// the model, that shows as an empty formula instead of ending the program.
fn nothing(span: Span) -> Expression {
    Expression { kind: ExpressionKind::Number(Rational::zero()), span }
}

fn entry_rule(section: Section) -> Rule {
    match section {
        Section::Axes => Rule::axis,
        Section::Constants => Rule::constant,
        Section::Coefficients => Rule::coefficient,
        Section::Fields => Rule::field,
        Section::Operators => Rule::operator,
        Section::Equations => Rule::equation,
        Section::Conditions => Rule::conditions,
        Section::Accuracy => Rule::accuracy,
        Section::Time => Rule::time,
        Section::Output => Rule::output,
        Section::Verification => Rule::verification,
    }
}

/// A statement with comments and line ends replaced by as many blanks.
pub(super) fn blanked(raw: &str) -> String {
    let mut text = String::with_capacity(raw.len());
    for line in super::cut::lines(raw) {
        if line.start > 0 {
            text.push(' ');
        }
        text.push_str(&raw[line.start..line.comment]);
        text.extend(std::iter::repeat_n(' ', line.end - line.comment));
    }
    text
}

/// How many statements of each kind a file has.
struct Lengths([usize; 11]);

impl ModelFile {
    fn clone_lengths(&self) -> Lengths {
        Lengths([
            self.axes.len(),
            self.constants.len(),
            self.coefficients.len(),
            self.fields.len(),
            self.operators.len(),
            self.equations.len(),
            self.conditions.len(),
            self.accuracy.len(),
            self.time.len(),
            self.outputs.len(),
            self.verification.len(),
        ])
    }

    /// Takes back what a statement that turned out faulty has added.
    fn truncate(&mut self, lengths: &Lengths) {
        let [
            axes,
            constants,
            coefficients,
            fields,
            operators,
            equations,
            conditions,
            accuracy,
            time,
            outputs,
            verification,
        ] = lengths.0;
        self.axes.truncate(axes);
        self.constants.truncate(constants);
        self.coefficients.truncate(coefficients);
        self.fields.truncate(fields);
        self.operators.truncate(operators);
        self.equations.truncate(equations);
        self.conditions.truncate(conditions);
        self.accuracy.truncate(accuracy);
        self.time.truncate(time);
        self.outputs.truncate(outputs);
        self.verification.truncate(verification);
    }
}
