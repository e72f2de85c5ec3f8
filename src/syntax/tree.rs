//! The tree of a model file: what was written, with spans, before any name or unit is resolved.
//!
//! Names are in canonical spelling (`u₀` and `u_0` are both `u_0`; control words are symbols). Sums and
//! products are n-ary. Depth is bounded by the parser, so recursive passes, `Drop` and `Clone` cannot
//! overflow. Nothing here says whether a name exists or a unit fits: that is `check`'s business.

use crate::exact::Rational;
use crate::source::Span;

/// A name as declared or used, in canonical spelling.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Name {
    pub text: String,
    pub span: Span,
}

/// A quoted text, without its quotes; the span has them.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Text {
    pub text: String,
    pub span: Span,
}

/// A whole number written in a statement (`145 nodes`, `order 4`).
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Whole {
    pub value: u64,
    pub span: Span,
}

/// A model file. Statements that could not be read are in `faulty`; everything else is as if they were not there.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct ModelFile {
    /// `model NAME "TITLE"`; nothing if the line is missing or faulty.
    pub header: Option<Header>,
    /// The sections that were opened, in the order of the file, each kind at most once.
    pub sections: Vec<SectionMark>,
    pub axes: Vec<Axis>,
    pub constants: Vec<Constant>,
    pub coefficients: Vec<Coefficient>,
    pub fields: Vec<Field>,
    pub operators: Vec<Operator>,
    pub equations: Vec<Equation>,
    pub conditions: Vec<Condition>,
    pub accuracy: Vec<AccuracyLine>,
    pub time: Vec<TimeLine>,
    pub outputs: Vec<OutputLine>,
    pub verification: Vec<VerificationLine>,
    pub faulty: Vec<Faulty>,
}

/// The first line.
#[derive(Clone, Debug, PartialEq)]
pub struct Header {
    pub name: Name,
    pub title: Option<Text>,
    pub span: Span,
}

/// The sections of a model file.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Section {
    Axes,
    Constants,
    Coefficients,
    Fields,
    Operators,
    Equations,
    Conditions,
    Accuracy,
    Time,
    Output,
    Verification,
}

impl Section {
    /// All, with their words.
    pub const ALL: [(Section, &'static str); 11] = [
        (Section::Axes, "axes"),
        (Section::Constants, "constants"),
        (Section::Coefficients, "coefficients"),
        (Section::Fields, "fields"),
        (Section::Operators, "operators"),
        (Section::Equations, "equations"),
        (Section::Conditions, "conditions"),
        (Section::Accuracy, "accuracy"),
        (Section::Time, "time"),
        (Section::Output, "output"),
        (Section::Verification, "verification"),
    ];

    /// The word that opens the section.
    pub fn word(self) -> &'static str {
        Self::ALL[self as usize].1
    }

    /// The section that a word opens.
    pub fn from_word(word: &str) -> Option<Section> {
        Self::ALL.iter().find(|(_, known)| *known == word).map(|(section, _)| *section)
    }
}

/// Where a section was opened.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct SectionMark {
    pub section: Section,
    /// The section word.
    pub span: Span,
}

/// A statement that could not be read. Its fault has been reported.
#[derive(Clone, Debug, PartialEq)]
pub struct Faulty {
    /// The section it stands in; nothing before the first and in an unknown one.
    pub section: Option<Section>,
    /// The name that it would have declared, where that can be told: uses of it are no second fault.
    pub declares: Option<Name>,
    pub span: Span,
}

/// `x: 0 m to 0.36 m, 145 nodes, periodic`.
#[derive(Clone, Debug, PartialEq)]
pub struct Axis {
    pub name: Name,
    pub extent: Extent,
    /// What follows the extent, in the order written; duplicates are not yet refused.
    pub properties: Vec<AxisProperty>,
    pub span: Span,
}

/// Where the nodes of an axis lie.
#[derive(Clone, Debug, PartialEq)]
#[expect(clippy::large_enum_variant, reason = "a file has three axes at most, and nearly all are intervals")]
pub enum Extent {
    /// `A to B, N nodes` or `N cells`.
    Interval { low: Expression, high: Expression, count: Count },
    /// `nodes at A, B, C, …`.
    Listed(Vec<Expression>),
}

/// How many nodes or cells.
#[derive(Clone, Debug, PartialEq)]
pub struct Count {
    pub number: Whole,
    pub of: Counted,
}

