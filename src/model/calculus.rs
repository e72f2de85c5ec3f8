//! Symbolic calculus on model expressions: dependence, partial derivatives, affine and derivative-linear decompositions.
//!
//! Everything here is exact. Coefficients are looked through by the list that is passed along; nothing is expanded unless said.

use super::expression::{Derivative, factors};
use super::{AxisId, Coefficient, Expression, FieldId, Function};
use crate::exact::Rational;
use std::collections::BTreeSet;

/// What an expression depends on, coefficients looked through.
#[derive(Clone, Debug, Default, PartialEq, Eq)]
pub struct Dependence {
    pub coordinates: BTreeSet<AxisId>,
    pub time: bool,
    pub fields: BTreeSet<FieldId>,
    pub rates: BTreeSet<FieldId>,
    /// Any spatial derivative, applied operator or normal derivative.
    pub derivatives: bool,
    pub noise: bool,
}

impl Dependence {
    /// One value for the whole grid at all times.
    pub fn is_constant(&self) -> bool {
        self.is_uniform() && !self.time
    }

    /// One value for the whole grid (it may change with time).
    pub fn is_uniform(&self) -> bool {
        self.coordinates.is_empty() && !self.noise && !self.on_state()
    }

    /// Depends on the unknowns.
    pub fn on_state(&self) -> bool {
        !self.fields.is_empty() || !self.rates.is_empty() || self.derivatives
    }
}

/// What `expression` depends on.
pub fn dependence(expression: &Expression, coefficients: &[Coefficient]) -> Dependence {
    let mut found = Dependence::default();
    collect(expression, coefficients, &mut found);
    found
}

fn collect(expression: &Expression, coefficients: &[Coefficient], found: &mut Dependence) {
    match expression {
        Expression::Coordinate(axis) => {
            found.coordinates.insert(*axis);
        }
        Expression::Time => found.time = true,
        Expression::Field(field) => {
            found.fields.insert(*field);
        }
        Expression::Rate(field) => {
            found.rates.insert(*field);
        }
        Expression::Noise(_) => found.noise = true,
        Expression::Derivative(_) | Expression::Applied(_) | Expression::Normal(_) => {
            found.derivatives = true
        }
        Expression::Coefficient(id) => {
            if let Some(coefficient) = coefficients.get(id.0) {
                collect(&coefficient.value, coefficients, found);
            }
        }
        _ => {}
    }
    for child in expression.children() {
        collect(child, coefficients, found);
    }
}

/// Replaces every coefficient by its value.
pub fn expand(expression: &Expression, coefficients: &[Coefficient]) -> Expression {
    expression.rewrite(&mut |node| match &node {
        Expression::Coefficient(id) => match coefficients.get(id.0) {
            Some(coefficient) => expand(&coefficient.value, coefficients),
            None => node,
        },
        _ => node,
    })
}

/// A variable to differentiate by.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Variable {
    Field(FieldId),
    Rate(FieldId),
    Coordinate(AxisId),
    Time,
}

/// ∂expression/∂variable with everything else held. `None` where there is none in closed form (`noise`, derivatives, a
/// choice that jumps: `cases`, `sign`, `abs`, `min` and `max` of something that depends on the variable).
pub fn partial(expression: &Expression, by: Variable, coefficients: &[Coefficient]) -> Option<Expression> {
    if !mentions(expression, by, coefficients) {
        return Some(Expression::zero());
    }
    let rule = |inner: &Expression| partial(inner, by, coefficients);
    match expression {
        Expression::Field(_) | Expression::Rate(_) | Expression::Coordinate(_) | Expression::Time => {
            Some(Expression::one())
        }
        Expression::Coefficient(id) => rule(&coefficients.get(id.0)?.value),
        Expression::Sum(items) => Some(Expression::sum(items.iter().map(rule).collect::<Option<Vec<_>>>()?)),
        Expression::Product(items) => {
            let mut terms = Vec::new();
            for (index, item) in items.iter().enumerate() {
                let slope = rule(item)?;
                if slope.is_zero() {
                    continue;
                }
                let mut product: Vec<Expression> = items.clone();
                product[index] = slope;
                terms.push(Expression::product(product));
            }
            Some(Expression::sum(terms))
        }
        Expression::Quotient(above, below) => {
            let (slope_above, slope_below) = (rule(above)?, rule(below)?);
            let first = slope_above.over((**below).clone());
            if slope_below.is_zero() {
                return Some(first);
            }
            let second =
                (**above).clone().times(slope_below).over((**below).clone().power(Rational::from(2)));
            Some(first.minus(second))
        }
        Expression::Power(base, exponent) => {
            let slope = rule(base)?;
            let lowered = (**base).clone().power(exponent - &Rational::from(1));
            Some(Expression::product([Expression::Number(exponent.clone()), lowered, slope]))
        }
        Expression::Call(function, arguments) => {
            let inner = arguments.first()?;
            Some(outer_slope(*function, inner)?.times(rule(inner)?))
        }
        Expression::Cases(cases, otherwise) => {
            if cases.iter().any(|(comparison, _)| {
                mentions(&comparison.left, by, coefficients) || mentions(&comparison.right, by, coefficients)
            }) {
                return None;
            }
            let cases = cases
                .iter()
                .map(|(comparison, value)| Some((comparison.clone(), rule(value)?)))
                .collect::<Option<Vec<_>>>()?;
            Some(Expression::Cases(cases, Box::new(rule(otherwise)?)))
        }
        _ => None,
    }
}

