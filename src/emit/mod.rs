//! Program text.

pub mod weights;
