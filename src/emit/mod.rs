//! Program text.
