//! Building and running.
