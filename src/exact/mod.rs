//! Exact arithmetic.
