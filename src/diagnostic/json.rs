//! Diagnostics for programs, as JSON.
