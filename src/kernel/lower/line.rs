//! Certified operators as the plain weights of a kernel.

use crate::kernel::operator::{
    ClosureRow, ConstantOperator, LineOperator, Parity, VaryingEntry, VaryingOperator,
};
use crate::scheme::{self, DifferenceOperator, OperatorRule, SecondDerivativeForm};

/// The weights of a rule.
pub(super) fn operator(rule: &OperatorRule) -> LineOperator {
    match rule {
        OperatorRule::First(pair) => constant(pair.operator()),
        OperatorRule::Second(operator) | OperatorRule::Centred(operator) => constant(operator),
        OperatorRule::VaryingSecond(form) => varying(form),
    }
}

fn constant(operator: &DifferenceOperator) -> LineOperator {
    let centre = operator.left_reach();
    let taps = operator.taps();
    let (parity, from) = match operator.parity() {
        scheme::Parity::Odd => (Parity::Odd, centre + 1),
        _ => (Parity::Even, centre),
    };
    let closure = operator
        .closure()
        .iter()
        .map(|row| ClosureRow { first: row.first, weights: row.weights.clone() })
        .collect();
    LineOperator::Constant(ConstantOperator { parity, interior: taps[from..].to_vec(), closure })
}

fn varying(form: &SecondDerivativeForm) -> LineOperator {
    let closure = form
        .closure_rows()
        .iter()
        .map(|row| {
            let entry = |(column, weights): &(usize, scheme::LinearForm)| VaryingEntry {
                column: *column,
                weights: weights.clone(),
            };
            row.columns.iter().map(entry).collect()
        })
        .collect();
    LineOperator::Varying(VaryingOperator { forms: form.interior_forms().to_vec(), closure })
}
