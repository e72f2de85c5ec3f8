//! Program text.

pub mod c_driver;
pub mod weights;
