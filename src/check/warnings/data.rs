//! Traps of data: starts and faces that disagree, ranges, data without a rate, decisions made at a default.

use crate::check::conditions::points_of_face;
use crate::diagnostic::{Diagnostic, Diagnostics, codes_conditions as codes};
use crate::model::calculus::{Variable, dependence, expand, partial};
use crate::model::characteristics::blocks;
use crate::model::numeric::{Point, evaluate, holds, nodes};
use crate::model::{AxisId, Condition, Expression, Face, FieldId, Method, Model, Treatment};

/// Relative difference that counts as disagreement.
const TOLERANCE: f64 = 1e-9;
/// Difference between start and face that matters, against the size of the field.
const NOTICEABLE: f64 = 1e-6;
/// Nodes along each axis at which a range is tried.
const TRIALS: usize = 64;

fn start_of(model: &Model, field: FieldId) -> Option<&Expression> {
    model
        .initial
        .iter()
        .find(|initial| initial.field == field && initial.derivative == 0)
        .map(|initial| &initial.value)
}

fn given(condition: &Condition) -> Option<(FieldId, Expression)> {
    match &condition.treatment {
        Treatment::Value { field, value, .. } | Treatment::InflowValue { field, value } => {
            Some((*field, value.clone()))
        }
        Treatment::Upwind { relations } => {
            let [relation] = relations.as_slice() else { return None };
            let [(field, weight)] = relation.coefficients.as_slice() else { return None };
            Some((*field, relation.data.clone().over(weight.clone())))
        }
        Treatment::Flux { .. } => None,
    }
}

fn applies(model: &Model, condition: &Condition, point: &Point) -> bool {
    condition.patch.iter().all(|comparison| holds(comparison, model, point).unwrap_or(false))
}

fn differ(a: f64, b: f64) -> bool {
    (a - b).abs() > TOLERANCE * a.abs().max(b.abs()).max(f64::MIN_POSITIVE)
}

/// The start against the values given at faces.
pub(super) fn starts(model: &Model, diagnostics: &mut Diagnostics) {
    for condition in &model.conditions {
        let Some((field, value)) = given(condition) else { continue };
        let Some(start) = start_of(model, field) else { continue };
        // A tail of a pulse at a face is no disagreement: differences are measured against the size of the whole field.
        let size = largest(model, start);
        for point in points_of_face(model, condition.face) {
            if !applies(model, condition, &point) {
                continue;
            }
            let (Some(inside), Some(face)) =
                (evaluate(start, model, &point), evaluate(&value, model, &point))
            else {
                break;
            };
            let scale = size.max(face.abs());
            if differ(inside, face) && (inside - face).abs() > NOTICEABLE * scale {
                let field = &model.fields[field.0];
                diagnostics.push(
                    Diagnostic::warning(
                        codes::START_MISMATCH,
                        condition.span,
                        format!("{} is {face:.6} at this face at the start, and the initial state has {inside:.6} there (SI)", field.name),
                    )
                    .with_remedy("let the two agree at the start, or expect a layer that is not resolved at first"),
                );
                break;
            }
        }
    }
}

/// The largest magnitude of an expression over the grid, at the start.
fn largest(model: &Model, value: &Expression) -> f64 {
    sample(model).iter().filter_map(|point| evaluate(value, model, point)).map(f64::abs).fold(0.0, f64::max)
}

fn sample(model: &Model) -> Vec<Point> {
    let trials = if model.axes.len() == 3 { 12 } else { TRIALS };
    let mut points: Vec<Vec<f64>> = vec![Vec::new()];
    for axis in (0..model.axes.len()).map(AxisId) {
        if model.axes[axis.0].nodes > 1 << 20 {
            return Vec::new();
        }
        let Some(all) = nodes(model, axis) else { return Vec::new() };
        let stride = all.len().div_ceil(trials).max(1);
        let chosen: Vec<f64> = all.iter().step_by(stride).copied().chain(all.last().copied()).collect();
        points = points
            .into_iter()
            .flat_map(|point| chosen.iter().map(move |value| point.iter().copied().chain([*value]).collect()))
            .collect();
    }
    let time = evaluate(&model.time.start, model, &Point::default()).unwrap_or(0.0);
    points.into_iter().map(|coordinates| Point { coordinates, time, fields: Vec::new() }).collect()
}

/// Values that two faces give where they meet.
pub(super) fn edges(model: &Model, diagnostics: &mut Diagnostics) {
    for (index, first) in model.conditions.iter().enumerate() {
        for second in &model.conditions[index + 1..] {
            if first.face.axis == second.face.axis {
                continue;
            }
            let (Some((a, left)), Some((b, right))) = (given(first), given(second)) else { continue };
            if a != b {
                continue;
            }
            for point in points_of_face(model, first.face) {
                if !on_face(model, second.face, &point)
                    || !applies(model, first, &point)
                    || !applies(model, second, &point)
                {
                    continue;
                }
                let (Some(x), Some(y)) = (evaluate(&left, model, &point), evaluate(&right, model, &point))
                else {
                    break;
                };
                if differ(x, y) {
                    diagnostics.push(
                        Diagnostic::warning(
                            codes::EDGE_MISMATCH,
                            second.span,
                            format!("{} is given as {x:.6} and as {y:.6} where two faces meet (SI, at the start)", model.fields[a.0].name),
                        )
                        .with_label(first.span, "the other face")
                        .with_remedy("let the data agree at the edge; as it is, the later condition sets the value there"),
                    );
                    break;
                }
            }
        }
    }
}

