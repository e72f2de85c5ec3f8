//! The kernel: what an emitted program computes, and in which order.
//!
//! # What a kernel means
//!
//! A kernel lives on a grid of nodes, `axes` slowest first: the last axis is the fastest in memory. A **row** is one line
//! of nodes along the last axis. A **buffer** holds one double for every node. A **table** holds one double for every node
//! of a *subset* of the axes; tables are computed once, after the parameters and sizes are known, and never change.
//!
//! **Values** form one acyclic graph; operands stand before their users. Each value has an [`Extent`]: fixed (one number
//! for the run), uniform (one number for a stage: it depends on time or step), table (one for each node of some axes;
//! only in definitions of tables), or varying (one for each node in a sweep). Every operation rounds once, in the order of
//! the graph. No back end may contract, reassociate or fold what is not a literal: that is why C, Rust and the executor
//! agree to the last bit.
//!
//! A **sweep** visits every node once. It first evaluates its `rates` everywhere; then, at the nodes of each face term's
//! face (and patch), in the order of the list, it adds to or replaces a rate; then it evaluates its `writes`, where
//! `Operation::Rate(k)` is the rate so obtained. A buffer that a sweep writes is never the source of an applied operator in
//! the same sweep; it may be loaded at the same node (before it is written: all values of a node are computed before the
//! first write of that node).
//!
//! An **applied operator** is a sum over the nodes of one grid line in units of the spacing. Its order of operations is fixed:
//! - interior rows of odd parity: t = w₁·(f₊₁ − f₋₁), then t = t + w_k·(f₊ₖ − f₋ₖ) for k = 2, …
//! - interior rows of even parity: t = w₀·f₀, then t = t + w_k·(f₊ₖ + f₋ₖ) for k = 1, …
//! - interior rows without parity, and closure rows: t = w_first·f_first, then t = t + w_j·f_j for increasing j (zero weights are left out of interiors, not of closure rows)
//! - with a varying coefficient, interior: t = 0 for s = 1, … p: c₊ = Σ weight·b_{i+offset} (in the order of the form, first term plain), c₋ the
//!   same form shifted to i−s; t = c₊·(f₊ₛ − f₀) first (s = 1, no addition to zero), then t = t + c₋·(f₋ₛ − f₀), then on with s = 2, …
//! - with a varying coefficient, closure rows: for increasing column l: c = Σ weight·b_m in the order of the list, t = c·f_l first, then t = t + c·f_l.
//!
//! The right end is the mirrored left end: row N−i uses the weights of row i on nodes N−j *in the order of increasing j of the
//! left row*, times −1 for odd derivatives (the weights are negated, then used in the same order). Periodic axes have no closure rows; indices wrap.
//!
//! A **stage** is a list of passes at one time. A **step** is the list of stages, then the swaps of `rotation`.

pub mod build;
pub mod interpret;
pub mod lower;
pub mod operator;
pub mod plan;
pub mod validate;

pub use build::Builder;
pub use operator::{ClosureRow, ConstantOperator, LineOperator, Parity, VaryingEntry, VaryingOperator};
pub use validate::{KernelFault, ValidKernel, validate};

use crate::exact::Rational;
pub use crate::model::{Function, Relation};

