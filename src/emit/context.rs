//! What all parts of one emitted program share: global names, stored values, which operator functions are used.

use super::expression::constant_only;
use super::language::Language;
use super::namer::Namer;
use crate::kernel::{
    Extent, Kernel, Operation, OperatorId, OutputKind, Pass, Source, Sweep, TableId, ValidKernel, ValueId,
};
use std::cell::RefCell;
use std::collections::{BTreeMap, BTreeSet};

/// The functions of an operator beside that for interior nodes.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub enum Variant {
    /// At interior nodes.
    Inner,
    /// At any node of a line.
    At,
    /// Along a whole row, across the operator's axis; whether field and coefficient change along the row.
    Row { field_moves: bool, coefficient_moves: bool },
}

impl Variant {
    /// What is appended to the operator's name.
    pub fn ending(self) -> &'static str {
        match self {
            Variant::Inner => "",
            Variant::At => "_at",
            Variant::Row { field_moves: true, coefficient_moves: true } => "_row",
            Variant::Row { field_moves: true, coefficient_moves: false } => "_row_fixed_coefficient",
            Variant::Row { field_moves: false, coefficient_moves: true } => "_row_fixed_field",
            Variant::Row { field_moves: false, coefficient_moves: false } => "_row_fixed",
        }
    }
}

/// Endings of names that belong to an operator.
const OPERATOR_NAMES: [&str; 13] = [
    "_at",
    "_row",
    "_row_fixed_coefficient",
    "_row_fixed_field",
    "_row_fixed",
    "_weights",
    "_closure",
    "_first",
    "_start",
    "_column",
    "_entries",
    "_terms",
    "_node",
];

/// Names of the file's scope and of locals in operator functions, besides those that no identifier may be.
const FILE_NAMES: &str = "
swap largest fixed_values axis_list parameter_list field_list output_list quadrature_0 quadrature_1 quadrature_2
quadrature_list quadrature_counts model_lines model_text description describe arrays kernel
f b g c i k stride b_stride high forward b_forward turn from columns column sum entry entries factor term blocks
block number width weight start result
passes step_shift ends period arrays periodic near_cache far_cache most_steps pass_shift step_part rotate slab_count
slab_begin wave_length wave_steps band wave plain least_shared
";

/// Names of an axis in program text.
#[derive(Clone, Debug)]
pub struct AxisNames {
    /// Number of nodes.
    pub count: String,
    /// Index of a node.
    pub index: String,
    /// The coordinate.
    pub place: String,
}

/// See the module.
pub struct Context<'a> {
    pub kernel: &'a Kernel,
    pub language: Language,
    /// Prefix of public names in C.
    pub prefix: String,
    pub axes: Vec<AxisNames>,
    /// Member names.
    pub buffers: Vec<String>,
    pub tables: Vec<String>,
    /// Fixed values that others read, by member name.
    pub stored: BTreeMap<ValueId, String>,
    pub operators: Vec<String>,
    pub constant_only: Vec<bool>,
    pub used: RefCell<BTreeSet<(OperatorId, Variant)>>,
    functions: RefCell<Namer>,
    /// Names that functions must not have: members, and what the templates and printers use.
    avoided: Namer,
}

