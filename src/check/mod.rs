//! From syntax to model.

pub mod conditions;
