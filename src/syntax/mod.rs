//! The language's tree.
