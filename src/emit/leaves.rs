//! What a pass reads, and under which local names: arrays at the present node, applied operators, numbers that are the
//! same for all nodes.

use super::context::{Context, is_literal};
use super::expression::{Met, Printer};
use super::namer::Namer;
use super::text::Text;
use crate::kernel::{BufferId, Extent, FaceSet, Operation, OperatorId, Source, TableId, ValueId};
use std::cell::RefCell;
use std::collections::{BTreeMap, BTreeSet};

/// An applied operator of a pass.
#[derive(Clone, Debug)]
pub struct Applied {
    pub name: String,
    pub operator: OperatorId,
    pub axis: usize,
    pub source: Source,
    pub coefficient: Option<Source>,
}

/// Local names of one pass.
pub struct Leaves<'a> {
    pub context: &'a Context<'a>,
    /// Every array that is read or written; the name is that of the pointer to the row and of the value at a node.
    pub arrays: BTreeMap<Source, String>,
    /// Arrays whose value at the node itself is read.
    pub loads: BTreeSet<Source>,
    pub applied: BTreeMap<ValueId, Applied>,
    /// Fixed values, parameters and uniform values.
    pub uniform: BTreeMap<ValueId, String>,
    pub names: RefCell<Namer>,
}

impl PartialOrd for Source {
    fn partial_cmp(&self, other: &Source) -> Option<std::cmp::Ordering> {
        Some(self.cmp(other))
    }
}

impl Ord for Source {
    fn cmp(&self, other: &Source) -> std::cmp::Ordering {
        let key = |source: &Source| match source {
            Source::Buffer(BufferId(index)) => (0, *index),
            Source::Table(TableId(index)) => (1, *index),
        };
        key(self).cmp(&key(other))
    }
}

