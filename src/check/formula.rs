//! Formulas: from the tree to exact expressions in SI, with dimensions checked in every term.

use super::Checker;
use super::scope::{Kind, Typed};
use super::size::{DEEPEST, DEEPEST_READING, digits};
use super::units;
use crate::diagnostic::{Diagnostic, codes_check};
use crate::exact::Rational;
use crate::model::calculus::dependence;
use crate::model::sign;
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
    /// The body of a named operator: all that can stand where it may be used.
    Operator,
}

/// Where a function has a value.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Domain {
    Positive,
    NotNegative,
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
            Place::Operator => "only what can stand in equations, outputs or conditions can stand here",
        }
    }
}

/// Names that stand for something else inside a named operator.
#[derive(Clone, Debug, Default)]
pub(super) struct Bound {
    pub(super) parameters: Vec<(String, Typed)>,
    pub(super) order: Option<usize>,
}

impl Checker<'_> {
    /// A formula at a place; faults are reported and give nothing.
    pub(super) fn formula(&mut self, tree: &tree::Expression, place: Place) -> Option<Typed> {
        let typed = self.convert(tree, place, &Bound::default())?;
        self.bounded(typed, tree.span)
    }

    pub(super) fn convert(&mut self, tree: &tree::Expression, place: Place, bound: &Bound) -> Option<Typed> {
        if self.nesting >= DEEPEST_READING {
            self.too_large(tree.span);
            return None;
        }
        self.nesting += 1;
        let typed = self.convert_kind(tree, place, bound);
        self.nesting -= 1;
        typed
    }

    fn convert_kind(&mut self, tree: &tree::Expression, place: Place, bound: &Bound) -> Option<Typed> {
        match &tree.kind {
            ExpressionKind::Number(number) => Some(Typed {
                value: Expression::Number(number.clone()),
                dimension: (!number.is_zero()).then(Dimension::one),
            }),
            ExpressionKind::Quantity { value, unit } => {
                let scale = units::resolve(unit, &mut self.diagnostics)?;
                let value = Expression::Number(value.clone()).times(scale.factor);
                Some(Typed { value, dimension: Some(scale.dimension) })
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

    pub(super) fn misplaced(&mut self, span: Span, what: &str, place: Place) -> Option<Typed> {
        self.diagnostics.push(
            Diagnostic::error(codes_check::MISPLACED, span, format!("{what} cannot stand here"))
                .with_text(place.what()),
        );
        None
    }

    fn name(&mut self, name: &str, span: Span, place: Place, bound: &Bound) -> Option<Typed> {
        if let Some((_, typed)) = bound.parameters.iter().find(|(own, _)| own == name) {
            return self.grow(typed.clone(), span);
        }
        if name == "t" {
            if place == Place::Constant {
                return self.misplaced(span, "the time `t`", place);
            }
            return Some(Typed { value: Expression::Time, dimension: self.time_dimension.clone() });
        }
        match self.scope.kind(name) {
            None => {
                self.scope.unknown(name, span, &mut self.diagnostics);
                None
            }
            Some(Kind::Faulty) => None,
            Some(Kind::Constant(index)) => {
                let typed = self.constant(index, span)?;
                self.grow(typed, span)
            }
            Some(Kind::Axis(_)) if place == Place::Constant => {
                self.misplaced(span, &format!("the coordinate `{name}`"), place)
            }
            Some(Kind::Axis(index)) => Some(Typed {
                value: Expression::Coordinate(AxisId(index)),
                dimension: self.scope.length(AxisId(index)),
            }),
            Some(Kind::Coefficient(_)) if place == Place::Constant => {
                self.misplaced(span, &format!("the coefficient `{name}`"), place)
            }
            Some(Kind::Coefficient(index)) => {
                let typed = self.coefficient(index, span)?;
                if place == Place::Data && dependence(&typed.value, &self.coefficients).on_state() {
                    let what = format!("the coefficient `{name}`, which depends on a field,");
                    return self.misplaced(span, &what, place);
                }
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
                dimension: self.scope.fields.get(index).cloned().flatten(),
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
        let mut total = Rational::zero();
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
            if let Expression::Number(number) = &typed.value {
                total = &total + number;
                let many = total.numerator().bits() + total.denominator().bits();
                self.short(many, term.value.span)?;
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
        let mut quotients = 0;
        for (factor, typed) in factors.iter().zip(converted) {
            let typed = typed?;
            if factor.operation == Operation::Over && typed.value.is_zero() {
                self.diagnostics.push(
                    Diagnostic::error(
                        codes_check::DIVISION_BY_ZERO,
                        factor.value.span,
                        "this divides by zero",
                    )
                    .with_text("this is exactly zero"),
                );
                return None;
            }
            if factor.operation == Operation::Over && !matches!(typed.value, Expression::Number(_)) {
                quotients += 1;
                if quotients > DEEPEST {
                    self.too_large(factor.value.span);
                    return None;
                }
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
            let many = total.as_ref().map_or(0, |total| digits(&total.value));
            self.short(many, factor.value.span)?;
        }
        // Quotients of quotients are the one thing that grows deeper than it is written.
        if quotients > 8 { self.bounded(total?, factors.first()?.value.span) } else { total }
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
                self.diagnostics.push(
                    Diagnostic::error(codes_check::DIVISION_BY_ZERO, base.span, "a negative power of zero")
                        .with_text("this is exactly zero"),
                );
                return None;
            }
            if matches!(typed.value, Expression::Number(_)) && exact.is_integer() {
                let times = exact.abs().to_i64().map_or(u64::MAX, |times| times as u64);
                self.short(digits(&typed.value).saturating_mul(times), base.span)?;
            }
            if !exact.is_integer() {
                self.within_domain(&typed.value, base.span, "a broken power", Domain::NotNegative)?;
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
        self.within_domain(&typed.value, base.span, "a varying power", Domain::Positive)?;
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
                self.within_domain(&typed[0].value, arguments[0].span, "a root", Domain::NotNegative)?;
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
                if function == tree::Function::Log {
                    self.within_domain(&typed[0].value, arguments[0].span, "a logarithm", Domain::Positive)?;
                }
                Some(Typed::number(Expression::Call(name, values)))
            }
        }
    }

    /// What a function is taken of, where that is a constant whose sign is known.
    fn within_domain(&mut self, value: &Expression, span: Span, what: &str, domain: Domain) -> Option<()> {
        let is_constant = !value.any(&|node| !is_part_of_constant(node));
        let known = if is_constant { self.sign(value) } else { sign::Sign::Unknown };
        let (outside, expected) = match domain {
            Domain::Positive => {
                (matches!(known, sign::Sign::Negative | sign::Sign::Zero), "greater than zero")
            }
            Domain::NotNegative => (known == sign::Sign::Negative, "not less than zero"),
        };
        if !outside {
            return Some(());
        }
        self.diagnostics.push(
            Diagnostic::error(codes_check::NO_VALUE, span, format!("{what} of this has no value"))
                .with_text(format!("expected a number that is {expected}")),
        );
        None
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

/// Whether a node can be part of an expression of constants.
fn is_part_of_constant(node: &Expression) -> bool {
    matches!(
        node,
        Expression::Number(_)
            | Expression::Pi
            | Expression::Constant(_)
            | Expression::Sum(_)
            | Expression::Product(_)
            | Expression::Quotient(..)
            | Expression::Power(..)
            | Expression::Call(..)
            | Expression::Cases(..)
    )
}
