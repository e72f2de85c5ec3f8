//! What one condition becomes, by the needs of its face.

use super::RawCondition;
use super::need::{Need, NeedKind, name, place};
use super::reading::{Reading, normal};
use crate::diagnostic::{Diagnostic, Diagnostics, codes_conditions as codes};
use crate::model::calculus::{Variable, dependence, derivative_terms, partial};
use crate::model::characteristics::{mean_and_root, outward, sign_at};
use crate::model::expression::DerivativeKind;
use crate::model::sign::Sign;
use crate::model::{Condition, Expression, FaceRelation, FieldId, Model, TimeOrder, Treatment};

/// A classified condition, before relations of a block are joined.
pub(super) enum Kind {
    Value { field: FieldId, value: Expression, rate: Option<Expression>, second_rate: Option<Expression> },
    Flux { field: FieldId, normal_derivative: Expression },
    Inflow { field: FieldId, value: Expression },
    Relation(FaceRelation),
}

type Fault = Box<Diagnostic>;

/// The need that a condition serves (by index) and what it becomes.
pub(super) fn classify(model: &Model, raw: &RawCondition, needs: &[Need]) -> Result<(usize, Kind), Fault> {
    let reading = Reading::of(model, raw)?;
    if let Some(field) = reading.normals.iter().next().copied() {
        return flux(model, raw, needs, &reading, field);
    }
    if let Some(field) = reading.rates.iter().next() {
        return Err(rate_fault(model, raw, *field));
    }
    let Some(field) = reading.fields.iter().next().copied() else {
        return Err(Box::new(
            Diagnostic::error(codes::NAMES_NO_FIELD, raw.span, "the condition names no field")
                .with_text("expected a field's value, its normal derivative, or a relation between fields"),
        ));
    };
    let diffusive = reading.fields.iter().copied().find(|field| {
        needs.iter().any(|need| matches!(need.kind, NeedKind::Diffusive(own) if own == *field))
    });
    match diffusive {
        Some(field) => value(model, raw, needs, &reading, field),
        None => relation(model, raw, needs, &reading, field),
    }
}

fn serving(needs: &[Need], field: FieldId) -> usize {
    needs.iter().position(|need| need.concerns(field)).unwrap_or(0)
}

fn flux(
    model: &Model,
    raw: &RawCondition,
    needs: &[Need],
    reading: &Reading,
    field: FieldId,
) -> Result<(usize, Kind), Fault> {
    if reading.normals.len() > 1 {
        return Err(Box::new(
            Diagnostic::error(
                codes::DERIVATIVE_IN_CONDITION,
                raw.span,
                "the condition holds the normal derivatives of two fields",
            )
            .with_text("expected the normal derivative of one field")
            .with_remedy("give each field a condition of its own"),
        ));
    }
    let need = serving(needs, field);
    if !matches!(needs[need].kind, NeedKind::Diffusive(_)) {
        let axis = &model.axes[raw.face.axis.0].name;
        return Err(Box::new(
            Diagnostic::error(
                codes::NO_NORMAL_DERIVATIVE,
                raw.span,
                format!("the equation of {} has no second derivative along {axis}", name(model, field)),
            )
            .with_text(format!("a condition on ∂{}/∂n has nothing to act on", name(model, field)))
            .with_remedy(format!("this face: {}", needs[need].why)),
        ));
    }
    let foreign = reading
        .rates
        .iter()
        .find(|rate| **rate != field || model.equations[field.0].order != TimeOrder::Second);
    if let Some(rate) = foreign {
        return Err(rate_fault(model, raw, *rate));
    }
    refuse_mixed(model, raw, field)?;
    let what = format!("∂{}/∂n", name(model, field));
    let normal_derivative = reading.solved_for(model, raw, normal(model, field), &what)?;
    if let Some(slope) = partial(&normal_derivative, Variable::Rate(field), &model.coefficients)
        && sign_at(&slope, model, raw.face) == Sign::Positive
    {
        return Err(Box::new(
            Diagnostic::error(
                codes::ABSORBING_WRONG_SIGN,
                raw.span,
                format!(
                    "this condition feeds the wave instead of letting it out at {}",
                    place(model, raw.face)
                ),
            )
            .with_text("expected ∂u/∂t + c * ∂u/∂n = 0 with c > 0")
            .with_remedy("turn the sign of one of the terms"),
        ));
    }
    Ok((need, Kind::Flux { field, normal_derivative }))
}

fn rate_fault(model: &Model, raw: &RawCondition, field: FieldId) -> Fault {
    let name = name(model, field);
    Box::new(
        Diagnostic::error(codes::RATE_IN_CONDITION, raw.span, format!("∂{name}/∂t cannot stand in this condition"))
            .with_text("a rate stands beside ∂/∂n of the same field, where its equation is second order in time")
            .with_remedy(format!("a one-way wave condition is ∂{name}/∂t + c * ∂{name}/∂n = 0; otherwise give the value or the flux")),
    )
}

