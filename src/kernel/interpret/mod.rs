//! Running a kernel in this process: an interpreter over rows of nodes.
//!
//! Every value is computed by the operations of the graph in their order, so that the bits are those of a program that
//! computes node after node; only how many nodes are done at once differs. Options, outputs and files are not here.

mod block;
mod line;
mod numbers;
mod program;
mod row;
mod scalar;
mod traverse;

use super::{BufferId, Kernel, OutputKind, Pass, Stage, Step, Sweep, ValidKernel};
use crate::exact::round::nearest;
use block::{AXES, Array, Grid, Surroundings};
use line::Line;
use numbers::Numbers;
use program::Program;
use row::Vectors;

/// A kernel made ready to run. Indices are those of the kernel, values in SI, times in seconds.
pub struct Executor {
    kernel: ValidKernel,
    plan: Plan,
    numbers: Numbers,
    memory: Memory,
    threads: usize,
    /// The length of the last step.
    step: f64,
}

/// Compiled passes.
struct Plan {
    lines: Vec<Line>,
    tables: Vec<Program>,
    start: Vec<CompiledStage>,
    first_step: Vec<CompiledStage>,
    step: Vec<CompiledStage>,
    rate: Program,
    /// For each output: what fills its buffer, and what sets a maximum at the start.
    outputs: Vec<(Vec<Program>, Vec<Program>)>,
}

struct CompiledStage {
    fraction: f64,
    passes: Vec<CompiledPass>,
}

enum CompiledPass {
    Everywhere(Program),
    AtFace(Program),
}

/// Arrays for the present sizes.
struct Memory {
    grid: Grid,
    periodic: [bool; AXES],
    coordinates: Vec<Vec<f64>>,
    buffers: Vec<Vec<f64>>,
    tables: Vec<(Vec<f64>, [usize; AXES])>,
    vectors: Vectors,
}

fn compile_stages(kernel: &Kernel, stages: &[Stage]) -> Vec<CompiledStage> {
    let pass = |pass: &Pass| match pass {
        Pass::Sweep(sweep) => CompiledPass::Everywhere(Program::sweep(kernel, sweep)),
        Pass::Face(face) => CompiledPass::AtFace(Program::face(kernel, face)),
    };
    let stage = |stage: &Stage| CompiledStage {
        fraction: nearest(&stage.fraction),
        passes: stage.passes.iter().map(pass).collect(),
    };
    stages.iter().map(stage).collect()
}

impl Plan {
    fn new(kernel: &Kernel) -> Plan {
        let sweeps =
            |sweeps: &[Sweep]| sweeps.iter().map(|sweep| Program::sweep(kernel, sweep)).collect::<Vec<_>>();
        let outputs = kernel.outputs.iter().map(|output| {
            let begin = match &output.kind {
                OutputKind::Maximum { begin } => sweeps(begin),
                _ => Vec::new(),
            };
            (sweeps(&output.sweeps), begin)
        });
        Plan {
            lines: kernel.operators.iter().map(|operator| Line::of(&operator.operator)).collect(),
            tables: kernel.tables.iter().map(|table| Program::value(&kernel.values, table.value)).collect(),
            start: compile_stages(kernel, &kernel.start),
            first_step: compile_stages(kernel, &kernel.first_step),
            step: compile_stages(kernel, &kernel.step),
            rate: Program::value(&kernel.values, kernel.limit.rate),
            outputs: outputs.collect(),
        }
    }
}

/// Zeros, or a message instead of an abort.
fn zeros(count: usize) -> Result<Vec<f64>, String> {
    let mut array = Vec::new();
    let refused = |_| format!("not enough memory for an array of {count} nodes; ask for fewer with --nodes");
    array.try_reserve_exact(count).map_err(refused)?;
    array.resize(count, 0.0);
    Ok(array)
}

impl Memory {
    fn empty() -> Memory {
        Memory {
            grid: Grid { sizes: [1; AXES], fast: 0 },
            periodic: [false; AXES],
            coordinates: Vec::new(),
            buffers: Vec::new(),
            tables: Vec::new(),
            vectors: Vectors::of_this_machine(),
        }
    }

