//! Building and running.

#[path = "../../templates/rust/driver.rs"]
pub mod driver;
