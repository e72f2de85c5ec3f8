//! From source text to a valid kernel: the stages in their order, with every fault of the user's as a diagnostic.

use std::path::Path;

use sha2::{Digest, Sha256};

use super::closed::{self, Closed};
use crate::analysis::{limit, stability};
use crate::check;
use crate::diagnostic::{Diagnostic, Diagnostics, codes_scheme};
use crate::discretize;
use crate::exact::{Rational, round};
use crate::kernel::lower::lower;
use crate::kernel::validate::{KernelFault, ValidKernel, validate};
use crate::model::Model;
use crate::scheme::{LimitLaw, Scheme};
use crate::source::SourceFile;
use crate::syntax;

/// What is changed before a model is compiled.
#[derive(Clone, Debug, Default)]
pub struct Overrides {
    /// Node counts by axis name.
    pub nodes: Vec<(String, usize)>,
}

/// A model that compiled.
#[derive(Clone, Debug)]
pub struct Compiled {
    pub model: Model,
    pub scheme: Scheme,
    pub law: LimitLaw,
    pub kernel: ValidKernel,
}

/// A model as far as it could be read and checked, and everything that was said about it.
#[derive(Clone, Debug)]
pub struct Checked {
    /// Nothing where there are errors.
    pub model: Option<Model>,
    pub diagnostics: Diagnostics,
}

/// Reads a model file. Bytes that are no text are a diagnostic later, not a failure here.
pub fn read(path: &Path) -> std::io::Result<SourceFile> {
    let bytes = std::fs::read(path)?;
    Ok(SourceFile::from_bytes(path.display().to_string(), bytes))
}

/// SHA-256 of the model text, in lower-case hexadecimal.
pub fn hash(source: &SourceFile) -> String {
    Sha256::digest(source.text().as_bytes()).iter().map(|byte| format!("{byte:02x}")).collect()
}

/// Parses and checks; then compiles as well, so that what only the scheme can know is said too.
pub fn check(source: &SourceFile) -> Checked {
    match compile(source, &Overrides::default()) {
        Ok((compiled, warnings)) => Checked { model: Some(compiled.model), diagnostics: warnings },
        Err(diagnostics) => Checked { model: None, diagnostics },
    }
}

/// The whole way to a valid kernel. Warnings come with the result, everything comes with a failure.
pub fn compile(source: &SourceFile, overrides: &Overrides) -> Result<(Compiled, Diagnostics), Diagnostics> {
    let (file, mut diagnostics) = syntax::parse(source);
    if source.fault().is_some() {
        // Where there is no text, all sections would be missing.
        return Err(diagnostics);
    }
    let (model, more) = check::check(&file, source);
    diagnostics.append(more);
    let Some(mut model) = model.filter(|_| !diagnostics.has_errors()) else { return Err(diagnostics) };
    for (name, nodes) in &overrides.nodes {
        if let Some(axis) = model.axes.iter_mut().find(|axis| axis.name == *name) {
            axis.nodes = *nodes;
        }
    }
    let compiled = build(model, &mut diagnostics);
    match compiled {
        Some(compiled) if !diagnostics.has_errors() => Ok((compiled, diagnostics)),
        _ => Err(diagnostics),
    }
}

/// From a checked model to its kernel; what cannot be had is added to the diagnostics.
pub fn build(model: Model, diagnostics: &mut Diagnostics) -> Option<Compiled> {
    let scheme = match discretize::assemble(&model) {
        Ok(scheme) => scheme,
        Err(faults) => {
            for fault in faults {
                let message =
                    Diagnostic::error(codes_scheme::ORDER_NOT_REACHED, model.accuracy.span, fault.what);
                diagnostics.push(message.with_remedy(fault.remedy));
            }
            return None;
        }
    };
    check_sizes(&model, &scheme, diagnostics);
    if diagnostics.has_errors() {
        return None;
    }
    let mut law = limit::law(&model, &scheme, &stability::extents(model.time.method));
    let mut kernel = valid(validate(lower(&model, &scheme, &law, notes(&model, &scheme, &law))));
    let closed = closed::examine(&kernel);
    law.text = format!("{}; {}", law.text, closed.describe());
    if let Closed::Lowered { factor, .. } = &closed {
        law.lower(round::from_f64(*factor).unwrap_or_else(Rational::one));
    }
    kernel = valid(validate(lower(&model, &scheme, &law, notes(&model, &scheme, &law))));
    Some(Compiled { model, scheme, law, kernel })
}

/// Closures of the two ends of an axis may not overlap.
fn check_sizes(model: &Model, scheme: &Scheme, diagnostics: &mut Diagnostics) {
    for (axis, facts) in model.axes.iter().zip(&scheme.axes) {
        if axis.nodes < facts.least_nodes {
            let message = format!(
                "axis {} has {} nodes, and operators of interior order {} need at least {}",
                axis.name,
                axis.nodes,
                2 * facts.half_order,
                facts.least_nodes
            );
            diagnostics.push(
                Diagnostic::error(codes_scheme::TOO_FEW_NODES, axis.span, message).with_remedy(format!(
                    "take at least {} nodes, or ask for a lower order",
                    facts.least_nodes
                )),
            );
        }
    }
}

/// What readers of emitted text should know.
fn notes(model: &Model, scheme: &Scheme, law: &LimitLaw) -> Vec<String> {
    let mut notes =
        vec![format!("time method {}", model.time.method.name()), format!("step limit: {}", law.text)];
    notes.extend(scheme.choices.iter().cloned());
    notes.extend(model.conditions.iter().map(|condition| format!("condition: {}", condition.text)));
    notes
}

/// A kernel that does not validate is a fault of this program, never of the model.
fn valid(kernel: Result<ValidKernel, KernelFault>) -> ValidKernel {
    match kernel {
        Ok(kernel) => kernel,
        Err(fault) => panic!("a lowered kernel is invalid: {fault}; please report this with the model"),
    }
}
