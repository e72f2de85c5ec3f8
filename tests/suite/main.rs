//! The one test binary.

mod exactness;
mod layering;
mod published;