impl<'a> Context<'a> {
    pub fn new(kernel: &'a ValidKernel, language: Language) -> Context<'a> {
        let kernel: &'a Kernel = kernel;
        let mut members = Namer::default();
        let axes = kernel
            .axes
            .iter()
            .map(|axis| AxisNames {
                count: members.name(&format!("n_{}", axis.name)),
                index: members.name(&format!("i_{}", axis.name)),
                place: members.name(&axis.name),
            })
            .collect();
        let buffers = kernel.buffers.iter().map(|buffer| members.name(&buffer.name)).collect();
        let tables = kernel.tables.iter().map(|table| members.name(&table.name)).collect();
        let stored = stored(kernel)
            .into_iter()
            .map(|value| {
                let wish = kernel.values[value.0].hint.as_deref().unwrap_or("c");
                (value, members.name(wish))
            })
            .collect();
        members.reserve(FILE_NAMES);
        let mut context = Context {
            kernel,
            language,
            prefix: Namer::default().name(&kernel.name),
            axes,
            buffers,
            tables,
            stored,
            operators: Vec::new(),
            constant_only: constant_only(kernel),
            used: RefCell::default(),
            functions: RefCell::default(),
            avoided: members,
        };
        context.operators = kernel
            .operators
            .iter()
            .map(|operator| context.function_name(&operator.name, &OPERATOR_NAMES))
            .collect();
        context
    }

    /// A new name of the file's scope, such that it followed by each ending is free as well. It differs from every
    /// member, because local names are made of those.
    pub fn function_name(&self, wish: &str, endings: &[&str]) -> String {
        let mut functions = self.functions.borrow_mut();
        let mut all = self.avoided.clone();
        all.absorb(&functions);
        let name = all.family(wish, endings);
        functions.family(&name, endings);
        name
    }

    /// Names for one function: those of the file's scope are taken.
    pub fn local_names(&self) -> Namer {
        self.functions.borrow().clone()
    }

    /// The last axis.
    pub fn fast(&self) -> usize {
        self.axes.len() - 1
    }

    /// The function of an operator, noted as used.
    pub fn operator(&self, operator: OperatorId, variant: Variant) -> String {
        self.used.borrow_mut().insert((operator, variant));
        format!("{}{}", self.operators[operator.0], variant.ending())
    }

    /// The axes over which a source has values; bit a is axis a.
    pub fn axes_of(&self, source: Source) -> u8 {
        match source {
            Source::Buffer(_) => ((1u16 << self.axes.len()) - 1) as u8,
            Source::Table(table) => self.table_axes(table),
        }
    }

    pub fn table_axes(&self, table: TableId) -> u8 {
        self.kernel.tables[table.0].axes
    }

    /// Whether the array changes along a row.
    pub fn moves(&self, axes: u8) -> bool {
        axes >> self.fast() & 1 == 1
    }

    /// Elements from one node to the next along `axis`, in an array over `axes`.
    pub fn stride(&self, axes: u8, axis: usize) -> String {
        let later: Vec<&str> = (axis + 1..self.axes.len())
            .filter(|later| axes >> later & 1 == 1)
            .map(|later| self.axes[later].count.as_str())
            .collect();
        if later.is_empty() { "1".to_owned() } else { later.join(" * ") }
    }

    /// How many nodes at each end of `axis` an operator treats differently from the inside.
    pub fn edge(&self, operator: OperatorId, axis: usize) -> usize {
        let line = &self.kernel.operators[operator.0].operator;
        if self.kernel.axes[axis].periodic { line.interior_reach() } else { line.closure_rows() }
    }

    /// Where a fixed value or parameter is stored, if it is.
    pub fn storage(&self, value: ValueId) -> Option<String> {
        match self.kernel.values[value.0].operation {
            Operation::Parameter(parameter) => {
                Some(self.language.member(&format!("parameter[{}]", parameter.0)))
            }
            Operation::InverseSpacing(axis) => {
                Some(self.language.member(&format!("inverse_spacing[{axis}]")))
            }
            _ => self.stored.get(&value).map(|name| self.language.member(name)),
        }
    }

    /// A name for a value that is the same for all nodes.
    pub fn wish(&self, value: ValueId) -> String {
        let entry = &self.kernel.values[value.0];
        match &entry.operation {
            Operation::Parameter(parameter) => self.kernel.parameters[parameter.0].name.clone(),
            Operation::InverseSpacing(axis) => format!("per_spacing_{}", self.kernel.axes[*axis].name),
            Operation::Literal(_) | Operation::Pi => "constant".to_owned(),
            Operation::Time => "t".to_owned(),
            Operation::Step => "dt".to_owned(),
            _ => entry.hint.clone().unwrap_or_else(|| "c".to_owned()),
        }
    }

    /// The head of the C function that runs a pass on some rows, from `low` to before `high`.
    pub fn part_head(&self, name: &str, uses: [bool; 2]) -> String {
        let whole = self.pass_head(&format!("{name}_part"), uses, false);
        whole.replace(") {", ", ptrdiff_t low, ptrdiff_t high) {")
    }

    /// The C function that runs a pass on all rows, shared by the threads.
    pub fn whole_pass(&self, name: &str, uses: [bool; 2]) -> String {
        let typed = uses.into_iter().zip([", t", ", dt"]).filter(|(used, _)| *used);
        let numbers: String = typed.map(|(_, number)| number).collect();
        let slabs = self.slabs();
        let head = self.pass_head(name, uses, false);
        format!(
            "{head}\n    const ptrdiff_t parts = s->team, rows = {slabs};\n    ROWS_IN_PARALLEL\n    \
             for (ptrdiff_t part = 0; part < parts; part++) {{\n        \
             {name}_part(s{numbers}, rows * part / parts{0}, rows * (part + 1) / parts{0});\n    }}\n}}\n",
            self.slab_rows()
        )
    }

    /// What threads and plans share out: indices of the slowest axis.
    pub fn slabs(&self) -> &'static str {
        "s->nodes[0]"
    }

