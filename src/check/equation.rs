//! Equations: one for each field, linear in its highest time derivative, brought to explicit form.

use std::collections::BTreeSet;

use super::Checker;
use super::formula::Place;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::model::expression::{DerivativeKind, factors, terms};
use crate::model::{self, AxisId, Equation, Expression, FieldId, TimeOrder};
use crate::source::Span;
use crate::syntax::tree::Section;

/// A converted equation, both sides on the left: Σ = 0.
struct Read {
    terms: Expression,
    span: Span,
}

impl Checker<'_> {
    /// Explicit equations in the order of the fields.
    pub(super) fn equations(&mut self) -> Option<Vec<Equation>> {
        let file = self.file;
        let mut read = Vec::new();
        let mut sound = !self.has_faulty(Section::Equations);
        for equation in &file.equations {
            let (left, right) = (
                self.formula(&equation.left, Place::Equation),
                self.formula(&equation.right, Place::Equation),
            );
            let (Some(left), Some(right)) = (left, right) else {
                sound = false;
                continue;
            };
            if let (Some(a), Some(b)) = (&left.dimension, &right.dimension)
                && a != b
            {
                let (a, b) = (a.clone(), b.clone());
                self.mismatch(equation.right.span, &b, equation.left.span, &a, "the sides of an equation");
                sound = false;
                continue;
            }
            let whole = Expression::sum(
                terms(left.value).into_iter().chain(terms(right.value).into_iter().map(Expression::negative)),
            );
            read.push(Read { terms: whole, span: equation.span });
        }
        let second: BTreeSet<FieldId> = read.iter().flat_map(|one| second_rates(&one.terms)).collect();
        let mut found: Vec<Option<Equation>> = vec![None; file.fields.len()];
        for one in read {
            let Some(equation) = self.explicit(&one, &second) else {
                sound = false;
                continue;
            };
            let place = &mut found[equation.field.0];
            if let Some(first) = place {
                let (span, name) = (first.span, file.fields[equation.field.0].name.text.clone());
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::SECOND_EQUATION,
                        equation.span,
                        format!("`{name}` has two equations"),
                    )
                    .with_text("the second one")
                    .with_label(span, "the first one")
                    .with_remedy("leave one out, or write it for the field that it belongs to"),
                );
                sound = false;
            } else {
                *place = Some(equation);
            }
        }
        if sound && file.section(Section::Equations).is_some() {
            for (field, equation) in file.fields.iter().zip(&found) {
                if equation.is_none() {
                    self.diagnostics.push(
                        Diagnostic::error(
                            codes_check::NO_EQUATION,
                            field.name.span,
                            format!("no equation says how `{}` changes", field.name.text),
                        )
                        .with_remedy(format!(
                            "add one with ∂{0}/∂t or ∂²{0}/∂t² to the section `equations`",
                            field.name.text
                        )),
                    );
                }
            }
        }
        sound.then_some(())?;
        found.into_iter().collect()
    }

    fn explicit(&mut self, one: &Read, second: &BTreeSet<FieldId>) -> Option<Equation> {
        let (field, order) = self.highest(one, second)?;
        let marker = match order {
            TimeOrder::First => Expression::Rate(field),
            TimeOrder::Second => Expression::SecondRate(field),
        };
        let name = self.file.fields[field.0].name.text.clone();
        let Some((coefficient, rest)) = linear(&one.terms, &marker) else {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::NOT_LINEAR_IN_RATE,
                    one.span,
                    format!("the equation is not linear in the highest time derivative of `{name}`"),
                )
                .with_remedy("bring it to a form where that derivative is only multiplied by something"),
            );
            return None;
        };
        if coefficient.is_zero() {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::NOT_LINEAR_IN_RATE,
                    one.span,
                    format!("the time derivative of `{name}` cancels out"),
                )
                .with_text("what multiplies it is exactly zero"),
            );
            return None;
        }
        if coefficient.any(&|node| {
            matches!(node, Expression::Derivative(_) | Expression::Rate(_) | Expression::SecondRate(_))
        }) {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::NOT_LINEAR_IN_RATE,
                    one.span,
                    format!("what multiplies the time derivative of `{name}` holds another derivative"),
                )
                .with_remedy("divide by it on paper, or name the derivative as a field of its own"),
            );
            return None;
        }
        let foreign = rates(&rest).into_iter().find(|other| !second.contains(other));
        if let Some(other) = foreign {
            let other = &self.file.fields[other.0].name.text;
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::RATE_ON_RIGHT,
                    one.span,
                    format!("the equation of `{name}` also holds ∂{other}/∂t, which is not known before its own equation is solved"),
                )
                .with_remedy(format!("put the right side of the equation of `{other}` in its place")),
            );
            return None;
        }
        let right = Expression::sum(terms(rest).into_iter().map(Expression::negative));
        Some(Equation { field, order, right: right.over(coefficient), span: one.span })
    }

    /// The field whose equation this is.
    fn highest(&mut self, one: &Read, second: &BTreeSet<FieldId>) -> Option<(FieldId, TimeOrder)> {
        let accelerations = second_rates(&one.terms);
        let speeds: BTreeSet<FieldId> =
            rates(&one.terms).into_iter().filter(|field| !second.contains(field)).collect();
        let names = |fields: &BTreeSet<FieldId>| -> Vec<String> {
            fields.iter().map(|field| format!("`{}`", self.file.fields[field.0].name.text)).collect()
        };
        let (fields, order) = if accelerations.is_empty() {
            (speeds, TimeOrder::First)
        } else {
            (accelerations, TimeOrder::Second)
        };
        let mut each = fields.iter();
        match (each.next(), each.next()) {
            (Some(field), None) => Some((*field, order)),
            (None, _) => {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::NO_TIME_DERIVATIVE,
                        one.span,
                        "the equation has no time derivative",
                    )
                    .with_text("expected ∂/∂t or ∂²/∂t² of one field")
                    .with_remedy(
                        "steady equations are not solved here: let the field evolve until it is steady",
                    ),
                );
                None
            }
            _ => {
                let list = names(&fields).join(" and ");
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::TWO_TIME_DERIVATIVES,
                        one.span,
                        format!(
                            "the equation holds the time derivatives of {list}, so it belongs to neither"
                        ),
                    )
                    .with_remedy(
                        "combine the equations so that each holds the highest time derivative of one field",
                    ),
                );
                None
            }
        }
    }

    /// What only periodic axes offer so far: third and fourth derivatives, and derivatives of derivatives that are no second derivative.
    pub(super) fn bounded_axes(
        &mut self,
        axes: &Option<Vec<model::Axis>>,
        equations: &Option<Vec<Equation>>,
        outputs: &Option<Vec<model::Output>>,
    ) {
        let Some(axes) = axes else { return };
        for output in outputs.iter().flatten() {
            let mut found: Vec<AxisId> = Vec::new();
            collect(&output.value, &mut |node| {
                if let Expression::Derivative(derivative) = node
                    && let DerivativeKind::Higher { axis, .. } = &derivative.kind
                {
                    found.push(*axis);
                }
            });
            found.retain(|axis| !axes[axis.0].periodic);
            if let Some(axis) = found.first() {
                let name = axes[axis.0].name.clone();
                self.not_yet(
                    output.span,
                    &format!("a derivative of third or higher order along `{name}`, which has boundaries,"),
                    "make the axis periodic, or leave the output out",
                );
            }
        }
        let Some(equations) = equations else { return };
        for equation in equations {
            let mut found: Vec<AxisId> = Vec::new();
            high_derivatives(&equation.right, false, &mut found);
            found.retain(|axis| !axes[axis.0].periodic);
            if let Some(axis) = found.first() {
                let name = axes[axis.0].name.clone();
                self.not_yet(
                    equation.span,
                    &format!("a derivative of third or higher order along `{name}`, which has boundaries,"),
                    "make the axis periodic",
                );
            }
        }
    }
}

