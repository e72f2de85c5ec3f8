//! Fixed and uniform values: one number for a run, or for a stage.

use super::scalar;
use crate::exact::round::nearest;
use crate::kernel::{Extent, Kernel, Operation, ValueId};

/// All fixed and uniform values by their index in the graph; others are NaN.
#[derive(Clone, Debug, Default)]
pub(super) struct Numbers {
    pub(super) values: Vec<f64>,
    literals: Vec<f64>,
    uniform: Vec<usize>,
    /// Given SI values.
    given: Vec<Option<f64>>,
    nodes: Vec<usize>,
}

impl Numbers {
    pub(super) fn new(kernel: &Kernel) -> Numbers {
        let literal = |operation: &Operation| match operation {
            Operation::Literal(number) => nearest(number),
            _ => f64::NAN,
        };
        let uniform = |index: &usize| kernel.values[*index].extent == Extent::Uniform;
        Numbers {
            values: vec![f64::NAN; kernel.values.len()],
            literals: kernel.values.iter().map(|value| literal(&value.operation)).collect(),
            uniform: (0..kernel.values.len()).filter(uniform).collect(),
            given: vec![None; kernel.parameters.len()],
            nodes: kernel.axes.iter().map(|axis| axis.nodes).collect(),
        }
    }

    pub(super) fn get(&self, value: ValueId) -> f64 {
        self.values[value.0]
    }

    /// The value in force.
    pub(super) fn parameter(&self, kernel: &Kernel, parameter: usize) -> f64 {
        self.given[parameter].unwrap_or_else(|| self.get(kernel.parameters[parameter].default))
    }

    /// Evaluates what is fixed.
    pub(super) fn settle(&mut self, kernel: &Kernel, nodes: &[usize], given: &[Option<f64>]) {
        self.nodes = nodes.to_vec();
        self.given = given.to_vec();
        self.given.resize(kernel.parameters.len(), None);
        let mut known = vec![false; kernel.values.len()];
        for index in 0..kernel.values.len() {
            if kernel.values[index].extent == Extent::Fixed {
                self.fixed(kernel, index, &mut known);
            }
        }
    }

    /// A default or an end of an axis may stand later in the graph than its user.
    fn fixed(&mut self, kernel: &Kernel, index: usize, known: &mut [bool]) -> f64 {
        if known[index] {
            return self.values[index];
        }
        let value = match &kernel.values[index].operation {
            Operation::Parameter(parameter) => match self.given[parameter.0] {
                Some(given) => given,
                None => self.fixed(kernel, kernel.parameters[parameter.0].default.0, known),
            },
            Operation::InverseSpacing(axis) => {
                let low = self.fixed(kernel, kernel.axes[*axis].low.0, known);
                let high = self.fixed(kernel, kernel.axes[*axis].high.0, known);
                1.0 / self.spacing_of(kernel, *axis, low, high)
            }
            operation => {
                for operand in operation.operands() {
                    self.fixed(kernel, operand.0, known);
                }
                self.combine(operation, index, f64::NAN, f64::NAN)
            }
        };
        known[index] = true;
        self.values[index] = value;
        value
    }

    fn spacing_of(&self, kernel: &Kernel, axis: usize, low: f64, high: f64) -> f64 {
        let nodes = self.nodes[axis];
        let intervals = if kernel.axes[axis].periodic { nodes } else { nodes - 1 };
        (high - low) / intervals as f64
    }

    /// Low end, high end, spacing.
    pub(super) fn axis(&self, kernel: &Kernel, axis: usize) -> (f64, f64, f64) {
        let (low, high) = (self.get(kernel.axes[axis].low), self.get(kernel.axes[axis].high));
        (low, high, self.spacing_of(kernel, axis, low, high))
    }

    /// Evaluates what depends on time and step.
    pub(super) fn at(&mut self, kernel: &Kernel, time: f64, step: f64) {
        for place in 0..self.uniform.len() {
            let index = self.uniform[place];
            self.values[index] = self.combine(&kernel.values[index].operation, index, time, step);
        }
    }

    fn combine(&self, operation: &Operation, index: usize, time: f64, step: f64) -> f64 {
        let get = |value: &ValueId| self.values[value.0];
        match operation {
            Operation::Literal(_) => self.literals[index],
            Operation::Pi => scalar::NEAREST_PI,
            Operation::Time => time,
            Operation::Step => step,
            Operation::Negate(a) => -get(a),
            Operation::Add(a, b) => get(a) + get(b),
            Operation::Subtract(a, b) => get(a) - get(b),
            Operation::Multiply(a, b) => get(a) * get(b),
            Operation::Divide(a, b) => get(a) / get(b),
            Operation::Power(a, b) => get(a).powf(get(b)),
            Operation::Call(function, a) => scalar::call(*function, get(a)),
            Operation::Minimum(a, b) => scalar::minimum(get(a), get(b)),
            Operation::Maximum(a, b) => scalar::maximum(get(a), get(b)),
            Operation::Select { left, relation, right, then, otherwise } => {
                if scalar::holds(get(left), *relation, get(right)) { get(then) } else { get(otherwise) }
            }
            // Found apart, or never of these extents.
            Operation::Parameter(_)
            | Operation::InverseSpacing(_)
            | Operation::Coordinate(_)
            | Operation::Noise(_)
            | Operation::Load(_)
            | Operation::Table(_)
            | Operation::Apply { .. }
            | Operation::Rate(_) => f64::NAN,
        }
    }
}
