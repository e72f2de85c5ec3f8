//! The kernel and its meaning.
