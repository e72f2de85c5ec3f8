//! What the closed operators' spectrum allows: the map of one step of the model itself, on a small grid, by eigenvalues.
//!
//! The law of the step limit comes from the interior's symbol. Closures, conditions and coefficients of the model enter here: the
//! state is disturbed entry by entry, one step is taken by the executor, and the eigenvalues of the map so obtained must not grow faster at
//! the limit than they do at a quarter of it (a model may grow by itself: a reaction, a front). Where they do, the limit is lowered.
//! Computed, not proved: for the grid it was computed on, at the default constants, about the initial state.

use crate::analysis::spectrum::{eigenvalues, radius};
use crate::kernel::interpret::Executor;
use crate::kernel::{Kernel, ValidKernel};

/// Unknowns that a dense spectrum is computed for, at most.
const MOST_UNKNOWNS: usize = 160;
/// Nodes along the axis of a one-dimensional model.
const NODES_ALONE: usize = 41;
/// Growth of a disturbance over one step that counts as rounding.
const ROUNDING: f64 = 1e-6;

/// What was found.
#[derive(Clone, Debug, PartialEq)]
pub enum Closed {
    /// The closed operators allow what the interior allows.
    Confirmed { nodes: Vec<usize> },
    /// They allow only this share of it.
    Lowered { nodes: Vec<usize>, factor: f64 },
    /// Not computed: the smallest grid has too many unknowns, or the state is not finite.
    Unknown,
}

impl Closed {
    /// One sentence for people.
    pub fn describe(&self) -> String {
        let grid = |nodes: &[usize]| nodes.iter().map(ToString::to_string).collect::<Vec<_>>().join(" × ");
        match self {
            Closed::Confirmed { nodes } => {
                format!("the closed operators allow the interior's step (eigenvalues of one step on {} nodes)", grid(nodes))
            }
            Closed::Lowered { nodes, factor } => format!(
                "the closed operators allow {factor:.4} of the interior's step (eigenvalues of one step on {} nodes)",
                grid(nodes)
            ),
            Closed::Unknown => {
                "the spectrum of the closed operators was not computed for this model (too many unknowns on its least grid)".to_owned()
            }
        }
    }
}

/// Examines the kernel's own step at the limit of its law.
pub fn examine(kernel: &ValidKernel) -> Closed {
    let Some(nodes) = small_grid(kernel) else { return Closed::Unknown };
    let Some(mut probe) = Probe::new(kernel, &nodes) else { return Closed::Unknown };
    let (Some(calm), Some(at_limit)) = (probe.growth(0.25), probe.growth(1.0)) else {
        return Closed::Unknown;
    };
    let allowed = |calm: f64, step: f64| 1.5 * calm.max(0.0) + ROUNDING / step;
    if at_limit <= allowed(calm, probe.limit) {
        return Closed::Confirmed { nodes };
    }
    let (mut low, mut high) = (0.25, 1.0);
    for _ in 0..7 {
        let middle = 0.5 * (low + high);
        match probe.growth(middle) {
            Some(growth) if growth <= allowed(calm, middle * probe.limit) => low = middle,
            _ => high = middle,
        }
    }
    Closed::Lowered { nodes, factor: low }
}

/// The least grids on which a closed spectrum is worth having and can be had.
fn small_grid(kernel: &Kernel) -> Option<Vec<usize>> {
    let alone = kernel.axes.len() == 1;
    let nodes: Vec<usize> = kernel
        .axes
        .iter()
        .map(|axis| if alone { axis.least_nodes.max(NODES_ALONE) } else { axis.least_nodes.max(8) })
        .collect();
    let unknowns = nodes.iter().product::<usize>() * kernel.state.len();
    (unknowns <= MOST_UNKNOWNS).then_some(nodes)
}

struct Probe<'a> {
    kernel: &'a Kernel,
    executor: Executor,
    base: Vec<Vec<f64>>,
    time: f64,
    limit: f64,
}

impl<'a> Probe<'a> {
    fn new(kernel: &'a ValidKernel, nodes: &[usize]) -> Option<Probe<'a>> {
        let mut executor = Executor::new(kernel.clone());
        executor.prepare(nodes, &vec![None; kernel.parameters.len()], 1).ok()?;
        let time = executor.fixed(kernel.time.start);
        executor.start(time);
        let rate = executor.largest_rate(time);
        if !rate.is_finite() || rate <= 0.0 {
            return None;
        }
        let limit = 1.0 / rate;
        executor.first_step(time, limit);
        let base = kernel.state.iter().map(|buffer| executor.buffer(*buffer).to_vec()).collect();
        Some(Probe { kernel, executor, base, time, limit })
    }

    /// ln of the spectral radius of one step of that share of the limit, over the step.
    fn growth(&mut self, share: f64) -> Option<f64> {
        let step = share * self.limit;
        let rest = self.advanced(None, step);
        let size = self.base.iter().map(Vec::len).sum::<usize>();
        let mut rows = vec![vec![0.0; size]; size];
        for column in 0..size {
            let disturbance = self.disturbance(column);
            let disturbed = self.advanced(Some((column, disturbance)), step);
            for (row, (a, b)) in rows.iter_mut().zip(disturbed.iter().zip(&rest)) {
                let entry = (a - b) / disturbance;
                row[column] = if entry.is_finite() { entry } else { return None };
            }
        }
        Some(radius(&eigenvalues(&rows).ok()?).ln() / step)
    }

    /// Small against the state, so that a nonlinear model is seen linearised; relative to the entry's own array.
    fn disturbance(&self, column: usize) -> f64 {
        let (buffer, _) = self.place(column);
        let size = self.base[buffer].iter().fold(0.0_f64, |size, value| size.max(value.abs()));
        if size > 0.0 { 1e-4 * size } else { 1e-4 }
    }

    fn place(&self, column: usize) -> (usize, usize) {
        let length = self.base[0].len();
        (column / length, column % length)
    }

    fn advanced(&mut self, disturbed: Option<(usize, f64)>, step: f64) -> Vec<f64> {
        for (index, buffer) in self.kernel.state.iter().enumerate() {
            self.executor.buffer_mut(*buffer).copy_from_slice(&self.base[index]);
        }
        if let Some((column, by)) = disturbed {
            let (buffer, node) = self.place(column);
            self.executor.buffer_mut(self.kernel.state[buffer])[node] += by;
        }
        self.executor.advance(self.time, step, self.time + step);
        self.kernel.state.iter().flat_map(|buffer| self.executor.buffer(*buffer).to_vec()).collect()
    }
}
