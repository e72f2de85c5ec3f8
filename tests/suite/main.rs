//! The one test binary.

mod c_driver;
mod exactness;
mod layering;
mod published;