fn refuse_mixed(model: &Model, raw: &RawCondition, field: FieldId) -> Result<(), Fault> {
    for equation in &model.equations {
        let Some((terms, _)) = derivative_terms(&equation.right) else { continue };
        let mixed = terms.iter().any(|term| match &term.derivative.kind {
            DerivativeKind::Mixed { outer, inner, of, .. } => {
                (*outer == raw.face.axis || *inner == raw.face.axis)
                    && partial(of, Variable::Field(field), &model.coefficients)
                        .is_none_or(|slope| !slope.is_zero())
            }
            _ => false,
        });
        if mixed {
            return Err(Box::new(
                Diagnostic::error(
                    codes::MIXED_WITH_FLUX,
                    raw.span,
                    "a flux condition where a mixed derivative acts is not available yet",
                )
                .with_label(equation.span, "the mixed derivative stands here")
                .with_remedy("give the value at this face"),
            ));
        }
    }
    Ok(())
}

fn value(
    model: &Model,
    raw: &RawCondition,
    needs: &[Need],
    reading: &Reading,
    field: FieldId,
) -> Result<(usize, Kind), Fault> {
    if let Some(other) = reading.fields.iter().find(|other| **other != field) {
        return Err(Box::new(
            Diagnostic::error(
                codes::DATA_DEPEND_ON_STATE,
                raw.span,
                format!(
                    "the value of {} at {} depends on {}",
                    name(model, field),
                    place(model, raw.face),
                    name(model, *other)
                ),
            )
            .with_text("given values depend on place, time and constants only")
            .with_remedy("write it as a flux: k * ∂u/∂n = … may hold any field"),
        ));
    }
    let value = reading.solved_for(model, raw, field, name(model, field))?;
    if dependence(&value, &model.coefficients).on_state() {
        return Err(Box::new(
            Diagnostic::error(
                codes::DATA_DEPEND_ON_STATE,
                raw.span,
                format!("the value of {} depends on the state through a coefficient", name(model, field)),
            )
            .with_remedy("given values depend on place, time and constants only"),
        ));
    }
    let slope = |of: &Expression| partial(of, Variable::Time, &model.coefficients);
    let rate = slope(&value);
    let second_rate = rate.as_ref().and_then(slope);
    Ok((serving(needs, field), Kind::Value { field, value, rate, second_rate }))
}

fn relation(
    model: &Model,
    raw: &RawCondition,
    needs: &[Need],
    reading: &Reading,
    field: FieldId,
) -> Result<(usize, Kind), Fault> {
    let need = serving(needs, field);
    let NeedKind::Transport(block) = &needs[need].kind else {
        let axis = &model.axes[raw.face.axis.0].name;
        return Err(Box::new(
            Diagnostic::error(
                codes::NO_NORMAL_DERIVATIVE,
                raw.span,
                format!(
                    "no derivative along {axis} in the equation of {} needs a condition",
                    name(model, field)
                ),
            )
            .with_remedy("leave the condition out"),
        ));
    };
    if let Some(other) = reading.fields.iter().find(|other| !block.fields.contains(other)) {
        return Err(Box::new(
            Diagnostic::error(
                codes::DATA_DEPEND_ON_STATE,
                raw.span,
                format!(
                    "{} is not coupled to {} at this face",
                    name(model, *other),
                    needs[need].names(model)
                ),
            )
            .with_text("a relation holds fields that first derivatives couple along this axis")
            .with_remedy("give each field a condition of its own"),
        ));
    }
    if block.fields.len() == 1 && moves_with_state(model, &block.matrix[0][0]) {
        let value = reading.solved_for(model, raw, field, name(model, field))?;
        return Ok((need, Kind::Inflow { field, value }));
    }
    let fields: Vec<FieldId> = reading.fields.iter().copied().collect();
    let mut coefficients = Vec::new();
    for own in &fields {
        let Some(factor) = reading.factor(model, *own) else {
            return Err(Box::new(
                Diagnostic::error(
                    codes::RELATION_NOT_LINEAR,
                    raw.span,
                    "the relation is not linear in the fields",
                )
                .with_text("expected a sum of fields times known factors")
                .with_remedy("write it as p = Z * v + g, with Z and g known"),
            ));
        };
        coefficients.push((*own, factor));
    }
    let relation = FaceRelation { coefficients, data: reading.remainder(&fields) };
    if let Some(fault) = says_nothing(model, raw, needs[need].count, block, &relation) {
        return Err(fault);
    }
    Ok((need, Kind::Relation(relation)))
}

