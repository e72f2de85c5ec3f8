//! {{ title }}
//!
//! Made by rimstone {{ version }}. [`kernel::Kernel`] is the solver; [`driver`] holds the trait that it implements and,
//! for whoever wants it, everything of a command-line program around it.

pub mod driver;
pub mod kernel;
