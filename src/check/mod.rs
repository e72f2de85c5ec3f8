//! From syntax to model.
