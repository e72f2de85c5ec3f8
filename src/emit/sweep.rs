//! Sweeps as functions: what one node needs, a loop over the inside of a row, and the schedule over rows.
//!
//! Three functions come of a sweep. `NAME_point` computes one node from its inputs (with face terms, `NAME_rates` goes
//! before it). `NAME_inside` runs it along the inside of a row, with every operator inlined and no branch. `NAME` goes over
//! the rows: it treats the ends of each row node by node, and in rows near an outer face it first puts the outer axes'
//! operators into scratch rows. All of them compute in the kernel's order, so a node's bits do not depend on the way.

mod schedule;

use super::context::Context;
use super::expression::{Met, Printer};
use super::language::{Language, Linkage, Type};
use super::leaves::Leaves;
use super::operators::inline_mark;
use super::text::Text;
use crate::kernel::{Action, BufferId, FaceTerm, Operation, Source, Sweep, ValueId};

/// What a sweep's results go to.
#[derive(Clone, Debug)]
pub enum Target {
    /// The buffers of the writes, in order.
    Buffers(Vec<BufferId>),
    /// The largest value over all nodes is returned.
    Largest,
}

/// A sweep to print.
pub struct Job<'a> {
    pub wish: String,
    pub label: String,
    pub rates: Vec<ValueId>,
    pub face_terms: &'a [FaceTerm],
    pub values: Vec<ValueId>,
    pub target: Target,
}

impl<'a> Job<'a> {
    pub fn of(sweep: &'a Sweep, wish: &str) -> Job<'a> {
        Job {
            wish: wish.to_owned(),
            label: sweep.label.clone(),
            rates: sweep.rates.clone(),
            face_terms: &sweep.face_terms,
            values: sweep.writes.iter().map(|write| write.value).collect(),
            target: Target::Buffers(sweep.writes.iter().map(|write| write.buffer).collect()),
        }
    }
}

/// A printed function and how to call it.
#[derive(Clone, Debug)]
pub struct Routine {
    pub text: String,
    /// In C, `text` is the function that runs the pass on some rows, and this one runs it on all.
    pub whole: Option<String>,
    pub name: String,
    pub uses_time: bool,
    pub uses_step: bool,
    /// Scratch rows that a thread needs.
    pub scratch_rows: usize,
}

impl Routine {
    /// A call with these expressions for time and step.
    pub fn call(&self, time: &str, step: &str) -> String {
        let mut arguments = vec!["s"];
        if self.uses_time {
            arguments.push(time);
        }
        if self.uses_step {
            arguments.push(step);
        }
        format!("{}({})", self.name, arguments.join(", "))
    }

    /// A call for the rows from `low` to before `high`.
    pub fn part_call(&self, time: &str, step: &str) -> String {
        let whole = self.call(time, step);
        let arguments = whole.strip_prefix(&self.name).unwrap_or(&whole);
        let arguments = arguments.strip_suffix(')').unwrap_or(arguments);
        format!("{}_part{arguments}, low, high)", self.name)
    }
}

/// Name of the scratch row that holds results of a `Target::Largest`.
const RESULT_ROW: &str = "result";

/// Prints a sweep.
pub fn sweep(context: &Context, job: &Job) -> Routine {
    let name = context.function_name(&job.wish, &["_point", "_rates", "_inside", "_part"]);
    let written = match &job.target {
        Target::Buffers(buffers) => buffers.clone(),
        Target::Largest => Vec::new(),
    };
    let mut roots = job.rates.clone();
    roots.extend(&job.values);
    for term in job.face_terms {
        roots.push(term.value);
        roots.extend(term.on.patch.iter().flat_map(|(left, _, right)| [*left, *right]));
    }
    let leaves = Leaves::new(context, &roots, &written);
    let rates = (0..job.rates.len()).map(|_| leaves.names.borrow_mut().name("rate")).collect();
    let results: Vec<String> = job.values.iter().map(|_| leaves.names.borrow_mut().name("updated")).collect();
    let scratch = leaves.applied.values().map(|applied| format!("{}_row", applied.name)).collect::<Vec<_>>();
    let scratch = scratch.iter().map(|wish| leaves.names.borrow_mut().name(wish)).collect();
    SweepPrinter { context, job, name, written, leaves, rates, results, scratch }.print()
}

struct SweepPrinter<'a> {
    context: &'a Context<'a>,
    job: &'a Job<'a>,
    name: String,
    written: Vec<BufferId>,
    leaves: Leaves<'a>,
    rates: Vec<String>,
    /// Names of the results of `NAME_point`.
    results: Vec<String>,
    /// Names of scratch rows, in the order of the applied operators.
    scratch: Vec<String>,
}

/// A function that is called with arguments of the same names.
struct Signature {
    parameters: Vec<(String, Type)>,
}