impl Checker<'_> {
    /// Outputs hold rates of fields that are second order in time; the others are only known inside a step.
    pub(super) fn rates_in_outputs(
        &mut self,
        equations: &Option<Vec<Equation>>,
        outputs: &Option<Vec<model::Output>>,
    ) {
        let Some(equations) = equations else { return };
        for output in outputs.iter().flatten() {
            let first = rates(&output.value)
                .into_iter()
                .find(|field| equations.get(field.0).is_some_and(|one| one.order == TimeOrder::First));
            let Some(field) = first else { continue };
            let name = &self.file.fields[field.0].name.text;
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::RATE_ON_RIGHT,
                    output.span,
                    format!("`{}` holds ∂{name}/∂t, which is not kept between steps", output.name),
                )
                .with_text(format!("`{name}` is first order in time"))
                .with_remedy(format!("put the right side of the equation of `{name}` in its place")),
            );
        }
    }
}

fn second_rates(expression: &Expression) -> BTreeSet<FieldId> {
    let mut found = BTreeSet::new();
    collect(expression, &mut |node| {
        if let Expression::SecondRate(field) = node {
            found.insert(*field);
        }
    });
    found
}

fn rates(expression: &Expression) -> BTreeSet<FieldId> {
    let mut found = BTreeSet::new();
    collect(expression, &mut |node| {
        if let Expression::Rate(field) = node {
            found.insert(*field);
        }
    });
    found
}

