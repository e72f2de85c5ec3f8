//! Everything around a kernel: options, step choice, output, checkpoints. It changes no value, it only writes values down.
//!
//! The numerics stand behind [`Solver`]. [`run`] is a whole command-line program; [`simulate`] is the same for a caller
//! that wants a typed result and, through an [`Observer`], the data in memory.
//!
//! A step from `time` to `next` belongs to a stage time of `time` for fraction 0, `next` for fraction 1, and
//! `time + fraction·step` else; that is the business of the solver, as all arithmetic is.

#![allow(dead_code, reason = "a program around one model uses less of this than a library does")]

#[path = "driver/checkpoint.rs"]
mod checkpoint;
#[path = "driver/checkpoint_read.rs"]
mod checkpoint_read;
#[path = "driver/file.rs"]
mod file;
#[path = "driver/folder.rs"]
mod folder;
#[path = "driver/index.rs"]
mod index;
#[path = "driver/march.rs"]
mod march;
#[path = "driver/measure.rs"]
mod measure;
#[path = "driver/number.rs"]
mod number;
#[path = "driver/options.rs"]
mod options;
#[path = "driver/output.rs"]
mod output;
#[path = "driver/progress.rs"]
mod progress;
#[path = "driver/signal.rs"]
mod signal;
#[path = "driver/state.rs"]
mod state;
#[path = "driver/steps.rs"]
mod steps;
#[path = "driver/usage.rs"]
mod usage;

pub use march::simulate;
pub use number::general;
pub use options::{Options, Request, settle};

use std::path::PathBuf;

/// Exit status: done.
pub const FINISHED: i32 = 0;
/// Exit status: the arguments have faults.
pub const BAD_ARGUMENTS: i32 = 1;
/// Exit status: no permission, disk full, no memory.
pub const ENVIRONMENT_FAILED: i32 = 2;
/// Exit status: the numbers are not finite any more.
pub const BLEW_UP: i32 = 3;
/// Exit status: stopped on request; a checkpoint is there.
pub const INTERRUPTED: i32 = 130;

/// What does not depend on sizes and constants.
#[derive(Clone, Debug, Default)]
pub struct Description {
    pub name: String,
    pub title: String,
    /// Version of the program that made the solver.
    pub version: String,
    /// SHA-256 of the model's text, hexadecimal.
    pub hash: String,
    /// Method in time.
    pub method: String,
    /// How the limit of the step was found, for readers.
    pub limit_law: String,
    /// The model as written.
    pub model_text: String,
    /// Slowest first.
    pub axes: Vec<AxisInfo>,
    pub parameters: Vec<ParameterInfo>,
    pub fields: Vec<FieldInfo>,
    pub outputs: Vec<OutputInfo>,
    /// One step length for the whole run.
    pub constant_step: bool,
    /// The limit changes with the state or the time.
    pub state_dependent: bool,
    /// Part of the limit that is a step; not used when the solver gives a duration.
    pub fraction: f64,
    /// Nodes along each axis that give the value at a gauge.
    pub interpolation_nodes: usize,
    /// For each axis the weights at the low end in units of the spacing, mirrored at the high end, one inside.
    pub quadrature: Vec<Vec<f64>>,
}

/// One axis of the grid.
#[derive(Clone, Debug)]
pub struct AxisInfo {
    pub name: String,
    pub unit: String,
    pub nodes: usize,
    pub least_nodes: usize,
    pub periodic: bool,
}

/// A constant that may be set.
#[derive(Clone, Debug)]
pub struct ParameterInfo {
    pub name: String,
    pub description: String,
    pub unit: String,
    pub bounded: bool,
}

/// An unknown.
#[derive(Clone, Debug)]
pub struct FieldInfo {
    pub name: String,
    pub unit: String,
}

/// Something to write.
#[derive(Clone, Debug)]
pub struct OutputInfo {
    pub name: String,
    pub unit: String,
    pub kind: Kind,
    /// Has an interval between its times.
    pub repeated: bool,
}

/// What is made of an output's values.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    Snapshot,
    Gauge,
    Integral,
    Maximum,
}

