//! The checked model.
