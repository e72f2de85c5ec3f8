//! The checked model: what is solved, on which grid, under which conditions, how accurately, and for how long.
//!
//! A `Model` is what `check` promises to everything after it: every name is resolved, every unit agrees, every equation
//! is explicit in its highest time derivative, every face has the conditions it needs. All quantities are in SI base units.
//! What is not here: source text and spans (except for messages), weights, floating-point numbers.

pub mod calculus;
pub mod characteristics;
pub mod dimension;
pub mod expression;
pub mod formula;
pub mod numeric;
pub mod sign;

pub use dimension::Dimension;
pub use expression::{Comparison, Derivative, Expression, Function, Relation};

use crate::exact::Rational;
use crate::source::Span;

/// Index of an axis, in the order of the model file. The first axis is the slowest in memory.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct AxisId(pub usize);
/// Index of a *free* constant; the others are folded by `check`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct ConstantId(pub usize);
/// Index of a coefficient.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct CoefficientId(pub usize);
/// Index of a field.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct FieldId(pub usize);

/// A model that has passed every check.
#[derive(Clone, Debug)]
pub struct Model {
    /// Prefix of what is emitted; an identifier of ASCII letters, digits and `_` is derived by `emit`, never assumed here.
    pub name: String,
    pub title: String,
    pub axes: Vec<Axis>,
    /// Free constants; `Expression::Constant` indexes this list.
    pub free_constants: Vec<FreeConstant>,
    /// Constants folded at compile time, for reports and messages.
    pub folded_constants: Vec<FoldedConstant>,
    pub coefficients: Vec<Coefficient>,
    pub fields: Vec<Field>,
    /// One for each field, in the order of `fields`.
    pub equations: Vec<Equation>,
    pub conditions: Vec<Condition>,
    pub initial: Vec<InitialCondition>,
    pub accuracy: Accuracy,
    pub time: TimePlan,
    pub outputs: Vec<Output>,
    pub verification: Option<Verification>,
}

/// A uniform axis. Bounds are uniform expressions (constants, π, free constants), in SI base units.
#[derive(Clone, Debug)]
pub struct Axis {
    pub name: String,
    pub dimension: Dimension,
    pub low: Expression,
    pub high: Expression,
    /// Number of nodes: N cells mean N+1 nodes, N when periodic.
    pub nodes: usize,
    pub periodic: bool,
    pub span: Span,
}

/// A constant that may be set when the emitted program runs.
#[derive(Clone, Debug)]
pub struct FreeConstant {
    pub name: String,
    pub description: Option<String>,
    pub dimension: Dimension,
    /// Default value; uniform, without free constants that come later in the list.
    pub value: Expression,
    /// `between A and B`: refused at run time outside of it.
    pub bounds: Option<(Expression, Expression)>,
    /// Unit as written in the model, for messages; values at run time are given in it. `scale` turns it into SI.
    pub unit: String,
    pub scale: Expression,
}

/// A constant whose value is known.
#[derive(Clone, Debug)]
pub struct FoldedConstant {
    pub name: String,
    pub description: Option<String>,
    pub dimension: Dimension,
    pub value: Expression,
}

/// A named function of position, time or fields; `Expression::Coefficient` indexes the list.
#[derive(Clone, Debug)]
pub struct Coefficient {
    pub name: String,
    pub dimension: Dimension,
    pub value: Expression,
}

/// An unknown. It lives at all nodes of all axes.
#[derive(Clone, Debug)]
pub struct Field {
    pub name: String,
    pub dimension: Dimension,
    /// Unit as written, for labels, and the factor from it to SI base units.
    pub unit: String,
    pub scale: Expression,
    /// `between A and B`, in SI base units: used for step limits, signs and blow-up.
    pub bounds: Option<(Expression, Expression)>,
    pub span: Span,
}

/// Order of the highest time derivative.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum TimeOrder {
    First,
    Second,
}

/// ∂f/∂t = right, or ∂²f/∂t² = right.
#[derive(Clone, Debug)]
pub struct Equation {
    pub field: FieldId,
    pub order: TimeOrder,
    /// Contains `Derivative` nodes with the structure as written (conservation form is kept), never `Constant`s that were folded.
    pub right: Expression,
    pub span: Span,
}

/// Which end of an axis.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Side {
    Low,
    High,
}

/// A face of the grid.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub struct Face {
    pub axis: AxisId,
    pub side: Side,
}

