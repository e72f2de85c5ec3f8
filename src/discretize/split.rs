//! Split forms of transport terms: those that keep the energy when the speed varies.
//!
//! For a(x) ∂u/∂x and ∂(a u)/∂x the skew-symmetric part ½(a D u + D(a u)) has the energy rate of the equation itself,
//! max|∂a/∂x|/2, independent of the grid; u ∂u/∂x and ∂(½u²)/∂x use (D u² + u D u)/3 (Richtmyer & Morton 1967, from memory).
//! Only a term in the field's own equation is split: coupling between fields is skew by itself.

use crate::exact::Rational;
use crate::model::calculus::{Variable, dependence, expand, partial};
use crate::model::expression::factors;
use crate::model::{AxisId, Expression, FieldId, Model};

/// Σ factor·D(argument) + rest in the place of factor·∂(of)/∂axis.
pub(super) struct Split {
    pub(super) terms: Vec<(Expression, Expression)>,
    pub(super) rest: Expression,
    pub(super) reason: String,
}

/// The split form of factor·∂(of)/∂axis in the equation of `field`, where one is known to keep the energy.
pub(super) fn split_first(
    model: &Model,
    field: FieldId,
    axis: AxisId,
    factor: &Expression,
    of: &Expression,
) -> Option<Split> {
    let of = expand(of, &model.coefficients);
    let slope = partial(&of, Variable::Field(field), &model.coefficients)?;
    if slope.is_zero() {
        return None;
    }
    burgers(model, field, axis, factor, &of, &slope)
        .or_else(|| varying_speed(model, field, axis, factor, &of, &slope))
}

fn varying_speed(
    model: &Model,
    field: FieldId,
    axis: AxisId,
    factor: &Expression,
    of: &Expression,
    slope: &Expression,
) -> Option<Split> {
    // of = slope·u exactly, and neither slope nor factor depends on the state.
    if dependence(slope, &model.coefficients).on_state() || dependence(factor, &model.coefficients).on_state()
    {
        return None;
    }
    let at_rest =
        of.rewrite(&mut |node| if node == Expression::Field(field) { Expression::zero() } else { node });
    if !at_rest.is_zero() {
        return None;
    }
    let speed = factor.clone().times(slope.clone());
    let gradient =
        partial(&expand(&speed, &model.coefficients), Variable::Coordinate(axis), &model.coefficients)?;
    if gradient.is_zero() {
        return None;
    }
    let varies_inside = partial(slope, Variable::Coordinate(axis), &model.coefficients)?;
    let varies_outside = partial(factor, Variable::Coordinate(axis), &model.coefficients)?;
    let half = || Expression::Number(Rational::ratio(1, 2));
    let u = || Expression::Field(field);
    // factor ∂(slope u) = ½ a D u + ½ D(a u) − ½ (∂a) u + factor (∂slope) u, with a = factor·slope.
    let correction = Expression::sum([
        Expression::product([Expression::Number(Rational::ratio(-1, 2)), gradient, u()]),
        Expression::product([factor.clone(), varies_inside.clone(), u()]),
    ]);
    let form = if varies_outside.is_zero() { "conservative" } else { "advective" };
    Some(Split {
        terms: vec![(half().times(speed.clone()), u()), (half(), speed.times(u()))],
        rest: correction,
        reason: format!(
            "the {form} transport term of {} along {} is taken in split form, ½(a·D u + D(a·u)) and a pointwise rest, which keeps the energy estimate when the speed varies",
            model.fields[field.0].name, model.axes[axis.0].name
        ),
    })
}

fn burgers(
    model: &Model,
    field: FieldId,
    axis: AxisId,
    factor: &Expression,
    of: &Expression,
    slope: &Expression,
) -> Option<Split> {
    let u = || Expression::Field(field);
    let constant = |part: &Expression| dependence(part, &model.coefficients).is_constant();
    // u ∂u/∂x, times a constant.
    let (rest_of_factor, carriers): (Vec<_>, Vec<_>) =
        factors(factor.clone()).into_iter().partition(|part| *part != u());
    let strength = if carriers.len() == 1 && *of == u() {
        Expression::product(rest_of_factor)
    } else {
        // c·∂(k·u²)/∂x = 2 c k · u ∂u/∂x.
        let curvature = partial(slope, Variable::Field(field), &model.coefficients)?;
        let at_rest = |part: &Expression| {
            part.rewrite(&mut |node| if node == u() { Expression::zero() } else { node }).is_zero()
        };
        if curvature.is_zero() || !at_rest(of) || !at_rest(slope) {
            return None;
        }
        factor.clone().times(curvature)
    };
    if !constant(&strength) {
        return None;
    }
    let third = || Expression::Number(Rational::ratio(1, 3));
    Some(Split {
        terms: vec![
            (third().times(strength.clone()), u().power(Rational::from(2))),
            (Expression::product([third(), strength, u()]), u()),
        ],
        rest: Expression::zero(),
        reason: format!(
            "the quadratic transport term of {} along {} is taken in the split form (D u² + u·D u)/3, which keeps the energy balance",
            model.fields[field.0].name, model.axes[axis.0].name
        ),
    })
}
