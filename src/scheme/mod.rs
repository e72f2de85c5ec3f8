//! Facts of a discretization: types whose constructors check, exactly, that what they say is true.
//!
//! Nothing here searches for weights; that is [`crate::discretize`]'s task. All weights are for unit spacing.

pub mod biased;
pub mod certificate;
pub mod dissipation;
pub mod norm;
pub mod operator;
pub mod second_derivative;
pub mod spatial;
pub mod squares;
pub mod staggered;
pub mod stencil;
pub mod step_rule;
pub mod summation_by_parts;

pub use biased::{BiasedFault, BiasedPair, Direction};
pub use certificate::{Certificate, Line};
pub use dissipation::{ConstantRows, Dissipation, DissipationFault};
pub use norm::{Norm, NormFault};
pub use operator::{ClosedRow, DifferenceOperator, EndRows, Extension, OperatorFault, Parity};
pub use second_derivative::{FormFault, FormRow, LinearForm, SecondDerivativeForm};
pub use spatial::{
    Application, Correction, Injection, LimitLaw, OperatorRule, Scheme, SchemeAxis, SchemeOperator,
};
pub use squares::{RepeatedSquare, SquareTerm, SquaresFault, SumOfSquares};
pub use staggered::{RowPlace, StaggeredClosure, StaggeredFault, StaggeredPair};
pub use stencil::{LeadingError, Stencil, StencilFault};
pub use summation_by_parts::{SummationByParts, SummationFault};