/// A condition at a face, or at a patch of one, as `check` classified it.
#[derive(Clone, Debug)]
pub struct Condition {
    pub face: Face,
    /// Holds only where every comparison (of tangential coordinates) is true; empty: the whole face.
    pub patch: Vec<Comparison>,
    pub treatment: Treatment,
    /// The condition as written, for reports.
    pub text: String,
    pub span: Span,
}

/// What becomes of a condition.
#[derive(Clone, Debug)]
pub enum Treatment {
    /// The face nodes are set: `field = value`. `rate` and `second_rate` are ∂value/∂t and ∂²value/∂t², `None` where the
    /// value cannot be differentiated (the stage value is then set directly, at a cost in order that is reported).
    Value { field: FieldId, value: Expression, rate: Option<Expression>, second_rate: Option<Expression> },
    /// ∂field/∂n (outward) is the expression; it replaces the boundary flux of every second derivative of `field` normal to the face.
    /// It may contain fields, their `Rate`s (second order in time), time and tangential coordinates.
    Flux { field: FieldId, normal_derivative: Expression },
    /// Relations that hold between the hyperbolic fields at the face, each `Σ coefficient·field = data`;
    /// the flux is replaced by that of the upwind state. There are as many as characteristics enter.
    Upwind { relations: Vec<FaceRelation> },
    /// Value of a scalar with a nonlinear flux at an inflow: the flux of the given value replaces that of the inside.
    InflowValue { field: FieldId, value: Expression },
}

/// Σ coefficients·field = data.
#[derive(Clone, Debug)]
pub struct FaceRelation {
    pub coefficients: Vec<(FieldId, Expression)>,
    pub data: Expression,
}

/// The state at the start: field (derivative 0) or its first time derivative (derivative 1).
#[derive(Clone, Debug)]
pub struct InitialCondition {
    pub field: FieldId,
    pub derivative: usize,
    pub value: Expression,
    pub span: Span,
}

/// What was asked for.
#[derive(Clone, Debug)]
pub struct Accuracy {
    pub span: Span,
    /// Along each axis.
    pub per_axis: Vec<AskedOrder>,
}

/// An order asked for, of the solution (boundaries included) or of interior stencils.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum AskedOrder {
    Solution(usize),
    Interior(usize),
}

/// Time methods, named by the literature.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Method {
    Euler,
    Ssprk3,
    Rk4,
    Lsrk4,
    Leapfrog,
}

impl Method {
    /// All, with the names they have in model files.
    pub const ALL: [(Method, &'static str); 5] = [
        (Method::Euler, "euler"),
        (Method::Ssprk3, "ssprk3"),
        (Method::Rk4, "rk4"),
        (Method::Lsrk4, "lsrk4"),
        (Method::Leapfrog, "leapfrog"),
    ];

    /// The name in model files.
    pub fn name(self) -> &'static str {
        Self::ALL.iter().find(|(method, _)| *method == self).map_or("", |(_, name)| name)
    }
}

/// How the step is chosen.
#[derive(Clone, Debug)]
pub enum Step {
    /// A duration in seconds (uniform expression).
    Duration(Expression),
    /// A fraction of the stability limit.
    OfLimit(Rational),
}

/// The interval, the method and the step. Times in seconds, uniform expressions.
#[derive(Clone, Debug)]
pub struct TimePlan {
    pub start: Expression,
    pub end: Expression,
    pub method: Method,
    pub step: Step,
    pub span: Span,
}

/// One line of the output section.
#[derive(Clone, Debug)]
pub struct Output {
    pub name: String,
    pub dimension: Dimension,
    /// Unit for headers (that of the field where the expression is one; SI otherwise) and the factor from it to SI.
    pub unit: String,
    pub scale: Expression,
    pub value: Expression,
    pub kind: OutputKind,
    /// Seconds between outputs; `None`: fields and derived outputs at start and end, gauges and integrals each step.
    pub every: Option<Expression>,
    pub span: Span,
}

/// What is made of the expression.
#[derive(Clone, Debug)]
pub enum OutputKind {
    /// A field of the model, or a derived one: a `.npy` file at each time.
    Snapshot,
    /// The value at a place, one coordinate (uniform expression) for each axis.
    Gauge { place: Vec<Expression> },
    /// Integral over all axes with the norm's weights.
    Integral,
    /// Largest value over time at each node, written at the end.
    Maximum,
}

/// Exact or manufactured solutions and the grids of a verification.
#[derive(Clone, Debug)]
pub struct Verification {
    pub solutions: Vec<(FieldId, Expression)>,
    pub manufactured: bool,
    pub grids: Vec<usize>,
}
