//! Conditions as they were read: both sides converted, not yet classified.

use crate::model::{Comparison, Expression, Face};
use crate::source::Span;

/// left = right on a face (and patch). `∂u/∂n` is `Normal`, `∂u/∂t` is `Rate` of any field.
#[derive(Clone, Debug)]
pub struct RawCondition {
    pub face: Face,
    pub patch: Vec<Comparison>,
    pub left: Expression,
    pub right: Expression,
    /// As written.
    pub text: String,
    pub span: Span,
}
