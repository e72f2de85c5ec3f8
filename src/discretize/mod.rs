//! From what is wanted to weights: derivations. Every result passes through the checking constructor of a
//! fact in [`crate::scheme`], so nothing wrong leaves this module unnoticed.

pub mod closure;
pub mod interior;
pub mod weights;

pub use closure::{ClosureFault, Impossible};
pub use interior::{LargestRequest, NodeFamily, WeightsFault};
