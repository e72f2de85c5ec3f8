//! Traps of stability: signs of diffusion and films, methods that do not suit the equations, cells too coarse, jumps.

use crate::diagnostic::{Diagnostic, Diagnostics, codes_conditions as codes};
use crate::model::calculus::{DerivativeTerm, Variable, dependence, derivative_terms, expand, partial};
use crate::model::characteristics::{blocks, mean_and_root, outward, own_second_terms, sign_at};
use crate::model::expression::DerivativeKind;
use crate::model::formula::formula;
use crate::model::numeric::{Point, evaluate, spacing};
use crate::model::sign::{Sign, sign};
use crate::model::{AxisId, Expression, FieldId, Method, Model, TimeOrder, Treatment};

fn axes(model: &Model) -> impl Iterator<Item = AxisId> {
    (0..model.axes.len()).map(AxisId)
}

fn terms(model: &Model, field: FieldId) -> Vec<DerivativeTerm> {
    derivative_terms(&model.equations[field.0].right).map_or_else(Vec::new, |(terms, _)| terms)
}

/// factor·k·∂of/∂u of a second derivative of the field itself.
fn strength(model: &Model, field: FieldId, term: &DerivativeTerm) -> Option<Expression> {
    let DerivativeKind::Second { coefficient, of, .. } = &term.derivative.kind else { return None };
    let slope = partial(of, Variable::Field(field), &model.coefficients)?;
    let whole = Expression::product([term.factor.clone(), coefficient.clone(), slope]);
    Some(expand(&whole, &model.coefficients))
}

/// Whether no first derivative and no wave ties the step to the first power of the spacing.
pub(super) fn step_goes_with_square(model: &Model) -> bool {
    model.equations.iter().all(|equation| {
        equation.order == TimeOrder::First
            && terms(model, equation.field).iter().all(|term| {
                matches!(term.derivative.kind, DerivativeKind::Second { .. } | DerivativeKind::Mixed { .. })
            })
            && axes(model).all(|axis| !own_second_terms(model, equation.field, axis).is_empty())
    })
}

/// Diffusion must not run backwards.
pub(super) fn diffusion(model: &Model, diagnostics: &mut Diagnostics) {
    for equation in &model.equations {
        let nested = equation.right.any(&|node| match node {
            Expression::Derivative(derivative) => match &derivative.kind {
                DerivativeKind::Second { of, .. } => {
                    of.any(&|inner| matches!(inner, Expression::Derivative(_)))
                }
                DerivativeKind::Higher { .. } => true,
                _ => false,
            },
            _ => false,
        });
        for axis in axes(model) {
            // Several terms along one axis are judged by their sum.
            let parts: Vec<Expression> = own_second_terms(model, equation.field, axis)
                .iter()
                .filter_map(|term| strength(model, equation.field, term))
                .collect();
            if parts.is_empty() {
                continue;
            }
            let whole = Expression::sum(parts);
            let (name, along) = (&model.fields[equation.field.0].name, &model.axes[axis.0].name);
            match sign(&whole, model) {
                // With a fourth derivative behind it a negative second one is tamed; that is not judged here.
                Sign::Negative | Sign::NonPositive if !nested => diagnostics.push(
                    Diagnostic::error(
                        codes::NEGATIVE_DIFFUSION,
                        equation.span,
                        format!("the second derivative of {name} along {along} has a negative coefficient: {}", formula(&whole, model)),
                    )
                    .with_text("expected a coefficient that is nowhere negative")
                    .with_remedy("check the sign of the term, or of the constants in it"),
                ),
                Sign::Unknown if !nested => diagnostics.push(
                    Diagnostic::warning(
                        codes::DIFFUSION_SIGN_UNKNOWN,
                        equation.span,
                        format!("the sign of the coefficient of the second derivative of {name} along {along} is not known: {}", formula(&whole, model)),
                    )
                    .with_remedy("bound the fields or free constants in it with `between A and B`"),
                ),
                _ => {}
            }
        }
    }
}