impl<'a> Leaves<'a> {
    /// The leaves of everything that `roots` are made of. `written` arrays get names as well.
    pub fn new(context: &'a Context<'a>, roots: &[ValueId], written: &[BufferId]) -> Leaves<'a> {
        let mut names = context.local_names();
        for axis in &context.axes {
            names.name(&axis.count);
            names.name(&axis.index);
        }
        let mut leaves = Leaves {
            context,
            arrays: BTreeMap::new(),
            loads: BTreeSet::new(),
            applied: BTreeMap::new(),
            uniform: BTreeMap::new(),
            names: RefCell::new(names),
        };
        for buffer in written {
            leaves.array(Source::Buffer(*buffer));
        }
        let needed = context.kernel.needed(roots.iter().copied());
        for value in &needed {
            leaves.arrays_of(*value);
        }
        for value in &needed {
            leaves.uniform_of(*value, roots);
        }
        for value in &needed {
            leaves.applied_of(*value);
        }
        leaves
    }

    fn array(&mut self, source: Source) {
        if self.arrays.contains_key(&source) {
            return;
        }
        let wish = match source {
            Source::Buffer(buffer) => &self.context.buffers[buffer.0],
            Source::Table(table) => &self.context.tables[table.0],
        };
        let name = self.names.borrow_mut().name(wish);
        self.arrays.insert(source, name);
    }

    fn arrays_of(&mut self, value: ValueId) {
        match self.context.kernel.values[value.0].operation {
            Operation::Load(buffer) => self.load(Source::Buffer(buffer)),
            Operation::Table(table) => self.load(Source::Table(table)),
            Operation::Apply { source, coefficient, .. } => {
                self.array(source);
                coefficient.into_iter().for_each(|read| self.array(read));
            }
            _ => {}
        }
    }

    fn load(&mut self, source: Source) {
        self.array(source);
        self.loads.insert(source);
    }

    /// Registers operands that are the same for all nodes, met by values that are not, and such roots.
    fn uniform_of(&mut self, value: ValueId, roots: &[ValueId]) {
        let kernel = self.context.kernel;
        let entry = &kernel.values[value.0];
        let same = |extent: Extent| matches!(extent, Extent::Fixed | Extent::Uniform);
        if roots.contains(&value) && same(entry.extent) && !is_literal(kernel, value) {
            self.register(value);
        }
        if same(entry.extent) {
            return;
        }
        let library = matches!(entry.operation, Operation::Call(..) | Operation::Power(..));
        for operand in entry.operation.operands() {
            let extent = kernel.values[operand.0].extent;
            if same(extent) && (library || !is_literal(kernel, operand)) {
                self.register(operand);
            }
        }
    }

    fn register(&mut self, value: ValueId) {
        if !self.uniform.contains_key(&value) {
            if let Operation::Time | Operation::Step = self.context.kernel.values[value.0].operation {
                // Parameters of the pass, under the same names.
                self.uniform.insert(value, self.context.wish(value));
                return;
            }
            let wish = match self.context.stored.get(&value) {
                Some(member) => member.clone(),
                None => self.context.wish(value),
            };
            let name = self.names.borrow_mut().name(&wish);
            self.uniform.insert(value, name);
        }
    }

    fn applied_of(&mut self, value: ValueId) {
        let kernel = self.context.kernel;
        let entry = &kernel.values[value.0];
        if let Operation::Apply { operator, axis, source, coefficient } = entry.operation {
            let wish = match &entry.hint {
                Some(hint) => hint.clone(),
                None => format!("{}_of_{}", kernel.operators[operator.0].name, self.arrays[&source]),
            };
            let name = self.names.borrow_mut().name(&wish);
            self.applied.insert(value, Applied { name, operator, axis, source, coefficient });
        }
    }

    /// Text of a value as a parameter of a function of one node.
    pub fn at_node(&self, value: ValueId, met: Met) -> Option<String> {
        if let Some(name) = self.uniform_name(value, met) {
            return Some(name);
        }
        match self.context.kernel.values[value.0].operation {
            Operation::Load(buffer) => self.arrays.get(&Source::Buffer(buffer)).cloned(),
            Operation::Table(table) => self.arrays.get(&Source::Table(table)).cloned(),
            Operation::Apply { .. } => self.applied.get(&value).map(|applied| applied.name.clone()),
            _ => None,
        }
    }

    /// Text of a value where arrays are indexed by `index` along the row.
    pub fn in_row(&self, value: ValueId, met: Met, index: &str) -> Option<String> {
        match self.context.kernel.values[value.0].operation {
            Operation::Load(buffer) => Some(self.element(Source::Buffer(buffer), index)),
            Operation::Table(table) => Some(self.element(Source::Table(table), index)),
            _ => self.at_node(value, met),
        }
    }

    fn uniform_name(&self, value: ValueId, met: Met) -> Option<String> {
        if met == Met::Plain && is_literal(self.context.kernel, value) {
            return None;
        }
        self.uniform.get(&value).cloned()
    }

    /// The array's value at node `index` of the row.
    pub fn element(&self, source: Source, index: &str) -> String {
        let moves = self.context.moves(self.context.axes_of(source));
        self.context.language.at(&self.arrays[&source], if moves { index } else { "0" })
    }

    /// The pointer to node `index` of the row.
    pub fn here(&self, source: Source, index: &str) -> String {
        let moves = self.context.moves(self.context.axes_of(source));
        if moves {
            self.context.language.shifted(&self.arrays[&source], index)
        } else {
            self.arrays[&source].clone()
        }
    }

    /// Declarations of the uniform values that `body` mentions.
    pub fn uniform_declarations(&self, body: &str) -> Vec<String> {
        let context = self.context;
        let language = context.language;
        let mut lines = Vec::new();
        let mut computed = Vec::new();
        for (value, name) in self.uniform.iter().filter(|(_, name)| super::text::mentions(body, name)) {
            match context.kernel.values[value.0].extent {
                Extent::Uniform if name == "t" || name == "dt" => {}
                Extent::Uniform => computed.push((*value, name.clone())),
                _ => {
                    let storage = context.storage(*value).unwrap_or_else(|| "unknown".to_owned());
                    lines.push(language.double(name, &storage));
                }
            }
        }
        let roots: Vec<ValueId> = computed.iter().map(|(value, _)| *value).collect();
        let mut names = self.names.borrow_mut();
        let mut leaf = |value: ValueId, met: Met| match context.kernel.values[value.0].operation {
            Operation::Time => Some("t".to_owned()),
            Operation::Step => Some("dt".to_owned()),
            _ if met == Met::Plain && is_literal(context.kernel, value) => None,
            _ => context.storage(value),
        };
        let statements = Printer { kernel: context.kernel, language, leaf: &mut leaf, names: &mut names }
            .statements(&roots);
        lines.extend(statements.lines);
        for ((_, name), text) in computed.iter().zip(&statements.roots) {
            lines.push(language.double(name, text));
        }
        lines
    }

    /// Declarations of numbers of nodes and pointers to the present row that `body` mentions. Outer indices must be known.
    pub fn row_declarations(&self, body: &str, written: &[BufferId]) -> Vec<String> {
        let context = self.context;
        let language = context.language;
        let mut lines = Vec::new();
        for (source, name) in self.arrays.iter().filter(|(_, name)| super::text::mentions(body, name)) {
            let axes = context.axes_of(*source);
            let outer: Vec<String> = (0..context.fast())
                .filter(|axis| axes >> axis & 1 == 1)
                .map(|axis| {
                    let stride = context.stride(axes, axis);
                    let index = &context.axes[axis].index;
                    if stride == "1" { index.clone() } else { format!("{index} * {stride}") }
                })
                .collect();
            let offset = if outer.is_empty() { "0".to_owned() } else { outer.join(" + ") };
            let (member, is_written) = match source {
                Source::Buffer(buffer) => (&context.buffers[buffer.0], written.contains(buffer)),
                Source::Table(table) => (&context.tables[table.0], false),
            };
            let value = language.shifted(&language.array(member), &offset);
            let kind = match (language, is_written) {
                (super::Language::C, true) => "double *const",
                (super::Language::C, false) => "const double *const",
                (super::Language::Rust, _) => "let",
            };
            lines.push(format!("{kind} {name} = {value};"));
        }
        lines
    }

    /// Declarations of the numbers of nodes that `body` mentions.
    pub fn count_declarations(&self, body: &str) -> Vec<String> {
        let context = self.context;
        let mut lines = Vec::new();
        for (axis, names) in context.axes.iter().enumerate() {
            if super::text::mentions(body, &names.count) {
                let nodes = context.language.member(&format!("nodes[{axis}]"));
                lines.push(context.language.index(&names.count, &nodes));
            }
        }
        lines
    }

    /// The condition that a node lies on a face, and statements and condition of the patch.
    pub fn face(&self, on: &FaceSet, index: &str) -> (String, Vec<String>, Option<String>) {
        let names = &self.context.axes[on.axis];
        let place = if on.axis == self.context.fast() { index } else { names.index.as_str() };
        let condition =
            if on.high { format!("{place} == {} - 1", names.count) } else { format!("{place} == 0") };
        let roots: Vec<ValueId> = on.patch.iter().flat_map(|(left, _, right)| [*left, *right]).collect();
        let (lines, texts) = self.values(&roots, index);
        let comparisons: Vec<String> = on
            .patch
            .iter()
            .zip(texts.chunks(2))
            .map(|((_, order, _), pair)| {
                format!("{} {} {}", pair[0], super::language::relation(*order), pair[1])
            })
            .collect();
        (condition, lines, (!comparisons.is_empty()).then(|| comparisons.join(" && ")))
    }

    /// Values without applied operators at node `index` of the row.
    pub fn values(&self, roots: &[ValueId], index: &str) -> (Vec<String>, Vec<String>) {
        let mut names = self.names.borrow().clone();
        let mut leaf = |value: ValueId, met: Met| self.in_row(value, met, index);
        let statements = Printer {
            kernel: self.context.kernel,
            language: self.context.language,
            leaf: &mut leaf,
            names: &mut names,
        }
        .statements(roots);
        (statements.lines, statements.roots)
    }
}

/// Declares the outer indices of row number `row` that `body` mentions.
pub fn outer_indices(context: &Context, body: &mut Text, row: &str, rest: &str) {
    let language = context.language;
    let outer = &context.axes[..context.fast()];
    let mut lines = Vec::new();
    for (place, names) in outer.iter().enumerate() {
        if !super::text::mentions(rest, &names.index) {
            continue;
        }
        let later: Vec<&str> = outer[place + 1..].iter().map(|other| other.count.as_str()).collect();
        let quotient =
            if later.is_empty() { row.to_owned() } else { format!("{row} / {}", later.join(" / ")) };
        let value = if place == 0 { quotient } else { format!("{quotient} % {}", names.count) };
        lines.push(language.index(&names.index, &value));
    }
    body.lines(&lines);
}
