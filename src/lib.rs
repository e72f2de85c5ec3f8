//! rimstone: from one page of model equation to a solver that can be trusted.
//!
//! The pipeline, in reading order:
//!
//! source text → [`syntax`] → [`check`] → [`model`] → [`discretize`] → [`scheme`] → { [`analysis`], [`kernel`] } → [`emit`] → [`verify`]

pub mod analysis;
pub mod check;
pub mod cli;
pub mod diagnostic;
pub mod discretize;
pub mod emit;
pub mod exact;
pub mod kernel;
pub mod model;
pub mod pipeline;
pub mod scheme;
pub mod source;
pub mod syntax;
pub mod verify;
