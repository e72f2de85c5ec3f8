//! The one test binary.

mod beyond;
mod exactness;
mod published;
