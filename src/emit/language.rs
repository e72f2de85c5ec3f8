//! What differs between C and Rust in a statement or an expression. Layout of files is elsewhere.

use super::literal;
use crate::kernel::{Function, Relation};

/// A target language. C is C11, Rust is edition 2021 with the standard library.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Language {
    C,
    Rust,
}

/// Types of parameters and results.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Type {
    Double,
    /// A signed size: `ptrdiff_t`, `isize`.
    Index,
    /// An array that is read only.
    In,
    /// An array that is written and that nothing else reaches.
    Out,
}

/// How a function is declared.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Linkage {
    /// Always inlined.
    Inlined,
    /// An ordinary private function.
    Private,
}

impl Language {
    /// One of two texts.
    pub fn pick<'a>(self, c: &'a str, rust: &'a str) -> &'a str {
        match self {
            Language::C => c,
            Language::Rust => rust,
        }
    }

    pub fn call(self, function: Function, argument: &str) -> String {
        let c = match function {
            Function::Sin => "sin",
            Function::Cos => "cos",
            Function::Tan => "tan",
            Function::Exp => "exp",
            Function::Log => "log",
            Function::Sqrt => "sqrt",
            Function::Abs => "fabs",
            Function::Tanh => "tanh",
            Function::Sinh => "sinh",
            Function::Cosh => "cosh",
            Function::Erf => "erf",
            Function::Erfc => "erfc",
            Function::Sign => "sign",
            // Refused by the kernel's validation: these are operations of two operands.
            Function::Minimum => "minimum",
            Function::Maximum => "maximum",
        };
        let name = match (self, function) {
            (Language::C, _) | (_, Function::Erf | Function::Erfc | Function::Sign) => c.to_owned(),
            (Language::Rust, Function::Log) => "f64::ln".to_owned(),
            (Language::Rust, Function::Abs) => "f64::abs".to_owned(),
            (Language::Rust, _) => format!("f64::{c}"),
        };
        format!("{name}({argument})")
    }

    pub fn power(self, base: &str, exponent: &str) -> String {
        format!("{}({base}, {exponent})", self.pick("pow", "f64::powf"))
    }

    pub fn pi(self) -> String {
        match self {
            Language::C => literal::double(std::f64::consts::PI, self),
            Language::Rust => "std::f64::consts::PI".to_owned(),
        }
    }

    /// Element `index` of what `pointer` points at.
    pub fn at(self, pointer: &str, index: &str) -> String {
        match self {
            Language::C => format!("{pointer}[{index}]"),
            Language::Rust => format!("at({pointer}, {index})"),
        }
    }

    /// `pointer` moved on by `offset` elements.
    pub fn shifted(self, pointer: &str, offset: &str) -> String {
        match (self, offset) {
            (_, "0") => pointer.to_owned(),
            (Language::C, _) => format!("{pointer} + {offset}"),
            (Language::Rust, _) => format!("{pointer}.offset({offset})"),
        }
    }

    /// Entry of a constant array.
    pub fn entry(self, array: &str, index: &str) -> String {
        match self {
            Language::C => format!("{array}[{index}]"),
            Language::Rust if index.bytes().all(|byte| byte.is_ascii_digit()) => format!("{array}[{index}]"),
            Language::Rust if index.contains(' ') => format!("{array}[({index}) as usize]"),
            Language::Rust => format!("{array}[{index} as usize]"),
        }
    }

    pub fn store(self, pointer: &str, index: &str, value: &str) -> String {
        match self {
            Language::C => format!("{pointer}[{index}] = {value};"),
            Language::Rust => format!("*{pointer}.offset({index}) = {value};"),
        }
    }

    pub fn double(self, name: &str, value: &str) -> String {
        format!("{} {name} = {value};", self.pick("const double", "let"))
    }

    pub fn index(self, name: &str, value: &str) -> String {
        format!("{} {name} = {value};", self.pick("const ptrdiff_t", "let"))
    }

    pub fn truth(self, name: &str, value: &str) -> String {
        format!("{} {name} = {value};", self.pick("const int", "let"))
    }

