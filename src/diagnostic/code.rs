//! What a diagnostic code is, and the macro that makes a table of them.
//!
//! The tables themselves are [`super::codes`] and [`super::codes_check`].

use std::fmt;

/// A code with its explanation. Codes are compared by their strings.
#[derive(Clone, Copy)]
pub struct Code(pub &'static Entry);

/// An entry of the registry.
#[derive(Debug)]
pub struct Entry {
    /// `E0101`.
    pub code: &'static str,
    /// A few words, without a full stop.
    pub title: &'static str,
    /// Whole sentences: what the rule is and why.
    pub explanation: &'static str,
    /// A line or a few that have the fault.
    pub wrong: &'static str,
    /// The same without it.
    pub right: &'static str,
}

impl Code {
    /// `E0101`.
    pub fn as_str(self) -> &'static str {
        self.0.code
    }

    /// All codes, in the order of their strings.
    pub fn all() -> Vec<Code> {
        let mut all = [
            super::codes::TABLE,
            super::codes_check::TABLE,
            super::codes_conditions::TABLE,
            super::codes_scheme::TABLE,
        ]
        .concat();
        all.sort_by_key(|code| code.as_str());
        all
    }

    /// The code of a string, in either case of letters.
    pub fn find(text: &str) -> Option<Code> {
        Code::all().into_iter().find(|code| code.as_str().eq_ignore_ascii_case(text))
    }
}

impl PartialEq for Code {
    fn eq(&self, other: &Code) -> bool {
        self.as_str() == other.as_str()
    }
}

impl Eq for Code {}

impl fmt::Display for Code {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        out.write_str(self.as_str())
    }
}

impl fmt::Debug for Code {
    fn fmt(&self, out: &mut fmt::Formatter<'_>) -> fmt::Result {
        out.write_str(self.as_str())
    }
}

/// Makes a table of codes: one constant for each entry, and `TABLE` with all of them.
///
/// ```text
/// code_table! {
///     UNEXPECTED = "E0101", "the statement cannot be read", "Explanation.", wrong "k 3", right "k = 3";
/// }
/// ```
#[macro_export]
macro_rules! code_table {
    ($($name:ident = $code:literal, $title:literal, $explanation:literal, wrong $wrong:literal, right $right:literal;)*) => {
        $(
            #[doc = $title]
            pub const $name: $crate::diagnostic::Code = $crate::diagnostic::Code(&$crate::diagnostic::Entry {
                code: $code,
                title: $title,
                explanation: $explanation,
                wrong: $wrong,
                right: $right,
            });
        )*
        /// All codes of this table.
        pub const TABLE: &[$crate::diagnostic::Code] = &[$($name),*];
    };
}