fn moves_with_state(model: &Model, speed: &Expression) -> bool {
    dependence(speed, &model.coefficients).on_state()
}

/// A relation that holds only outgoing characteristics gives nothing to the entering one.
fn says_nothing(
    model: &Model,
    raw: &RawCondition,
    count: usize,
    block: &crate::model::characteristics::Block,
    relation: &FaceRelation,
) -> Option<Fault> {
    if block.fields.len() != 2 || count != 1 {
        return None;
    }
    let matrix = outward(block, raw.face.side);
    let (mean, root) = mean_and_root(&matrix)?;
    let eigenvalue = mean.minus(root);
    let vector = if matrix[0][1].is_zero() {
        [eigenvalue.minus(matrix[1][1].clone()), matrix[1][0].clone()]
    } else {
        [matrix[0][1].clone(), eigenvalue.minus(matrix[0][0].clone())]
    };
    let weight = |field: FieldId| {
        relation
            .coefficients
            .iter()
            .find(|(own, _)| *own == field)
            .map_or_else(Expression::zero, |(_, value)| value.clone())
    };
    let along = Expression::sum(
        block.fields.iter().zip(vector).map(|(field, part)| weight(*field).times(part)).collect::<Vec<_>>(),
    );
    // Roots are not exact numbers: what is left of a cancellation is judged in double precision, where it is small against its terms.
    let point = super::count::middle_of_face(model, raw.face);
    let scale: f64 = crate::model::expression::terms(along.clone())
        .iter()
        .filter_map(|term| crate::model::numeric::evaluate(term, model, &point))
        .map(f64::abs)
        .fold(0.0, f64::max);
    let total = crate::model::numeric::evaluate(&along, model, &point)?;
    (total.abs() <= 1e-12 * scale || scale == 0.0).then(|| {
        Box::new(
            Diagnostic::error(
                codes::RELATION_SETS_OUTGOING,
                raw.span,
                format!("the relation fixes what leaves at {}, and nothing of what enters", place(model, raw.face)),
            )
            .with_text("the entering characteristic drops out of it")
            .with_remedy("check the sign: with v along the axis the outward normal velocity is −v at the low face and +v at the high face"),
        )
    })
}

/// Patches compare tangential coordinates with known numbers.
pub(super) fn patch_faults(model: &Model, raw: &RawCondition) -> Vec<Diagnostic> {
    raw.patch
        .iter()
        .filter_map(|comparison| {
            let left = dependence(&comparison.left, &model.coefficients);
            let right = dependence(&comparison.right, &model.coefficients);
            let plain =
                |side: &crate::model::calculus::Dependence| !side.time && !side.on_state() && !side.noise;
            let normal =
                left.coordinates.contains(&raw.face.axis) || right.coordinates.contains(&raw.face.axis);
            (normal || !plain(&left) || !plain(&right)).then(|| {
                Diagnostic::error(
                    codes::PATCH_NOT_COMPARABLE,
                    raw.span,
                    "a patch of a face compares coordinates along the face with known numbers",
                )
                .with_text(format!("expected something like `{} and y < 0.3 m`", place(model, raw.face)))
            })
        })
        .collect()
}

/// Fluxes that another field's equation needs at a face where only the value is given.
pub(super) fn refuse_missing_fluxes(model: &Model, found: &[Condition], diagnostics: &mut Diagnostics) {
    for condition in found {
        let Treatment::Value { field, .. } = &condition.treatment else { continue };
        for equation in model.equations.iter().filter(|equation| equation.field != *field) {
            let fixed = found.iter().any(|other| {
                other.face == condition.face
                    && matches!(&other.treatment, Treatment::Value { field: own, .. } if *own == equation.field)
            });
            let Some((terms, _)) = derivative_terms(&equation.right) else { continue };
            let crossing = terms.iter().any(|term| match &term.derivative.kind {
                DerivativeKind::Second { axis, of, .. } => {
                    *axis == condition.face.axis
                        && partial(of, Variable::Field(*field), &model.coefficients)
                            .is_some_and(|slope| !slope.is_zero())
                }
                _ => false,
            });
            if crossing && !fixed {
                diagnostics.push(
                    Diagnostic::error(
                        codes::FLUX_OF_FIXED_FIELD,
                        condition.span,
                        format!(
                            "the equation of {} needs the flux of {} at {}, where only its value is given",
                            name(model, equation.field),
                            name(model, *field),
                            place(model, condition.face)
                        ),
                    )
                    .with_label(equation.span, "this equation")
                    .with_remedy(format!(
                        "give the value of {} there as well, or the flux of {}",
                        name(model, equation.field),
                        name(model, *field)
                    )),
                );
            }
        }
    }
}
