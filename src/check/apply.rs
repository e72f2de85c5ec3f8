//! Named operators in formulas: their bodies with the parameters put in.

use super::Checker;
use super::formula::{Bound, Place};
use super::scope::{Kind, Typed};
use crate::diagnostic::{Diagnostic, codes_check};
use crate::source::Span;
use crate::syntax::tree;

impl Checker<'_> {
    pub(super) fn apply(
        &mut self,
        operator: &tree::Name,
        arguments: &[tree::Expression],
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        let index = match self.scope.kind(&operator.text) {
            Some(Kind::Operator(index)) => index,
            Some(Kind::Faulty) => return None,
            None => {
                self.scope.unknown(&operator.text, operator.span, &mut self.diagnostics);
                return None;
            }
            Some(kind) => return self.not_an_operator(operator, kind),
        };
        let file = self.file;
        let declared = &file.operators[index];
        self.applied.insert(index);
        if declared.parameters.len() != arguments.len() {
            let parameters: Vec<&str> = declared.parameters.iter().map(|name| name.text.as_str()).collect();
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::OPERATOR_ARGUMENTS,
                    operator.span,
                    format!(
                        "`{}` takes {} and is given {}",
                        operator.text,
                        declared.parameters.len(),
                        arguments.len()
                    ),
                )
                .with_text(format!("expected `{}({})`", operator.text, parameters.join(", ")))
                .with_label(declared.name.span, "declared here"),
            );
            return None;
        }
        let mut inner = Bound { order: bound.order, ..Bound::default() };
        for (parameter, argument) in declared.parameters.iter().zip(arguments) {
            let typed = self.convert(argument, place, bound)?;
            inner.parameters.push((parameter.text.clone(), typed));
        }
        self.body(index, operator.span, place, inner)
    }

    /// The value of an operator with its parameters put in.
    pub(super) fn body(&mut self, index: usize, span: Span, place: Place, mut inner: Bound) -> Option<Typed> {
        let file = self.file;
        let declared = &file.operators[index];
        self.enter(Kind::Operator(index), span)?;
        inner.order = self.operator_order(&declared.accuracy).or(inner.order);
        let typed = self.convert(&declared.value, place, &inner);
        self.resolving.pop();
        self.grow(typed?, span)
    }

    fn not_an_operator(&mut self, name: &tree::Name, kind: Kind) -> Option<Typed> {
        let remedy = match kind {
            Kind::Coefficient(_) => format!("write `{}`: a coefficient is used by its bare name", name.text),
            _ => format!("write `{} * (…)` if a product is meant", name.text),
        };
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::WRONG_KIND,
                name.span,
                format!("`{}` is {} and takes no arguments", name.text, kind.word()),
            )
            .with_text("expected a function or a named operator before the bracket")
            .with_remedy(remedy),
        );
        None
    }
}
