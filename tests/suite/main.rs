//! The one test binary.

mod exactness;
mod limits;
mod published;
