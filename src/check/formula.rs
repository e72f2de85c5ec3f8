//! Formulas: from the tree to exact expressions in SI, with dimensions checked in every term.

use super::Checker;
use super::derive::differentiate;
use super::scope::{Kind, Typed};
use super::units;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::exact::Rational;
use crate::model::{self, AxisId, CoefficientId, Dimension, Expression, FieldId};
use crate::source::Span;
use crate::syntax::tree::{self, ExpressionKind, Operation, Sign};

/// What may stand in a formula, by its place in the model.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Place {
    /// Numbers, π and constants.
    Constant,
    /// Also coordinates, time, coefficients and fields; no derivatives.
    Pointwise,
    /// Also coordinates, time and coefficients, but no field and no derivative.
    Data,
    /// Also spatial derivatives.
    Output,
    /// Also ∂/∂t of fields.
    Equation,
    /// Pointwise, with ∂/∂n and ∂/∂t of fields.
    Condition,
}

impl Place {
    fn what(self) -> &'static str {
        match self {
            Place::Constant => "only numbers, π and constants can stand here",
            Place::Data => "only coordinates, time, constants and coefficients of them can stand here",
            Place::Pointwise => "no derivative can stand here",
            Place::Output => "no rate of change of a field that is first order in time can stand here",
            Place::Equation => "no normal derivative can stand here",
            Place::Condition => "only the field's value, ∂/∂n and ∂/∂t can stand in a condition",
        }
    }
}

/// Names that stand for something else inside a named operator.
#[derive(Clone, Debug, Default)]
pub(super) struct Bound {
    pub(super) parameters: Vec<(String, Typed)>,
    pub(super) order: Option<usize>,
    /// How many operators deep.
    depth: usize,
}

/// Named operators may use each other this deep.
const DEEPEST_OPERATORS: usize = 16;

