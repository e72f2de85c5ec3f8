//! The spatial scheme: a model whose derivatives have become applied operators, with what happens at the faces.
//!
//! Plain facts, made by `discretize::assemble`: which certified operator acts where, which expression each rate is, what
//! each face adds or sets, and the law of the step limit. Weights live in the operators.

use super::{DifferenceOperator, Norm, SecondDerivativeForm, SummationByParts};
use crate::exact::Rational;
use crate::model::{AxisId, Comparison, Expression, Face, FieldId};
use std::sync::Arc;

/// A discretized model.
#[derive(Clone, Debug)]
pub struct Scheme {
    pub axes: Vec<SchemeAxis>,
    /// Nodes along each axis that a value between nodes is interpolated from.
    pub interpolation_nodes: usize,
    pub operators: Vec<SchemeOperator>,
    pub applications: Vec<Application>,
    /// The explicit right side for each field, with `Applied` in the place of derivatives.
    pub rates: Vec<Expression>,
    /// The expression of each output, likewise.
    pub outputs: Vec<Expression>,
    /// In the order in which they act: additions first, then settings of values.
    pub corrections: Vec<Correction>,
    pub injections: Vec<Injection>,
    /// What was chosen and why, one sentence each, for people.
    pub choices: Vec<String>,
}

/// What one axis carries.
#[derive(Clone, Debug)]
pub struct SchemeAxis {
    /// Half of the interior order of every operator along the axis that the norm belongs to.
    pub half_order: usize,
    /// The norm; `None` on periodic axes (all weights one).
    pub norm: Option<&'static Norm>,
    /// The least number of nodes that every operator on the axis needs.
    pub least_nodes: usize,
    /// The order at which the solution converges in space along this axis.
    pub solution_order: usize,
}

/// An operator with a name for readers.
#[derive(Clone, Debug)]
pub struct SchemeOperator {
    pub name: String,
    pub rule: OperatorRule,
}

/// The kinds of certified line operators.
#[derive(Clone, Debug)]
pub enum OperatorRule {
    /// First derivative with energy-stable closures.
    First(&'static SummationByParts),
    /// −H⁻¹M(1): second derivative without its boundary flux.
    Second(Arc<DifferenceOperator>),
    /// −H⁻¹M(b).
    VaryingSecond(&'static SecondDerivativeForm),
    /// Centred weights on a periodic axis.
    Centred(Arc<DifferenceOperator>),
}

impl OperatorRule {
    /// The least number of nodes on a line.
    pub fn least_nodes(&self) -> usize {
        match self {
            OperatorRule::First(operator) => operator.minimum_nodes(),
            OperatorRule::VaryingSecond(form) => form.minimum_nodes(),
            OperatorRule::Second(operator) | OperatorRule::Centred(operator) => operator.minimum_nodes(),
        }
    }
}

/// An operator at work: `operator` along `axis` on the values of `of`, in units of the spacing
/// (the factor 1/spacingᵈ stands in the rates).
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Application {
    pub operator: usize,
    pub axis: AxisId,
    /// Pointwise, or with `Applied` of earlier applications.
    pub of: Expression,
    /// b of −H⁻¹M(b).
    pub coefficient: Option<Expression>,
}

/// An addition to the rate of a field at a face: pointwise, 1/spacing included.
#[derive(Clone, Debug)]
pub struct Correction {
    pub face: Face,
    pub patch: Vec<Comparison>,
    pub field: FieldId,
    pub value: Expression,
}

/// A value that is set at a face.
#[derive(Clone, Debug)]
pub struct Injection {
    pub face: Face,
    pub patch: Vec<Comparison>,
    pub field: FieldId,
    pub value: Expression,
    pub rate: Option<Expression>,
    pub second_rate: Option<Expression>,
}

/// The law of the step limit: the step may be at most 1 / (largest value of `rate` over the nodes).
#[derive(Clone, Debug)]
pub struct LimitLaw {
    /// Pointwise in coefficients and, for nonlinear models, fields; 1/time.
    pub rate: Expression,
    /// For readers: what binds, and with which numbers.
    pub text: String,
    /// The factor (at most one) by which the closed operators lowered the interior's limit.
    pub closed_factor: Rational,
}

impl SchemeAxis {
    /// Weight of the norm at the face, 1 where there is none.
    pub fn face_weight(&self) -> Rational {
        self.norm.as_ref().and_then(|norm| norm.left().first().cloned()).unwrap_or_else(|| Rational::from(1))
    }
}

impl Scheme {
    /// A scheme of nothing.
    pub fn empty() -> Scheme {
        Scheme {
            axes: Vec::new(),
            interpolation_nodes: 2,
            operators: Vec::new(),
            applications: Vec::new(),
            rates: Vec::new(),
            outputs: Vec::new(),
            corrections: Vec::new(),
            injections: Vec::new(),
            choices: Vec::new(),
        }
    }
}

impl LimitLaw {
    /// Takes only this share (0 < share ≤ 1) of the limit.
    pub fn lower(&mut self, share: Rational) {
        if let Some(inverse) = share.recip() {
            self.rate = Expression::Number(inverse).times(self.rate.clone());
            self.closed_factor = share;
        }
    }
}
