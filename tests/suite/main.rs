//! The one test binary.

mod c_driver;
mod cli;
mod convergence;
mod drivers;
mod emission;
mod exactness;
mod layering;
mod limits;
mod lowering;
mod published;
mod reference;
mod syntax;
mod waves;