/// Forward Euler and what lies on the imaginary axis.
pub(super) fn euler(model: &Model, diagnostics: &mut Diagnostics) {
    if model.time.method != Method::Euler {
        return;
    }
    for equation in &model.equations {
        let name = &model.fields[equation.field.0].name;
        if equation.order == TimeOrder::Second {
            diagnostics.push(
                Diagnostic::error(
                    codes::EULER_UNSTABLE,
                    equation.span,
                    format!("forward Euler amplifies every wave of {name}, whatever the step"),
                )
                .with_label(model.time.span, "the method is chosen here")
                .with_remedy("use leapfrog or rk4"),
            );
            continue;
        }
        for axis in axes(model) {
            let transport: Vec<Expression> = terms(model, equation.field)
                .iter()
                .filter_map(|term| match &term.derivative.kind {
                    DerivativeKind::First { axis: along, of } if *along == axis => {
                        let all = (0..model.fields.len()).map(FieldId).filter_map(|field| {
                            let slope = partial(of, Variable::Field(field), &model.coefficients)?;
                            (!slope.is_zero()).then(|| term.factor.clone().times(slope))
                        });
                        Some(Expression::sum(all.collect::<Vec<_>>()))
                    }
                    _ => None,
                })
                .filter(|speed| !speed.is_zero())
                .collect();
            if transport.is_empty() {
                continue;
            }
            let along = &model.axes[axis.0].name;
            if own_second_terms(model, equation.field, axis).is_empty() {
                diagnostics.push(
                    Diagnostic::error(
                        codes::EULER_UNSTABLE,
                        equation.span,
                        format!("forward Euler with a central derivative of {name} along {along} and no diffusion grows at every step"),
                    )
                    .with_label(model.time.span, "the method is chosen here")
                    .with_remedy("use ssprk3, rk4 or lsrk4"),
                );
            } else {
                diagnostics.push(
                    Diagnostic::warning(
                        codes::EULER_CENTRAL,
                        equation.span,
                        format!("forward Euler carries the transport of {name} along {along} by its diffusion alone: the step stays below 2k/a² however fine the grid"),
                    )
                    .with_remedy("rk4 or ssprk3 allow steps that go with the spacing"),
                );
            }
        }
    }
}

/// What leapfrog asks of the equations.
pub(super) fn leapfrog(model: &Model, diagnostics: &mut Diagnostics) {
    if model.time.method != Method::Leapfrog {
        return;
    }
    for equation in &model.equations {
        let name = &model.fields[equation.field.0].name;
        if equation.order == TimeOrder::First {
            diagnostics.push(
                Diagnostic::error(
                    codes::LEAPFROG_NEEDS_SECOND_ORDER,
                    equation.span,
                    format!("leapfrog needs ∂²{name}/∂t²: this equation is first order in time"),
                )
                .with_label(model.time.span, "the method is chosen here")
                .with_remedy("use rk4 or lsrk4"),
            );
            continue;
        }
        let faces = model.conditions.iter().filter_map(|condition| match &condition.treatment {
            Treatment::Flux { field, normal_derivative } if *field == equation.field => {
                Some(normal_derivative)
            }
            _ => None,
        });
        for expression in std::iter::once(&equation.right).chain(faces) {
            if let Some(why) = bad_rate(model, equation.field, expression) {
                diagnostics.push(
                    Diagnostic::error(
                        codes::LEAPFROG_RATE,
                        equation.span,
                        format!("leapfrog cannot take this: {why}"),
                    )
                    .with_label(model.time.span, "the method is chosen here")
                    .with_remedy("use rk4"),
                );
            }
        }
    }
}

