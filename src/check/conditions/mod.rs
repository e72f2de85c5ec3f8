//! Conditions at faces: how many each face needs, and what becomes of each one.

mod need;
mod reading;

pub use super::raw::RawCondition;
use crate::diagnostic::Diagnostics;
use crate::model::calculus::{Variable, partial};
use crate::model::{Condition, FaceRelation, Model, Treatment};
use reading::{Reading, normal};

/// Temporary: no counting yet.
pub fn classify(model: &Model, raw: Vec<RawCondition>, diagnostics: &mut Diagnostics) -> Vec<Condition> {
    let mut found = Vec::new();
    for one in raw {
        let reading = match Reading::of(model, &one) {
            Ok(reading) => reading,
            Err(fault) => {
                diagnostics.push(fault);
                continue;
            }
        };
        let treatment = if let Some(field) = reading.normals.iter().next().copied() {
            match reading.solved_for(model, &one, normal(model, field), "the normal derivative") {
                Ok(normal_derivative) => Treatment::Flux { field, normal_derivative },
                Err(fault) => {
                    diagnostics.push(fault);
                    continue;
                }
            }
        } else if let Some(field) =
            reading.fields.iter().copied().find(|field| need::is_diffusive(model, *field, one.face.axis))
        {
            match reading.solved_for(model, &one, field, "the value") {
                Ok(value) => {
                    let slope =
                        |of: &crate::model::Expression| partial(of, Variable::Time, &model.coefficients);
                    let rate = slope(&value);
                    let second_rate = rate.as_ref().and_then(slope);
                    Treatment::Value { field, value, rate, second_rate }
                }
                Err(fault) => {
                    diagnostics.push(fault);
                    continue;
                }
            }
        } else {
            let fields: Vec<_> = reading.fields.iter().copied().collect();
            let coefficients =
                fields.iter().filter_map(|field| Some((*field, reading.factor(model, *field)?))).collect();
            Treatment::Upwind {
                relations: vec![FaceRelation { coefficients, data: reading.remainder(&fields) }],
            }
        };
        found.push(Condition { face: one.face, patch: one.patch, treatment, text: one.text, span: one.span });
    }
    found
}
