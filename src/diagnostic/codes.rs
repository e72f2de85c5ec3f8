//! Codes of text and syntax (E01xx), and of names and numbers that the syntax alone decides (E02xx below E0220).
//!
//! The codes of the checker are in [`super::codes_check`].

use crate::code_table;

code_table! {
    UNEXPECTED = "E0101", "the statement cannot be read here",
        "A statement does not have one of the forms that its section takes. The message says what could have stood at the marked place.",
        wrong "constants\n  k 0.72",
        right "constants\n  k = 0.72";
    NOT_UTF8 = "E0102", "the file is not UTF-8 text",
        "A model file is Unicode text in UTF-8. A file in another encoding shows as this fault; save it as UTF-8 in the editor.",
        wrong "(a file saved in a national code page)",
        right "(the same file saved as UTF-8)";
}