macro_rules! index {
    ($($(#[$doc:meta])* $name:ident;)*) => {$(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
        pub struct $name(pub usize);
    )*};
}

index! {
    /// Index into `Kernel::values`.
    ValueId;
    /// Index into `Kernel::buffers`.
    BufferId;
    /// Index into `Kernel::tables`.
    TableId;
    /// Index into `Kernel::operators`.
    OperatorId;
    /// Index into `Kernel::parameters`.
    ParameterId;
}

/// A complete, still exact program.
#[derive(Clone, Debug)]
pub struct Kernel {
    /// The model's name and title as written; back ends derive legal identifiers.
    pub name: String,
    pub title: String,
    /// Lines that say what is solved, for comments; may hold any characters, back ends make them harmless.
    pub notes: Vec<String>,
    pub axes: Vec<Axis>,
    pub parameters: Vec<Parameter>,
    pub values: Vec<Value>,
    pub operators: Vec<NamedOperator>,
    pub buffers: Vec<Buffer>,
    pub tables: Vec<Table>,
    pub fields: Vec<Field>,
    /// Passes that set the state at the start.
    pub start: Vec<Stage>,
    /// One step from t to t + dt.
    pub step: Vec<Stage>,
    /// Buffers exchanged after each step, in order.
    pub rotation: Vec<(BufferId, BufferId)>,
    /// What a checkpoint must hold to go on to the last bit.
    pub state: Vec<BufferId>,
    /// For two-level methods in time: how the level before the start is made (run after `start`, with the first step's dt).
    pub first_step: Vec<Stage>,
    pub limit: Limit,
    pub time: TimePlan,
    pub outputs: Vec<Output>,
    /// Nodes used to interpolate a gauge along each axis.
    pub interpolation_nodes: usize,
    /// Quadrature weights at the low end of each axis (mirrored at the high end), one inside; empty when periodic.
    pub quadrature: Vec<Vec<Rational>>,
}

/// A grid axis. `low` and `high` are fixed values; a periodic axis of N nodes has spacing (high − low)/N, others /(N − 1).
#[derive(Clone, Debug)]
pub struct Axis {
    pub name: String,
    pub unit: String,
    pub low: ValueId,
    pub high: ValueId,
    pub nodes: usize,
    pub least_nodes: usize,
    pub periodic: bool,
}

/// A constant that may be set when the program runs. Its value is in SI; `scale` turns a number in `unit` into SI.
#[derive(Clone, Debug)]
pub struct Parameter {
    pub name: String,
    pub description: Option<String>,
    pub unit: String,
    pub scale: ValueId,
    /// Default, in SI; fixed, and free of later parameters.
    pub default: ValueId,
    /// Inclusive bounds in SI.
    pub bounds: Option<(ValueId, ValueId)>,
}

/// How far a value reaches.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Extent {
    /// One number for the run.
    Fixed,
    /// One number for a stage.
    Uniform,
    /// One number for each node of the axes in the set (bit a is axis a); independent of time and state.
    Table(u8),
    /// One number for each node, in a sweep.
    Varying,
}

/// A node of the graph.
#[derive(Clone, Debug)]
pub struct Value {
    pub operation: Operation,
    pub extent: Extent,
    /// A name from the model for readers (a coefficient, a derivative); not unique, any characters.
    pub hint: Option<String>,
}

/// What a value is.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub enum Operation {
    Literal(Rational),
    Pi,
    Parameter(ParameterId),
    /// Time of the stage.
    Time,
    /// dt; in outputs, the dt of the last step taken.
    Step,
    /// 1/spacing of an axis.
    InverseSpacing(usize),
    /// low + index·spacing; only in definitions of tables.
    Coordinate(usize),
    /// Hash of seed and node index; only in definitions of tables. See `noise` of the executor for the exact recipe.
    Noise(u64),
    /// The buffer at this node.
    Load(BufferId),
    /// The table at this node.
    Table(TableId),
    /// An operator applied along an axis, in units of the spacing.
    Apply {
        operator: OperatorId,
        axis: usize,
        source: Source,
        coefficient: Option<Source>,
    },
    /// The rate k of the sweep, after its face terms; only in writes.
    Rate(usize),
    Negate(ValueId),
    Add(ValueId, ValueId),
    Subtract(ValueId, ValueId),
    Multiply(ValueId, ValueId),
    Divide(ValueId, ValueId),
    /// x^y by the mathematical library.
    Power(ValueId, ValueId),
    /// One-argument functions; `Minimum` and `Maximum` never occur here.
    Call(Function, ValueId),
    /// a < b ? a : b
    Minimum(ValueId, ValueId),
    /// a > b ? a : b
    Maximum(ValueId, ValueId),
    /// left RELATION right ? then : otherwise
    Select {
        left: ValueId,
        relation: Relation,
        right: ValueId,
        then: ValueId,
        otherwise: ValueId,
    },
}

/// An array that an operator reads along a line. A table always holds the operator's axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Source {
    Buffer(BufferId),
    Table(TableId),
}

/// An operator and its name for readers, like `first_x_order_6`.
#[derive(Clone, Debug)]
pub struct NamedOperator {
    pub name: String,
    pub operator: LineOperator,
}

/// A full-grid array.
#[derive(Clone, Debug)]
pub struct Buffer {
    /// For readers; any characters.
    pub name: String,
}

/// A fixed array over the axes of its set.
#[derive(Clone, Debug)]
pub struct Table {
    pub name: String,
    /// Bit a is axis a; never zero.
    pub axes: u8,
    pub value: ValueId,
}

