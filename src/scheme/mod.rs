//! Facts of a discretization.
