//! Derivatives in formulas: ∂/∂x, ∂/∂t, ∂/∂n, Δ, ∇· and ∇f·∇g. What they become is in [`super::derive`].

use super::Checker;
use super::derive::differentiate;
use super::formula::{Bound, Place};
use super::scope::Typed;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::exact::Rational;
use crate::model::{AxisId, Dimension, Expression, FieldId};
use crate::source::Span;
use crate::syntax::tree::{self, ExpressionKind, Operation, Sign};

impl Checker<'_> {
    pub(super) fn allow_spatial(&mut self, span: Span, place: Place) -> Option<()> {
        if matches!(place, Place::Output | Place::Equation) {
            return Some(());
        }
        self.misplaced(span, "a spatial derivative", place);
        None
    }

    pub(super) fn derivative(
        &mut self,
        derivative: &tree::Derivative,
        span: Span,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        let in_time: u32 = derivative.by.iter().filter(|by| by.name.text == "t").map(|by| by.power).sum();
        if in_time > 0 {
            return self.rate(derivative, in_time, span, place, bound);
        }
        if derivative.by.iter().any(|by| by.name.text == "n" && self.scope.kind("n").is_none()) {
            return self.normal(derivative, span, place, bound);
        }
        self.allow_spatial(span, place)?;
        let mut typed = self.convert(&derivative.of, place, bound)?;
        for by in derivative.by.iter().rev() {
            let axis = self.scope.axis(&by.name.text);
            let axis = self.scope.expect(&by.name, "an axis, `t` or `n`", axis, &mut self.diagnostics)?;
            for _ in 0..by.power {
                typed = self.along(axis, typed, bound);
            }
        }
        Some(typed)
    }

    fn along(&mut self, axis: AxisId, typed: Typed, bound: &Bound) -> Typed {
        let length = self.scope.length(axis);
        Typed {
            value: differentiate(axis, typed.value, bound.order, &self.coefficients),
            dimension: typed.dimension.zip(length).map(|(own, length)| own.over(&length)),
        }
    }

    fn rate(
        &mut self,
        derivative: &tree::Derivative,
        in_time: u32,
        span: Span,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        if !matches!(place, Place::Equation | Place::Condition | Place::Output) {
            return self.misplaced(span, "a rate of change", place);
        }
        if in_time != derivative.order {
            // ∂²u/∂t∂x: the rate of a field under a spatial derivative.
            let mut typed = self.rate_of(&derivative.of, in_time, span, place, bound)?;
            for by in derivative.by.iter().rev().filter(|by| by.name.text != "t") {
                let axis = self.scope.axis(&by.name.text);
                let axis = self.scope.expect(&by.name, "an axis", axis, &mut self.diagnostics)?;
                for _ in 0..by.power {
                    typed = self.along(axis, typed, bound);
                }
            }
            return Some(typed);
        }
        self.rate_of(&derivative.of, in_time, span, place, bound)
    }

    fn rate_of(
        &mut self,
        of: &tree::Expression,
        in_time: u32,
        span: Span,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        let typed = self.convert(of, place, bound)?;
        let (factor, field) = match split_field(&typed.value) {
            Some(found) => found,
            None => {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::RATE_OF_FORMULA,
                        span,
                        "the rate of change of a formula: only fields have one here",
                    )
                    .with_remedy("write the rule out, for example c * ∂T/∂t for a constant c"),
                );
                return None;
            }
        };
        let value = match in_time {
            1 => Expression::Rate(field),
            2 if place == Place::Equation => Expression::SecondRate(field),
            _ => {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::TIME_ORDER,
                        span,
                        "equations are of first or second order in time, conditions and outputs of first",
                    )
                    .with_remedy("introduce the rate as a further field with an equation of its own"),
                );
                return None;
            }
        };
        let exponent = Rational::from(i64::from(in_time));
        let duration = self.time_dimension.as_ref().map(|time| time.power(&exponent));
        Some(Typed {
            value: factor.times(value),
            dimension: typed.dimension.zip(duration).map(|(own, duration)| own.over(&duration)),
        })
    }

    fn normal(
        &mut self,
        derivative: &tree::Derivative,
        span: Span,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        if place != Place::Condition {
            return self.misplaced(span, "a normal derivative ∂/∂n", place);
        }
        if derivative.order != 1 {
            self.not_yet(
                span,
                "a condition on a higher normal derivative",
                "give the value or the first normal derivative",
            );
            return None;
        }
        let typed = self.convert(&derivative.of, place, bound)?;
        let length = self.normal_dimension.clone();
        let Some((factor, field)) = split_field(&typed.value) else {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::RATE_OF_FORMULA,
                    span,
                    "the normal derivative of a formula: only fields have one here",
                )
                .with_remedy("write the rule out"),
            );
            return None;
        };
        Some(Typed {
            value: factor.times(Expression::Normal(Box::new(Expression::Field(field)))),
            dimension: typed.dimension.zip(length).map(|(own, length)| own.over(&length)),
        })
    }

    pub(super) fn laplacian(
        &mut self,
        inner: &tree::Expression,
        span: Span,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        self.allow_spatial(span, place)?;
        let typed = self.convert(inner, place, bound)?;
        let mut parts = Vec::new();
        let mut dimension = None;
        for axis in (0..self.scope.axes.len()).map(AxisId) {
            let once = self.along(axis, typed.clone(), bound);
            let twice = self.along(axis, once, bound);
            dimension = twice.dimension;
            parts.push(twice.value);
        }
        self.same_lengths(span)?;
        Some(Typed { value: Expression::sum(parts), dimension })
    }

    /// Δ and ∇· add derivatives along all axes, whose units must agree.
    fn same_lengths(&mut self, span: Span) -> Option<()> {
        let mut known = self.scope.axes.iter().flatten();
        let Some(first) = known.next().cloned() else { return Some(()) };
        if let Some(other) = known.find(|dimension| **dimension != first).cloned() {
            self.mismatch(span, &other, span, &first, "the axes under Δ or ∇");
            return None;
        }
        Some(())
    }

    /// ∇·(flux): terms with one gradient each.
    pub(super) fn divergence(
        &mut self,
        flux: &tree::Expression,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        self.same_lengths(flux.span)?;
        match &flux.kind {
            ExpressionKind::Sum(terms) => {
                let converted: Vec<Option<Typed>> =
                    terms.iter().map(|term| self.divergence(&term.value, place, bound)).collect();
                let mut parts = Vec::new();
                let mut dimension: Option<(Dimension, Span)> = None;
                for (term, typed) in terms.iter().zip(converted) {
                    let typed = typed?;
                    if let (Some((first, span)), Some(own)) = (&dimension, &typed.dimension)
                        && first != own
                    {
                        let (first, span, own) = (first.clone(), *span, own.clone());
                        self.mismatch(term.value.span, &own, span, &first, "the terms of a flux");
                        return None;
                    }
                    if dimension.is_none() {
                        dimension = typed.dimension.clone().map(|own| (own, term.value.span));
                    }
                    parts.push(if term.sign == Sign::Minus { typed.value.negative() } else { typed.value });
                }
                Some(Typed { value: Expression::sum(parts), dimension: dimension.map(|(own, _)| own) })
            }
            ExpressionKind::Negate(inner) => {
                let typed = self.divergence(inner, place, bound)?;
                Some(Typed { value: typed.value.negative(), ..typed })
            }
            ExpressionKind::Gradient(inner) => {
                let of = self.convert(inner, place, bound)?;
                Some(self.divergence_of(&Typed::number(Expression::one()), of, bound))
            }
            ExpressionKind::Product(factors) => {
                let gradients =
                    factors.iter().filter(|factor| matches!(factor.value.kind, ExpressionKind::Gradient(_)));
                let (1, Some(gradient)) = (gradients.clone().count(), gradients.clone().next()) else {
                    return self.scalar_flux(flux.span);
                };
                let ExpressionKind::Gradient(inner) = &gradient.value.kind else { return None };
                if gradient.operation == Operation::Over {
                    return self.scalar_flux(gradient.value.span);
                }
                let mut coefficient = Typed::number(Expression::one());
                for factor in factors {
                    if matches!(factor.value.kind, ExpressionKind::Gradient(_)) {
                        continue;
                    }
                    let typed = self.convert(&factor.value, place, bound)?;
                    coefficient = Typed {
                        dimension: match (coefficient.dimension, typed.dimension, factor.operation) {
                            (Some(a), Some(b), Operation::Times) => Some(a.times(&b)),
                            (Some(a), Some(b), Operation::Over) => Some(a.over(&b)),
                            _ => None,
                        },
                        value: match factor.operation {
                            Operation::Times => coefficient.value.times(typed.value),
                            Operation::Over => coefficient.value.over(typed.value),
                        },
                    };
                }
                let of = self.convert(inner, place, bound)?;
                Some(self.divergence_of(&coefficient, of, bound))
            }
            _ => self.scalar_flux(flux.span),
        }
    }

    fn scalar_flux(&mut self, span: Span) -> Option<Typed> {
        self.diagnostics.push(
            Diagnostic::error(codes_check::VECTOR_ALONE, span, "∇· takes a vector, and this is none")
                .with_text("expected terms like k * ∇T, one gradient each")
                .with_remedy(
                    "transport by a velocity is written axis by axis: ∂/∂x(u_x * q) + ∂/∂y(u_y * q)",
                ),
        );
        None
    }

    fn divergence_of(&mut self, coefficient: &Typed, of: Typed, bound: &Bound) -> Typed {
        let mut parts = Vec::new();
        let mut dimension = None;
        for axis in (0..self.scope.axes.len()).map(AxisId) {
            let slope = self.along(axis, of.clone(), bound);
            let flux = Typed {
                value: coefficient.value.clone().times(slope.value),
                dimension: coefficient
                    .dimension
                    .as_ref()
                    .zip(slope.dimension.as_ref())
                    .map(|(a, b)| a.times(b)),
            };
            let outer = self.along(axis, flux, bound);
            dimension = outer.dimension;
            parts.push(outer.value);
        }
        Typed { value: Expression::sum(parts), dimension }
    }

    /// ∇f·∇g.
    pub(super) fn dot(
        &mut self,
        left: &tree::Expression,
        right: &tree::Expression,
        span: Span,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        self.allow_spatial(span, place)?;
        self.same_lengths(span)?;
        let (ExpressionKind::Gradient(f), ExpressionKind::Gradient(g)) = (&left.kind, &right.kind) else {
            return self.scalar_flux(span);
        };
        let (f, g) = (self.convert(f, place, bound)?, self.convert(g, place, bound)?);
        let mut parts = Vec::new();
        let mut dimension = None;
        for axis in (0..self.scope.axes.len()).map(AxisId) {
            let (a, b) = (self.along(axis, f.clone(), bound), self.along(axis, g.clone(), bound));
            dimension = a.dimension.zip(b.dimension).map(|(a, b)| a.times(&b));
            parts.push(a.value.times(b.value));
        }
        Some(Typed { value: Expression::sum(parts), dimension })
    }
}

/// factor · field, with a factor that holds no field.
fn split_field(value: &Expression) -> Option<(Expression, FieldId)> {
    match value {
        Expression::Field(field) => Some((Expression::one(), *field)),
        Expression::Product(items) => {
            let mut fields = items.iter().filter_map(|item| match item {
                Expression::Field(field) => Some(*field),
                _ => None,
            });
            let field =
                fields.next().filter(|_| items.iter().filter(|item| holds_state(item)).count() == 1)?;
            let rest = items.iter().filter(|item| !holds_state(item)).cloned();
            let rest: Vec<Expression> = rest.collect();
            // A factor that varies in time would have to be differentiated as well.
            let still = rest
                .iter()
                .all(|item| !item.any(&|node| matches!(node, Expression::Time | Expression::Coefficient(_))));
            still.then(|| (Expression::product(rest), field))
        }
        _ => None,
    }
}

fn holds_state(value: &Expression) -> bool {
    value.any(&|node| {
        matches!(
            node,
            Expression::Field(_) | Expression::Rate(_) | Expression::Derivative(_) | Expression::Normal(_)
        )
    })
}