    fn allocate(kernel: &Kernel, numbers: &Numbers, nodes: &[usize]) -> Result<Memory, String> {
        let mut memory = Memory::empty();
        memory.grid.fast = nodes.len() - 1;
        let points = nodes.iter().try_fold(1usize, |points, nodes| points.checked_mul(*nodes));
        let points = points.ok_or("not enough memory for so many nodes; ask for fewer with --nodes")?;
        for _ in &kernel.buffers {
            memory.buffers.push(zeros(points)?);
        }
        for (axis, nodes) in nodes.iter().enumerate() {
            memory.grid.sizes[axis] = *nodes;
            memory.periodic[axis] = kernel.axes[axis].periodic;
            let (low, high, spacing) = numbers.axis(kernel, axis);
            let mut line: Vec<f64> = (0..*nodes).map(|index| low + index as f64 * spacing).collect();
            if let Some(last) = line.last_mut().filter(|_| !kernel.axes[axis].periodic) {
                *last = high;
            }
            memory.coordinates.push(line);
        }
        Ok(memory)
    }

    fn around<'a>(&'a self, grid: &'a Grid, numbers: &'a Numbers, lines: &'a [Line]) -> Surroundings<'a> {
        let strides = self.grid.strides(|_| true);
        Surroundings {
            grid,
            periodic: self.periodic,
            buffers: self.buffers.iter().map(|data| Array { data, strides }).collect(),
            tables: self.tables.iter().map(|(data, strides)| Array { data, strides: *strides }).collect(),
            coordinates: &self.coordinates,
            numbers: &numbers.values,
            lines,
            vectors: self.vectors,
        }
    }

    /// Tables are computed once, each on the grid of its own axes.
    fn fill_tables(
        &mut self,
        kernel: &Kernel,
        plan: &Plan,
        numbers: &Numbers,
        threads: usize,
    ) -> Result<(), String> {
        for (table, program) in kernel.tables.iter().zip(&plan.tables) {
            let has = |axis: usize| axis < kernel.axes.len() && table.axes & (1 << axis) != 0;
            let mut grid = Grid { sizes: [1; AXES], fast: 0 };
            for axis in (0..AXES).filter(|axis| has(*axis)) {
                grid.sizes[axis] = self.grid.sizes[axis];
                grid.fast = axis;
            }
            let mut data = zeros(grid.points())?;
            traverse::everywhere(
                &self.around(&grid, numbers, &plan.lines),
                program,
                vec![&mut data],
                threads,
            );
            self.tables.push((data, grid.strides(has)));
        }
        Ok(())
    }

    /// The buffers that a program writes leave the others while it runs.
    fn run(
        &mut self,
        program: &Program,
        numbers: &Numbers,
        lines: &[Line],
        how: impl FnOnce(&Surroundings<'_>, Vec<&mut [f64]>),
    ) {
        let mut written: Vec<Vec<f64>> =
            program.written.iter().map(|buffer| std::mem::take(&mut self.buffers[*buffer])).collect();
        how(
            &self.around(&self.grid, numbers, lines),
            written.iter_mut().map(|array| array.as_mut_slice()).collect(),
        );
        for (buffer, array) in program.written.iter().zip(written) {
            self.buffers[*buffer] = array;
        }
    }

    fn sweep(&mut self, program: &Program, numbers: &Numbers, lines: &[Line], threads: usize) {
        self.run(program, numbers, lines, |around, written| {
            traverse::everywhere(around, program, written, threads)
        });
    }
}

impl Executor {
    /// Compiles a kernel; nothing is allocated yet.
    pub fn new(kernel: ValidKernel) -> Executor {
        let (plan, numbers) = (Plan::new(&kernel), Numbers::new(&kernel));
        Executor { kernel, plan, numbers, memory: Memory::empty(), threads: 1, step: 0.0 }
    }

    pub fn kernel(&self) -> &Kernel {
        &self.kernel
    }

    /// Allocates arrays of these sizes, evaluates what is fixed and fills the tables.
    ///
    /// # Errors
    /// Sizes that the operators cannot serve, or too little memory.
    pub fn prepare(
        &mut self,
        nodes: &[usize],
        parameters: &[Option<f64>],
        threads: usize,
    ) -> Result<(), String> {
        let axes = self.kernel.axes.len();
        if nodes.len() != axes || axes == 0 || axes > AXES {
            return Err(format!("the grid has {axes} axes, but {} sizes were given", nodes.len()));
        }
        for (axis, nodes) in self.kernel.axes.iter().zip(nodes) {
            let least = axis.least_nodes.max(if axis.periodic { 1 } else { 2 });
            if *nodes < least {
                return Err(format!(
                    "{nodes} nodes along {} are too few: at least {least} are needed",
                    axis.name
                ));
            }
        }
        self.memory = Memory::empty();
        self.threads = threads.max(1);
        self.step = 0.0;
        self.numbers.settle(&self.kernel, nodes, parameters);
        self.memory = Memory::allocate(&self.kernel, &self.numbers, nodes)?;
        self.memory.fill_tables(&self.kernel, &self.plan, &self.numbers, self.threads)
    }

