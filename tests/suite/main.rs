//! The one test binary.
mod syntax;
