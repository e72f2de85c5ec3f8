//! Names of a model and what they stand for.

use std::collections::HashMap;

use crate::diagnostic::nearest::nearest;
use crate::diagnostic::{Diagnostic, Diagnostics, codes, codes_check};
use crate::model::{AxisId, Dimension, Expression, FieldId};
use crate::source::Span;
use crate::syntax::names::reserved;
use crate::syntax::tree::{ModelFile, Name};

/// What a name was declared as; indices are places in the lists of the file.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Kind {
    Axis(usize),
    Constant(usize),
    Coefficient(usize),
    Field(usize),
    Operator(usize),
    /// Declared in a statement that could not be read: its uses are no second fault.
    Faulty,
}

impl Kind {
    pub(super) fn word(self) -> &'static str {
        match self {
            Kind::Axis(_) => "an axis",
            Kind::Constant(_) => "a constant",
            Kind::Coefficient(_) => "a coefficient",
            Kind::Field(_) => "a field",
            Kind::Operator(_) => "an operator",
            Kind::Faulty => "a name whose declaration has a fault",
        }
    }
}

/// An expression in SI with its dimension. None is that of the literal zero, which takes any, and of what has a fault elsewhere.
#[derive(Clone, Debug)]
pub(super) struct Typed {
    pub(super) value: Expression,
    pub(super) dimension: Option<Dimension>,
}

impl Typed {
    pub(super) fn number(value: Expression) -> Typed {
        Typed { value, dimension: Some(Dimension::one()) }
    }
}

/// All names of a file.
#[derive(Debug, Default)]
pub(super) struct Scope {
    kinds: HashMap<String, (Kind, Span)>,
    /// Nothing where a fault hides it.
    pub(super) axes: Vec<Option<Dimension>>,
    pub(super) fields: Vec<Option<Dimension>>,
    /// One for each constant and coefficient, once resolved.
    pub(super) constants: Vec<Option<Typed>>,
    pub(super) coefficients: Vec<Option<Typed>>,
}

impl Scope {
    /// Declares every name of the file; second declarations and names that mean something already are reported.
    pub(super) fn declare(file: &ModelFile, diagnostics: &mut Diagnostics) -> Scope {
        let mut scope = Scope {
            constants: vec![None; file.constants.len()],
            coefficients: vec![None; file.coefficients.len()],
            ..Scope::default()
        };
        let names = (file.axes.iter().enumerate().map(|(index, item)| (&item.name, Kind::Axis(index))))
            .chain(file.constants.iter().enumerate().map(|(index, item)| (&item.name, Kind::Constant(index))))
            .chain(
                file.coefficients
                    .iter()
                    .enumerate()
                    .map(|(index, item)| (&item.name, Kind::Coefficient(index))),
            )
            .chain(file.fields.iter().enumerate().map(|(index, item)| (&item.name, Kind::Field(index))))
            .chain(file.operators.iter().enumerate().map(|(index, item)| (&item.name, Kind::Operator(index))))
            .chain(
                file.faulty.iter().filter_map(|item| item.declares.as_ref()).map(|name| (name, Kind::Faulty)),
            );
        for (name, kind) in names {
            scope.add(name, kind, diagnostics);
        }
        scope.refuse_twins(file, diagnostics);
        scope.refuse_shadows(file, diagnostics);
        scope
    }

    fn add(&mut self, name: &Name, kind: Kind, diagnostics: &mut Diagnostics) {
        if reserved(&name.text).is_some() {
            // The parser has said so.
            return;
        }
        if name.text == "n" && matches!(kind, Kind::Axis(_)) {
            diagnostics.push(
                Diagnostic::error(codes::RESERVED_NAME, name.span, "`n` cannot name an axis")
                    .with_text("∂/∂n is the derivative along the outward normal")
                    .with_remedy("give the axis another name"),
            );
        }
        if let Some((known, first)) = self.kinds.get(&name.text) {
            if *known != Kind::Faulty && kind != Kind::Faulty {
                diagnostics.push(
                    Diagnostic::error(
                        codes_check::DUPLICATE_NAME,
                        name.span,
                        format!("`{}` is declared twice", name.text),
                    )
                    .with_text("declared again here")
                    .with_label(*first, format!("first declared here, as {}", known.word()))
                    .with_remedy("give one of them another name"),
                );
            }
            return;
        }
        self.kinds.insert(name.text.clone(), (kind, name.span));
    }

