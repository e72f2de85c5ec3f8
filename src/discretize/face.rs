//! What conditions become at the faces: additions to rates, and settings of values.
//!
//! With outward normal n and weight h₀ of the norm at the face, in units of the spacing Δ:
//! - a given normal derivative g adds  factor·k·(∂of/∂u)·g / (h₀Δ)  to each rate that holds factor·∂/∂n(k ∂of/∂n);
//! - relations L q = data of entering characteristics add  −A_n R (L R)⁻¹ (data − L q) / (h₀Δ)  with R the entering
//!   eigenvectors of the outward matrix A_n: the flux of the inside is replaced by that of the upwind state;
//! - a value of a scalar with a nonlinear flux adds  s (F(u) − F(value)) / (h₀Δ), s = +1 at the high face, −1 at the low one.

use super::choose::AxisPlan;
use crate::exact::Rational;
use crate::model::calculus::{Variable, dependence, derivative_terms, partial};
use crate::model::characteristics::{Block, Entering, blocks, entering, mean_and_root, outward};
use crate::model::expression::DerivativeKind;
use crate::model::{Condition, Expression, Face, FaceRelation, FieldId, Model, Side, Treatment};
use crate::scheme::{Correction, Injection};

/// All additions to rates, in the order of the conditions.
pub(super) fn corrections(model: &Model, plans: &[AxisPlan]) -> Vec<Correction> {
    let mut found = Vec::new();
    for condition in &model.conditions {
        let weight = plans[condition.face.axis.0].face_weight();
        let strength = match weight.recip() {
            Some(inverse) => {
                Expression::Number(inverse).times(Expression::InverseSpacing(condition.face.axis))
            }
            None => continue,
        };
        let additions = match &condition.treatment {
            Treatment::Value { .. } => Vec::new(),
            Treatment::Flux { field, normal_derivative } => {
                flux(model, condition.face, *field, normal_derivative)
            }
            Treatment::Upwind { .. } if moving_inflow(model, condition).is_some() => Vec::new(),
            Treatment::Upwind { relations } => upwind(model, condition.face, relations),
            Treatment::InflowValue { field, value } => inflow(model, condition.face, *field, value),
        };
        for (field, value) in additions {
            found.push(Correction {
                face: condition.face,
                patch: condition.patch.clone(),
                field,
                value: value.times(strength.clone()),
            });
        }
    }
    found
}

/// All settings of values, in the order of the conditions.
pub(super) fn injections(model: &Model) -> Vec<Injection> {
    model.conditions.iter().filter_map(|condition| injection(model, condition)).collect()
}

fn injection(model: &Model, condition: &Condition) -> Option<Injection> {
    match &condition.treatment {
        Treatment::Value { field, value, rate, second_rate } => Some(Injection {
            face: condition.face,
            patch: condition.patch.clone(),
            field: *field,
            value: value.clone(),
            rate: rate.clone(),
            second_rate: second_rate.clone(),
        }),
        Treatment::Upwind { .. } => moving_inflow(model, condition),
        _ => None,
    }
}

/// The value of a single transported field whose data move in time, where they can be differentiated: set rather than replaced as a
/// flux. Both are stable (−a u_N² against −a u_N² − a u_0² in the energy rate), but only a value that is advanced by its own
/// derivative keeps the order of a Runge–Kutta method of order four.
fn moving_inflow(model: &Model, condition: &Condition) -> Option<Injection> {
    let Treatment::Upwind { relations } = &condition.treatment else { return None };
    let [relation] = relations.as_slice() else { return None };
    let [(field, weight)] = relation.coefficients.as_slice() else { return None };
    let alone = blocks(model, condition.face.axis)?.iter().any(|block| block.fields == [*field]);
    let value = relation.data.clone().over(weight.clone());
    if !alone || !dependence(&value, &model.coefficients).time {
        return None;
    }
    let slope = |of: &Expression| partial(of, Variable::Time, &model.coefficients);
    let rate = slope(&value)?;
    Some(Injection {
        face: condition.face,
        patch: condition.patch.clone(),
        field: *field,
        second_rate: slope(&rate),
        rate: Some(rate),
        value,
    })
}

fn flux(
    model: &Model,
    face: Face,
    field: FieldId,
    normal_derivative: &Expression,
) -> Vec<(FieldId, Expression)> {
    let mut additions = Vec::new();
    for equation in &model.equations {
        let Some((terms, _)) = derivative_terms(&equation.right) else { continue };
        for term in terms {
            let DerivativeKind::Second { axis, coefficient, of } = &term.derivative.kind else { continue };
            if *axis != face.axis {
                continue;
            }
            let Some(slope) = partial(of, Variable::Field(field), &model.coefficients) else { continue };
            let value = term.factor.times(coefficient.clone()).times(slope).times(normal_derivative.clone());
            if !value.is_zero() {
                additions.push((equation.field, value));
            }
        }
    }
    additions
}

fn inflow(model: &Model, face: Face, field: FieldId, value: &Expression) -> Vec<(FieldId, Expression)> {
    let Some((terms, _)) = derivative_terms(&model.equations[field.0].right) else { return Vec::new() };
    let given = |flux: &Expression| {
        flux.rewrite(&mut |node| if node == Expression::Field(field) { value.clone() } else { node })
    };
    let mut additions = Vec::new();
    for term in terms {
        let DerivativeKind::First { axis, of } = &term.derivative.kind else { continue };
        if *axis != face.axis {
            continue;
        }
        // The rate holds factor·∂of/∂x: at the high face factor·(of(value) − of(u)), at the low face the opposite.
        let flux = primitive(&term.factor, of, field);
        let Some((factor, of)) = flux else { continue };
        let jump = given(&of).minus(of.clone());
        let signed = if face.side == Side::High { jump } else { jump.negative() };
        additions.push((field, factor.times(signed)));
    }
    additions
}