fn bad_rate(model: &Model, field: FieldId, expression: &Expression) -> Option<String> {
    let name = |field: FieldId| model.fields[field.0].name.clone();
    let found = dependence(expression, &model.coefficients);
    let under_derivative = expression.any(&|node| {
        matches!(node, Expression::Derivative(_))
            && node.children().iter().any(|child| !dependence(child, &model.coefficients).rates.is_empty())
    });
    if under_derivative {
        return Some("a rate of change stands under a spatial derivative".to_owned());
    }
    if let Some(other) = found.rates.iter().find(|other| **other != field) {
        return Some(format!("∂{}/∂t stands in the equation of {}", name(*other), name(field)));
    }
    if !found.rates.contains(&field) {
        return None;
    }
    match partial(expression, Variable::Rate(field), &model.coefficients) {
        Some(slope)
            if dependence(&slope, &model.coefficients).rates.is_empty()
                && !dependence(&slope, &model.coefficients).derivatives =>
        {
            (sign(&slope.negative(), model) == Sign::Negative)
                .then(|| format!("∂{}/∂t feeds itself instead of damping", name(field)))
        }
        _ => Some(format!("∂{}/∂t does not stand linearly", name(field))),
    }
}

/// A film that feeds.
pub(super) fn films(model: &Model, diagnostics: &mut Diagnostics) {
    for condition in &model.conditions {
        let Treatment::Flux { field, normal_derivative } = &condition.treatment else { continue };
        let Some(slope) = partial(normal_derivative, Variable::Field(*field), &model.coefficients) else {
            continue;
        };
        if sign_at(&slope, model, condition.face) == Sign::Positive {
            diagnostics.push(
                Diagnostic::warning(
                    codes::ROBIN_WRONG_SIGN,
                    condition.span,
                    format!(
                        "this condition feeds {} in proportion to itself: ∂/∂n grows with the value",
                        model.fields[field.0].name
                    ),
                )
                .with_text(format!("the slope is {}", formula(&slope, model)))
                .with_remedy("a film that loses heat is -k * ∂T/∂n = h * (T - T_outside)"),
            );
        }
    }
}

/// Relations that send back more than they receive, for pairs with opposite speeds.
pub(super) fn reflections(model: &Model, diagnostics: &mut Diagnostics) {
    for condition in &model.conditions {
        let Treatment::Upwind { relations } = &condition.treatment else { continue };
        let [relation] = relations.as_slice() else { continue };
        let Some(all) = blocks(model, condition.face.axis) else { continue };
        let own = all.into_iter().find(|block| {
            block.fields.len() == 2
                && relation.coefficients.iter().any(|(field, _)| block.fields.contains(field))
        });
        let Some(block) = own else { continue };
        let matrix = outward(&block, condition.face.side);
        let Some((mean, root)) = mean_and_root(&matrix) else { continue };
        let point = super::super::conditions::middle_of_face(model, condition.face);
        let number = |value: &Expression| evaluate(value, model, &point);
        let (Some(mean), Some(root)) = (number(&mean), number(&root)) else { continue };
        let (Some(a), Some(b), Some(c), Some(d)) =
            (number(&matrix[0][0]), number(&matrix[0][1]), number(&matrix[1][0]), number(&matrix[1][1]))
        else {
            continue;
        };
        // Energy-scaled eigenvectors of [[a, b], [c, d]] with bc > 0 and equal diagonal: (√|b|, ±√|c|) up to sign.
        if b * c <= 0.0 || (a - d).abs() > 1e-12 * root.abs() {
            continue;
        }
        let vector = |eigenvalue: f64| [b, eigenvalue - a];
        let along = |vector: [f64; 2]| -> Option<f64> {
            let mut total = 0.0;
            for (field, part) in block.fields.iter().zip(vector) {
                if let Some((_, weight)) = relation.coefficients.iter().find(|(own, _)| own == field) {
                    total += number(weight)? * part;
                }
            }
            Some(total)
        };
        let (Some(incoming), Some(outgoing)) = (along(vector(mean - root)), along(vector(mean + root)))
        else {
            continue;
        };
        let reflection = (outgoing / incoming).abs();
        if reflection.is_finite() && reflection > 1.0 + 1e-9 {
            diagnostics.push(
                Diagnostic::warning(
                    codes::OVER_REFLECTING,
                    condition.span,
                    format!("this relation returns {reflection:.4} times what it receives: the energy grows at each reflection"),
                )
                .with_remedy("check the sign of the impedance: along the outward normal p = Z * v_n with Z ≥ 0"),
            );
        }
    }
}

