//! The one test binary.

mod exactness;
mod layering;
mod lowering;
mod published;
mod reference;
mod syntax;
