//! From model to scheme.