    /// A fixed value, after `prepare`.
    pub fn fixed(&self, value: super::ValueId) -> f64 {
        self.numbers.get(value)
    }

    /// The value in force, SI.
    pub fn parameter(&self, parameter: usize) -> f64 {
        self.numbers.parameter(&self.kernel, parameter)
    }

    /// Low end, high end, spacing.
    pub fn axis(&self, axis: usize) -> (f64, f64, f64) {
        self.numbers.axis(&self.kernel, axis)
    }

    /// The given step, when it is no part of the limit.
    pub fn step_duration(&self) -> Option<f64> {
        match self.kernel.time.step {
            Step::Duration(duration) => Some(self.fixed(duration)),
            Step::OfLimit(_) => None,
        }
    }

    fn stages(&mut self, which: fn(&Plan) -> &[CompiledStage], time: f64, step: f64, next: f64) {
        for stage in which(&self.plan) {
            let now = if stage.fraction == 0.0 {
                time
            } else if stage.fraction == 1.0 {
                next
            } else {
                time + stage.fraction * step
            };
            self.numbers.at(&self.kernel, now, step);
            for pass in &stage.passes {
                match pass {
                    CompiledPass::Everywhere(program) => {
                        self.memory.sweep(program, &self.numbers, &self.plan.lines, self.threads);
                    }
                    CompiledPass::AtFace(program) => {
                        self.memory.run(program, &self.numbers, &self.plan.lines, |around, written| {
                            traverse::at_face(around, program, written);
                        });
                    }
                }
            }
        }
    }

    /// Sets the initial state.
    pub fn start(&mut self, time: f64) {
        self.step = 0.0;
        self.stages(|plan| &plan.start, time, 0.0, time);
    }

    /// For methods of two levels: sets the level before the start.
    pub fn first_step(&mut self, time: f64, step: f64) {
        self.step = step;
        self.stages(|plan| &plan.first_step, time, step, time + step);
    }

    /// One step, with the rotation of buffers.
    pub fn advance(&mut self, time: f64, step: f64, next: f64) {
        self.step = step;
        self.stages(|plan| &plan.step, time, step, next);
        for (a, b) in &self.kernel.rotation {
            self.memory.buffers.swap(a.0, b.0);
        }
    }

    /// The largest value of the limit's rate over all nodes; NaN when one is.
    pub fn largest_rate(&mut self, time: f64) -> f64 {
        self.numbers.at(&self.kernel, time, 0.0);
        let around = self.memory.around(&self.memory.grid, &self.numbers, &self.plan.lines);
        traverse::largest(&around, &self.plan.rate, self.threads)
    }

    /// A buffer, row-major, first axis slowest.
    pub fn buffer(&self, buffer: BufferId) -> &[f64] {
        &self.memory.buffers[buffer.0]
    }

    pub fn buffer_mut(&mut self, buffer: BufferId) -> &mut [f64] {
        &mut self.memory.buffers[buffer.0]
    }

    /// Runs the sweeps of an output (of a maximum: those that keep the largest value).
    pub fn fill_output(&mut self, output: usize, time: f64) {
        self.numbers.at(&self.kernel, time, self.step);
        for program in &self.plan.outputs[output].0 {
            self.memory.sweep(program, &self.numbers, &self.plan.lines, self.threads);
        }
    }

    /// Sets a maximum at the start.
    pub fn begin_maximum(&mut self, output: usize, time: f64) {
        self.numbers.at(&self.kernel, time, self.step);
        for program in &self.plan.outputs[output].1 {
            self.memory.sweep(program, &self.numbers, &self.plan.lines, self.threads);
        }
    }

    /// Bytes of all arrays.
    pub fn memory_bytes(&self) -> usize {
        let tables = self.memory.tables.iter().map(|(data, _)| data.len());
        8 * self.memory.buffers.iter().map(Vec::len).chain(tables).sum::<usize>()
    }
}
