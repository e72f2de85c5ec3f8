//! Conditions at faces: how many each face needs, and what becomes of each one.
mod need;
mod reading;
use crate::model::{Comparison, Expression, Face};
use crate::source::Span;
/// A condition at a face as written.
#[derive(Clone, Debug)]
pub struct RawCondition {
    pub face: Face,
    pub patch: Vec<Comparison>,
    pub left: Expression,
    pub right: Expression,
    pub text: String,
    pub span: Span,
}