fn collect(expression: &Expression, visit: &mut dyn FnMut(&Expression)) {
    visit(expression);
    for child in expression.children() {
        collect(child, visit);
    }
}

/// expression = coefficient·marker + rest, without expanding anything else.
fn linear(expression: &Expression, marker: &Expression) -> Option<(Expression, Expression)> {
    let holds = |part: &Expression| part.any(&|node| node == marker);
    if expression == marker {
        return Some((Expression::one(), Expression::zero()));
    }
    if !holds(expression) {
        return Some((Expression::zero(), expression.clone()));
    }
    match expression {
        Expression::Sum(items) => {
            let mut coefficients = Vec::new();
            let mut rest = Vec::new();
            for item in items {
                let (coefficient, remainder) = linear(item, marker)?;
                coefficients.push(coefficient);
                rest.push(remainder);
            }
            Some((Expression::sum(coefficients), Expression::sum(rest)))
        }
        Expression::Product(_) => {
            let (with, without): (Vec<_>, Vec<_>) =
                factors(expression.clone()).into_iter().partition(|part| holds(part));
            let [single] = with.as_slice() else { return None };
            let (coefficient, rest) = linear(single, marker)?;
            let scale = |part: Expression| Expression::product(without.iter().cloned().chain([part]));
            Some((scale(coefficient), if rest.is_zero() { rest } else { scale(rest) }))
        }
        Expression::Quotient(above, below) if !holds(below) => {
            let (coefficient, rest) = linear(above, marker)?;
            Some((
                coefficient.over((**below).clone()),
                if rest.is_zero() { rest } else { rest.over((**below).clone()) },
            ))
        }
        _ => None,
    }
}

/// Axes along which more than two derivatives act on each other.
fn high_derivatives(expression: &Expression, inside: bool, found: &mut Vec<AxisId>) {
    let mut deeper = inside;
    if let Expression::Derivative(derivative) = expression {
        match &derivative.kind {
            DerivativeKind::Higher { axis, .. } => found.push(*axis),
            DerivativeKind::First { axis, of } => {
                if of.any(&|node| matches!(node, Expression::Derivative(_))) || inside {
                    found.push(*axis);
                }
            }
            DerivativeKind::Second { axis, of, .. } => {
                if of.any(&|node| matches!(node, Expression::Derivative(_))) || inside {
                    found.push(*axis);
                }
            }
            DerivativeKind::Mixed { outer, inner, of, .. } => {
                if of.any(&|node| matches!(node, Expression::Derivative(_))) || inside {
                    found.extend([*outer, *inner]);
                }
            }
        }
        deeper = true;
    }
    for child in expression.children() {
        high_derivatives(child, deeper, found);
    }
}