impl SweepPrinter<'_> {
    fn language(&self) -> Language {
        self.context.language
    }

    fn split(&self) -> bool {
        !self.job.face_terms.is_empty()
    }

    fn print(&self) -> Routine {
        let mut text = Text::default();
        text.comment(&self.job.label);
        let rates = self.split().then(|| {
            let name = format!("{}_rates", self.name);
            self.node_function(&mut text, &name, &self.job.rates, &self.rates, &[])
        });
        let before = if self.split() { self.rates.as_slice() } else { &[] };
        let point_name = format!("{}_point", self.name);
        let point = self.node_function(&mut text, &point_name, &self.job.values, &self.results, before);
        let node = NodeFunctions { rates, point };
        let inside = self.inside(&mut text, &node);
        let (uses_time, uses_step, scratch_rows) = self.schedule(&mut text, &node, &inside);
        let parts = self.language() == Language::C && !matches!(self.job.target, Target::Largest);
        Routine {
            text: text.into_string(),
            whole: parts.then(|| self.context.whole_pass(&self.name, [uses_time, uses_step])),
            name: self.name.clone(),
            uses_time,
            uses_step,
            scratch_rows,
        }
    }

    /// Prints a function from the inputs of one node to `results`.
    fn node_function(
        &self,
        text: &mut Text,
        name: &str,
        roots: &[ValueId],
        results: &[String],
        rates: &[String],
    ) -> Signature {
        let language = self.language();
        let mut names = self.leaves.names.borrow().clone();
        let mut leaf = |value: ValueId, met: Met| match self.context.kernel.values[value.0].operation {
            Operation::Rate(rate) if self.split() => rates.get(rate).cloned(),
            _ => self.leaves.at_node(value, met),
        };
        let unsplit: Vec<ValueId> = roots.iter().map(|root| self.without_rate(*root)).collect();
        let statements = if self.split() || self.job.rates.is_empty() {
            Printer { kernel: self.context.kernel, language, leaf: &mut leaf, names: &mut names }
                .statements(&unsplit)
        } else {
            self.joined(&unsplit, &mut names)
        };
        let mut body = Text::indented(1);
        body.lines(&statements.lines);
        match (language, statements.roots.as_slice()) {
            (_, [one]) => body.line(&language.result(one)),
            (Language::C, many) => {
                for (result, value) in results.iter().zip(many) {
                    body.line(&format!("*{result} = {value};"));
                }
            }
            (Language::Rust, many) => body.line(&format!("({})", many.join(", "))),
        }
        let parameters = self.node_inputs(rates).into_iter().filter(|name| body.mentions(name));
        let parameters: Vec<(String, Type)> = parameters.map(|name| (name, Type::Double)).collect();
        inline_mark(text, language);
        text.open(&language.function(Linkage::Inlined, name, &parameters, results));
        text.append(&body);
        text.close("}");
        text.blank();
        Signature { parameters }
    }

    /// A root that is a rate of a sweep without face terms is that rate's value.
    fn without_rate(&self, root: ValueId) -> ValueId {
        match self.context.kernel.values[root.0].operation {
            Operation::Rate(rate) if !self.split() => self.job.rates.get(rate).copied().unwrap_or(root),
            _ => root,
        }
    }

    /// Statements for writes without face terms: rates first, then what is made of them.
    fn joined(&self, roots: &[ValueId], names: &mut super::namer::Namer) -> super::expression::Statements {
        let (kernel, language) = (self.context.kernel, self.language());
        let rates = &self.job.rates;
        let needed = kernel.needed(roots.iter().copied());
        let used: Vec<usize> = (0..rates.len())
            .filter(|rate| {
                let reads = |value: &ValueId| kernel.values[value.0].operation == Operation::Rate(*rate);
                needed.iter().any(reads) || roots.contains(&rates[*rate])
            })
            .collect();
        let values: Vec<ValueId> = used.iter().map(|rate| rates[*rate]).collect();
        let mut leaf = |value: ValueId, met: Met| self.leaves.at_node(value, met);
        let mut first = Printer { kernel, language, leaf: &mut leaf, names }.statements(&values);
        for (rate, value) in used.iter().zip(&first.roots) {
            first.lines.push(language.double(&self.rates[*rate], value));
        }
        let mut leaf = |value: ValueId, met: Met| match kernel.values[value.0].operation {
            Operation::Rate(rate) => self.rates.get(rate).cloned(),
            _ => match rates.iter().position(|rate| *rate == value) {
                Some(rate) if used.contains(&rate) => Some(self.rates[rate].clone()),
                _ => self.leaves.at_node(value, met),
            },
        };
        let second = Printer { kernel, language, leaf: &mut leaf, names }.statements(roots);
        first.lines.extend(second.lines);
        first.roots = second.roots;
        first
    }

    /// Everything that a function of one node may take, in the order of parameters.
    fn node_inputs(&self, rates: &[String]) -> Vec<String> {
        let loads = self.leaves.loads.iter().map(|source| self.leaves.arrays[source].clone());
        let applied = self.leaves.applied.values().map(|applied| applied.name.clone());
        let uniform = self.leaves.uniform.values().cloned();
        loads.chain(applied).chain(rates.iter().cloned()).chain(uniform).collect()
    }

    /// Arguments for a function of one node at `index` of the row.
    fn node_arguments(&self, signature: &Signature, index: &str) -> Vec<String> {
        let argument = |name: &String| {
            let load = self.leaves.loads.iter().find(|source| self.leaves.arrays[*source] == *name);
            load.map_or(name.clone(), |source| self.leaves.element(*source, index))
        };
        signature.parameters.iter().map(|(name, _)| argument(name)).collect()
    }

    /// Statements that compute one node, operators known by name, and store it.
    fn node(&self, text: &mut Text, node: &NodeFunctions, index: &str, faces: Faces) {
        if let Some(rates) = &node.rates {
            self.rates_at_node(text, rates, index, faces);
        }
        let language = self.language();
        let mut arguments = self.node_arguments(&node.point, index);
        let call = |arguments: &[String]| format!("{}_point({})", self.name, arguments.join(", "));
        match (self.targets().as_slice(), language) {
            ([], _) => {}
            ([one], _) => text.line(&language.store(one, index, &call(&arguments))),
            (many, Language::C) => {
                arguments.extend(many.iter().map(|target| format!("&{target}[{index}]")));
                text.line(&format!("{};", call(&arguments)));
            }
            (many, Language::Rust) => {
                text.line(&format!("let ({}) = {};", self.results.join(", "), call(&arguments)));
                for (target, result) in many.iter().zip(&self.results) {
                    text.line(&language.store(target, index, result));
                }
            }
        }
    }

    /// Names of the rows that results are stored to.
    fn targets(&self) -> Vec<String> {
        match &self.job.target {
            Target::Largest => vec![RESULT_ROW.to_owned()],
            Target::Buffers(buffers) => {
                buffers.iter().map(|buffer| self.leaves.arrays[&Source::Buffer(*buffer)].clone()).collect()
            }
        }
    }

    fn rates_at_node(&self, text: &mut Text, signature: &Signature, index: &str, faces: Faces) {
        let language = self.language();
        let mut arguments = self.node_arguments(signature, index);
        let terms: Vec<&FaceTerm> =
            self.job.face_terms.iter().filter(|term| faces.has(self.context, term)).collect();
        let changed = |rate: usize| terms.iter().any(|term| term.rate == rate);
        let used: Vec<usize> = (0..self.rates.len()).collect();
        match (language, used.as_slice()) {
            (_, []) => {}
            (_, [_]) => {
                let call = format!("{}_rates({})", self.name, arguments.join(", "));
                let declared = if changed(0) {
                    language.variable(&self.rates[0], &call)
                } else {
                    language.double(&self.rates[0], &call)
                };
                text.line(&declared);
            }
            (Language::C, _) => {
                text.line(&format!("double {};", self.rates.join(", ")));
                arguments.extend(self.rates.iter().map(|rate| format!("&{rate}")));
                text.line(&format!("{}_rates({});", self.name, arguments.join(", ")));
            }
            (Language::Rust, _) => {
                let list: Vec<String> = used
                    .iter()
                    .map(|rate| format!("{}{}", if changed(*rate) { "mut " } else { "" }, self.rates[*rate]))
                    .collect();
                text.line(&format!(
                    "let ({}) = {}_rates({});",
                    list.join(", "),
                    self.name,
                    arguments.join(", ")
                ));
            }
        }
        for term in terms {
            self.face_term(text, term, index);
        }
    }

    fn face_term(&self, text: &mut Text, term: &FaceTerm, index: &str) {
        let language = self.language();
        let (condition, before, patch) = self.leaves.face(&term.on, index);
        text.open(&language.when(&condition));
        text.lines(&before);
        if let Some(patch) = &patch {
            text.open(&language.when(patch));
        }
        let (lines, values) = self.leaves.values(&[term.value], index);
        text.lines(&lines);
        let rate = &self.rates[term.rate];
        text.line(&match term.action {
            Action::Add => format!("{rate} = {rate} + ({});", values[0]).replace_simple_parentheses(),
            Action::Replace => format!("{rate} = {};", values[0]),
        });
        if patch.is_some() {
            text.close("}");
        }
        text.close("}");
    }
}

/// The functions of one node.
struct NodeFunctions {
    /// With face terms only.
    rates: Option<Signature>,
    point: Signature,
}

/// Which faces a place in the program can lie on.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Faces {
    None,
    Outer,
    All,
}

impl Faces {
    fn has(self, context: &Context, term: &FaceTerm) -> bool {
        match self {
            Faces::None => false,
            Faces::Outer => term.on.axis != context.fast(),
            Faces::All => true,
        }
    }
}

/// `x = x + (y);` without the parentheses where `y` is one word.
trait SimpleParentheses {
    fn replace_simple_parentheses(self) -> String;
}

impl SimpleParentheses for String {
    fn replace_simple_parentheses(self) -> String {
        let Some((before, inner)) =
            self.split_once(" + (").and_then(|(before, rest)| Some((before, rest.strip_suffix(");")?)))
        else {
            return self;
        };
        let simple = inner.bytes().all(|byte| byte.is_ascii_alphanumeric() || matches!(byte, b'_' | b'.'));
        if simple { format!("{before} + {inner};") } else { self }
    }
}
