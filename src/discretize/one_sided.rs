//! Closures without a certificate: one-sided rows at the ends, and reflection at them.
//!
//! One-sided rows are exact and nothing more. Many of them are unstable; it is for the analysis to say so. A
//! reflected function needs no rows of its own. Energy-keeping closures are in [`super::closure`].

use crate::exact::Rational;
use crate::scheme::{ClosedRow, DifferenceOperator, Extension};

use super::closure::{ClosureFault, Impossible};
use super::interior;

/// The centred derivative (1 to 4) of an even order with rows of the same order at the ends, each on as few
/// of the first nodes as that takes.
pub fn one_sided(derivative: usize, order: usize) -> Result<DifferenceOperator, ClosureFault> {
    one_sided_with(derivative, order, order)
}

/// As [`one_sided`] with end rows of another order, at least one.
pub fn one_sided_with(
    derivative: usize,
    interior_order: usize,
    closure_order: usize,
) -> Result<DifferenceOperator, ClosureFault> {
    Ok(derived(derivative, interior_order, closure_order)?)
}

/// The centred derivative of an even order for functions that both end nodes reflect.
pub fn mirrored(
    derivative: usize,
    order: usize,
    extension: Extension,
) -> Result<DifferenceOperator, ClosureFault> {
    let centred = interior::centred(derivative, order).map_err(Impossible::from)?;
    Ok(DifferenceOperator::mirrored(centred, order, extension).map_err(Impossible::from)?)
}

fn derived(
    derivative: usize,
    interior_order: usize,
    closure_order: usize,
) -> Result<DifferenceOperator, Impossible> {
    let centred = interior::centred(derivative, interior_order)?;
    let reach = centred.nodes().len() / 2;
    let nodes: Vec<Rational> =
        (0..derivative + closure_order.max(1)).map(|node| Rational::from(node as i64)).collect();
    let rows: Result<Vec<ClosedRow>, Impossible> = (0..reach)
        .map(|row| {
            let stencil = interior::weights(&nodes, &Rational::from(row as i64), derivative)?;
            Ok(ClosedRow { first: 0, weights: stencil.weights().to_vec() })
        })
        .collect();
    Ok(DifferenceOperator::bounded(centred, interior_order, rows?, closure_order)?)
}
