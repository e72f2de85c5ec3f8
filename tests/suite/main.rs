//! The one test binary.

mod c_driver;
mod exactness;
mod layering;
mod lowering;
mod published;
mod reference;
mod syntax;
