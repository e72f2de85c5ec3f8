//! From syntax to a checked model: names, units, explicit equations, conditions, and everything a model must say.
//!
//! All faults are reported in one go; a statement with a fault is left out and the rest is checked as if it were not there. Nothing
//! here derives weights.

mod apply;
pub mod conditions;
mod declare;
mod derive;
mod equation;
mod formula;
mod output;
mod place;
mod plan;
pub mod raw;
mod scope;
mod size;
mod units;
mod vector;
mod verification;
pub mod warnings;

use crate::diagnostic::{Diagnostic, Diagnostics, codes_check};
use crate::model::{AxisId, Coefficient, Dimension, FoldedConstant, FreeConstant, Model};
use crate::source::{SourceFile, Span};
use crate::syntax::tree::{ModelFile, Section};
use scope::Scope;
use std::collections::HashSet;

/// Bytes of stack for a check: formulas are read by descent, as deep as [`size`] allows, on whatever thread a caller has.
const STACK: usize = 32 << 20;

/// Checks a parsed file. The model is there only when nothing is wrong with it.
pub fn check(file: &ModelFile, source: &SourceFile) -> (Option<Model>, Diagnostics) {
    std::thread::scope(|scope| {
        let roomy = std::thread::Builder::new().stack_size(STACK);
        match roomy.spawn_scoped(scope, || check_here(file, source)) {
            Ok(thread) => thread.join().unwrap_or_else(|panic| std::panic::resume_unwind(panic)),
            Err(_) => check_here(file, source),
        }
    })
}

fn check_here(file: &ModelFile, source: &SourceFile) -> (Option<Model>, Diagnostics) {
    if file.header.is_none() && file.sections.is_empty() && file.faulty.is_empty() {
        // Nothing could be read, and the parser has said so.
        return (None, Diagnostics::new());
    }
    let mut checker = Checker {
        file,
        source,
        diagnostics: Diagnostics::new(),
        scope: Scope::default(),
        resolving: Vec::new(),
        free: Vec::new(),
        folded: Vec::new(),
        coefficients: Vec::new(),
        time_dimension: None,
        whole_time: None,
        sizes: Vec::new(),
        free_sizes: Vec::new(),
        growth: 0,
        nesting: 0,
        failed: HashSet::new(),
        applied: HashSet::new(),
        normal: None,
    };
    let model = checker.model();
    let mut diagnostics = checker.diagnostics;
    let Some((mut model, raw)) = model.filter(|_| !diagnostics.has_errors()) else {
        return (None, diagnostics);
    };
    model.conditions = conditions::classify(&model, raw, &mut diagnostics);
    if diagnostics.has_errors() {
        return (None, diagnostics);
    }
    warnings::warn(&model, &mut diagnostics);
    if diagnostics.has_errors() {
        return (None, diagnostics);
    }
    (Some(model), diagnostics)
}

/// The state of a check.
struct Checker<'a> {
    file: &'a ModelFile,
    source: &'a SourceFile,
    diagnostics: Diagnostics,
    scope: Scope,
    /// Constants and coefficients that are being resolved, for cycles.
    resolving: Vec<scope::Kind>,
    free: Vec<FreeConstant>,
    folded: Vec<FoldedConstant>,
    coefficients: Vec<Coefficient>,
    /// What has a fault of its own that was told: uses of it are no second fault.
    failed: HashSet<scope::Kind>,
    /// Operators that some formula uses.
    applied: HashSet<usize>,
    /// One for each coefficient, those it uses put in.
    sizes: Vec<size::Size>,
    /// The same of the free constants.
    free_sizes: Vec<size::Size>,
    /// Parts that were put into formulas so far.
    growth: u64,
    /// How deep the formula that is being read stands.
    nesting: usize,
    /// The unit of `t`, as the time section has it; nothing where it is not known.
    time_dimension: Option<Dimension>,
    /// The length of the time interval, where it is sound.
    whole_time: Option<crate::model::Expression>,
    /// The axis that a condition is normal to, and its unit, while the condition is read.
    normal: Option<(AxisId, Option<Dimension>)>,
}

