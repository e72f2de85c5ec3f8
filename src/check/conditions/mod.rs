//! Placeholder.
use super::raw::RawCondition;
use crate::diagnostic::Diagnostics;
use crate::model::{Condition, Model};
pub fn classify(_model: &Model, _raw: Vec<RawCondition>, _diagnostics: &mut Diagnostics) -> Vec<Condition> {
    Vec::new()
}
