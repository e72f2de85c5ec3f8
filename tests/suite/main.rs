//! The one test binary.

mod exactness;
mod layering;
mod limits;
mod lowering;
mod published;
mod reference;
mod syntax;
