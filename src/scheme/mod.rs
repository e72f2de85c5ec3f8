//! Facts of a discretization: types whose constructors check, exactly, that what they say is true.
//!
//! Nothing here searches for weights; that is [`crate::discretize`]'s task. All weights are for unit spacing.

pub mod stencil;

pub use stencil::{LeadingError, Stencil, StencilFault};
