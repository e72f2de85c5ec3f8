//! What follows from a scheme.
