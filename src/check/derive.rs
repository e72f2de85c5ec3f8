//! Derivatives with the structure that was written: what ∂/∂x of an expression is.
//!
//! ∂/∂x(k ∂f/∂x) is one second derivative in conservation form, ∂/∂x(k ∂f/∂y) one mixed derivative; terms of a sum go one by one;
//! anything without derivatives inside is the first derivative of a pointwise flux. Nothing is expanded.

use crate::model::calculus::{DerivativeTerm, dependence, derivative_terms};
use crate::model::expression::{Derivative, DerivativeKind};
use crate::model::{AxisId, Coefficient, Expression};

/// ∂(of)/∂axis; `order` is the interior order that a named operator asked for.
pub(super) fn differentiate(
    axis: AxisId,
    of: Expression,
    order: Option<usize>,
    coefficients: &[Coefficient],
) -> Expression {
    let Some((terms, rest)) = derivative_terms(&of) else {
        return node(DerivativeKind::First { axis, of }, order);
    };
    let mut parts: Vec<Expression> = terms.into_iter().map(|term| again(axis, term, order)).collect();
    let constant = rest.is_zero() || dependence(&rest, coefficients).is_uniform();
    if !constant {
        parts.push(node(DerivativeKind::First { axis, of: rest }, order));
    }
    Expression::sum(parts)
}

/// ∂/∂axis(factor · derivative).
fn again(axis: AxisId, term: DerivativeTerm, order: Option<usize>) -> Expression {
    let order = order.or(term.derivative.order);
    let plain = term.factor.is_one();
    let kind = match term.derivative.kind {
        DerivativeKind::First { axis: inner, of } if inner == axis => {
            DerivativeKind::Second { axis, coefficient: term.factor, of }
        }
        DerivativeKind::First { axis: inner, of } => {
            DerivativeKind::Mixed { outer: axis, inner, coefficient: term.factor, of }
        }
        DerivativeKind::Second { axis: inner, coefficient, of }
            if inner == axis && plain && coefficient.is_one() =>
        {
            DerivativeKind::Higher { axis, degree: 3, of }
        }
        DerivativeKind::Higher { axis: inner, degree: 3, of } if inner == axis && plain => {
            DerivativeKind::Higher { axis, degree: 4, of }
        }
        other => {
            let inner = node(other, term.derivative.order);
            DerivativeKind::First { axis, of: term.factor.times(inner) }
        }
    };
    node(kind, order)
}

fn node(kind: DerivativeKind, order: Option<usize>) -> Expression {
    Expression::Derivative(Box::new(Derivative { kind, order }))
}
