//! Building and running: the only place that starts processes, and the driver that runs solvers in process.

mod cache;
pub mod in_process;
pub mod package;
pub mod run;
pub mod toolchain;

#[path = "../../templates/rust/driver.rs"]
pub mod driver;
