//! The one test binary.

mod exactness;
mod published;
