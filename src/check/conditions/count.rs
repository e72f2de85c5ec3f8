//! Whether a face has the conditions that it needs, everywhere on it.

use super::RawCondition;
use super::kind::Kind;
use super::need::{Need, NeedKind, name, place};
use crate::diagnostic::{Diagnostic, Diagnostics, codes_conditions as codes};
use crate::model::numeric::{Point, holds, nodes};
use crate::model::{AxisId, Face, Model, Side};

/// A condition with the need that it serves.
pub(super) struct Placed<'a> {
    pub(super) raw: &'a RawCondition,
    pub(super) need: usize,
    pub(super) kind: Kind,
}

/// Places of a face that patches are tried at, at most, along each tangential axis.
const TRIALS: usize = 128;

/// Compares what a face needs with what it has.
pub(super) fn check(model: &Model, face: Face, need: &Need, own: &[&Placed], diagnostics: &mut Diagnostics) {
    if need.refused {
        return;
    }
    if need.count == 0 {
        for one in own {
            diagnostics.push(superfluous(model, face, need, one.raw));
        }
        return;
    }
    if own.iter().all(|one| one.raw.patch.is_empty()) {
        match own.len() {
            has if has < need.count => diagnostics.push(lacking(model, face, need, own)),
            has if has > need.count => diagnostics.push(too_many(model, face, need, own)),
            _ => {}
        }
        return;
    }
    if let Some(fault) = patches(model, face, need, own) {
        diagnostics.push(fault);
    }
}

fn superfluous(model: &Model, face: Face, need: &Need, raw: &RawCondition) -> Diagnostic {
    let place = place(model, face);
    let (code, message) = if need.is_idle() {
        (codes::NO_NORMAL_DERIVATIVE, format!("{} needs no condition at {place}", need.names(model)))
    } else {
        (
            codes::CONDITION_AT_OUTFLOW,
            format!("nothing enters at {place}: {} needs no condition there", need.names(model)),
        )
    };
    Diagnostic::error(code, raw.span, message)
        .with_text(need.why.clone())
        .with_remedy("leave this condition out")
}

fn lacking(model: &Model, face: Face, need: &Need, own: &[&Placed]) -> Diagnostic {
    let place = place(model, face);
    let span = own.first().map_or(model.axes[face.axis.0].span, |one| one.raw.span);
    let wanted =
        if need.count == 1 { "one condition".to_owned() } else { format!("{} conditions", need.count) };
    let remedy = match &need.kind {
        NeedKind::Diffusive(field) => {
            let name = name(model, *field);
            format!("add `at {place}: {name} = …` or `at {place}: ∂{name}/∂n = …`")
        }
        _ => format!("add `at {place}: …` with a value of {} or a relation between them", need.names(model)),
    };
    Diagnostic::error(
        codes::FACE_LACKS_CONDITION,
        span,
        format!("{place} needs {wanted} for {} and has {}", need.names(model), own.len()),
    )
    .with_text(format!("because {}", need.why))
    .with_remedy(remedy)
}

fn too_many(model: &Model, face: Face, need: &Need, own: &[&Placed]) -> Diagnostic {
    let place = place(model, face);
    let is_flux = |one: &&&Placed| matches!(one.kind, Kind::Flux { .. });
    let mixed = own.iter().any(|one| is_flux(&one)) && own.iter().any(|one| !is_flux(&one));
    let code = if mixed { codes::CONTRADICTING_CONDITIONS } else { codes::TOO_MANY_CONDITIONS };
    let wanted =
        if need.count == 1 { "one condition".to_owned() } else { format!("{} conditions", need.count) };
    let mut diagnostic = Diagnostic::error(
        code,
        own[need.count].raw.span,
        format!("{place} needs {wanted} for {} and has {}", need.names(model), own.len()),
    )
    .with_text(format!("one too many, because {}", need.why))
    .with_remedy("keep one of them");
    for other in &own[..need.count] {
        diagnostic = diagnostic.with_label(other.raw.span, "also given here");
    }
    diagnostic
}

/// Tries the nodes of the face: each must have exactly as many conditions as are needed.
fn patches(model: &Model, face: Face, need: &Need, own: &[&Placed]) -> Option<Diagnostic> {
    for point in points_of_face(model, face) {
        let mut here = Vec::new();
        for one in own {
            let inside: Option<bool> = one
                .raw
                .patch
                .iter()
                .try_fold(true, |all, comparison| Some(all && holds(comparison, model, &point)?));
            if inside? {
                here.push(one);
            }
        }
        if here.len() == need.count {
            continue;
        }
        let at: Vec<String> = model
            .axes
            .iter()
            .zip(&point.coordinates)
            .enumerate()
            .filter(|(axis, _)| *axis != face.axis.0)
            .map(|(_, (axis, value))| format!("{} = {value:.6} {}", axis.name, axis.dimension))
            .collect();
        let what = if here.len() < need.count { "has a gap" } else { "is covered twice" };
        let span =
            here.last().copied().or(own.first()).map_or(model.axes[face.axis.0].span, |one| one.raw.span);
        return Some(
            Diagnostic::error(
                codes::PATCHES_DO_NOT_FIT,
                span,
                format!(
                    "{} {what} at {}: {} conditions for {}, {} needed",
                    place(model, face),
                    at.join(", "),
                    here.len(),
                    need.names(model),
                    need.count
                ),
            )
            .with_text(format!("because {}", need.why))
            .with_remedy("make the patches meet, like `y < 0.3 m` and `y >= 0.3 m`"),
        );
    }
    None
}

/// Nodes of a face, thinned out where there are many; the ends are among them.
pub(in crate::check) fn points_of_face(model: &Model, face: Face) -> Vec<Point> {
    let mut points: Vec<Vec<f64>> = vec![Vec::new()];
    for axis in (0..model.axes.len()).map(AxisId) {
        let Some(all) = nodes(model, axis) else { return Vec::new() };
        let chosen: Vec<f64> = if axis == face.axis {
            let end = if face.side == Side::Low { all.first() } else { all.last() };
            end.copied().into_iter().collect()
        } else {
            let stride = all.len().div_ceil(TRIALS).max(1);
            let last = all.len().saturating_sub(1);
            all.iter()
                .enumerate()
                .filter(|(index, _)| index % stride == 0 || *index == last)
                .map(|(_, value)| *value)
                .collect()
        };
        points = points
            .into_iter()
            .flat_map(|point| chosen.iter().map(move |value| point.iter().copied().chain([*value]).collect()))
            .collect();
    }
    let time = crate::model::numeric::evaluate(&model.time.start, model, &Point::default()).unwrap_or(0.0);
    points.into_iter().map(|coordinates| Point { coordinates, time, fields: Vec::new() }).collect()
}

/// A node in the middle of a face, at the start.
pub(in crate::check) fn middle_of_face(model: &Model, face: Face) -> Point {
    let points = points_of_face(model, face);
    let middle = points.len() / 2;
    points.into_iter().nth(middle).unwrap_or_default()
}