/// What is counted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Counted {
    Nodes,
    Cells,
}

/// A property of an axis.
#[derive(Clone, Debug, PartialEq)]
pub struct AxisProperty {
    pub kind: AxisPropertyKind,
    pub span: Span,
}

/// The properties an axis can have.
#[derive(Clone, Debug, PartialEq)]
pub enum AxisPropertyKind {
    Periodic,
    /// `graded by EXPR`, a map of the unit interval in `s`.
    Graded(Expression),
    Radial,
    Spherical,
}

/// `k = 0.72 W/(m·K), free between A and B "description"`.
#[derive(Clone, Debug, PartialEq)]
pub struct Constant {
    pub name: Name,
    pub value: Expression,
    /// `, free`: where it is written.
    pub free: Option<Span>,
    pub bounds: Option<Bounds>,
    pub description: Option<Text>,
    pub span: Span,
}

/// `between A and B`.
#[derive(Clone, Debug, PartialEq)]
pub struct Bounds {
    pub low: Expression,
    pub high: Expression,
    pub span: Span,
}

/// `k(x, y) in W/(m·K) = EXPR`, or from data.
#[derive(Clone, Debug, PartialEq)]
pub struct Coefficient {
    pub name: Name,
    /// What it depends on: axes, `t`, fields.
    pub arguments: Vec<Name>,
    pub unit: Option<Unit>,
    /// `on x, y` of the data form.
    pub on: Vec<Name>,
    pub value: CoefficientValue,
    pub description: Option<Text>,
    pub span: Span,
}

/// Where a coefficient's values come from.
#[derive(Clone, Debug, PartialEq)]
pub enum CoefficientValue {
    Formula(Expression),
    /// `from "file"`, with `covering x: A to B, …` and `interpolated linear`.
    Data {
        file: Text,
        covering: Vec<Covering>,
        interpolated: Option<Name>,
    },
}

/// `x: A to B` of a data file's grid.
#[derive(Clone, Debug, PartialEq)]
pub struct Covering {
    pub axis: Name,
    pub low: Expression,
    pub high: Expression,
    pub span: Span,
}

/// `T in K on x, y, staggered in x, between A and B`.
#[derive(Clone, Debug, PartialEq)]
pub struct Field {
    pub name: Name,
    pub unit: Option<Unit>,
    pub axes: Vec<Name>,
    /// `staggered in x`: the axes along which it lives between the nodes.
    pub staggered: Vec<Name>,
    pub bounds: Option<Bounds>,
    pub description: Option<Text>,
    pub span: Span,
}

/// `spread(f) = ∂/∂x(k * ∂f/∂x) with order 6, one-sided closures`.
#[derive(Clone, Debug, PartialEq)]
pub struct Operator {
    pub name: Name,
    pub parameters: Vec<Name>,
    pub value: Expression,
    /// After `with`, separated by commas.
    pub accuracy: Vec<AccuracyLine>,
    pub span: Span,
}

/// `left = right` at every node.
#[derive(Clone, Debug, PartialEq)]
pub struct Equation {
    pub left: Expression,
    pub right: Expression,
    pub span: Span,
}

/// `at PLACE: left = right`. Several on one line are several conditions.
#[derive(Clone, Debug, PartialEq)]
pub struct Condition {
    pub place: Place,
    pub left: Expression,
    pub right: Expression,
    pub span: Span,
}

/// Where a condition holds.
#[derive(Clone, Debug, PartialEq)]
pub struct Place {
    pub kind: PlaceKind,
    /// What stands between `at` and `:`.
    pub span: Span,
}

/// The kinds of place.
#[derive(Clone, Debug, PartialEq)]
pub enum PlaceKind {
    /// `every edge`: all faces of all axes that are not periodic.
    EveryEdge,
    /// `t = start`.
    Start,
    /// `x = low`, with comparisons after `and` for a patch of the face.
    Face { axis: Name, end: End, patch: Vec<Comparison> },
}

/// Which end of an axis.
#[derive(Clone, Debug, PartialEq)]
pub enum End {
    Low(Span),
    High(Span),
    /// A coordinate; it must equal one of the bounds.
    At(Expression),
}

/// One clause of the accuracy section, or of an operator's `with`.
#[derive(Clone, Debug, PartialEq)]
pub struct AccuracyLine {
    pub kind: AccuracyKind,
    pub span: Span,
}

