//! Conditions at faces: how many each face needs, what becomes of each one, and whether they fit together.
//!
//! A face needs one condition for each field that diffuses through it and one for each characteristic that enters. Each condition is an
//! equality that holds there; it becomes a given value, a given flux, or a relation between the fields of a transported block.

mod count;
mod kind;
mod need;
mod reading;

use std::collections::BTreeSet;

pub use super::raw::RawCondition;
use crate::diagnostic::{Diagnostic, Diagnostics, codes_conditions as codes};
use crate::model::{AxisId, Condition, Face, FaceRelation, Model, Side, Treatment};
use count::Placed;
pub(super) use count::{middle_of_face, points_of_face};
use kind::Kind;
use need::Need;

/// Classifies every condition of a model that has none yet; all faults are reported.
pub fn classify(model: &Model, raw: Vec<RawCondition>, diagnostics: &mut Diagnostics) -> Vec<Condition> {
    let mut found = Vec::new();
    let (on_faces, on_periodic): (Vec<_>, Vec<_>) =
        raw.into_iter().partition(|one| !model.axes[one.face.axis.0].periodic);
    for one in on_periodic {
        let axis = &model.axes[one.face.axis.0];
        diagnostics.push(
            Diagnostic::error(
                codes::PERIODIC_AXIS,
                one.span,
                format!("axis {} is periodic: it has no faces", axis.name),
            )
            .with_text("this condition has no place")
            .with_label(axis.span, "declared periodic here")
            .with_remedy("leave the condition out, or `periodic`"),
        );
    }
    for axis in (0..model.axes.len()).map(AxisId).filter(|axis| !model.axes[axis.0].periodic) {
        for side in [Side::Low, Side::High] {
            let face = Face { axis, side };
            let own: Vec<&RawCondition> = on_faces.iter().filter(|one| one.face == face).collect();
            found.extend(one_face(model, face, &own, diagnostics));
        }
    }
    kind::refuse_missing_fluxes(model, &found, diagnostics);
    found
}

fn one_face(
    model: &Model,
    face: Face,
    raw: &[&RawCondition],
    diagnostics: &mut Diagnostics,
) -> Vec<Condition> {
    let Some(needs) = need::of_face(model, face, diagnostics) else { return Vec::new() };
    let mut placed: Vec<Placed> = Vec::new();
    let mut sound = true;
    for one in raw {
        match kind::classify(model, one, &needs) {
            Ok((need, kind)) => {
                for field in kind::patch_faults(model, one) {
                    diagnostics.push(field);
                    sound = false;
                }
                placed.push(Placed { raw: one, need, kind });
            }
            Err(fault) => {
                diagnostics.push(*fault);
                sound = false;
            }
        }
    }
    if !sound {
        // The count would blame the face for what is wrong with a condition.
        return Vec::new();
    }
    for (index, need) in needs.iter().enumerate() {
        let own: Vec<&Placed> = placed.iter().filter(|one| one.need == index).collect();
        count::check(model, face, need, &own, diagnostics);
    }
    conditions(&needs, placed)
}

/// Relations of one block on the same patch become one condition.
fn conditions(needs: &[Need], placed: Vec<Placed>) -> Vec<Condition> {
    let mut found: Vec<Condition> = Vec::new();
    let mut joined: BTreeSet<usize> = BTreeSet::new();
    for index in 0..placed.len() {
        if joined.contains(&index) {
            continue;
        }
        let one = &placed[index];
        let mut text = one.raw.text.clone();
        let treatment = match &one.kind {
            Kind::Value { field, value, rate, second_rate } => Treatment::Value {
                field: *field,
                value: value.clone(),
                rate: rate.clone(),
                second_rate: second_rate.clone(),
            },
            Kind::Flux { field, normal_derivative } => {
                Treatment::Flux { field: *field, normal_derivative: normal_derivative.clone() }
            }
            Kind::Inflow { field, value } => Treatment::InflowValue { field: *field, value: value.clone() },
            Kind::Relation(first) => {
                let mut relations: Vec<FaceRelation> = vec![first.clone()];
                if needs[one.need].count > 1 {
                    for (later, other) in placed.iter().enumerate().skip(index + 1) {
                        if let Kind::Relation(relation) = &other.kind
                            && other.need == one.need
                            && other.raw.patch == one.raw.patch
                        {
                            relations.push(relation.clone());
                            joined.insert(later);
                            text = format!("{text}; {}", other.raw.text);
                        }
                    }
                }
                Treatment::Upwind { relations }
            }
        };
        found.push(Condition {
            face: one.raw.face,
            patch: one.raw.patch.clone(),
            treatment,
            text,
            span: one.raw.span,
        });
    }
    found
}
