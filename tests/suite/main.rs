//! The one test binary.

mod c_driver;
mod emission;
mod exactness;
mod layering;
mod published;