/// What an accuracy clause says.
#[derive(Clone, Debug, PartialEq)]
pub enum AccuracyKind {
    /// `order N [in x, y]` (of the solution) or `interior order N [in x, y]`.
    Order { order: Whole, of: OrderOf, axes: Vec<Name> },
    /// `closures energy-stable`, `one-sided closures`, …
    Closures(ClosureFamily),
    /// `dissipation order 6, strength 0.1`.
    Dissipation { order: Whole, strength: Option<Expression> },
}

/// What an order is the order of.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum OrderOf {
    Solution,
    Interior,
}

/// Families of boundary closures.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum ClosureFamily {
    EnergyStable,
    OneSided,
    Mirrored,
}

/// A line of the time section.
#[derive(Clone, Debug, PartialEq)]
pub struct TimeLine {
    pub kind: TimeKind,
    pub span: Span,
}

/// What a line of the time section says.
#[derive(Clone, Debug, PartialEq)]
pub enum TimeKind {
    /// `A to B`.
    Interval { start: Expression, end: Expression },
    /// `method rk4`.
    Method(Name),
    /// `step DURATION`.
    Step(Expression),
    /// `step F of limit`.
    StepOfLimit(Expression),
}

/// A line of the output section.
#[derive(Clone, Debug, PartialEq)]
pub struct OutputLine {
    pub kind: OutputKind,
    /// `every DURATION`.
    pub every: Option<Expression>,
    pub description: Option<Text>,
    pub span: Span,
}

/// What is written.
#[derive(Clone, Debug, PartialEq)]
pub enum OutputKind {
    /// `T every 30 min`.
    Field(Name),
    /// `NAME = EXPR every …`.
    Derived { name: Name, value: Expression },
    /// `gauge NAME: EXPR at x = A, y = B`.
    Gauge { name: Name, value: Expression, place: Vec<Coordinate> },
    /// `gauges NAME: EXPR at x = A to B by C, y = D`.
    Gauges { name: Name, value: Expression, place: Vec<GaugeRange> },
    /// `integral NAME: EXPR over x, y`.
    Integral { name: Name, value: Expression, over: Vec<Name> },
    /// `maximum NAME: EXPR over time`.
    Maximum { name: Name, value: Expression },
}

/// `x = A`.
#[derive(Clone, Debug, PartialEq)]
pub struct Coordinate {
    pub axis: Name,
    pub value: Expression,
}

/// `x = A to B by C`, or a single value.
#[derive(Clone, Debug, PartialEq)]
pub struct GaugeRange {
    pub axis: Name,
    pub first: Expression,
    /// The last value and the distance.
    pub to: Option<(Expression, Expression)>,
}

/// A line of the verification section.
#[derive(Clone, Debug, PartialEq)]
pub struct VerificationLine {
    pub kind: VerificationKind,
    pub span: Span,
}

/// What a line of the verification section says.
#[derive(Clone, Debug, PartialEq)]
pub enum VerificationKind {
    /// `exact T = EXPR`.
    Exact { field: Name, value: Expression },
    /// `manufactured T = EXPR`.
    Manufactured { field: Name, value: Expression },
    /// `grids 17, 33, 65`.
    Grids(Vec<Whole>),
}

/// A unit as spelled: factors with signed exponents, in the order written. Symbols are not resolved
/// (`ms` is one symbol); that is `check`'s business. No factors: the unit `1`.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Unit {
    pub factors: Vec<UnitFactor>,
    /// As written, with control words and look-alikes folded: `W/(m·K)`.
    pub spelling: String,
    pub span: Span,
}

/// A unit symbol and its exponent (negative below the line).
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct UnitFactor {
    pub symbol: String,
    pub exponent: Rational,
    /// The symbol alone.
    pub span: Span,
}

/// A formula. The span has the brackets around it, if any.
#[derive(Clone, Debug, PartialEq)]
pub struct Expression {
    pub kind: ExpressionKind,
    pub span: Span,
}

