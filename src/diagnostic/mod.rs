//! Diagnostics.
