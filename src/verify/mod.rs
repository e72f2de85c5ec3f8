//! Building and running.

#[path = "../../templates/rust/driver.rs"]
pub mod driver;
//! Building and running emitted programs: the only place that starts processes.

mod cache;
pub mod run;
pub mod toolchain;