/// factor·∂of as a derivative of a flux with a factor free of the field: u ∂u becomes ∂(½u²).
fn primitive(factor: &Expression, of: &Expression, field: FieldId) -> Option<(Expression, Expression)> {
    let u = Expression::Field(field);
    let (carriers, rest): (Vec<_>, Vec<_>) =
        crate::model::expression::factors(factor.clone()).into_iter().partition(|part| *part == u);
    if carriers.is_empty() {
        return Some((factor.clone(), of.clone()));
    }
    if *of != u {
        return None;
    }
    let degree = carriers.len() as i64 + 1;
    let flux = Expression::Number(Rational::ratio(1, degree)).times(u.power(Rational::from(degree)));
    Some((Expression::product(rest), flux))
}

fn upwind(model: &Model, face: Face, relations: &[FaceRelation]) -> Vec<(FieldId, Expression)> {
    let Some(all) = blocks(model, face.axis) else { return Vec::new() };
    let mut additions = Vec::new();
    for block in all {
        let own: Vec<&FaceRelation> = relations
            .iter()
            .filter(|relation| relation.coefficients.iter().any(|(field, _)| block.fields.contains(field)))
            .collect();
        if own.is_empty() {
            continue;
        }
        if let Entering::Count(count) = entering(model, &block, face.side)
            && count == own.len()
        {
            additions.extend(upwind_block(&block, face.side, &own));
        }
    }
    additions
}

fn upwind_block(block: &Block, side: Side, relations: &[&FaceRelation]) -> Vec<(FieldId, Expression)> {
    let matrix = outward(block, side);
    match (block.fields.len(), relations) {
        (1, [relation]) => {
            // −a_n (data/ℓ − q)
            let weight = coefficient(relation, block.fields[0]);
            let wanted = relation.data.clone().over(weight).minus(Expression::Field(block.fields[0]));
            vec![(block.fields[0], matrix[0][0].clone().times(wanted).negative())]
        }
        (2, [relation]) => one_of_two(block, &matrix, relation),
        (2, [first, second]) => both_of_two(block, &matrix, first, second),
        _ => Vec::new(),
    }
}

fn coefficient(relation: &FaceRelation, field: FieldId) -> Expression {
    relation
        .coefficients
        .iter()
        .find(|(own, _)| *own == field)
        .map_or_else(Expression::zero, |(_, value)| value.clone())
}

/// data − L q over the fields of the block.
fn residual(relation: &FaceRelation) -> Expression {
    let inside =
        relation.coefficients.iter().map(|(field, weight)| weight.clone().times(Expression::Field(*field)));
    relation.data.clone().minus(Expression::sum(inside.collect::<Vec<_>>()))
}

/// One characteristic enters: eigenvalue λ = mean − root < 0 with eigenvector r, addition −λ r (data − L q)/(L·r).
fn one_of_two(
    block: &Block,
    matrix: &[Vec<Expression>],
    relation: &FaceRelation,
) -> Vec<(FieldId, Expression)> {
    let Some((mean, root)) = mean_and_root(matrix) else { return Vec::new() };
    let [a, b, c, d] = [&matrix[0][0], &matrix[0][1], &matrix[1][0], &matrix[1][1]];
    let (eigenvalue, vector) = if b.is_zero() && c.is_zero() {
        // Not coupled at all: the block has one field too many; each entering field is its own block, so this is unreachable
        // for blocks made by `blocks`, and no addition is the safe answer.
        return Vec::new();
    } else {
        let eigenvalue = mean.minus(root);
        let vector = if b.is_zero() {
            [eigenvalue.clone().minus(d.clone()), c.clone()]
        } else {
            [b.clone(), eigenvalue.clone().minus(a.clone())]
        };
        (eigenvalue, vector)
    };
    let along = Expression::sum(
        block
            .fields
            .iter()
            .zip(&vector)
            .map(|(field, part)| coefficient(relation, *field).times(part.clone()))
            .collect::<Vec<_>>(),
    );
    let strength = eigenvalue.negative().times(residual(relation)).over(along);
    block.fields.iter().zip(vector).map(|(field, part)| (*field, part.times(strength.clone()))).collect()
}

/// Both enter: the state is given, q* = L⁻¹ data; addition −A_n L⁻¹ (data − L q).
fn both_of_two(
    block: &Block,
    matrix: &[Vec<Expression>],
    first: &FaceRelation,
    second: &FaceRelation,
) -> Vec<(FieldId, Expression)> {
    let [p, q] = [block.fields[0], block.fields[1]];
    let [a, b] = [coefficient(first, p), coefficient(first, q)];
    let [c, d] = [coefficient(second, p), coefficient(second, q)];
    let determinant = a.clone().times(d.clone()).minus(b.clone().times(c.clone()));
    let (r, s) = (residual(first), residual(second));
    let jump_p = d.times(r.clone()).minus(b.times(s.clone())).over(determinant.clone());
    let jump_q = a.times(s).minus(c.times(r)).over(determinant);
    let row = |index: usize| {
        Expression::sum([
            matrix[index][0].clone().times(jump_p.clone()),
            matrix[index][1].clone().times(jump_q.clone()),
        ])
        .negative()
    };
    vec![(p, row(0)), (q, row(1))]
}
