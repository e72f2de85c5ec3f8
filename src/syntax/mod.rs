//! The front end of the model language: text → tree with spans.

pub mod tree;
