//! The one test binary.

mod agreement;
mod beyond;
mod c_driver;
mod check;
mod cli;
mod closed;
mod convergence;
mod docs;
mod drivers;
mod emission;
mod exactness;
mod executor;
mod in_process;
mod known;
mod layering;
mod limits;
mod lowering;
mod mutations;
mod published;
mod reference;
mod rejects;
mod syntax;
mod traps;
mod waves;
