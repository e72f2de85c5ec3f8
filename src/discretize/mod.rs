//! From what is wanted to weights: derivations. Every result passes through the checking constructor of a
//! fact in [`crate::scheme`], so nothing wrong leaves this module unnoticed.

pub mod interior;

pub use interior::{LargestRequest, WeightsFault};
