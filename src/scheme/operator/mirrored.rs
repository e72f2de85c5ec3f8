//! Centred operators on functions that both ends reflect: the interior weights folded onto the axis.

use crate::exact::{Rational, factorial};

use super::{ClosedRow, DifferenceOperator, EndRows, Extension, OperatorFault, Stencil};

impl DifferenceOperator {
    /// The centred operator on an axis whose two end nodes reflect the function. No order is lost where the
    /// function's extension is smooth; each closed row is checked on the powers of x that have it.
    pub fn mirrored(
        interior: Stencil,
        interior_order: usize,
        extension: Extension,
    ) -> Result<DifferenceOperator, OperatorFault> {
        let bare = DifferenceOperator::interior_only(interior.clone(), interior_order)?;
        let reach = bare.left_reach.max(bare.right_reach);
        let rows = (0..reach).map(|row| folded(&bare, row, extension)).collect();
        let ends = EndRows::Mirrored(extension);
        DifferenceOperator::closed(interior, interior_order, rows, interior_order, ends)
    }
}

/// Row `row` of the interior with the weights of negative nodes brought to their mirror images.
fn folded(bare: &DifferenceOperator, row: usize, extension: Extension) -> ClosedRow {
    let mut weights = vec![Rational::zero(); row + bare.left_reach.max(bare.right_reach) + 1];
    let first = row as i64 - bare.left_reach as i64;
    for (node, weight) in (first..).zip(&bare.taps) {
        let place = node.unsigned_abs() as usize;
        match extension {
            Extension::Odd if node < 0 => weights[place] -= weight,
            // An odd function is nought at the end.
            Extension::Odd if node == 0 => {}
            _ => weights[place] += weight,
        }
    }
    ClosedRow { first: 0, weights }
}

/// Checks Σ wⱼ jᵐ = (xᵐ)⁽ᵈ⁾ at the row, for all m < derivative + order that are even or odd as the function.
pub(super) fn check_row(
    closed: &ClosedRow,
    row: usize,
    derivative: usize,
    order: usize,
    extension: Extension,
) -> Result<(), OperatorFault> {
    let lowest = match extension {
        Extension::Even => 0,
        Extension::Odd => 1,
    };
    for degree in (lowest..derivative + order).step_by(2) {
        let nodes = (closed.first as i64..).map(Rational::from);
        let found: Rational =
            nodes.zip(&closed.weights).map(|(node, weight)| node.power(degree as u32) * weight).sum();
        let needed = match degree.checked_sub(derivative) {
            None => Rational::zero(),
            Some(remaining) => {
                let factor = factorial(degree) / factorial(remaining);
                factor * Rational::from(row as i64).power(remaining as u32)
            }
        };
        if found != needed {
            return Err(OperatorFault::Row { row, degree, found: Box::new(found) });
        }
    }
    Ok(())
}