    /// What turns a slab's index into that of its first row (of its node, where there is one axis).
    pub fn slab_rows(&self) -> &'static str {
        if self.axes.len() == 3 { " * s->nodes[1]" } else { "" }
    }

    /// The head of a function that runs a pass; `uses` tells whether it takes time and step.
    pub fn pass_head(&self, name: &str, uses: [bool; 2], returns: bool) -> String {
        let language = self.language;
        let mut parameters = match language {
            Language::C => vec![format!("const {}_solver *s", self.prefix)],
            Language::Rust => vec!["s: &Arrays".to_owned()],
        };
        let typed = uses.into_iter().zip(["t", "dt"]).filter(|(used, _)| *used);
        parameters.extend(typed.map(|(_, number)| language.pick("double #", "#: f64").replace('#', number)));
        let list = parameters.join(", ");
        match (language, returns) {
            (Language::C, false) => format!("static void {name}({list}) {{"),
            (Language::C, true) => format!("static double {name}({list}) {{"),
            (Language::Rust, false) => format!("unsafe fn {name}({list}) {{"),
            (Language::Rust, true) => format!("unsafe fn {name}({list}) -> f64 {{"),
        }
    }
}

/// Whether the value is a literal.
pub fn is_literal(kernel: &Kernel, value: ValueId) -> bool {
    matches!(kernel.values[value.0].operation, Operation::Literal(_) | Operation::Pi)
}

/// Fixed values that values of other extents, passes or tables read; literals only where the library reads them.
fn stored(kernel: &Kernel) -> BTreeSet<ValueId> {
    let mut found = BTreeSet::new();
    let own_place = |value: ValueId| {
        matches!(kernel.values[value.0].operation, Operation::Parameter(_) | Operation::InverseSpacing(_))
    };
    let fixed = |value: ValueId| kernel.values[value.0].extent == Extent::Fixed && !own_place(value);
    for value in kernel.values.iter().filter(|value| value.extent != Extent::Fixed) {
        let library = matches!(value.operation, Operation::Call(..) | Operation::Power(..));
        for operand in value.operation.operands() {
            if fixed(operand) && (library || !is_literal(kernel, operand)) {
                found.insert(operand);
            }
        }
    }
    for root in roots(kernel) {
        if fixed(root) && !is_literal(kernel, root) {
            found.insert(root);
        }
    }
    found
}

/// Values that passes, tables and the limit name.
fn roots(kernel: &Kernel) -> Vec<ValueId> {
    let mut found: Vec<ValueId> = kernel.tables.iter().map(|table| table.value).collect();
    found.push(kernel.limit.rate);
    let mut sweep_roots = |sweep: &Sweep| {
        found.extend(&sweep.rates);
        found.extend(sweep.writes.iter().map(|write| write.value));
        for term in &sweep.face_terms {
            found.push(term.value);
            found.extend(term.on.patch.iter().flat_map(|(left, _, right)| [*left, *right]));
        }
    };
    let stages = kernel.start.iter().chain(&kernel.first_step).chain(&kernel.step);
    let mut faces = Vec::new();
    for pass in stages.flat_map(|stage| &stage.passes) {
        match pass {
            Pass::Sweep(sweep) => sweep_roots(sweep),
            Pass::Face(face) => faces.push(face),
        }
    }
    for output in &kernel.outputs {
        output.sweeps.iter().for_each(&mut sweep_roots);
        if let OutputKind::Maximum { begin } = &output.kind {
            begin.iter().for_each(&mut sweep_roots);
        }
    }
    for face in faces {
        found.extend(face.writes.iter().map(|write| write.value));
        found.extend(face.on.patch.iter().flat_map(|(left, _, right)| [*left, *right]));
    }
    found
}