fn on_face(model: &Model, face: Face, point: &Point) -> bool {
    let Some(all) = nodes(model, face.axis) else { return false };
    let end = if face.side == crate::model::Side::Low { all.first() } else { all.last() };
    end.is_some_and(|end| point.coordinates.get(face.axis.0) == Some(end))
}

/// The start against stated ranges.
pub(super) fn ranges(model: &Model, diagnostics: &mut Diagnostics) {
    for (index, field) in model.fields.iter().enumerate() {
        let Some((low, high)) = &field.bounds else { continue };
        let number = |value: &Expression| evaluate(value, model, &Point::default());
        let (Some(low), Some(high)) = (number(low), number(high)) else { continue };
        let Some(start) = start_of(model, FieldId(index)) else { continue };
        let slack = TOLERANCE * (high - low).abs();
        for point in sample(model) {
            let Some(value) = evaluate(start, model, &point) else { break };
            if value < low - slack || value > high + slack {
                let span = model
                    .initial
                    .iter()
                    .find(|initial| initial.field.0 == index)
                    .map_or(field.span, |initial| initial.span);
                diagnostics.push(
                    Diagnostic::warning(
                        codes::START_OUT_OF_RANGE,
                        span,
                        format!(
                            "{} starts at {value:.6}, outside its range {low:.6} to {high:.6} (SI)",
                            field.name
                        ),
                    )
                    .with_label(field.span, "the range is stated here")
                    .with_remedy("widen the range, or change the initial state"),
                );
                break;
            }
        }
    }
}

/// Values that move in time and have no derivative in closed form.
pub(super) fn without_rate(model: &Model, diagnostics: &mut Diagnostics) {
    for condition in &model.conditions {
        let missing = match &condition.treatment {
            Treatment::Value { value, rate, .. } => {
                rate.is_none() && dependence(value, &model.coefficients).time
            }
            Treatment::Upwind { relations } => relations.iter().any(|relation| {
                dependence(&relation.data, &model.coefficients).time
                    && partial(&relation.data, Variable::Time, &model.coefficients).is_none()
            }),
            _ => false,
        };
        if missing && model.time.method != Method::Leapfrog {
            diagnostics.push(
                Diagnostic::warning(
                    codes::DATA_NOT_DIFFERENTIABLE,
                    condition.span,
                    "these data have no derivative in time in closed form: they are set at each stage, and the order in time falls to about 2.5",
                )
                .with_remedy("use smooth functions of t, without abs, min, max, sign and cases that depend on t"),
            );
        }
    }
}

/// ∂u/∂t in outputs of leapfrog.
pub(super) fn staggered_rates(model: &Model, diagnostics: &mut Diagnostics) {
    if model.time.method != Method::Leapfrog {
        return;
    }
    for output in &model.outputs {
        if !dependence(&output.value, &model.coefficients).rates.is_empty() {
            diagnostics.push(
                Diagnostic::warning(
                    codes::RATE_OUTPUT_STAGGERED,
                    output.span,
                    format!("`{}` holds a rate of change, which leapfrog knows half a step before the time of the output", output.name),
                )
                .with_remedy("use rk4 where this matters"),
            );
        }
    }
}

/// Free constants without a range in speeds that decide how many conditions a face needs.
pub(super) fn signs_at_default(model: &Model, diagnostics: &mut Diagnostics) {
    let mut told: Vec<usize> = Vec::new();
    for axis in (0..model.axes.len()).map(AxisId).filter(|axis| !model.axes[axis.0].periodic) {
        for block in blocks(model, axis).unwrap_or_default() {
            for entry in block.matrix.iter().flatten() {
                let whole = expand(entry, &model.coefficients);
                for (index, constant) in model.free_constants.iter().enumerate() {
                    let used = whole.any(&|node| matches!(node, Expression::Constant(id) if id.0 == index));
                    if used && constant.bounds.is_none() && !told.contains(&index) {
                        told.push(index);
                        let span = block
                            .fields
                            .first()
                            .map_or_else(Default::default, |field| model.equations[field.0].span);
                        diagnostics.push(
                            Diagnostic::warning(
                                codes::SIGN_AT_DEFAULT,
                                span,
                                format!("the directions of transport were decided at the default of the free constant `{}`", constant.name),
                            )
                            .with_remedy(format!("state its range: `{} = …, free between A and B`", constant.name)),
                        );
                    }
                }
            }
        }
    }
}