/// The numerics of one model. Indices are those of the description; times in seconds, everything else in SI.
pub trait Solver {
    fn description(&self) -> &Description;
    /// Allocates and evaluates what is fixed. `nodes`: one for each axis; `parameters`: SI values, or `None` for the
    /// default. May be called again, with other sizes.
    ///
    /// # Errors
    /// Too little memory, or sizes that the operators cannot serve.
    fn prepare(&mut self, nodes: &[usize], parameters: &[Option<f64>], threads: usize) -> Result<(), String>;
    /// The value in force.
    fn parameter(&self, parameter: usize) -> f64;
    fn parameter_bounds(&self, parameter: usize) -> Option<(f64, f64)>;
    /// SI value of one unit.
    fn parameter_scale(&self, parameter: usize) -> f64;
    /// Low end, high end, spacing.
    fn axis(&self, axis: usize) -> (f64, f64, f64);
    fn start_time(&self) -> f64;
    fn end_time(&self) -> f64;
    /// `None`: a fraction of the limit.
    fn step_duration(&self) -> Option<f64>;
    fn every(&self, output: usize) -> Option<f64>;
    /// Of a gauge: one coordinate for each axis.
    fn place(&self, output: usize) -> Vec<f64>;
    /// SI value of one unit of the output.
    fn scale(&self, output: usize) -> f64;
    /// SI value of one unit of the field.
    fn field_scale(&self, field: usize) -> f64;
    /// Sets the initial state.
    fn start(&mut self, time: f64);
    /// For two-level methods: the level before the start. Nothing for others.
    fn first_step(&mut self, time: f64, step: f64);
    /// The longest stable step is one over this; NaN is handed through.
    fn largest_rate(&mut self, time: f64) -> f64;
    /// One step, from `time` to `next`; `step` is what the scheme uses as its length.
    fn advance(&mut self, time: f64, step: f64, next: f64);
    /// Values at the nodes, first axis slowest.
    fn field(&self, field: usize) -> &[f64];
    /// Values at the nodes; of a maximum: the largest so far, without a new look.
    fn output(&mut self, output: usize, time: f64) -> &[f64];
    fn begin_maximum(&mut self, output: usize, time: f64);
    fn accumulate_maximum(&mut self, output: usize, time: f64);
    /// The largest values so far, for a run that goes on from a checkpoint.
    fn maximum_mut(&mut self, output: usize) -> &mut [f64];
    /// Arrays that a run needs to go on.
    fn state_count(&self) -> usize;
    fn state(&self, index: usize) -> &[f64];
    fn state_mut(&mut self, index: usize) -> &mut [f64];
    fn memory_bytes(&self) -> usize;
}

/// Sees what a run gives, as it gives it. `()` sees nothing.
pub trait Observer {
    /// A field or an output, in its unit times `scale` (values are in SI).
    fn series(&mut self, _name: &str, _step: u64, _time: f64, _values: &[f64]) {}
    /// Gauges and integrals in their units, in the order of the outputs; `None`: not due.
    fn row(&mut self, _step: u64, _time: f64, _cells: &[Option<f64>]) {}
    /// Asked before each step; `false` interrupts the run.
    fn goes_on(&mut self, _step: u64) -> bool {
        true
    }
}

impl Observer for () {}

/// How a run ended.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ended {
    Finished,
    BlewUp,
    Interrupted,
}

/// A run that took place.
#[derive(Clone, Debug)]
pub struct Outcome {
    pub ended: Ended,
    /// Why it ended, when not by reaching the end.
    pub message: String,
    pub steps: u64,
    /// Last time reached.
    pub time: f64,
    /// Length of the last step.
    pub step: f64,
    /// Limit of the step at the start; infinite when there is none.
    pub limit: f64,
    pub step_above_limit: bool,
    pub wall_seconds: f64,
    /// The stepping loop alone, without output.
    pub stepping_seconds: f64,
    /// Where results were written, if anywhere.
    pub folder: Option<PathBuf>,
}

/// A run that did not take place, or whose results could not be written.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Failure {
    /// Faults of what was asked for, one a line.
    Refused(Vec<String>),
    /// The machine: no memory, no permission, disk full.
    Environment(String),
}

impl Failure {
    fn refused(fault: impl Into<String>) -> Failure {
        Failure::Refused(vec![fault.into()])
    }
}

impl Ended {
    fn status(self) -> i32 {
        match self {
            Ended::Finished => FINISHED,
            Ended::BlewUp => BLEW_UP,
            Ended::Interrupted => INTERRUPTED,
        }
    }
}

/// The program: reads the arguments (without the program's name), runs, reports; returns the exit status.
///
/// Nothing goes to standard output but the path of the run's folder, at the end, and the page of `--help`.
pub fn run(solver: &mut dyn Solver, arguments: &[String]) -> i32 {
    let name = solver.description().name.clone();
    let outcome = match Request::read(solver.description(), arguments) {
        (request, _) if request.help => usage::page(solver, &name).map(|page| {
            print(&page);
            None
        }),
        (request, faults) => settle(solver, request, faults).and_then(|options| {
            signal::catch();
            simulate(solver, &options, &mut signal::UntilAsked).map(Some)
        }),
    };
    match outcome {
        Ok(None) => FINISHED,
        Ok(Some(outcome)) => {
            if !outcome.message.is_empty() {
                eprintln!("{name}: {}", outcome.message);
            }
            if let Some(folder) = &outcome.folder {
                print(&format!("{}\n", folder.display()));
            }
            outcome.ended.status()
        }
        Err(Failure::Refused(faults)) => {
            for fault in faults {
                eprintln!("{name}: {fault}");
            }
            BAD_ARGUMENTS
        }
        Err(Failure::Environment(reason)) => {
            eprintln!("{name}: {reason}");
            ENVIRONMENT_FAILED
        }
    }
}

/// A reader that has gone away is no fault of the run.
fn print(text: &str) {
    use std::io::Write;
    let mut out = std::io::stdout().lock();
    let _ = out.write_all(text.as_bytes()).and_then(|()| out.flush());
}
