//! Building and running emitted programs: the only place that starts processes.

mod cache;
pub mod run;
pub mod toolchain;
