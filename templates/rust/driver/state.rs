//! The state of a run between steps, and when outputs are due.

use super::file::OutFile;
use super::folder::safe_name;
use super::measure::Interpolation;
use super::{Description, Kind, Observer, Options, Solver};
use std::path::PathBuf;
use std::time::Instant;

/// Two times closer than this part of an output's interval are one.
pub const ONE_TIME: f64 = 1e-9;

/// A series of `.npy` files: a field, or an output that is a snapshot or a maximum.
pub struct Series {
    pub name: String,
    pub unit: String,
    pub folder: String,
    pub field: Option<usize>,
    /// A snapshot named like a field serves both.
    pub output: Option<usize>,
    /// SI value of one unit.
    pub scale: f64,
    /// Written so far.
    pub files: u64,
}

/// One file of a series.
#[derive(Clone, Copy, Debug)]
pub struct Record {
    pub series: usize,
    pub number: u64,
    pub step: u64,
    pub time: f64,
}

/// Where the run stands; together with the solver's arrays this is what a checkpoint holds.
#[derive(Clone, Debug, Default)]
pub struct Position {
    pub end: f64,
    /// `Some`: exactly that many steps.
    pub steps: Option<u64>,
    pub step: u64,
    pub time: f64,
    pub last_step: f64,
    /// The interval between events, or the rest of it.
    pub from: f64,
    pub to: f64,
    /// Equal steps in it, and those done.
    pub parts: u64,
    pub part: u64,
    /// At the start; infinite when there is none.
    pub limit: f64,
    /// When one step length serves the whole run, else 0.
    pub constant_step: f64,
    pub above_limit: bool,
    pub earlier_wall: f64,
    pub earlier_stepping: f64,
    /// For each output: the number of its next time.
    pub due_next: Vec<u64>,
}

/// A run in progress.
pub struct Run<'a> {
    pub about: Description,
    pub solver: &'a mut dyn Solver,
    pub observer: &'a mut dyn Observer,
    pub folder: Option<PathBuf>,
    pub quiet: bool,
    pub threads: usize,
    pub nodes: Vec<usize>,
    pub total: usize,
    pub series: Vec<Series>,
    pub records: Vec<Record>,
    /// For each output that is a gauge: one for each axis.
    pub gauges: Vec<Vec<Interpolation>>,
    pub rows: Option<OutFile>,
    pub row_bytes: u64,
    pub begin: f64,
    /// A fraction of the limit when `None`.
    pub given_step: Option<f64>,
    pub position: Position,
    pub started: Instant,
    pub output_seconds: f64,
    pub checkpoint_at: Instant,
    pub shown_at: Instant,
    pub shown_step: u64,
    pub terminal: bool,
    pub message: String,
}

