//! A run from its first state to its last.

use super::checkpoint_read::Reader;
use super::file::{Durability, write_text};
use super::folder::{self, Intent};
use super::number::general;
use super::options::{bound_faults, size_faults};
use super::output::Occasion;
use super::progress::Moment;
use super::state::Run;
use super::steps::{Halt, MOST_STEPS};
use super::{Ended, Failure, Observer, Options, Outcome, Solver};
use std::time::Instant;

const CHECKPOINT_SECONDS: f64 = 600.0;
/// Up to this many nodes every step is checked; looking at the clock would cost as much as such a step.
const SMALL_GRID: usize = 4096;
const CHECK_STRIDE: u64 = 16;
const CLOCK_STRIDE: u64 = 256;

/// Runs the model. The solver keeps the last state.
///
/// # Errors
/// Faults of the options, a folder that may not be written, a lack of memory or disk. A run that blew up or was
/// interrupted is an outcome, not an error.
pub fn simulate(
    solver: &mut dyn Solver,
    options: &Options,
    observer: &mut dyn Observer,
) -> Result<Outcome, Failure> {
    let mut options = options.clone();
    let about = solver.description().clone();
    options.nodes.resize(about.axes.len(), None);
    options.parameters.resize(about.parameters.len(), None);
    let faults = size_faults(&about, &options.nodes);
    if !faults.is_empty() {
        return Err(Failure::Refused(faults));
    }
    let mut reader = match options.out.as_deref().filter(|_| options.resume) {
        Some(out) => {
            folder::accept(out, Intent::GoOn)?;
            let mut reader = Reader::open(out)?;
            reader.adopt_setup(&about, &mut options)?;
            Some(reader)
        }
        None if options.resume => return Err(Failure::refused("--resume needs a folder, --out")),
        None => None,
    };
    let mut run = set_up(solver, &options, observer)?;
    if let (Some(out), false) = (&options.out, options.resume) {
        folder::accept(out, Intent::Begin)?;
    }
    if let Some(out) = &options.out {
        run.series.iter().try_for_each(|series| folder::make(&out.join(&series.folder)))?;
    }
    run.started = Instant::now();
    let begun = match &mut reader {
        Some(reader) => run.adopt(reader, &options).map_err(Halt::Failed),
        None => run.begin(),
    };
    drop(reader);
    run.shown_step = run.position.step;
    let ended = match begun.and_then(|()| run.step_on()) {
        Ok(ended) => ended,
        Err(Halt::BlewUp) => Ended::BlewUp,
        Err(Halt::Failed(failure)) => return Err(failure),
    };
    run.end(ended)
}

/// Prepares the solver and everything a run needs.
fn set_up<'a>(
    solver: &'a mut dyn Solver,
    options: &Options,
    observer: &'a mut dyn Observer,
) -> Result<Run<'a>, Failure> {
    let axes = &solver.description().axes;
    let nodes: Vec<usize> =
        axes.iter().zip(&options.nodes).map(|(axis, nodes)| nodes.unwrap_or(axis.nodes)).collect();
    let addressable = nodes.iter().try_fold(64usize, |bytes, nodes| bytes.checked_mul(*nodes));
    if addressable.is_none_or(|bytes| bytes > isize::MAX as usize) {
        return Err(Failure::refused("so many nodes cannot be addressed; ask for fewer with --nodes"));
    }
    let machine = || std::thread::available_parallelism().map_or(1, usize::from);
    let threads = options.threads.unwrap_or_else(machine).max(1);
    solver.prepare(&nodes, &options.parameters, threads).map_err(Failure::Environment)?;
    let mut faults = bound_faults(solver);
    let run = Run::new(solver, observer, options, nodes, threads);
    faults.extend(time_faults(&run));
    if faults.is_empty() { Ok(run) } else { Err(Failure::Refused(faults)) }
}