/// The kinds of formula.
#[derive(Clone, Debug, PartialEq)]
pub enum ExpressionKind {
    /// A literal without a unit. The literal 0 takes any dimension.
    Number(Rational),
    /// `0.72 W/(m·K)`; the value is in the unit as written.
    Quantity {
        value: Rational,
        unit: Unit,
    },
    Pi,
    /// Any other name, `t` included, in canonical spelling.
    Name(String),
    /// At least two terms. A bracketed sum within a sum stays a term of its own.
    Sum(Vec<Term>),
    /// At least two factors, from left to right; the first is never divided by.
    Product(Vec<Factor>),
    Negate(Box<Expression>),
    Power {
        base: Box<Expression>,
        exponent: Box<Expression>,
    },
    /// A function of the closed list, with at least one argument.
    Call {
        function: Function,
        arguments: Vec<Expression>,
    },
    /// A name before a bracket that is no function: a named operator, or a fault for `check` to tell.
    Apply {
        operator: Name,
        arguments: Vec<Expression>,
    },
    Cases {
        branches: Vec<Branch>,
        otherwise: Box<Expression>,
    },
    /// `noise(seed N)`.
    Noise(Whole),
    /// `δ(EXPR)`.
    PointSource(Box<Expression>),
    Derivative(Derivative),
    /// `Δ f`, `∇² f`.
    Laplacian(Box<Expression>),
    /// `∇ f`.
    Gradient(Box<Expression>),
    /// `∇·(…)`.
    Divergence(Box<Expression>),
    /// `∇f·∇g`: the scalar product of two formulas that hold a gradient each.
    Dot(Box<Expression>, Box<Expression>),
}

/// A term of a sum.
#[derive(Clone, Debug, PartialEq)]
pub struct Term {
    pub sign: Sign,
    pub value: Expression,
}

/// Whether a term is added or taken away.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sign {
    Plus,
    Minus,
}

/// A factor of a product.
#[derive(Clone, Debug, PartialEq)]
pub struct Factor {
    pub operation: Operation,
    pub value: Expression,
}

/// Whether a factor multiplies or divides what is left of it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Operation {
    Times,
    Over,
}

/// `condition: value` of `cases`.
#[derive(Clone, Debug, PartialEq)]
pub struct Branch {
    pub condition: Comparison,
    pub value: Expression,
}

/// `left < right`.
#[derive(Clone, Debug, PartialEq)]
pub struct Comparison {
    pub left: Expression,
    pub relation: Relation,
    pub right: Expression,
    pub span: Span,
}

/// How two values are compared.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Relation {
    Less,
    LessOrEqual,
    Greater,
    GreaterOrEqual,
}

/// `∂²u/∂x∂y` and its other forms. The powers sum to `order`, which is 1 to 4 (the parser has checked both).
#[derive(Clone, Debug, PartialEq)]
pub struct Derivative {
    pub of: Box<Expression>,
    pub order: u32,
    /// Variables below the line in the order written: axes, `t`, or `n` for the outward normal.
    pub by: Vec<Variable>,
}

/// `∂x²` below the line.
#[derive(Clone, Debug, PartialEq)]
pub struct Variable {
    pub name: Name,
    pub power: u32,
}

/// Functions of the closed list.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Function {
    Sin,
    Cos,
    Tan,
    Exp,
    Log,
    Sqrt,
    Abs,
    Min,
    Max,
    Tanh,
    Sinh,
    Cosh,
    Erf,
    Erfc,
    Sign,
}

impl Function {
    /// All, with their names.
    pub const ALL: [(Function, &'static str); 15] = [
        (Function::Sin, "sin"),
        (Function::Cos, "cos"),
        (Function::Tan, "tan"),
        (Function::Exp, "exp"),
        (Function::Log, "log"),
        (Function::Sqrt, "sqrt"),
        (Function::Abs, "abs"),
        (Function::Min, "min"),
        (Function::Max, "max"),
        (Function::Tanh, "tanh"),
        (Function::Sinh, "sinh"),
        (Function::Cosh, "cosh"),
        (Function::Erf, "erf"),
        (Function::Erfc, "erfc"),
        (Function::Sign, "sign"),
    ];

    /// The name in model files.
    pub fn name(self) -> &'static str {
        Self::ALL[self as usize].1
    }

    /// The function of a name.
    pub fn from_name(name: &str) -> Option<Function> {
        Self::ALL.iter().find(|(_, known)| *known == name).map(|(function, _)| *function)
    }
}

impl ModelFile {
    /// Where a section was opened.
    pub fn section(&self, section: Section) -> Option<Span> {
        self.sections.iter().find(|mark| mark.section == section).map(|mark| mark.span)
    }
}
