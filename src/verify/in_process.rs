//! The executor of kernels behind the driver's trait: runs in this process, without a compiler.

use super::driver::{AxisInfo, Description, FieldInfo, Kind, OutputInfo, ParameterInfo, Solver};
use crate::emit::Provenance;
use crate::exact::round::nearest;
use crate::kernel::interpret::Executor;
use crate::kernel::{Kernel, OutputKind, Step, ValidKernel};

/// A kernel as a solver.
pub struct InProcess {
    description: Description,
    executor: Executor,
}

impl InProcess {
    /// Compiles the kernel for the executor; nothing is allocated before `prepare`.
    pub fn new(kernel: ValidKernel, provenance: Provenance<'_>) -> InProcess {
        InProcess { description: describe(&kernel, provenance), executor: Executor::new(kernel) }
    }

    fn kernel(&self) -> &Kernel {
        self.executor.kernel()
    }
}

fn describe(kernel: &Kernel, provenance: Provenance<'_>) -> Description {
    let axes = kernel.axes.iter().map(|axis| AxisInfo {
        name: axis.name.clone(),
        unit: axis.unit.clone(),
        nodes: axis.nodes,
        least_nodes: axis.least_nodes,
        periodic: axis.periodic,
    });
    let parameters = kernel.parameters.iter().map(|parameter| ParameterInfo {
        name: parameter.name.clone(),
        description: parameter.description.clone().unwrap_or_default(),
        unit: parameter.unit.clone(),
        bounded: parameter.bounds.is_some(),
    });
    let fields = kernel.fields.iter();
    let outputs = kernel.outputs.iter().map(|output| OutputInfo {
        name: output.name.clone(),
        unit: output.unit.clone(),
        kind: match output.kind {
            OutputKind::Snapshot => Kind::Snapshot,
            OutputKind::Gauge(_) => Kind::Gauge,
            OutputKind::Integral => Kind::Integral,
            OutputKind::Maximum { .. } => Kind::Maximum,
        },
        repeated: output.every.is_some(),
    });
    Description {
        name: kernel.name.clone(),
        title: kernel.title.clone(),
        version: provenance.version.to_owned(),
        hash: provenance.hash.to_owned(),
        method: kernel.time.method.clone(),
        limit_law: kernel.limit.law.clone(),
        model_text: provenance.model_text.to_owned(),
        axes: axes.collect(),
        parameters: parameters.collect(),
        fields: fields
            .map(|field| FieldInfo { name: field.name.clone(), unit: field.unit.clone() })
            .collect(),
        outputs: outputs.collect(),
        constant_step: kernel.time.constant_step,
        state_dependent: kernel.limit.state_dependent,
        fraction: match &kernel.time.step {
            Step::Duration(_) => 0.0,
            Step::OfLimit(fraction) => nearest(fraction),
        },
        interpolation_nodes: kernel.interpolation_nodes,
        quadrature: kernel.quadrature.iter().map(|weights| weights.iter().map(nearest).collect()).collect(),
    }
}

impl Solver for InProcess {
    fn description(&self) -> &Description {
        &self.description
    }

    fn prepare(&mut self, nodes: &[usize], parameters: &[Option<f64>], threads: usize) -> Result<(), String> {
        self.executor.prepare(nodes, parameters, threads)
    }

    fn parameter(&self, parameter: usize) -> f64 {
        self.executor.parameter(parameter)
    }

    fn parameter_bounds(&self, parameter: usize) -> Option<(f64, f64)> {
        let (low, high) = self.kernel().parameters[parameter].bounds?;
        Some((self.executor.fixed(low), self.executor.fixed(high)))
    }

    fn parameter_scale(&self, parameter: usize) -> f64 {
        self.executor.fixed(self.kernel().parameters[parameter].scale)
    }

    fn axis(&self, axis: usize) -> (f64, f64, f64) {
        self.executor.axis(axis)
    }

    fn start_time(&self) -> f64 {
        self.executor.fixed(self.kernel().time.start)
    }

    fn end_time(&self) -> f64 {
        self.executor.fixed(self.kernel().time.end)
    }

    fn step_duration(&self) -> Option<f64> {
        self.executor.step_duration()
    }

    fn every(&self, output: usize) -> Option<f64> {
        self.kernel().outputs[output].every.map(|every| self.executor.fixed(every))
    }

    fn place(&self, output: usize) -> Vec<f64> {
        match &self.kernel().outputs[output].kind {
            OutputKind::Gauge(place) => {
                place.iter().map(|coordinate| self.executor.fixed(*coordinate)).collect()
            }
            _ => Vec::new(),
        }
    }

    fn scale(&self, output: usize) -> f64 {
        self.executor.fixed(self.kernel().outputs[output].scale)
    }

    fn field_scale(&self, field: usize) -> f64 {
        self.executor.fixed(self.kernel().fields[field].scale)
    }

    fn start(&mut self, time: f64) {
        self.executor.start(time);
    }

    fn first_step(&mut self, time: f64, step: f64) {
        self.executor.first_step(time, step);
    }

    fn largest_rate(&mut self, time: f64) -> f64 {
        self.executor.largest_rate(time)
    }

    fn advance(&mut self, time: f64, step: f64, next: f64) {
        self.executor.advance(time, step, next);
    }

    fn field(&self, field: usize) -> &[f64] {
        self.executor.buffer(self.kernel().fields[field].buffer)
    }

    fn output(&mut self, output: usize, time: f64) -> &[f64] {
        if self.description.outputs[output].kind != Kind::Maximum {
            self.executor.fill_output(output, time);
        }
        self.executor.buffer(self.kernel().outputs[output].buffer)
    }

    fn begin_maximum(&mut self, output: usize, time: f64) {
        self.executor.begin_maximum(output, time);
    }

    fn accumulate_maximum(&mut self, output: usize, time: f64) {
        self.executor.fill_output(output, time);
    }

    fn maximum_mut(&mut self, output: usize) -> &mut [f64] {
        let buffer = self.kernel().outputs[output].buffer;
        self.executor.buffer_mut(buffer)
    }

    fn state_count(&self) -> usize {
        self.kernel().state.len()
    }

    fn state(&self, index: usize) -> &[f64] {
        self.executor.buffer(self.kernel().state[index])
    }

    fn state_mut(&mut self, index: usize) -> &mut [f64] {
        let buffer = self.kernel().state[index];
        self.executor.buffer_mut(buffer)
    }

    fn memory_bytes(&self) -> usize {
        self.executor.memory_bytes()
    }
}
