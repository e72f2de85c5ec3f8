//! What follows from a scheme: symbols, stability regions, the law of the step limit. Never fails: not knowing is a finding.

pub mod closed;
pub mod limit;
pub mod spectrum;
pub mod stability;
pub mod symbol;
