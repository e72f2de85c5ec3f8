//! The one place that knows the order of the stages.

pub mod closed;
mod compile;
pub mod emission;
pub mod weights;

pub use compile::{Checked, Compiled, Overrides, build, check, compile, hash, read};
