//! One evaluation of the right side: which auxiliary arrays are filled, then the rates with their face terms.

use super::translate::{Binding, Translation};
use crate::kernel::{
    Action, Buffer, BufferId, Builder, Extent, FaceSet, FaceTerm, OperatorId, Source, Sweep, ValueId, Write,
};
use crate::model::{Comparison, Expression, Face, Model, Side};
use crate::scheme::Scheme;

/// Everything that grows while a kernel is lowered.
pub(super) struct Lowering<'a> {
    pub(super) model: &'a Model,
    pub(super) scheme: &'a Scheme,
    pub(super) builder: Builder,
    pub(super) buffers: Vec<Buffer>,
    /// Auxiliary arrays: (application, whether it holds the coefficient) → buffer. Shared by all stages.
    pub(super) auxiliary: Vec<(usize, bool, BufferId)>,
}

impl<'a> Lowering<'a> {
    pub(super) fn buffer(&mut self, name: impl Into<String>) -> BufferId {
        self.buffers.push(Buffer { name: name.into() });
        BufferId(self.buffers.len() - 1)
    }

    pub(super) fn value(&mut self, expression: &Expression, binding: &Binding) -> ValueId {
        Translation { builder: &mut self.builder, coefficients: &self.model.coefficients }
            .value(expression, binding)
    }

    /// A value ready for a sweep: what is spatial comes from its table.
    pub(super) fn stored(&mut self, expression: &Expression, binding: &Binding) -> ValueId {
        let value = self.value(expression, binding);
        self.builder.stored(value)
    }

    /// Binds the applications that the expressions need; the sweeps fill auxiliary arrays and come first.
    pub(super) fn apply(&mut self, needed: &[&Expression], binding: &mut Binding) -> Vec<Sweep> {
        binding.applied = vec![None; self.scheme.applications.len()];
        let wanted = self.wanted(needed);
        let levels = self.levels();
        let deepest = wanted.iter().map(|index| levels[*index]).max();
        let mut sweeps = Vec::new();
        for level in 0..=deepest.unwrap_or(0) {
            let here: Vec<usize> = wanted.iter().copied().filter(|index| levels[*index] == level).collect();
            if here.is_empty() {
                continue;
            }
            let mut writes = Vec::new();
            let mut pending = Vec::new();
            for index in here {
                let application = self.scheme.applications[index].clone();
                let source =
                    self.source(index, false, &application.of, application.axis.0, binding, &mut writes);
                let coefficient = application.coefficient.as_ref().map(|coefficient| {
                    self.source(index, true, coefficient, application.axis.0, binding, &mut writes)
                });
                pending.push((index, application.operator, application.axis.0, source, coefficient));
            }
            if !writes.is_empty() {
                sweeps.push(Sweep {
                    label: "arguments of derivatives".to_owned(),
                    writes,
                    ..Sweep::default()
                });
            }
            for (index, operator, axis, source, coefficient) in pending {
                let value = match (source, coefficient) {
                    (Some(source), None) => self.builder.apply(OperatorId(operator), axis, source, None),
                    (Some(source), Some(Some(coefficient))) => {
                        self.builder.apply(OperatorId(operator), axis, source, Some(coefficient))
                    }
                    // The derivative of what is the same at every node of the line.
                    _ => self.builder.whole(0),
                };
                binding.applied[index] = Some(value);
            }
        }
        sweeps
    }

    fn wanted(&self, needed: &[&Expression]) -> Vec<usize> {
        let mut marked = vec![false; self.scheme.applications.len()];
        let mut open: Vec<&Expression> = needed.to_vec();
        while let Some(expression) = open.pop() {
            for index in applied_in(expression) {
                if !marked[index] {
                    marked[index] = true;
                    let application = &self.scheme.applications[index];
                    open.push(&application.of);
                    open.extend(&application.coefficient);
                }
            }
        }
        (0..marked.len()).filter(|index| marked[*index]).collect()
    }

    fn levels(&self) -> Vec<usize> {
        let mut levels: Vec<usize> = Vec::new();
        for application in &self.scheme.applications {
            let inner = applied_in(&application.of)
                .into_iter()
                .chain(application.coefficient.iter().flat_map(applied_in));
            let level = inner.map(|index| levels[index] + 1).max().unwrap_or(0);
            levels.push(level);
        }
        levels
    }

    /// The array that holds an expression: a field's buffer, a table, or an auxiliary buffer that is written first.
    /// `None` where the expression is the same at every node along the axis.
    fn source(
        &mut self,
        application: usize,
        is_coefficient: bool,
        expression: &Expression,
        axis: usize,
        binding: &Binding,
        writes: &mut Vec<Write>,
    ) -> Option<Source> {
        if let Expression::Field(field) = expression {
            return Some(Source::Buffer(binding.field[field.0]));
        }
        let value = self.value(expression, binding);
        if let crate::kernel::Operation::Load(buffer) = *self.builder.operation(value) {
            return Some(Source::Buffer(buffer));
        }
        match self.builder.extent(value) {
            Extent::Fixed | Extent::Uniform => None,
            Extent::Table(axes) if axes & (1 << axis) != 0 => Some(Source::Table(self.builder.table(value))),
            Extent::Table(_) => None,
            Extent::Varying => {
                let buffer = self.auxiliary_buffer(application, is_coefficient);
                writes.push(Write { buffer, value });
                Some(Source::Buffer(buffer))
            }
        }
    }

    fn auxiliary_buffer(&mut self, application: usize, is_coefficient: bool) -> BufferId {
        let known =
            self.auxiliary.iter().find(|(own, kind, _)| *own == application && *kind == is_coefficient);
        if let Some((_, _, buffer)) = known {
            return *buffer;
        }
        let what = if is_coefficient { "coefficient" } else { "argument" };
        let operator = &self.scheme.operators[self.scheme.applications[application].operator].name;
        let buffer = self.buffer(format!("{what} of {operator} {application}"));
        self.auxiliary.push((application, is_coefficient, buffer));
        buffer
    }

    /// The nodes of a face, or of a patch of it.
    pub(super) fn face_set(&mut self, face: Face, patch: &[Comparison], binding: &Binding) -> FaceSet {
        let patch = patch
            .iter()
            .map(|comparison| {
                let left = self.stored(&comparison.left, binding);
                let right = self.stored(&comparison.right, binding);
                (left, comparison.relation, right)
            })
            .collect();
        FaceSet { axis: face.axis.0, high: face.side == Side::High, patch }
    }

    /// A face term from expressions.
    pub(super) fn face_term(
        &mut self,
        face: Face,
        patch: &[Comparison],
        rate: usize,
        action: Action,
        value: &Expression,
        binding: &Binding,
    ) -> FaceTerm {
        let on = self.face_set(face, patch, binding);
        let value = self.stored(value, binding);
        FaceTerm { on, rate, action, value }
    }
}

fn applied_in(expression: &Expression) -> Vec<usize> {
    let mut found = Vec::new();
    collect(expression, &mut found);
    found
}

fn collect(expression: &Expression, found: &mut Vec<usize>) {
    if let Expression::Applied(index) = expression {
        found.push(*index);
    }
    for child in expression.children() {
        collect(child, found);
    }
}
