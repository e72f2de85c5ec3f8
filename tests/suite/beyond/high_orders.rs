//! Orders 10 and 12 against the reference derivation, and what is special about them. Sums run over common
//! denominators: their fractions are long.

use rimstone::discretize::closure;
use rimstone::exact::{Rational, factorial};
use rimstone::scheme::{FormFault, SecondDerivativeForm, SquaresFault, SumOfSquares};

use super::tables::FIRST_DERIVATIVES;
use super::{list, moments};

#[test]
fn first_derivatives_of_orders_ten_and_twelve() {
    for (order, norm, upper) in FIRST_DERIVATIVES {
        let first = closure::first_derivative(order).expect("offered");
        assert_eq!(first.norm().left(), list(norm), "order {order}");
        let closed = first.norm().left().len();
        for (row, (quoted, closed_row)) in upper.iter().zip(first.operator().closure()).enumerate() {
            let height = &first.norm().left()[row];
            let entry = |column: usize| match column.checked_sub(closed_row.first) {
                Some(place) => closed_row.weights.get(place).cloned().unwrap_or_else(Rational::zero) * height,
                None => Rational::zero(),
            };
            let found: Vec<Rational> = (row + 1..closed).map(entry).collect();
            assert_eq!(found, list(quoted), "order {order}, row {row}");
        }
    }
}

/// The recipe's prediction: some excess is negative from order 10 on, and yet no factor of the certificate.
#[test]
fn negative_excesses_leave_no_negative_factor() {
    for order in [10, 12] {
        let form = closure::second_derivative(order).expect("offered");
        assert_eq!((form.interior_order(), form.closure_order()), (order, order / 2));
        let squares = form.squares();
        let mut factors = squares
            .left()
            .iter()
            .flat_map(|square| &square.weight)
            .map(|(_, factor)| factor)
            .chain(squares.repeated().iter().flat_map(|square| &square.weight).map(|(_, factor)| factor));
        assert!(factors.all(Rational::is_positive), "order {order}");
        // The last square is the excess. Its functional is the excesses' mean of differences of order p + 1,
        // so moments of degree p + 1 give (p + 1)! and those below nought.
        let excess = squares.left().last().expect("closed orders have squares at the ends");
        for degree in 0..=order / 2 + 1 {
            let found: Rational = excess
                .functional
                .iter()
                .map(|(node, factor)| Rational::from(*node as i64).power(degree as u32) * factor)
                .sum();
            let needed = if degree == order / 2 + 1 { factorial(degree) } else { Rational::zero() };
            assert_eq!(found, needed, "order {order}, degree {degree}");
        }
    }
}

#[test]
fn a_tampered_second_derivative_of_order_ten_is_refused() {
    let form = closure::second_derivative(10).expect("offered");
    let rebuilt = |squares| SecondDerivativeForm::bounded(form.norm().clone(), squares, 10, 5);
    assert!(rebuilt(form.squares().clone()).is_ok());
    let last = form.squares().left().len() - 1;
    let mut left = form.squares().left().to_vec();
    left[last].weight[0].1 += Rational::ratio(1, 1 << 60);
    let heavier = SumOfSquares::bounded(left, form.squares().repeated().to_vec()).expect("still squares");
    assert!(matches!(rebuilt(heavier), Err(FormFault::NotExact { row: Some(_), .. })));
    let mut left = form.squares().left().to_vec();
    left[last].weight[0].1 = Rational::ratio(-1, 1 << 60);
    let negative = SumOfSquares::bounded(left, form.squares().repeated().to_vec());
    assert!(matches!(negative, Err(SquaresFault::NegativeWeight { term, .. }) if term == last));
}

#[test]
fn first_derivatives_are_exact_to_their_order_and_not_further() {
    for order in [10, 12] {
        let operator = closure::first_derivative(order).expect("offered").operator();
        assert_eq!(operator.closure_order(), Some(order / 2));
        for (row, closed) in operator.closure().iter().enumerate() {
            let origin = row as i64 - closed.first as i64;
            let found = moments(&closed.weights, -origin, order / 2 + 2);
            for (degree, moment) in found.iter().enumerate() {
                let exact = *moment == Rational::from(i64::from(degree == 1));
                assert_eq!(exact, degree <= order / 2, "order {order}, row {row}, degree {degree}");
            }
        }
    }
}

/// For b = x^s, u = x^t with s + t up to p + 1 every closed row with its flux is exact, and some row is not
/// at p + 2.
#[test]
fn second_derivatives_are_exact_to_their_order_and_not_further() {
    for order in [10, 12] {
        let form = closure::second_derivative(order).expect("offered");
        let mut fails_beyond = false;
        for (row, columns) in form.closure_rows().iter().enumerate() {
            for s in 0..=2 {
                let weights: Vec<Rational> = columns
                    .columns
                    .iter()
                    .map(|(_, factors)| {
                        let first = factors.first().map_or(0, |(node, _)| *node as i64);
                        let mut dense = vec![Rational::zero(); factors.len()];
                        dense.resize(
                            factors.last().map_or(0, |(node, _)| node + 1 - first as usize),
                            Rational::zero(),
                        );
                        for (node, factor) in factors {
                            dense[node - first as usize] = factor.clone();
                        }
                        moments(&dense, first - row as i64, s + 1).pop().unwrap_or_else(Rational::zero)
                    })
                    .collect();
                let first = columns.columns[0].0;
                assert!(
                    columns.columns.iter().enumerate().all(|(place, (column, _))| *column == first + place)
                );
                let found = moments(&weights, first as i64 - row as i64, order / 2 + 3 - s);
                for (t, moment) in found.iter().enumerate() {
                    // About the row's node (b u_x)_x is 2 for b = 1, u = x² and 1 for b = u = x, else nought.
                    let mut needed = Rational::from(match (s, t) {
                        (0, 2) => 2,
                        (1, 1) => 1,
                        _ => 0,
                    });
                    if (row, s, t) == (0, 0, 1) {
                        needed += form.norm().left()[0].recip().expect("positive");
                    }
                    if s + t <= order / 2 + 1 {
                        assert_eq!(*moment, needed, "order {order}, row {row}, b = x^{s}, u = x^{t}");
                    } else {
                        fails_beyond |= *moment != needed;
                    }
                }
            }
        }
        assert!(fails_beyond, "order {order}: the closure is better than it says");
    }
}