impl<'a> Run<'a> {
    /// Of a prepared solver.
    pub fn new(
        solver: &'a mut dyn Solver,
        observer: &'a mut dyn Observer,
        options: &Options,
        nodes: Vec<usize>,
        threads: usize,
    ) -> Run<'a> {
        let about = solver.description().clone();
        let now = Instant::now();
        let begin = solver.start_time();
        let position = Position {
            end: options.until.unwrap_or_else(|| solver.end_time()),
            steps: options.steps,
            limit: f64::INFINITY,
            due_next: vec![0; about.outputs.len()],
            ..Position::default()
        };
        let gauges = (0..about.outputs.len())
            .map(|output| match about.outputs[output].kind {
                Kind::Gauge => Interpolation::at(&about, solver, &nodes, &solver.place(output)),
                _ => Vec::new(),
            })
            .collect();
        Run {
            series: list_series(&about, solver),
            given_step: solver.step_duration(),
            total: nodes.iter().product(),
            folder: options.out.clone(),
            quiet: options.quiet,
            terminal: std::io::IsTerminal::is_terminal(&std::io::stderr()),
            about,
            solver,
            observer,
            threads,
            nodes,
            records: Vec::new(),
            gauges,
            rows: None,
            row_bytes: 0,
            begin,
            position,
            started: now,
            output_seconds: 0.0,
            checkpoint_at: now,
            shown_at: now,
            shown_step: 0,
            message: String::new(),
        }
    }

    pub fn is_row(&self, output: usize) -> bool {
        matches!(self.about.outputs[output].kind, Kind::Gauge | Kind::Integral)
    }

    pub fn has_rows(&self) -> bool {
        (0..self.about.outputs.len()).any(|output| self.is_row(output))
    }

    pub fn maxima(&self) -> Vec<usize> {
        let is_maximum = |output: &usize| self.about.outputs[*output].kind == Kind::Maximum;
        (0..self.about.outputs.len()).filter(is_maximum).collect()
    }

    /// Outputs with an interval, and that interval.
    pub fn repeated(&self) -> Vec<(usize, f64)> {
        let every = |output: usize| self.solver.every(output).map(|every| (output, every));
        (0..self.about.outputs.len())
            .filter(|output| self.about.outputs[*output].repeated)
            .filter_map(every)
            .collect()
    }

    /// The coordinate of a node: the last of a bounded axis is exactly the high end.
    pub fn coordinate(&self, axis: usize, index: usize) -> f64 {
        let (low, high, spacing) = self.solver.axis(axis);
        if !self.about.axes[axis].periodic && index + 1 == self.nodes[axis] {
            return high;
        }
        low + index as f64 * spacing
    }

    fn due_time(&self, output: usize, every: f64) -> f64 {
        self.begin + self.position.due_next[output] as f64 * every
    }

    /// The next time at which something is due, or the end.
    pub fn next_event(&self) -> f64 {
        let mut event = self.position.end;
        for (output, every) in self.repeated() {
            let due = self.due_time(output, every);
            if due < event && self.position.end - due > ONE_TIME * every {
                event = due;
            }
        }
        event
    }

    /// Whether an output with an interval is due now; if so, its next time is set.
    pub fn take_due(&mut self, output: usize) -> bool {
        let Some(every) = self.solver.every(output) else { return false };
        let mut due = false;
        while self.due_time(output, every) - self.position.time <= ONE_TIME * every {
            due = true;
            self.position.due_next[output] += 1;
        }
        due
    }

    pub fn wall(&self) -> f64 {
        self.position.earlier_wall + self.started.elapsed().as_secs_f64()
    }

    pub fn stepping(&self) -> f64 {
        self.position.earlier_stepping + (self.started.elapsed().as_secs_f64() - self.output_seconds)
    }
}

/// Fields first, then outputs, in the order of the model.
fn list_series(about: &Description, solver: &dyn Solver) -> Vec<Series> {
    let mut list: Vec<Series> = Vec::new();
    let mut add = |name: &str, unit: &str, field: Option<usize>, output: Option<usize>, scale: f64| {
        let folder = safe_name(name, list.iter().map(|series| series.folder.as_str()));
        let (name, unit) = (name.to_owned(), unit.to_owned());
        list.push(Series { name, unit, folder, field, output, scale, files: 0 });
    };
    let mut taken = Vec::new();
    for (index, field) in about.fields.iter().enumerate() {
        let same = |output: &super::OutputInfo| output.kind == Kind::Snapshot && output.name == field.name;
        match about.outputs.iter().rposition(same) {
            Some(output) => {
                let info = &about.outputs[output];
                add(&info.name, &info.unit, Some(index), Some(output), solver.scale(output));
                taken.push(output);
            }
            None => add(&field.name, &field.unit, Some(index), None, solver.field_scale(index)),
        }
    }
    for (output, info) in about.outputs.iter().enumerate() {
        if !taken.contains(&output) && matches!(info.kind, Kind::Snapshot | Kind::Maximum) {
            add(&info.name, &info.unit, None, Some(output), solver.scale(output));
        }
    }
    list
}
