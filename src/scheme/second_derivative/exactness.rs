//! The exactness of rows of −H⁻¹M(b) on monomials, in integers.

use num_bigint::BigInt;
use num_traits::Zero;

use crate::exact::Rational;
use crate::exact::matrix::{common_denominator, scaled};
use crate::scheme::Norm;

use super::{FormFault, FormRow};

/// A row over one common denominator.
struct IntegerRow {
    columns: Vec<(i64, Vec<(i64, BigInt)>)>,
    denominator: BigInt,
}

impl IntegerRow {
    fn new<'a>(
        columns: impl Iterator<Item = (i64, Vec<(i64, &'a Rational)>)>,
        extra: &Rational,
    ) -> IntegerRow {
        let columns: Vec<(i64, Vec<(i64, &Rational)>)> = columns.collect();
        let factors = columns.iter().flat_map(|(_, form)| form.iter().map(|(_, factor)| *factor));
        let denominator = common_denominator(factors.chain([extra]));
        let columns = columns
            .iter()
            .map(|(column, form)| {
                let form = form.iter().map(|(node, factor)| (*node, scaled(factor, &denominator)));
                (*column, form.collect())
            })
            .collect();
        IntegerRow { columns, denominator }
    }

    /// Each column's form on the coefficient b = x^degree.
    fn on_coefficient(&self, degree: usize) -> Vec<(i64, BigInt)> {
        let value = |form: &[(i64, BigInt)]| {
            form.iter().map(|(node, factor)| factor * power(*node, degree)).sum::<BigInt>()
        };
        self.columns.iter().map(|(column, form)| (*column, value(form))).collect()
    }
}

fn power(base: i64, degree: usize) -> BigInt {
    BigInt::from(base).pow(degree as u32)
}

fn applied(weights: &[(i64, BigInt)], degree: usize) -> BigInt {
    weights.iter().map(|(column, weight)| weight * power(*column, degree)).sum()
}

/// t(s + t − 1) i^(s + t − 2): the value of (x^s (x^t)')' at i.
fn exact_value(node: i64, coefficient_degree: usize, degree: usize) -> BigInt {
    match (coefficient_degree + degree).checked_sub(2) {
        None => BigInt::zero(),
        Some(remaining) => {
            BigInt::from(degree) * BigInt::from(coefficient_degree + degree - 1) * power(node, remaining)
        }
    }
}

/// Checks the interior row at node nought for all total degrees up to order + 1. Shifting a polynomial does
/// not raise its degree, so this decides for every node.
pub(super) fn check_interior(row: &[(i64, Vec<(i64, Rational)>)], order: usize) -> Result<(), FormFault> {
    let columns = row.iter().map(|(offset, form)| {
        (*offset, form.iter().map(|(node, factor)| (*node, factor)).collect::<Vec<_>>())
    });
    let row = IntegerRow::new(columns, &Rational::one());
    for coefficient_degree in 0..=order + 1 {
        let weights = row.on_coefficient(coefficient_degree);
        for degree in 0..=order + 1 - coefficient_degree {
            let needed = exact_value(0, coefficient_degree, degree) * &row.denominator;
            if applied(&weights, degree) != needed {
                return Err(FormFault::NotExact { row: None, coefficient_degree, degree });
            }
        }
    }
    Ok(())
}

/// Checks every closed row with the exact boundary flux for all total degrees up to order + 1.
pub(super) fn check_closure(rows: &[FormRow], norm: &Norm, order: usize) -> Result<(), FormFault> {
    for (index, row) in rows.iter().enumerate() {
        // At the left end the flux −(b u_x)(0) / h₀ is added; it is not nought for b = 1, u = x alone.
        let flux = match (index, norm.left().first().and_then(Rational::recip)) {
            (0, Some(reciprocal)) => -reciprocal,
            _ => Rational::zero(),
        };
        let columns = row.columns.iter().map(|(column, form)| {
            let form = form.iter().map(|(node, factor)| (*node as i64, factor));
            (*column as i64, form.collect::<Vec<_>>())
        });
        let row = IntegerRow::new(columns, &flux);
        for coefficient_degree in 0..=order + 1 {
            let weights = row.on_coefficient(coefficient_degree);
            for degree in 0..=order + 1 - coefficient_degree {
                let mut found = applied(&weights, degree);
                if (coefficient_degree, degree) == (0, 1) {
                    found += scaled(&flux, &row.denominator);
                }
                let needed = exact_value(index as i64, coefficient_degree, degree) * &row.denominator;
                if found != needed {
                    return Err(FormFault::NotExact { row: Some(index), coefficient_degree, degree });
                }
            }
        }
    }
    Ok(())
}