/// Cell Péclet numbers above two.
pub(super) fn cells(model: &Model, diagnostics: &mut Diagnostics) {
    for equation in model.equations.iter().filter(|equation| equation.order == TimeOrder::First) {
        for axis in axes(model) {
            let own = own_second_terms(model, equation.field, axis);
            if own.is_empty() || model.axes[axis.0].nodes > 1 << 20 {
                continue;
            }
            let speed = Expression::sum(
                terms(model, equation.field)
                    .iter()
                    .filter_map(|term| match &term.derivative.kind {
                        DerivativeKind::First { axis: along, of } if *along == axis => {
                            Some(term.factor.clone().times(partial(
                                of,
                                Variable::Field(equation.field),
                                &model.coefficients,
                            )?))
                        }
                        _ => None,
                    })
                    .collect::<Vec<_>>(),
            );
            let diffusion = Expression::sum(
                own.iter().filter_map(|term| strength(model, equation.field, term)).collect::<Vec<_>>(),
            );
            if speed.is_zero() || dependence(&speed, &model.coefficients).on_state() {
                continue;
            }
            let point = Point {
                coordinates: model.axes.iter().map(|axis| middle(model, axis).unwrap_or(0.0)).collect(),
                time: 0.0,
                fields: Vec::new(),
            };
            let (Some(a), Some(k), Some(h)) =
                (evaluate(&speed, model, &point), evaluate(&diffusion, model, &point), spacing(model, axis))
            else {
                continue;
            };
            let number = (a * h / k).abs();
            if number.is_finite() && number > 2.0 {
                let nodes = (model.axes[axis.0].nodes as f64 * number / 2.0).ceil();
                diagnostics.push(
                    Diagnostic::warning(
                        codes::CELL_PECLET,
                        equation.span,
                        format!(
                            "the cell Péclet number |a| Δ{0} / k is {number:.3}, above 2: central differences will ring near steep layers along {0}",
                            model.axes[axis.0].name
                        ),
                    )
                    .with_remedy(format!("about {nodes} nodes along {} bring it down to 2", model.axes[axis.0].name)),
                );
            }
        }
    }
}

fn middle(model: &Model, axis: &crate::model::Axis) -> Option<f64> {
    let point = Point::default();
    Some(0.5 * (evaluate(&axis.low, model, &point)? + evaluate(&axis.high, model, &point)?))
}

/// Coefficients that jump inside ∂/∂x(k ∂·).
pub(super) fn jumps(model: &Model, diagnostics: &mut Diagnostics) {
    for equation in &model.equations {
        for axis in axes(model) {
            for term in own_second_terms(model, equation.field, axis) {
                let DerivativeKind::Second { coefficient, .. } = &term.derivative.kind else { continue };
                let whole = expand(coefficient, &model.coefficients);
                let jumping = whole.any(&|node| match node {
                    Expression::Cases(cases, _) => cases.iter().any(|(comparison, _)| {
                        [&comparison.left, &comparison.right]
                            .iter()
                            .any(|side| dependence(side, &model.coefficients).coordinates.contains(&axis))
                    }),
                    Expression::Call(crate::model::Function::Sign, arguments) => {
                        dependence(&arguments[0], &model.coefficients).coordinates.contains(&axis)
                    }
                    _ => false,
                });
                if jumping {
                    diagnostics.push(
                        Diagnostic::warning(
                            codes::COEFFICIENT_JUMPS,
                            equation.span,
                            format!(
                                "the coefficient {} jumps along {}: order 1 remains near the jump",
                                formula(coefficient, model),
                                model.axes[axis.0].name
                            ),
                        )
                        .with_remedy(
                            "smooth the jump over a few nodes with tanh, if the order matters there",
                        ),
                    );
                }
            }
        }
    }
}