fn mentions(expression: &Expression, by: Variable, coefficients: &[Coefficient]) -> bool {
    let found = dependence(expression, coefficients);
    match by {
        Variable::Field(field) => {
            found.fields.contains(&field) || found.derivatives && inside(expression, by, coefficients)
        }
        Variable::Rate(field) => found.rates.contains(&field),
        Variable::Coordinate(axis) => found.coordinates.contains(&axis) || found.derivatives,
        Variable::Time => found.time,
    }
}

fn inside(expression: &Expression, by: Variable, coefficients: &[Coefficient]) -> bool {
    expression.any(&|node| match (node, by) {
        (Expression::Derivative(_), Variable::Field(field)) => {
            node.children().iter().any(|child| dependence(child, coefficients).fields.contains(&field))
        }
        _ => false,
    })
}

fn outer_slope(function: Function, inner: &Expression) -> Option<Expression> {
    let call = |name: Function| Expression::Call(name, vec![inner.clone()]);
    let square = |value: Expression| value.power(Rational::from(2));
    Some(match function {
        Function::Sin => call(Function::Cos),
        Function::Cos => call(Function::Sin).negative(),
        Function::Tan => Expression::sum([Expression::one(), square(call(Function::Tan))]),
        Function::Exp => call(Function::Exp),
        Function::Log => Expression::one().over(inner.clone()),
        Function::Sqrt => Expression::Number(Rational::ratio(1, 2)).over(call(Function::Sqrt)),
        Function::Tanh => Expression::one().minus(square(call(Function::Tanh))),
        Function::Sinh => call(Function::Cosh),
        Function::Cosh => call(Function::Sinh),
        Function::Erf | Function::Erfc => {
            let scale = Expression::Number(Rational::from(if function == Function::Erf { 2 } else { -2 }));
            let gauss = Expression::Call(Function::Exp, vec![square(inner.clone()).negative()]);
            scale.times(gauss).over(Expression::Pi.square_root())
        }
        Function::Abs | Function::Minimum | Function::Maximum | Function::Sign => return None,
    })
}

/// expression = Σ coefficients·variable + rest, when it is affine in the given variables (fields and their rates).
#[derive(Clone, Debug)]
pub struct Affine {
    pub coefficients: Vec<(Variable, Expression)>,
    pub rest: Expression,
}

/// Splits an expression that is affine in all fields and rates it mentions; `None` when it is not.
pub fn affine(expression: &Expression, coefficients: &[Coefficient]) -> Option<Affine> {
    let found = dependence(expression, coefficients);
    if found.derivatives {
        return None;
    }
    let variables: Vec<Variable> = found
        .fields
        .iter()
        .map(|field| Variable::Field(*field))
        .chain(found.rates.iter().map(|field| Variable::Rate(*field)))
        .collect();
    let mut parts = Vec::new();
    for variable in variables {
        let slope = partial(expression, variable, coefficients)?;
        if dependence(&slope, coefficients).on_state() {
            return None;
        }
        parts.push((variable, slope));
    }
    let rest = expand_state(expression, coefficients).rewrite(&mut |node| match node {
        Expression::Field(_) | Expression::Rate(_) => Expression::zero(),
        other => other,
    });
    Some(Affine { coefficients: parts, rest })
}

/// Replaces only those coefficients that depend on the state.
fn expand_state(expression: &Expression, coefficients: &[Coefficient]) -> Expression {
    expression.rewrite(&mut |node| match &node {
        Expression::Coefficient(id) => match coefficients.get(id.0) {
            Some(coefficient) if dependence(&coefficient.value, coefficients).on_state() => {
                expand_state(&coefficient.value, coefficients)
            }
            _ => node,
        },
        _ => node,
    })
}

/// One spatial derivative and what it is multiplied by.
#[derive(Clone, Debug)]
pub struct DerivativeTerm {
    pub factor: Expression,
    pub derivative: Derivative,
}

/// expression = Σ factor·derivative + rest, when it is linear in its derivatives; `None` when derivatives multiply each
/// other or stand inside a function. Products are distributed over sums that hold derivatives, and only over those.
pub fn derivative_terms(expression: &Expression) -> Option<(Vec<DerivativeTerm>, Expression)> {
    let holds = |part: &Expression| part.any(&|node| matches!(node, Expression::Derivative(_)));
    if !holds(expression) {
        return Some((Vec::new(), expression.clone()));
    }
    match expression {
        Expression::Derivative(derivative) => {
            let only = DerivativeTerm { factor: Expression::one(), derivative: (**derivative).clone() };
            Some((vec![only], Expression::zero()))
        }
        Expression::Sum(items) => {
            let mut all = Vec::new();
            let mut rest = Vec::new();
            for item in items {
                let (terms, remainder) = derivative_terms(item)?;
                all.extend(terms);
                rest.push(remainder);
            }
            Some((all, Expression::sum(rest)))
        }
        Expression::Product(_) => {
            let (with, without): (Vec<_>, Vec<_>) =
                factors(expression.clone()).into_iter().partition(|part| holds(part));
            let [single] = with.as_slice() else { return None };
            let (terms, rest) = derivative_terms(single)?;
            Some(scale(terms, rest, &|part| Expression::product(without.iter().cloned().chain([part]))))
        }
        Expression::Quotient(above, below) => {
            if holds(below) {
                return None;
            }
            let (terms, rest) = derivative_terms(above)?;
            Some(scale(terms, rest, &|part| part.over((**below).clone())))
        }
        _ => None,
    }
}

fn scale(
    terms: Vec<DerivativeTerm>,
    rest: Expression,
    by: &dyn Fn(Expression) -> Expression,
) -> (Vec<DerivativeTerm>, Expression) {
    let terms = terms
        .into_iter()
        .map(|term| DerivativeTerm { factor: by(term.factor), derivative: term.derivative })
        .collect();
    (terms, if rest.is_zero() { rest } else { by(rest) })
}
