//! All passes of a kernel as functions, and the calls that make up start, step, limit and outputs.

use super::context::{Context, is_literal};
use super::expression::Met;
use super::face::face;
use super::language::Language;
use super::leaves::Leaves;
use super::literal;
use super::sweep::{Job, Routine, Target, sweep};
use super::text::Text;
use super::wave::has_wave;
use crate::exact::Rational;
use crate::kernel::{Extent, OutputKind, Pass, Stage, Sweep};

/// See the module.
pub struct Routines {
    /// Functions in order of use.
    pub text: String,
    /// Calls, one statement each; they name `time`, `step` and `next`.
    pub start: Vec<String>,
    pub first_step: Vec<String>,
    pub step: Vec<String>,
    /// In C, calls of the step's passes for the rows from `low` to before `high`.
    pub step_parts: Vec<String>,
    /// The call that returns the largest rate; it names `time`.
    pub largest_rate: String,
    /// For each output the calls that fill its buffer; they name `time`.
    pub outputs: Vec<Vec<String>>,
    /// For each output the calls that begin a maximum.
    pub begins: Vec<Vec<String>>,
    /// Scratch rows that a thread needs.
    pub scratch_rows: usize,
}

/// Prints all passes.
pub fn routines(context: &Context) -> Routines {
    let kernel = context.kernel;
    let mut all = Routines {
        text: String::new(),
        start: Vec::new(),
        first_step: Vec::new(),
        step: Vec::new(),
        step_parts: Vec::new(),
        largest_rate: String::new(),
        outputs: Vec::new(),
        begins: Vec::new(),
        scratch_rows: 0,
    };
    let passes = |stages: &[Stage], wish: &str, all: &mut Routines| -> Vec<String> {
        let list = stage_passes(context, stages, wish);
        list.iter().for_each(|(routine, _)| all.add(routine));
        list.iter().map(|(routine, time)| routine.call(time, "step")).collect()
    };
    all.start = passes(&kernel.start, "start", &mut all);
    all.first_step = passes(&kernel.first_step, "first_step", &mut all);
    if context.language == Language::C && has_wave(context) {
        for (routine, time) in stage_passes(context, &kernel.step, "advance") {
            all.add_part(&routine);
            all.step_parts.push(routine.part_call(&time, "step"));
        }
    } else {
        all.step = passes(&kernel.step, "advance", &mut all);
    }
    all.largest_rate = limit(context, &mut all);
    for output in &kernel.outputs {
        let wish = format!("output_{}", super::namer::legal(&output.name));
        let fill = sweeps(context, &output.sweeps, &wish, &mut all);
        all.outputs.push(fill);
        let begin = match &output.kind {
            OutputKind::Maximum { begin } => sweeps(context, begin, &format!("begin_{wish}"), &mut all),
            _ => Vec::new(),
        };
        all.begins.push(begin);
    }
    all
}

impl Routines {
    fn add(&mut self, routine: &Routine) {
        self.add_part(routine);
        if let Some(whole) = &routine.whole {
            self.text.push_str(whole);
            self.text.push('\n');
        }
    }

    fn add_part(&mut self, routine: &Routine) {
        self.text.push_str(&routine.text);
        self.text.push('\n');
        self.scratch_rows = self.scratch_rows.max(routine.scratch_rows);
    }
}

/// The passes of stages, each with its time.
fn stage_passes(context: &Context, stages: &[Stage], wish: &str) -> Vec<(Routine, String)> {
    let mut list = Vec::new();
    let several = stages.iter().map(|stage| stage.passes.len()).sum::<usize>() > 1;
    for stage in stages {
        let time = stage_time(context, &stage.fraction);
        for pass in &stage.passes {
            let number = list.len() + 1;
            let name = if several { format!("{wish}_{number}") } else { format!("{wish}_sweep") };
            let routine = match pass {
                Pass::Sweep(work) => sweep(context, &Job::of(work, &name)),
                Pass::Face(work) => face(context, work, &name),
            };
            list.push((routine, time.clone()));
        }
    }
    list
}

/// Calls of an output's sweeps.
fn sweeps(context: &Context, list: &[Sweep], wish: &str, all: &mut Routines) -> Vec<String> {
    let last_step = context.language.member("last_step");
    list.iter()
        .map(|filling| {
            let routine = sweep(context, &Job::of(filling, wish));
            all.add(&routine);
            routine.call("time", &last_step)
        })
        .collect()
}

/// t, exactly the next time, or t + fraction·dt.
fn stage_time(context: &Context, fraction: &Rational) -> String {
    if fraction.is_zero() {
        return "time".to_owned();
    }
    if fraction.is_one() {
        return "next".to_owned();
    }
    format!("time + {} * step", literal::rational(fraction, context.language))
}

/// The step limit's rate: one number, or the largest over all nodes.
fn limit(context: &Context, all: &mut Routines) -> String {
    let rate = context.kernel.limit.rate;
    if context.kernel.values[rate.0].extent == Extent::Varying {
        let job = Job {
            wish: "rate_sweep".to_owned(),
            label: format!("What the step limit is made of: {}", context.kernel.limit.law),
            rates: Vec::new(),
            face_terms: &[],
            values: vec![rate],
            target: Target::Largest,
        };
        let routine = sweep(context, &job);
        all.add(&routine);
        return routine.call("time", "0.0");
    }
    let leaves = Leaves::new(context, &[rate], &[]);
    let result = match leaves.at_node(rate, Met::Plain) {
        Some(name) => name,
        None if is_literal(context.kernel, rate) => leaves.values(&[rate], "0").1.remove(0),
        None => String::new(),
    };
    let name = context.function_name("uniform_rate", &[]);
    let mut body = Text::indented(1);
    body.lines(&leaves.uniform_declarations(&result));
    body.line(&context.language.result(&result));
    let uses = [body.mentions("t"), body.mentions("dt")];
    if !body.mentions("s") {
        return result;
    }
    let mut text = Text::default();
    text.comment(&format!("What the step limit is made of: {}", context.kernel.limit.law));
    text.open(&context.pass_head(&name, uses, true));
    text.append(&body);
    text.close("}");
    let routine = Routine {
        text: text.into_string(),
        name,
        uses_time: uses[0],
        uses_step: uses[1],
        whole: None,
        scratch_rows: 0,
    };
    all.add(&routine);
    routine.call("time", "0.0")
}
