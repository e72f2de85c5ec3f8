//! From a scheme to its kernel. Total: what can go wrong went wrong before.

mod line;
mod method;
mod output;
mod stage;
mod tableau;
mod translate;

use super::{Axis, Builder, Field, Kernel, Limit, NamedOperator, Parameter, Step, TimePlan};
use crate::model::{self, Method, Model};
use crate::scheme::{LimitLaw, Scheme};
use stage::Lowering;
use translate::Binding;

/// The kernel of a scheme. `notes` are lines about the model for comments in emitted text.
pub fn lower(model: &Model, scheme: &Scheme, law: &LimitLaw, notes: Vec<String>) -> Kernel {
    let mut lowering = Lowering {
        model,
        scheme,
        builder: Builder::new(model.axes.len()),
        buffers: Vec::new(),
        auxiliary: Vec::new(),
    };
    let marching = lowering.march();
    let outputs = lowering.outputs(&marching.present);
    let rate = lowering.stored(&law.rate, &marching.present);
    let limit = Limit { rate, state_dependent: changes(model, law), law: law.text.clone() };
    let fixed = Binding::fixed();
    let axes = model
        .axes
        .iter()
        .zip(&scheme.axes)
        .map(|(axis, facts)| Axis {
            name: axis.name.clone(),
            unit: axis.dimension.to_string(),
            low: lowering.value(&axis.low, &fixed),
            high: lowering.value(&axis.high, &fixed),
            nodes: axis.nodes,
            least_nodes: facts.least_nodes,
            periodic: axis.periodic,
        })
        .collect();
    let parameters = model
        .free_constants
        .iter()
        .map(|constant| Parameter {
            name: constant.name.clone(),
            description: constant.description.clone(),
            unit: constant.unit.clone(),
            scale: lowering.value(&constant.scale, &fixed),
            default: lowering.value(&constant.value, &fixed),
            bounds: constant
                .bounds
                .as_ref()
                .map(|(low, high)| (lowering.value(low, &fixed), lowering.value(high, &fixed))),
        })
        .collect();
    let fields = model
        .fields
        .iter()
        .enumerate()
        .map(|(index, field)| Field {
            name: field.name.clone(),
            unit: field.unit.clone(),
            scale: lowering.value(&field.scale, &fixed),
            buffer: marching.present.field[index],
            bounds: field
                .bounds
                .as_ref()
                .map(|(low, high)| (lowering.value(low, &fixed), lowering.value(high, &fixed))),
        })
        .collect();
    let time = TimePlan {
        start: lowering.value(&model.time.start, &fixed),
        end: lowering.value(&model.time.end, &fixed),
        step: match &model.time.step {
            model::Step::Duration(duration) => Step::Duration(lowering.value(duration, &fixed)),
            model::Step::OfLimit(fraction) => Step::OfLimit(fraction.clone()),
        },
        method: model.time.method.name().to_owned(),
        constant_step: model.time.method == Method::Leapfrog,
    };
    let operators = scheme
        .operators
        .iter()
        .map(|operator| NamedOperator {
            name: operator.name.clone(),
            operator: line::operator(&operator.rule),
        })
        .collect();
    let Lowering { builder, buffers, .. } = lowering;
    let (values, tables) = builder.finish();
    Kernel {
        name: model.name.clone(),
        title: model.title.clone(),
        notes,
        axes,
        parameters,
        values,
        operators,
        buffers,
        tables,
        fields,
        start: marching.start,
        step: marching.step,
        rotation: marching.rotation,
        state: marching.state,
        first_step: marching.first_step,
        limit,
        time,
        outputs,
        interpolation_nodes: scheme.interpolation_nodes,
        quadrature: scheme
            .axes
            .iter()
            .map(|axis| axis.norm.as_ref().map_or_else(Vec::new, |norm| norm.left().to_vec()))
            .collect(),
    }
}

fn changes(model: &Model, law: &LimitLaw) -> bool {
    let found = crate::model::calculus::dependence(&law.rate, &model.coefficients);
    found.on_state() || found.time
}
