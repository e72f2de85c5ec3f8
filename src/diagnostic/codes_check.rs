//! Codes of the checker: names (E02xx), units (E03xx), equations (E04xx), conditions (E05xx), accuracy and
//! operators (E06xx), time (E07xx), outputs (E08xx), grids and what is not available yet (E09xx), warnings (W0xxx).

use crate::code_table;

code_table! {}
