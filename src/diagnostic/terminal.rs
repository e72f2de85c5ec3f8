//! Diagnostics for people, as text.
