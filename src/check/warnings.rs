//! Placeholder.
use crate::diagnostic::Diagnostics;
use crate::model::Model;
pub fn warn(_model: &Model, _diagnostics: &mut Diagnostics) {}
