//! Sweeps as functions: what one node needs, a loop over the inside of a row, and the schedule over rows.
//!
//! Three functions come of a sweep. `NAME_point` computes one node from its inputs (with face terms, `NAME_rates` goes
//! before it). `NAME_inside` runs it along the inside of a row, with every operator inlined and no branch. `NAME` goes over
//! the rows: it treats the ends of each row node by node, and in rows near an outer face it first puts the outer axes'
//! operators into scratch rows. All of them compute in the kernel's order, so a node's bits do not depend on the way.

use super::context::{Context, Variant};
use super::expression::{Met, Printer};
use super::language::{Language, Linkage, Type};
use super::leaves::{Applied, Leaves, outer_indices};
use super::operators::{inline_mark, open_row_loop};
use super::text::{Text, mentions};
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
}

/// Name of the scratch row that holds results of a `Target::Largest`.
const RESULT_ROW: &str = "result";

/// Prints a sweep.
pub fn sweep(context: &Context, job: &Job) -> Routine {
    let name = context.function_name(&job.wish, &["_point", "_rates", "_inside"]);
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
        Routine { text: text.into_string(), name: self.name.clone(), uses_time, uses_step, scratch_rows }
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
            Printer { kernel: self.context.kernel, language, leaf: &mut leaf, names: &mut names }.statements(&unsplit)
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
        let terms: Vec<&FaceTerm> = self.job.face_terms.iter().filter(|term| faces.has(self.context, term)).collect();
        let changed = |rate: usize| terms.iter().any(|term| term.rate == rate);
        let used: Vec<usize> = (0..self.rates.len()).collect();
        match (language, used.as_slice()) {
            (_, []) => {}
            (_, [_]) => {
                let call = format!("{}_rates({})", self.name, arguments.join(", "));
                let declared =
                    if changed(0) { language.variable(&self.rates[0], &call) } else { language.double(&self.rates[0], &call) };
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
                text.line(&format!("let ({}) = {}_rates({});", list.join(", "), self.name, arguments.join(", ")));
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

    /// Width of the ends of an axis that are treated apart.
    fn edge(&self, axis: usize) -> usize {
        let faces = self.job.face_terms.iter().any(|term| term.on.axis == axis);
        let operators = self.leaves.applied.values().filter(|applied| applied.axis == axis);
        operators.map(|applied| self.context.edge(applied.operator, axis)).chain([usize::from(faces)]).max().unwrap_or(0)
    }

    /// The operator at an interior node, inlined.
    fn inlined(&self, applied: &Applied, index: &str) -> String {
        let mut arguments = self.sources(applied, index);
        let name = self.context.operator(applied.operator, Variant::Inner);
        arguments.insert(0, self.leaves.here(applied.source, index));
        format!("{name}({})", arguments.join(", "))
    }

    /// Stride, coefficient and its stride, in the order of operator functions.
    fn sources(&self, applied: &Applied, index: &str) -> Vec<String> {
        let stride = |source: Source| self.context.stride(self.context.axes_of(source), applied.axis);
        let mut list = vec![stride(applied.source)];
        if let Some(coefficient) = applied.coefficient {
            list.push(self.leaves.here(coefficient, index));
            list.push(stride(coefficient));
        }
        list
    }

    /// The operator along the row at any of its nodes.
    fn at_any(&self, applied: &Applied, index: &str) -> String {
        let name = self.context.operator(applied.operator, Variant::At);
        let mut arguments = vec![self.leaves.here(applied.source, index)];
        arguments.extend(self.sources(applied, index));
        arguments.push(index.to_owned());
        arguments.push(self.context.axes[applied.axis].count.clone());
        format!("{name}({})", arguments.join(", "))
    }

    fn inside(&self, text: &mut Text, node: &NodeFunctions) -> Signature {
        let language = self.language();
        let mut body = Text::indented(1);
        open_row_loop(&mut body, language, "i", "0", "count");
        for applied in self.leaves.applied.values() {
            body.line(&language.double(&applied.name, &self.inlined(applied, "i")));
        }
        self.node(&mut body, node, "i", Faces::None);
        body.close("}");
        let targets = self.targets();
        let mut parameters = vec![("count".to_owned(), Type::Index)];
        parameters.extend(targets.iter().map(|target| (target.clone(), Type::Out)));
        let arrays = self.leaves.arrays.values().filter(|name| !targets.contains(name));
        parameters.extend(arrays.map(|name| (name.clone(), Type::In)));
        parameters.extend(self.context.axes.iter().map(|axis| (axis.count.clone(), Type::Index)));
        parameters.extend(self.leaves.uniform.values().map(|name| (name.clone(), Type::Double)));
        parameters.retain(|(name, _)| body.mentions(name));
        text.open(&language.function(Linkage::Private, &format!("{}_inside", self.name), &parameters, &[]));
        if language == Language::Rust {
            for target in &targets {
                text.line(&format!("let {target} = {target}.as_mut_ptr();"));
            }
        }
        text.append(&body);
        text.close("}");
        text.blank();
        Signature { parameters }
    }

    /// A call of `NAME_inside` from node `first` of the row on.
    fn inside_call(&self, signature: &Signature, first: &str, count: &str) -> String {
        let language = self.language();
        let targets = self.targets();
        let argument = |name: &String, kind: Type| match (language, kind) {
            _ if name == "count" => count.to_owned(),
            (Language::Rust, Type::Out) => format!("line({}, {count})", language.shifted(name, first)),
            (_, Type::Out) => language.shifted(name, first),
            (_, Type::In) => {
                let source = self.leaves.arrays.iter().find(|(_, other)| *other == name);
                source.map_or(name.clone(), |(source, _)| self.leaves.here(*source, first))
            }
            _ => name.clone(),
        };
        debug_assert!(signature.parameters.iter().filter(|(_, kind)| *kind == Type::Out).count() == targets.len());
        let arguments: Vec<String> = signature.parameters.iter().map(|(name, kind)| argument(name, *kind)).collect();
        format!("{}_inside({});", self.name, arguments.join(", "))
    }

    /// The function that goes over all rows. Returns whether it needs time and step, and its scratch rows.
    fn schedule(&self, text: &mut Text, node: &NodeFunctions, inside: &Signature) -> (bool, bool, usize) {
        let language = self.language();
        let largest = matches!(self.job.target, Target::Largest);
        let depth = 2;
        let mut row = Text::indented(depth);
        let several = self.context.axes.len() > 1;
        let slots = if several { self.row_of_grid(&mut row, node, inside) } else { self.row_of_line(&mut row, node, inside) };
        let scratch_rows = slots + usize::from(largest);
        if largest {
            let count = &self.context.axes[self.context.fast()].count;
            let store = match language {
                Language::C => format!("s->row_maximum[row] = largest({RESULT_ROW}, {count});"),
                Language::Rust => format!("*s.row_maximum.first().offset(row) = largest({RESULT_ROW}, {count});"),
            };
            row.line(&store);
        }
        let inner = row.as_str().to_owned();
        let mut head = Text::indented(depth);
        self.scratch_declarations(&mut head, &inner, slots, largest);
        let pointers = self.leaves.row_declarations(&(inner.clone() + head.as_str()), &self.written);
        let mut body = Text::indented(depth);
        let known = pointers.join("\n") + &inner;
        outer_indices(self.context, &mut body, "row", &known);
        body.lines(&pointers);
        body.append(&head);
        body.append(&row);

        let mut function = Text::indented(1);
        let whole = body.as_str().to_owned();
        let uniform = self.leaves.uniform_declarations(&whole);
        function.lines(&uniform);
        let rows = if several {
            "s->rows"
        } else if largest {
            "1"
        } else {
            "s->team"
        };
        let rows = if language == Language::C { rows.to_owned() } else { rows.replace("->", ".") };
        function.lines(&self.leaves.count_declarations(&whole));
        let parts = if several { "rows" } else { "parts" };
        function.line(&language.index(parts, &rows));
        self.open_rows(&mut function, parts, &whole);
        function.append(&body);
        function.close(language.pick("}", "});"));
        if largest {
            function.line(&language.result(&format!("largest({}, {parts})", language.array("row_maximum"))));
        }
        let uses_time = function.mentions("t");
        let uses_step = function.mentions("dt");
        text.open(&self.context.pass_head(&self.name, [uses_time, uses_step], largest));
        text.append(&function);
        text.close("}");
        (uses_time, uses_step, scratch_rows)
    }

    fn open_rows(&self, text: &mut Text, parts: &str, body: &str) {
        match self.language() {
            Language::C => {
                text.line("ROWS_IN_PARALLEL");
                text.open(&format!("for (ptrdiff_t row = 0; row < {parts}; row++) {{"));
            }
            Language::Rust => {
                let thread = if mentions(body, "thread") { "thread" } else { "_" };
                let row = if mentions(body, "row") { "row" } else { "_" };
                text.open(&format!("share(s.team, {parts}, &|{thread}, {row}| {{"));
            }
        }
    }

    /// Scratch rows of the present thread.
    fn scratch_declarations(&self, text: &mut Text, body: &str, slots: usize, largest: bool) {
        let language = self.language();
        let count = &self.context.axes[self.context.fast()].count;
        let mut slot = 0;
        let mut names: Vec<&str> = Vec::new();
        if slots > 0 {
            names = self.scratch.iter().map(String::as_str).filter(|name| mentions(body, name)).collect();
        }
        if largest {
            names.push(RESULT_ROW);
        }
        if names.is_empty() {
            return;
        }
        text.line(&match language {
            Language::C => "double *const scratch = s->scratch + thread_number() * s->scratch_length;".to_owned(),
            Language::Rust => "let scratch = s.scratch.first().offset(thread * s.scratch_length);".to_owned(),
        });
        for name in names {
            let offset = if slot == 0 { "0".to_owned() } else { format!("{slot} * {count}") };
            let kind = language.pick("double *const", "let");
            text.line(&format!("{kind} {name} = {};", language.shifted("scratch", &offset)));
            slot += 1;
        }
    }

    /// One row of a grid of two or three axes. Returns the number of scratch rows.
    fn row_of_grid(&self, text: &mut Text, node: &NodeFunctions, inside: &Signature) -> usize {
        let language = self.language();
        let fast = self.context.fast();
        let (count, index) = (&self.context.axes[fast].count, &self.context.axes[fast].index);
        let edge = self.edge(fast);
        let conditions: Vec<String> = (0..fast)
            .filter(|axis| self.edge(*axis) > 0)
            .map(|axis| {
                let (width, names) = (self.edge(axis), &self.context.axes[axis]);
                format!("{0} < {width} || {0} >= {1} - {width}", names.index, names.count)
            })
            .collect();
        let mut slots = 0;
        if !conditions.is_empty() {
            text.line(&language.truth("edge_row", &conditions.join(" || ")));
            slots = self.fill_scratch(text);
        }
        if edge > 0 {
            self.ends(text, node, edge, !conditions.is_empty());
        }
        let inside_call =
            self.inside_call(inside, &edge.to_string(), &if edge > 0 { format!("{count} - {}", 2 * edge) } else { count.clone() });
        if conditions.is_empty() {
            text.line(&inside_call);
            return slots;
        }
        text.open(&language.when("!edge_row"));
        text.line(&inside_call);
        text.close("} else {");
        text.open_only();
        let high = if edge > 0 { format!("{count} - {edge}") } else { count.clone() };
        open_row_loop(text, language, index, &edge.to_string(), &high);
        for (place, applied) in self.leaves.applied.values().enumerate() {
            let value = if self.scratch_axis(applied) {
                language.at(&self.scratch[place], index)
            } else {
                self.inlined(applied, index)
            };
            text.line(&language.double(&applied.name, &value));
        }
        self.node(text, node, index, Faces::Outer);
        text.close("}");
        text.close("}");
        slots
    }

    /// Whether the operator is read from a scratch row near outer faces.
    fn scratch_axis(&self, applied: &Applied) -> bool {
        applied.axis != self.context.fast() && self.edge(applied.axis) > 0
    }

    fn fill_scratch(&self, text: &mut Text) -> usize {
        let language = self.language();
        let count = &self.context.axes[self.context.fast()].count;
        let outer: Vec<(usize, &Applied)> =
            self.leaves.applied.values().enumerate().filter(|(_, applied)| self.scratch_axis(applied)).collect();
        if outer.is_empty() {
            return 0;
        }
        text.open(&language.when("edge_row"));
        for (place, applied) in &outer {
            let moves = |source: Source| self.context.moves(self.context.axes_of(source));
            let variant = Variant::Row {
                field_moves: moves(applied.source),
                coefficient_moves: applied.coefficient.is_none_or(moves),
            };
            let name = self.context.operator(applied.operator, variant);
            let names = &self.context.axes[applied.axis];
            let row = &self.scratch[*place];
            let mut arguments = match language {
                Language::C => vec![row.clone()],
                Language::Rust => vec![format!("line({row}, {count})")],
            };
            arguments.push(self.leaves.here(applied.source, "0"));
            arguments.extend(self.sources(applied, "0"));
            arguments.extend([names.index.clone(), names.count.clone(), count.clone()]);
            text.line(&format!("{name}({});", arguments.join(", ")));
        }
        text.close("}");
        outer.len()
    }

    /// The nodes at both ends of a row, one by one.
    fn ends(&self, text: &mut Text, node: &NodeFunctions, edge: usize, edge_rows: bool) {
        let language = self.language();
        let fast = self.context.fast();
        let (count, index) = (&self.context.axes[fast].count, &self.context.axes[fast].index);
        text.open(&language.count("end", "0", &(2 * edge).to_string()));
        let place = language.choose(&format!("end < {edge}"), "end", &format!("{count} - {} + end", 2 * edge));
        text.line(&language.index(index, &place));
        for (slot, applied) in self.leaves.applied.values().enumerate() {
            let value = if applied.axis == fast {
                self.at_any(applied, index)
            } else if edge_rows && self.scratch_axis(applied) {
                language.choose("edge_row", &language.at(&self.scratch[slot], index), &self.inlined(applied, index))
            } else {
                self.inlined(applied, index)
            };
            text.line(&language.double(&applied.name, &value));
        }
        self.node(text, node, index, Faces::All);
        text.close("}");
    }

    /// The nodes of a grid of one axis that fall to part `row`. Returns the number of scratch rows.
    fn row_of_line(&self, text: &mut Text, node: &NodeFunctions, inside: &Signature) -> usize {
        let language = self.language();
        let count = &self.context.axes[0].count;
        let edge = self.edge(0);
        if edge > 0 {
            text.open(&language.when("row == 0"));
            self.ends(text, node, edge, false);
            text.close("}");
        }
        let (width, low) = if edge > 0 {
            (format!("({count} - {})", 2 * edge), format!("{edge} + "))
        } else {
            (count.clone(), String::new())
        };
        text.line(&language.index("first", &format!("{low}{width} * row / parts")));
        text.line(&language.index("last", &format!("{low}{width} * (row + 1) / parts")));
        text.line(&self.inside_call(inside, "first", "last - first"));
        0
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
        let Some((before, inner)) = self.split_once(" + (").and_then(|(before, rest)| Some((before, rest.strip_suffix(");")?)))
        else {
            return self;
        };
        let simple = inner.bytes().all(|byte| byte.is_ascii_alphanumeric() || matches!(byte, b'_' | b'.'));
        if simple { format!("{before} + {inner};") } else { self }
    }
}