/// Times and intervals that a run cannot keep.
fn time_faults(run: &Run) -> Vec<String> {
    let mut faults = Vec::new();
    let (begin, end) = (run.begin, run.position.end);
    if !(end - begin).is_finite() || end < begin {
        let (begin, end) = (general(begin, 9), general(end, 9));
        faults.push(format!("the run would end at {end} s, before its start at {begin} s"));
    }
    for (output, every) in run.repeated() {
        if every.is_nan() || every <= 0.0 || (end - begin) / every > MOST_STEPS {
            faults.push(format!(
                "output {} every {} s: the interval has to be positive, and give less than 100 million times",
                run.about.outputs[output].name,
                general(every, 9)
            ));
        }
    }
    faults
}

impl Run<'_> {
    fn begin(&mut self) -> Result<(), Halt> {
        if let Some(folder) = &self.folder {
            write_text(folder.join("model.rim"), &self.about.model_text)?;
        }
        self.open_rows()?;
        self.position.time = self.begin;
        self.solver.start(self.begin);
        self.check_fields()?;
        self.settle_steps()?;
        if self.about.constant_step && !self.at_end() {
            self.solver.first_step(self.begin, self.position.constant_step);
        }
        for output in self.maxima() {
            self.solver.begin_maximum(output, self.begin);
        }
        Ok(self.write_outputs(Occasion::Start)?)
    }

    fn take_step(&mut self, maxima: &[usize]) -> Result<(), Halt> {
        let (step, next) = self.choose_step()?;
        if next.is_nan() || next <= self.position.time {
            let (step, time) = (general(step, 3), general(self.position.time, 9));
            self.message = format!("the step has shrunk to {step} s, too little to go on from t = {time} s");
            return Err(Halt::BlewUp);
        }
        self.solver.advance(self.position.time, step, next);
        self.position.step += 1;
        self.position.time = next;
        self.position.last_step = step;
        for output in maxima {
            self.solver.accumulate_maximum(*output, next);
        }
        let occasion = if self.at_end() {
            Occasion::End
        } else if self.position.steps.is_none() && next == self.position.to {
            Occasion::Event
        } else {
            Occasion::Between
        };
        let between = occasion == Occasion::Between;
        if !between || self.total <= SMALL_GRID || self.position.step.is_multiple_of(CHECK_STRIDE) {
            self.check_fields()?;
        }
        if !between || self.has_rows() {
            self.write_outputs(occasion)?;
        }
        Ok(())
    }

    /// Steps until the end, an interruption or a fault.
    fn step_on(&mut self) -> Result<Ended, Halt> {
        self.show_progress(Moment::First);
        let maxima = self.maxima();
        let stride = if self.total <= SMALL_GRID { CLOCK_STRIDE } else { 1 };
        while !self.at_end() {
            if !self.observer.goes_on(self.position.step) {
                return Ok(Ended::Interrupted);
            }
            self.take_step(&maxima)?;
            if self.position.step.is_multiple_of(stride) {
                self.show_progress(Moment::Some);
                if self.folder.is_some() && self.checkpoint_at.elapsed().as_secs_f64() > CHECKPOINT_SECONDS {
                    self.write_checkpoint()?;
                    self.write_index()?;
                }
            }
        }
        Ok(Ended::Finished)
    }

    /// Writes what closes a run.
    fn end(mut self, ended: Ended) -> Result<Outcome, Failure> {
        let stepping_seconds = self.stepping();
        self.show_progress(Moment::Last);
        if ended == Ended::Interrupted {
            let (step, time) = (self.position.step, general(self.position.time, 9));
            self.message = format!("interrupted after step {step}, t = {time} s; --resume goes on from here");
            self.write_checkpoint()?;
        }
        if let Some(rows) = self.rows.take() {
            rows.close(Durability::Flushed)?;
        }
        self.write_index()?;
        let wall_seconds = self.wall();
        self.write_summary(ended, wall_seconds, stepping_seconds)?;
        if let Some(folder) = self.folder.as_ref().filter(|_| ended == Ended::Finished) {
            for name in ["checkpoint.bin", "checkpoint.old"] {
                let _ = std::fs::remove_file(folder.join(name));
            }
        }
        Ok(Outcome {
            ended,
            message: self.message,
            steps: self.position.step,
            time: self.position.time,
            step: self.position.last_step,
            limit: self.position.limit,
            step_above_limit: self.position.above_limit,
            wall_seconds,
            stepping_seconds,
            folder: self.folder,
        })
    }
}
