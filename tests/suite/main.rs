//! The one test binary.

mod agreement;
mod c_driver;
mod cli;
mod convergence;
mod drivers;
mod emission;
mod exactness;
mod layering;
mod limits;
mod lowering;
mod mutations;
mod published;
mod reference;
mod rejects;
mod syntax;