    pub fn pointer(self, name: &str, value: &str) -> String {
        format!("{} {name} = {value};", self.pick("const double *const", "let"))
    }

    pub fn variable(self, name: &str, value: &str) -> String {
        format!("{} {name} = {value};", self.pick("double", "let mut"))
    }

    /// The head of a loop over `low ≤ name < high`.
    pub fn count(self, name: &str, low: &str, high: &str) -> String {
        match self {
            Language::C => format!("for (ptrdiff_t {name} = {low}; {name} < {high}; {name}++) {{"),
            Language::Rust => format!("for {name} in {low}..{high} {{"),
        }
    }

    pub fn when(self, condition: &str) -> String {
        match self {
            Language::C => format!("if ({condition}) {{"),
            Language::Rust => format!("if {condition} {{"),
        }
    }

    /// condition ? then : otherwise, for indices and doubles.
    pub fn choose(self, condition: &str, then: &str, otherwise: &str) -> String {
        match self {
            Language::C => format!("{condition} ? {then} : {otherwise}"),
            Language::Rust => format!("if {condition} {{ {then} }} else {{ {otherwise} }}"),
        }
    }

    /// The last statement of a function with a result.
    pub fn result(self, value: &str) -> String {
        match self {
            Language::C => format!("return {value};"),
            Language::Rust => value.to_owned(),
        }
    }

    /// The name of a constant array.
    pub fn constant(self, name: &str) -> String {
        match self {
            Language::C => name.to_owned(),
            Language::Rust => name.to_uppercase(),
        }
    }

    /// The head of a function; `results` doubles are returned.
    pub fn function(
        self,
        linkage: Linkage,
        name: &str,
        parameters: &[(String, Type)],
        results: &[String],
    ) -> String {
        let mut list: Vec<String> =
            parameters.iter().map(|(parameter, kind)| self.parameter(parameter, *kind)).collect();
        match self {
            Language::C => {
                let many = results.len() > 1;
                if many {
                    list.extend(results.iter().map(|result| format!("double *{result}")));
                }
                if list.is_empty() {
                    list.push("void".to_owned());
                }
                let kind = if results.len() == 1 { "double" } else { "void" };
                let start = match linkage {
                    Linkage::Inlined => "INLINE",
                    Linkage::Private => "static",
                };
                format!("{start} {kind} {name}({}) {{", list.join(", "))
            }
            Language::Rust => {
                let result = match results.len() {
                    0 => String::new(),
                    1 => " -> f64".to_owned(),
                    count => format!(" -> ({})", vec!["f64"; count].join(", ")),
                };
                format!("unsafe fn {name}({}){result} {{", list.join(", "))
            }
        }
    }

    fn parameter(self, name: &str, kind: Type) -> String {
        match (self, kind) {
            (Language::C, Type::Double) => format!("double {name}"),
            (Language::C, Type::Index) => format!("ptrdiff_t {name}"),
            (Language::C, Type::In) => format!("const double *{name}"),
            (Language::C, Type::Out) => format!("double *restrict {name}"),
            (Language::Rust, Type::Double) => format!("{name}: f64"),
            (Language::Rust, Type::Index) => format!("{name}: isize"),
            (Language::Rust, Type::In) => format!("{name}: *const f64"),
            (Language::Rust, Type::Out) => format!("{name}: &mut [f64]"),
        }
    }

    /// A member of the solver.
    pub fn member(self, name: &str) -> String {
        format!("{}{name}", self.pick("s->", "s."))
    }

    /// The first element of a member array, for reading or writing.
    pub fn array(self, name: &str) -> String {
        match self {
            Language::C => format!("s->{name}"),
            Language::Rust => format!("s.{name}.first()"),
        }
    }
}

/// The sign of a relation, the same in both languages.
pub fn relation(relation: Relation) -> &'static str {
    match relation {
        Relation::Less => "<",
        Relation::LessOrEqual => "<=",
        Relation::Greater => ">",
        Relation::GreaterOrEqual => ">=",
    }
}
