//! Outputs: which buffer holds what is asked for, and the sweeps that fill it.

use super::stage::Lowering;
use super::translate::Binding;
use crate::kernel::{BufferId, Operation, Output, OutputKind, Sweep, ValueId, Write};
use crate::model::{self, Expression};

impl Lowering<'_> {
    /// All outputs; `present` says where the state stands between steps.
    pub(super) fn outputs(&mut self, present: &Binding) -> Vec<Output> {
        let (model, scheme) = (self.model, self.scheme);
        model
            .outputs
            .iter()
            .zip(&scheme.outputs)
            .map(|(output, value)| self.output(output, value, present))
            .collect()
    }

    fn output(&mut self, output: &model::Output, value: &Expression, present: &Binding) -> Output {
        let fixed = Binding::fixed();
        let direct = match value {
            Expression::Field(field) => Some(present.field[field.0]),
            _ => None,
        };
        let largest = matches!(output.kind, model::OutputKind::Maximum);
        let buffer = match direct {
            Some(buffer) if !largest => buffer,
            _ => self.buffer(format!("output {}", output.name)),
        };
        let sweeps = if direct.is_some() && !largest {
            Vec::new()
        } else {
            self.filling(value, present, buffer, &output.name)
        };
        let kind = match &output.kind {
            model::OutputKind::Snapshot => OutputKind::Snapshot,
            model::OutputKind::Integral => OutputKind::Integral,
            model::OutputKind::Gauge { place } => {
                OutputKind::Gauge(place.iter().map(|coordinate| self.value(coordinate, &fixed)).collect())
            }
            model::OutputKind::Maximum => OutputKind::Maximum { begin: sweeps.clone() },
        };
        let sweeps = if largest { self.keep_largest(sweeps, buffer) } else { sweeps };
        Output {
            name: output.name.clone(),
            unit: output.unit.clone(),
            scale: self.value(&output.scale, &fixed),
            kind,
            sweeps,
            buffer,
            every: output.every.as_ref().map(|every| self.value(every, &fixed)),
        }
    }

    fn filling(&mut self, value: &Expression, present: &Binding, buffer: BufferId, name: &str) -> Vec<Sweep> {
        let mut binding = present.clone();
        let mut sweeps = self.apply(&[value], &mut binding);
        let value = self.stored(value, &binding);
        sweeps.push(Sweep {
            label: format!("output {name}"),
            writes: vec![Write { buffer, value }],
            ..Sweep::default()
        });
        sweeps
    }

    fn keep_largest(&mut self, mut sweeps: Vec<Sweep>, buffer: BufferId) -> Vec<Sweep> {
        if let Some(write) = sweeps.last_mut().and_then(|sweep| sweep.writes.last_mut()) {
            let old = self.builder.load(buffer);
            let larger: ValueId = self.builder.value(Operation::Maximum(write.value, old));
            write.value = larger;
        }
        sweeps
    }
}