    fn refuse_twins(&self, file: &ModelFile, diagnostics: &mut Diagnostics) {
        for (index, field) in file.fields.iter().enumerate() {
            let lower = field.name.text.to_lowercase();
            let twin = file.fields[..index]
                .iter()
                .find(|other| other.name.text != field.name.text && other.name.text.to_lowercase() == lower);
            if let Some(twin) = twin {
                diagnostics.push(
                    Diagnostic::error(
                        codes_check::CASE_TWINS,
                        field.name.span,
                        format!("fields `{}` and `{}` differ only in case", twin.name.text, field.name.text),
                    )
                    .with_text("too easily mistaken for the other")
                    .with_label(twin.name.span, "the other")
                    .with_remedy("rename one of them"),
                );
            }
        }
    }

    /// Parameters of operators are names like others: each means one thing.
    fn refuse_shadows(&self, file: &ModelFile, diagnostics: &mut Diagnostics) {
        for operator in &file.operators {
            for (index, parameter) in operator.parameters.iter().enumerate() {
                let twin = operator.parameters[..index].iter().find(|other| other.text == parameter.text);
                let known = self.kinds.get(&parameter.text);
                let (first, what) = match (twin, known) {
                    (Some(twin), _) => (twin.span, "another parameter"),
                    (None, Some((kind, span))) => (*span, kind.word()),
                    (None, None) => continue,
                };
                diagnostics.push(
                    Diagnostic::error(
                        codes_check::DUPLICATE_NAME,
                        parameter.span,
                        format!("`{}` is declared twice", parameter.text),
                    )
                    .with_text("as a parameter here")
                    .with_label(first, format!("first declared here, as {what}"))
                    .with_remedy("give the parameter a name of its own"),
                );
            }
        }
    }

    pub(super) fn kind(&self, name: &str) -> Option<Kind> {
        self.kinds.get(name).map(|(kind, _)| *kind)
    }

    /// The unit of length along an axis; nothing where it is not known.
    pub(super) fn length(&self, axis: AxisId) -> Option<Dimension> {
        self.axes.get(axis.0).cloned().flatten()
    }

    pub(super) fn axis(&self, name: &str) -> Option<AxisId> {
        match self.kind(name) {
            Some(Kind::Axis(index)) => Some(AxisId(index)),
            _ => None,
        }
    }

    pub(super) fn field(&self, name: &str) -> Option<FieldId> {
        match self.kind(name) {
            Some(Kind::Field(index)) => Some(FieldId(index)),
            _ => None,
        }
    }

    /// A name of one kind, or a diagnostic that says what it is instead.
    pub(super) fn expect<T>(
        &self,
        name: &Name,
        what: &str,
        found: Option<T>,
        diagnostics: &mut Diagnostics,
    ) -> Option<T> {
        if found.is_some() {
            return found;
        }
        match self.kind(&name.text) {
            Some(Kind::Faulty) => {}
            Some(kind) => diagnostics.push(
                Diagnostic::error(
                    codes_check::WRONG_KIND,
                    name.span,
                    format!("`{}` is {}, not {what}", name.text, kind.word()),
                )
                .with_text(format!("expected {what}")),
            ),
            None => self.unknown(&name.text, name.span, diagnostics),
        }
        None
    }

    /// Reports a name that is declared nowhere, with the nearest one that is.
    pub(super) fn unknown(&self, name: &str, span: Span, diagnostics: &mut Diagnostics) {
        let mut names: Vec<&str> = self.kinds.keys().map(String::as_str).chain(["t", "π"]).collect();
        names.sort_unstable();
        let mut diagnostic =
            Diagnostic::error(codes_check::UNKNOWN_NAME, span, format!("`{name}` is declared nowhere"))
                .with_text("not a name of this model");
        diagnostic = match nearest(name, names) {
            Some(near) => diagnostic.with_remedy(format!("did you mean `{near}`?")),
            None => diagnostic.with_remedy("declare it, for example under `constants`, or correct the name"),
        };
        diagnostics.push(diagnostic);
    }
}
