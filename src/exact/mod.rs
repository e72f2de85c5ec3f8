//! Exact arithmetic: rational numbers, rational matrices and the one door to doubles.
//!
//! Nothing here knows of grids, operators or programs. Floating point numbers occur in [`round`] alone.

pub mod decimal;
pub mod matrix;
pub mod rational;
pub mod round;

pub use matrix::{
    AffineSolution, Inconsistent, Matrix, NotSemidefinite, Residual, SemidefiniteFactors, Singular,
};
pub use rational::{ParseRationalError, Rational, binomial, factorial};
