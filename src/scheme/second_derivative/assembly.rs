//! The rows of −H⁻¹M(b) as linear forms, assembled from the squares. M(b) may be any sum of squares.
//!
//! Sums run on integers over one common denominator; fractions are reduced once at the end.

use std::collections::BTreeMap;

use num_bigint::BigInt;
use num_integer::Integer;
use num_traits::Zero;

use crate::exact::Rational;
use crate::exact::matrix::{common_denominator, scaled};
use crate::scheme::{Norm, SumOfSquares};

use super::FormRow;

/// One row in integers: (column, coefficient's node) → numerator.
type Numerators = BTreeMap<(i64, i64), BigInt>;

/// A square over common denominators: functional / s, weight / t.
struct IntegerSquare {
    functional: Vec<(i64, BigInt)>,
    weight: Vec<(i64, BigInt)>,
    /// t s².
    denominator: BigInt,
}

impl IntegerSquare {
    fn new<'a>(
        functional: impl Iterator<Item = (i64, &'a Rational)> + Clone,
        weight: impl Iterator<Item = (i64, &'a Rational)> + Clone,
    ) -> IntegerSquare {
        let functional_scale = common_denominator(functional.clone().map(|(_, factor)| factor));
        let weight_scale = common_denominator(weight.clone().map(|(_, factor)| factor));
        IntegerSquare {
            functional: functional.map(|(node, factor)| (node, scaled(factor, &functional_scale))).collect(),
            weight: weight.map(|(node, factor)| (node, scaled(factor, &weight_scale))).collect(),
            denominator: weight_scale * &functional_scale * &functional_scale,
        }
    }

    /// Adds the square's part of −M row `row`, over the denominator `common`, with anchor `anchor`.
    fn subtract_row(&self, row: i64, anchor: i64, common: &BigInt, sums: &mut Numerators) {
        let Some((_, own)) = self.functional.iter().find(|(node, _)| node + anchor == row) else {
            return;
        };
        let own = -own * (common / &self.denominator);
        for (column, factor) in &self.functional {
            let product = &own * factor;
            for (node, weight) in &self.weight {
                *sums.entry((column + anchor, node + anchor)).or_default() += &product * weight;
            }
        }
    }
}

fn repeated_squares(squares: &SumOfSquares) -> Vec<IntegerSquare> {
    squares
        .repeated()
        .iter()
        .map(|square| {
            IntegerSquare::new(
                square.functional.iter().map(|(offset, factor)| (*offset, factor)),
                square.weight.iter().map(|(offset, factor)| (*offset, factor)),
            )
        })
        .collect()
}

/// The least common multiple of the squares' denominators.
fn common(squares: &[IntegerSquare]) -> BigInt {
    squares.iter().fold(BigInt::from(1), |common, square| common.lcm(&square.denominator))
}

/// −M_{i,i+s} for s = 1, 2, … as (offset from i, factor), trimmed at the last one that does not vanish.
pub(in crate::scheme) fn interior_forms(squares: &SumOfSquares) -> Vec<Vec<(i64, Rational)>> {
    let repeated = repeated_squares(squares);
    let common = common(&repeated);
    let mut sums = Numerators::new();
    for square in &repeated {
        for (node, _) in &square.functional {
            square.subtract_row(0, -node, &common, &mut sums);
        }
    }
    let mut forms: Vec<Vec<(i64, Rational)>> = Vec::new();
    for ((distance, node), numerator) in sums {
        if distance > 0 && !numerator.is_zero() {
            forms.resize(forms.len().max(distance.unsigned_abs() as usize), Vec::new());
            let factor = Rational::new(numerator, common.clone()).expect("denominators are positive");
            forms[(distance - 1).unsigned_abs() as usize].push((node, factor));
        }
    }
    forms
}

/// The full interior row of −M from its forms: (column offset, form), offsets −p, …, p. The diagonal makes
/// the row sum vanish, as every functional does on constants.
pub(in crate::scheme) fn interior_row(forms: &[Vec<(i64, Rational)>]) -> Vec<(i64, Vec<(i64, Rational)>)> {
    let mut diagonal: BTreeMap<i64, Rational> = BTreeMap::new();
    let mut row = BTreeMap::new();
    for (index, form) in forms.iter().enumerate() {
        let distance = index as i64 + 1;
        let shifted: Vec<(i64, Rational)> =
            form.iter().map(|(offset, factor)| (offset - distance, factor.clone())).collect();
        for (offset, factor) in form.iter().chain(&shifted) {
            *diagonal.entry(*offset).or_insert_with(Rational::zero) -= factor;
        }
        row.insert(distance, form.clone());
        row.insert(-distance, shifted);
    }
    row.insert(0, diagonal.into_iter().filter(|(_, factor)| !factor.is_zero()).collect());
    row.into_iter().collect()
}

/// The rows at the left end that differ from the interior one or have a norm weight of their own, with the
/// norm divided out.
pub(in crate::scheme) fn closed_rows(
    squares: &SumOfSquares,
    norm: &Norm,
    interior: &[Vec<(i64, Rational)>],
) -> Vec<FormRow> {
    let affected = squares.affected_nodes().max(norm.left().len());
    let left: Vec<IntegerSquare> = squares
        .left()
        .iter()
        .map(|square| {
            IntegerSquare::new(
                square.functional.iter().map(|(node, factor)| (*node as i64, factor)),
                square.weight.iter().map(|(node, factor)| (*node as i64, factor)),
            )
        })
        .collect();
    let repeated = repeated_squares(squares);
    let common = common(&left).lcm(&common(&repeated));
    let pattern = interior_row(interior);
    let mut rows: Vec<FormRow> = (0..affected)
        .map(|index| {
            let mut sums = Numerators::new();
            for square in &left {
                square.subtract_row(index as i64, 0, &common, &mut sums);
            }
            for (square, family) in repeated.iter().zip(squares.repeated()) {
                for (node, _) in &square.functional {
                    let anchor = index as i64 - node;
                    if anchor >= family.first {
                        square.subtract_row(index as i64, anchor, &common, &mut sums);
                    }
                }
            }
            reduced_row(sums, &common, norm.left().get(index))
        })
        .collect();
    while rows.last().is_some_and(|row| is_interior(row, rows.len() - 1, &pattern))
        && rows.len() > norm.left().len()
    {
        rows.pop();
    }
    rows
}

/// Brings a row of sums to fractions, divided by its norm weight.
fn reduced_row(sums: Numerators, common: &BigInt, norm_weight: Option<&Rational>) -> FormRow {
    let one = Rational::one();
    let height = norm_weight.unwrap_or(&one);
    let denominator = common * height.numerator();
    let mut columns: Vec<(usize, Vec<(usize, Rational)>)> = Vec::new();
    for ((column, node), numerator) in sums {
        if numerator.is_zero() {
            continue;
        }
        let factor = Rational::new(numerator * height.denominator(), denominator.clone())
            .expect("norm weights are positive");
        let (column, node) = (column.unsigned_abs() as usize, node.unsigned_abs() as usize);
        match columns.last_mut() {
            Some((last, form)) if *last == column => form.push((node, factor)),
            _ => columns.push((column, vec![(node, factor)])),
        }
    }
    FormRow { columns }
}

fn is_interior(row: &FormRow, index: usize, pattern: &[(i64, Vec<(i64, Rational)>)]) -> bool {
    let here = |offset: i64, wanted: usize| index as i64 + offset == wanted as i64;
    row.columns.len() == pattern.len()
        && row.columns.iter().zip(pattern).all(|((column, form), (offset, wanted))| {
            here(*offset, *column)
                && form.len() == wanted.len()
                && form
                    .iter()
                    .zip(wanted)
                    .all(|((node, factor), (offset, value))| here(*offset, *node) && factor == value)
        })
}