impl Checker<'_> {
    fn model(&mut self) -> Option<(Model, Vec<raw::RawCondition>)> {
        self.scope = Scope::declare(self.file, &mut self.diagnostics);
        self.require_sections();
        self.find_time_dimension();
        let axes = self.axes();
        let fields = self.fields();
        self.resolve_all();
        let equations = self.equations();
        let initial = self.initial_conditions(&equations);
        let raw = self.face_conditions();
        let accuracy = self.accuracy();
        let time = self.time();
        let outputs = self.outputs(&axes, &fields);
        let verification = self.verification();
        self.unused_operators();
        self.bounded_axes(&axes, &equations, &outputs);
        self.rates_in_outputs(&equations, &outputs);
        let header = self.file.header.as_ref();
        let model = Model {
            name: header.map_or_else(|| "model".to_owned(), |header| header.name.text.clone()),
            title: header
                .and_then(|header| header.title.as_ref())
                .map_or_else(String::new, |title| title.text.clone()),
            axes: axes?,
            free_constants: std::mem::take(&mut self.free),
            folded_constants: std::mem::take(&mut self.folded),
            coefficients: std::mem::take(&mut self.coefficients),
            fields: fields?,
            equations: equations?,
            conditions: Vec::new(),
            initial: initial?,
            accuracy: accuracy?,
            time: time?,
            outputs: outputs?,
            verification: verification?,
        };
        Some((model, raw?))
    }

    /// Sections without which there is no model. A section with a faulty statement is not missing.
    fn require_sections(&mut self) {
        if self.file.header.is_none() && self.file.sections.is_empty() && self.file.faulty.is_empty() {
            // Nothing could be read, and the parser has said why.
            return;
        }
        let needed: [(Section, &str); 6] = [
            (Section::Axes, "x: 0 m to 1 m, 41 nodes"),
            (Section::Fields, "T in K on x"),
            (Section::Equations, "∂T/∂t = D * ∂²T/∂x²"),
            (Section::Conditions, "at t = start: T = 290 K"),
            (Section::Accuracy, "order 4"),
            (Section::Time, "0 s to 60 s, then `method rk4` and `step 0.9 of limit` on lines of their own"),
        ];
        for (section, example) in needed {
            if self.file.section(section).is_none() {
                let span = self.end();
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::SECTION_MISSING,
                        span,
                        format!("the model has no section `{}`", section.word()),
                    )
                    .with_remedy(format!(
                        "add the line `{}` and below it, for example: {example}",
                        section.word()
                    )),
                );
            }
        }
    }

    /// The end of the file: where something missing is missing.
    fn end(&self) -> Span {
        let length = self.source.text().trim_end().len() as u32;
        Span::new(length.saturating_sub(1), length)
    }

    /// Where a section's word stands, or the end of the file.
    fn section_span(&self, section: Section) -> Span {
        self.file.section(section).unwrap_or_else(|| self.end())
    }

    /// Whether a statement of the section could not be read.
    fn has_faulty(&self, section: Section) -> bool {
        self.file.faulty.iter().any(|faulty| faulty.section == Some(section))
    }

    /// Something that may be said once.
    fn stated_twice(&mut self, span: Span, first: Span, what: &str) {
        self.diagnostics.push(
            Diagnostic::error(codes_check::STATED_TWICE, span, format!("{what} is stated twice"))
                .with_text("stated again here")
                .with_label(first, "first stated here")
                .with_remedy("leave one of them out"),
        );
    }

    /// Something that is understood and comes later.
    fn not_yet(&mut self, span: Span, what: &str, remedy: &str) {
        self.diagnostics.push(
            Diagnostic::error(codes_check::NOT_AVAILABLE_YET, span, format!("{what} is not available yet"))
                .with_remedy(remedy.to_owned()),
        );
    }
}