impl Checker<'_> {
    /// A formula at a place; faults are reported and give nothing.
    pub(super) fn formula(&mut self, tree: &tree::Expression, place: Place) -> Option<Typed> {
        self.convert(tree, place, &Bound::default())
    }

    pub(super) fn convert(&mut self, tree: &tree::Expression, place: Place, bound: &Bound) -> Option<Typed> {
        match &tree.kind {
            ExpressionKind::Number(number) => Some(Typed {
                value: Expression::Number(number.clone()),
                dimension: (!number.is_zero()).then(Dimension::one),
            }),
            ExpressionKind::Quantity { value, unit } => {
                let scale = units::resolve(unit, &mut self.diagnostics)?;
                let dimension = (!value.is_zero()).then_some(scale.dimension);
                Some(Typed { value: Expression::Number(value.clone()).times(scale.factor), dimension })
            }
            ExpressionKind::Pi => Some(Typed::number(Expression::Pi)),
            ExpressionKind::Name(name) => self.name(name, tree.span, place, bound),
            ExpressionKind::Sum(terms) => self.sum(terms, place, bound),
            ExpressionKind::Product(factors) => self.product(factors, place, bound),
            ExpressionKind::Negate(inner) => {
                let inner = self.convert(inner, place, bound)?;
                Some(Typed { value: inner.value.negative(), ..inner })
            }
            ExpressionKind::Power { base, exponent } => self.power(base, exponent, place, bound),
            ExpressionKind::Call { function, arguments } => self.call(*function, arguments, place, bound),
            ExpressionKind::Apply { operator, arguments } => self.apply(operator, arguments, place, bound),
            ExpressionKind::Cases { branches, otherwise } => self.cases(branches, otherwise, place, bound),
            ExpressionKind::Noise(seed) => {
                if place == Place::Constant {
                    return self.misplaced(tree.span, "noise", place);
                }
                Some(Typed::number(Expression::Noise(seed.value)))
            }
            ExpressionKind::PointSource(_) => {
                self.not_yet(
                    tree.span,
                    "a point source δ",
                    "use a narrow smooth source, such as a Gaussian over a few nodes",
                );
                None
            }
            ExpressionKind::Derivative(derivative) => self.derivative(derivative, tree.span, place, bound),
            ExpressionKind::Laplacian(inner) => self.laplacian(inner, tree.span, place, bound),
            ExpressionKind::Divergence(inner) => {
                self.allow_spatial(tree.span, place)?;
                self.divergence(inner, place, bound)
            }
            ExpressionKind::Dot(left, right) => self.dot(left, right, tree.span, place, bound),
            ExpressionKind::Gradient(_) => {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::VECTOR_ALONE,
                        tree.span,
                        "a gradient is a vector and stands where a number is expected",
                    )
                    .with_remedy("take its divergence, ∇·(k * ∇T), or a scalar product, ∇T·∇T"),
                );
                None
            }
        }
    }

    fn misplaced(&mut self, span: Span, what: &str, place: Place) -> Option<Typed> {
        self.diagnostics.push(
            Diagnostic::error(codes_check::MISPLACED, span, format!("{what} cannot stand here"))
                .with_text(place.what()),
        );
        None
    }

    fn name(&mut self, name: &str, span: Span, place: Place, bound: &Bound) -> Option<Typed> {
        if let Some((_, typed)) = bound.parameters.iter().find(|(own, _)| own == name) {
            return Some(typed.clone());
        }
        if name == "t" {
            if place == Place::Constant {
                return self.misplaced(span, "the time `t`", place);
            }
            return Some(Typed { value: Expression::Time, dimension: Some(self.time_dimension.clone()) });
        }
        match self.scope.kind(name) {
            None => {
                self.scope.unknown(name, span, &mut self.diagnostics);
                None
            }
            Some(Kind::Faulty) => None,
            Some(Kind::Constant(index)) => self.constant(index, span),
            Some(Kind::Axis(_)) if place == Place::Constant => {
                self.misplaced(span, &format!("the coordinate `{name}`"), place)
            }
            Some(Kind::Axis(index)) => Some(Typed {
                value: Expression::Coordinate(AxisId(index)),
                dimension: self.scope.axes.get(index).cloned(),
            }),
            Some(Kind::Coefficient(_)) if place == Place::Constant => {
                self.misplaced(span, &format!("the coefficient `{name}`"), place)
            }
            Some(Kind::Coefficient(index)) => {
                let typed = self.coefficient(index, span)?;
                Some(Typed {
                    value: Expression::Coefficient(CoefficientId(index)),
                    dimension: typed.dimension,
                })
            }
            Some(Kind::Field(_)) if matches!(place, Place::Constant | Place::Data) => {
                self.misplaced(span, &format!("the field `{name}`"), place)
            }
            Some(Kind::Field(index)) => Some(Typed {
                value: Expression::Field(FieldId(index)),
                dimension: self.scope.fields.get(index).cloned(),
            }),
            Some(Kind::Operator(_)) => {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::WRONG_KIND,
                        span,
                        format!("`{name}` is an operator and needs its argument in brackets"),
                    )
                    .with_remedy(format!("write `{name}(…)`")),
                );
                None
            }
        }
    }

    fn sum(&mut self, terms: &[tree::Term], place: Place, bound: &Bound) -> Option<Typed> {
        let converted: Vec<Option<Typed>> =
            terms.iter().map(|term| self.convert(&term.value, place, bound)).collect();
        let mut dimension: Option<(Dimension, Span)> = None;
        let mut sound = true;
        let mut parts = Vec::new();
        for (term, typed) in terms.iter().zip(converted) {
            let Some(typed) = typed else {
                sound = false;
                continue;
            };
            if let Some(own) = typed.dimension {
                match &dimension {
                    None => dimension = Some((own, term.value.span)),
                    Some((first, span)) if *first != own => {
                        let (first, span) = (first.clone(), *span);
                        self.mismatch(term.value.span, &own, span, &first, "the terms of a sum");
                        sound = false;
                    }
                    Some(_) => {}
                }
            }
            parts.push(if term.sign == Sign::Minus { typed.value.negative() } else { typed.value });
        }
        sound.then(|| Typed { value: Expression::sum(parts), dimension: dimension.map(|(own, _)| own) })
    }

    /// Two things that must have the same dimension and have not.
    pub(super) fn mismatch(
        &mut self,
        at: Span,
        found: &Dimension,
        other: Span,
        expected: &Dimension,
        what: &str,
    ) {
        self.diagnostics.push(
            Diagnostic::error(
                codes_check::DIMENSIONS_DIFFER,
                at,
                format!("{what} have different units: {found} and {expected}"),
            )
            .with_text(format!("this is in {found}"))
            .with_label(other, format!("this is in {expected}"))
            .with_remedy("check the units of the quantities in both, or a factor that is missing"),
        );
    }

    fn product(&mut self, factors: &[tree::Factor], place: Place, bound: &Bound) -> Option<Typed> {
        let converted: Vec<Option<Typed>> =
            factors.iter().map(|factor| self.convert(&factor.value, place, bound)).collect();
        let mut total: Option<Typed> = None;
        for (factor, typed) in factors.iter().zip(converted) {
            let typed = typed?;
            if factor.operation == Operation::Over && typed.value.is_zero() {
                self.diagnostics.push(Diagnostic::error(
                    codes_check::DIVISION_BY_ZERO,
                    factor.value.span,
                    "this divides by zero",
                ));
                return None;
            }
            total = Some(match total {
                None => typed,
                Some(left) => Typed {
                    dimension: match (left.dimension, typed.dimension, factor.operation) {
                        (Some(a), Some(b), Operation::Times) => Some(a.times(&b)),
                        (Some(a), Some(b), Operation::Over) => Some(a.over(&b)),
                        _ => None,
                    },
                    value: match factor.operation {
                        Operation::Times => left.value.times(typed.value),
                        Operation::Over => left.value.over(typed.value),
                    },
                },
            });
        }
        total
    }

    fn power(
        &mut self,
        base: &tree::Expression,
        exponent: &tree::Expression,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        let typed = self.convert(base, place, bound);
        let power = self.convert(exponent, place, bound);
        let (typed, power) = (typed?, power?);
        if power.dimension.as_ref().is_some_and(|dimension| !dimension.is_one()) {
            self.diagnostics.push(
                Diagnostic::error(codes_check::EXPONENT, exponent.span, "an exponent is a pure number")
                    .with_text(format!("this is in {}", power.dimension.unwrap_or_else(Dimension::one))),
            );
            return None;
        }
        if let Expression::Number(exact) = &power.value {
            if exact.abs() > Rational::from(64) {
                self.diagnostics.push(
                    Diagnostic::error(codes_check::EXPONENT, exponent.span, "an exponent beyond ±64")
                        .with_remedy("write such a power with exp and log"),
                );
                return None;
            }
            if typed.value.is_zero() && exact.is_negative() {
                self.diagnostics.push(Diagnostic::error(
                    codes_check::DIVISION_BY_ZERO,
                    base.span,
                    "a negative power of zero",
                ));
                return None;
            }
            let dimension = typed.dimension.map(|dimension| dimension.power(exact));
            return Some(Typed { value: typed.value.power(exact.clone()), dimension });
        }
        if typed.dimension.as_ref().is_some_and(|dimension| !dimension.is_one()) {
            self.diagnostics.push(
                Diagnostic::error(
                    codes_check::EXPONENT,
                    exponent.span,
                    "the exponent of a quantity with a unit must be a literal number",
                )
                .with_text("else the unit of the result is not known"),
            );
            return None;
        }
        // a^b with a varying exponent: exp(b·log a).
        let log = Expression::Call(model::Function::Log, vec![typed.value]);
        Some(Typed::number(Expression::Call(model::Function::Exp, vec![power.value.times(log)])))
    }

    fn call(
        &mut self,
        function: tree::Function,
        arguments: &[tree::Expression],
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        let converted: Vec<Option<Typed>> =
            arguments.iter().map(|argument| self.convert(argument, place, bound)).collect();
        let typed: Vec<Typed> = converted.into_iter().collect::<Option<Vec<_>>>()?;
        let name = target(function);
        let values = typed.iter().map(|item| item.value.clone()).collect();
        match function {
            tree::Function::Min | tree::Function::Max => {
                let mut dimension: Option<(Dimension, Span)> = None;
                for (argument, item) in arguments.iter().zip(&typed) {
                    let Some(own) = item.dimension.clone() else { continue };
                    match &dimension {
                        None => dimension = Some((own, argument.span)),
                        Some((first, span)) if *first != own => {
                            let (first, span) = (first.clone(), *span);
                            self.mismatch(argument.span, &own, span, &first, "the arguments of min or max");
                            return None;
                        }
                        Some(_) => {}
                    }
                }
                Some(Typed {
                    value: Expression::Call(name, values),
                    dimension: dimension.map(|(own, _)| own),
                })
            }
            tree::Function::Sqrt => {
                let dimension = typed[0].dimension.as_ref().map(|own| own.power(&Rational::ratio(1, 2)));
                Some(Typed { value: typed[0].value.clone().square_root(), dimension })
            }
            tree::Function::Abs => {
                Some(Typed { value: Expression::Call(name, values), dimension: typed[0].dimension.clone() })
            }
            tree::Function::Sign => Some(Typed::number(Expression::Call(name, values))),
            _ => {
                if let Some(dimension) = typed[0].dimension.as_ref().filter(|dimension| !dimension.is_one()) {
                    self.diagnostics.push(
                        Diagnostic::error(
                            codes_check::ARGUMENT_NOT_A_NUMBER,
                            arguments[0].span,
                            format!("the argument of {} is a pure number", function.name()),
                        )
                        .with_text(format!("this is in {dimension}"))
                        .with_remedy("divide it by a quantity of the same unit"),
                    );
                    return None;
                }
                Some(Typed::number(Expression::Call(name, values)))
            }
        }
    }

    fn apply(
        &mut self,
        operator: &tree::Name,
        arguments: &[tree::Expression],
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        let index = match self.scope.kind(&operator.text) {
            Some(Kind::Operator(index)) => Some(index),
            _ => None,
        };
        let index =
            self.scope.expect(operator, "a named operator or a function", index, &mut self.diagnostics)?;
        let declared = &self.file.operators[index];
        if declared.parameters.len() != arguments.len() {
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
                .with_label(declared.name.span, "declared here"),
            );
            return None;
        }
        if bound.depth >= DEEPEST_OPERATORS {
            self.diagnostics.push(Diagnostic::error(
                codes_check::CYCLE,
                operator.span,
                format!("`{}` is defined by itself, or operators are nested too deep", operator.text),
            ));
            return None;
        }
        let mut inner = Bound { depth: bound.depth + 1, order: bound.order, ..Bound::default() };
        for (parameter, argument) in declared.parameters.iter().zip(arguments) {
            let typed = self.convert(argument, place, bound)?;
            inner.parameters.push((parameter.text.clone(), typed));
        }
        inner.order = self.operator_order(&declared.accuracy).or(inner.order);
        self.convert(&declared.value, place, &inner)
    }

    fn cases(
        &mut self,
        branches: &[tree::Branch],
        otherwise: &tree::Expression,
        place: Place,
        bound: &Bound,
    ) -> Option<Typed> {
        let mut converted = Vec::new();
        let mut sound = true;
        let last = self.convert(otherwise, place, bound);
        let mut dimension = last.as_ref().and_then(|typed| typed.dimension.clone());
        let mut first = otherwise.span;
        for branch in branches {
            let condition = self.comparison(&branch.condition, place, bound);
            let value = self.convert(&branch.value, place, bound);
            let (Some(condition), Some(value)) = (condition, value) else {
                sound = false;
                continue;
            };
            match (&dimension, value.dimension) {
                (Some(known), Some(own)) if *known != own => {
                    let known = known.clone();
                    self.mismatch(branch.value.span, &own, first, &known, "the values of cases");
                    sound = false;
                }
                (None, Some(own)) => {
                    dimension = Some(own);
                    first = branch.value.span;
                }
                _ => {}
            }
            converted.push((condition, value.value));
        }
        let last = last?;
        sound.then(|| Typed { value: Expression::Cases(converted, Box::new(last.value)), dimension })
    }

    pub(super) fn comparison(
        &mut self,
        comparison: &tree::Comparison,
        place: Place,
        bound: &Bound,
    ) -> Option<model::Comparison> {
        let left = self.convert(&comparison.left, place, bound);
        let right = self.convert(&comparison.right, place, bound);
        let (left, right) = (left?, right?);
        if let (Some(a), Some(b)) = (&left.dimension, &right.dimension)
            && a != b
        {
            self.mismatch(comparison.right.span, b, comparison.left.span, a, "the sides of a comparison");
            return None;
        }
        let relation = match comparison.relation {
            tree::Relation::Less => model::Relation::Less,
            tree::Relation::LessOrEqual => model::Relation::LessOrEqual,
            tree::Relation::Greater => model::Relation::Greater,
            tree::Relation::GreaterOrEqual => model::Relation::GreaterOrEqual,
        };
        Some(model::Comparison { left: left.value, relation, right: right.value })
    }

    fn allow_spatial(&mut self, span: Span, place: Place) -> Option<()> {
        if matches!(place, Place::Output | Place::Equation) {
            return Some(());
        }
        self.misplaced(span, "a spatial derivative", place);
        None
    }

    fn derivative(
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
        let length = self.scope.axes.get(axis.0).cloned().unwrap_or_else(Dimension::one);
        Typed {
            value: differentiate(axis, typed.value, bound.order, &self.coefficients),
            dimension: typed.dimension.map(|dimension| dimension.over(&length)),
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
                self.diagnostics.push(Diagnostic::error(
                    codes_check::TIME_ORDER,
                    span,
                    "equations are of first or second order in time, conditions and outputs of first",
                ));
                return None;
            }
        };
        let duration = self.time_dimension.power(&Rational::from(i64::from(in_time)));
        Some(Typed {
            value: factor.times(value),
            dimension: typed.dimension.map(|dimension| dimension.over(&duration)),
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
        let length = self.normal_dimension.clone().unwrap_or_else(Dimension::one);
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
            dimension: typed.dimension.map(|dimension| dimension.over(&length)),
        })
    }

    fn laplacian(
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
        let first = self.scope.axes.first().cloned()?;
        if let Some(other) = self.scope.axes.iter().find(|dimension| **dimension != first).cloned() {
            self.mismatch(span, &other, span, &first, "the axes under Δ or ∇");
            return None;
        }
        Some(())
    }

    /// ∇·(flux): terms with one gradient each.
    fn divergence(&mut self, flux: &tree::Expression, place: Place, bound: &Bound) -> Option<Typed> {
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
    fn dot(
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

fn target(function: tree::Function) -> model::Function {
    match function {
        tree::Function::Sin => model::Function::Sin,
        tree::Function::Cos => model::Function::Cos,
        tree::Function::Tan => model::Function::Tan,
        tree::Function::Exp => model::Function::Exp,
        tree::Function::Log => model::Function::Log,
        tree::Function::Sqrt => model::Function::Sqrt,
        tree::Function::Abs => model::Function::Abs,
        tree::Function::Min => model::Function::Minimum,
        tree::Function::Max => model::Function::Maximum,
        tree::Function::Tanh => model::Function::Tanh,
        tree::Function::Sinh => model::Function::Sinh,
        tree::Function::Cosh => model::Function::Cosh,
        tree::Function::Erf => model::Function::Erf,
        tree::Function::Erfc => model::Function::Erfc,
        tree::Function::Sign => model::Function::Sign,
    }
}