/// An unknown and where its present value stands (before `rotation` is applied: buffers keep their identity because the
/// rotation swaps contents).
#[derive(Clone, Debug)]
pub struct Field {
    pub name: String,
    pub unit: String,
    /// SI value of one `unit`.
    pub scale: ValueId,
    pub buffer: BufferId,
    /// Inclusive bounds, in SI; leaving them by more than their width is a blow-up.
    pub bounds: Option<(ValueId, ValueId)>,
}

/// Passes at one time: t, t + fraction·dt, or exactly the next time for fraction 1.
#[derive(Clone, Debug)]
pub struct Stage {
    pub fraction: Rational,
    pub passes: Vec<Pass>,
}

/// One traversal.
#[derive(Clone, Debug)]
pub enum Pass {
    Sweep(Sweep),
    /// Sets buffers at the nodes of a face.
    Face(FaceWrite),
}

/// See the essay above.
#[derive(Clone, Debug, Default)]
pub struct Sweep {
    /// For readers.
    pub label: String,
    pub rates: Vec<ValueId>,
    pub face_terms: Vec<FaceTerm>,
    pub writes: Vec<Write>,
}

/// buffer ← value.
#[derive(Clone, Debug)]
pub struct Write {
    pub buffer: BufferId,
    pub value: ValueId,
}

/// Which nodes of a face: all, or those where every comparison holds.
#[derive(Clone, Debug)]
pub struct FaceSet {
    pub axis: usize,
    pub high: bool,
    pub patch: Vec<(ValueId, Relation, ValueId)>,
}

/// A change of a rate at a face. The value holds no applied operator.
#[derive(Clone, Debug)]
pub struct FaceTerm {
    pub on: FaceSet,
    pub rate: usize,
    pub action: Action,
    pub value: ValueId,
}

/// What a face term does.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Action {
    Add,
    Replace,
}

/// Sets buffers at a face. The values hold no applied operator.
#[derive(Clone, Debug)]
pub struct FaceWrite {
    pub on: FaceSet,
    pub writes: Vec<Write>,
}

/// The stability limit: 1 / (largest value of `rate` over all nodes).
#[derive(Clone, Debug)]
pub struct Limit {
    pub rate: ValueId,
    /// Whether it changes with the state (or time) and must be found anew before each step.
    pub state_dependent: bool,
    /// How it was found, for readers.
    pub law: String,
}

/// Fixed values, in seconds.
#[derive(Clone, Debug)]
pub struct TimePlan {
    pub start: ValueId,
    pub end: ValueId,
    pub step: Step,
    pub method: String,
    /// One step length for the whole run (two-level methods); otherwise each interval between outputs is divided evenly.
    pub constant_step: bool,
}

/// How the step is chosen.
#[derive(Clone, Debug)]
pub enum Step {
    Duration(ValueId),
    OfLimit(Rational),
}

/// Something to write.
#[derive(Clone, Debug)]
pub struct Output {
    pub name: String,
    pub unit: String,
    /// SI value of one `unit`: results are divided by it before they are written.
    pub scale: ValueId,
    pub kind: OutputKind,
    /// Fill `buffer` before it is read, in order; empty when the buffer is a field's.
    pub sweeps: Vec<Sweep>,
    pub buffer: BufferId,
    /// Seconds between outputs, fixed; `None`: snapshots at start and end, gauges and integrals after each step.
    pub every: Option<ValueId>,
}

/// What is made of the buffer.
#[derive(Clone, Debug)]
pub enum OutputKind {
    Snapshot,
    /// A coordinate for each axis, fixed.
    Gauge(Vec<ValueId>),
    Integral,
    /// `sweeps` keep the largest value so far in `buffer`; `begin` set it at the start.
    Maximum {
        begin: Vec<Sweep>,
    },
}

impl Kernel {
    /// The values that these are made of, themselves included, in graph order.
    pub fn needed(&self, roots: impl IntoIterator<Item = ValueId>) -> Vec<ValueId> {
        let mut marked = vec![false; self.values.len()];
        for root in roots {
            marked[root.0] = true;
        }
        for index in (0..marked.len()).rev() {
            if marked[index] {
                for operand in self.values[index].operation.operands() {
                    marked[operand.0] = true;
                }
            }
        }
        (0..marked.len()).filter(|index| marked[*index]).map(ValueId).collect()
    }
}
