//! Program text: a valid kernel as a C or Rust package, the same bytes for the same kernel.
//!
//! Loop bodies and expressions are printed by small recursive printers; templates lay out files. Nothing here decides
//! about mathematics: the kernel says what is computed and in which order.

mod c;
pub mod c_driver;
mod context;
mod escape;
mod expression;
mod face;
mod fixed;
mod language;
mod leaves;
mod literal;
mod namer;
mod operators;
mod routines;
mod rust;
pub mod rust_driver;
mod sweep;
mod text;
mod wave;
pub mod weights;

pub use language::Language;

use crate::kernel::ValidKernel;
use std::collections::BTreeMap;

/// What is made of a kernel.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Form {
    /// A program with a driver: options, output files, checkpoints.
    Program,
    /// A library without a driver.
    Library,
}

/// Language and form.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub struct Target {
    pub language: Language,
    pub form: Form,
}

/// Where the kernel comes from: written into the program, so that a run can be traced to its model.
#[derive(Clone, Copy, Debug)]
pub struct Provenance<'a> {
    pub model_text: &'a str,
    /// SHA-256 of the model text, hexadecimal.
    pub hash: &'a str,
    /// Version of this compiler.
    pub version: &'a str,
}

/// An emitted package.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Program {
    /// Path with `/` → text.
    pub files: BTreeMap<String, String>,
    /// Prefix of public names in C, name of the package in Rust; also the stem of file names.
    pub prefix: String,
}

/// Emits a package. Total: a valid kernel always has one.
pub fn emit(kernel: &ValidKernel, target: Target, provenance: Provenance) -> Program {
    match target.language {
        Language::C => c::emit(kernel, target.form, provenance),
        Language::Rust => rust::emit(kernel, target.form, provenance),
    }
}

/// Renders one of this crate's own templates.
fn render(template: &str, values: &[(&'static str, String)]) -> String {
    let mut context = tera::Context::new();
    for (name, value) in values {
        context.insert(*name, value);
    }
    let text = tera::Tera::one_off(template, &context, false)
        .unwrap_or_else(|fault| panic!("a template of this crate does not render: {fault}"));
    text::tidy(&text)
}
