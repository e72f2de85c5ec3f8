//! Properties that every operator must have on any grid: exact on polynomials up to the order and not one
//! degree further, Q + Qᵀ = B, M(b) semidefinite; and tampered facts are refused.
//!
//! Not here: quoted values, see `published`; orders 10 and 12, see `beyond`.

use proptest::prelude::*;
use rimstone::discretize::{closure, interior};
use rimstone::exact::{Matrix, Rational, factorial};
use rimstone::scheme::{
    ClosedRow, DifferenceOperator, FormFault, Norm, OperatorFault, SecondDerivativeForm, SquaresFault,
    Stencil, StencilFault, SumOfSquares, SummationByParts, SummationFault,
};

const ORDERS: [usize; 4] = [2, 4, 6, 8];

fn integer(value: usize) -> Rational {
    Rational::from(value as i64)
}

/// xᵐ at nodes 0, …, n − 1 shifted by `origin`.
fn monomial(nodes: usize, origin: usize, degree: usize) -> Vec<Rational> {
    (0..nodes).map(|node| (integer(node) - integer(origin)).power(degree as u32)).collect()
}

/// The derivative of (x − x₀)^degree at x₀ for unit spacing.
fn derivative_at_origin(derivative: usize, degree: usize) -> Rational {
    if derivative == degree { factorial(degree) } else { Rational::zero() }
}

fn strictly_increasing() -> impl Strategy<Value = Vec<Rational>> {
    prop::collection::btree_set((-400_i64..400, 1_i64..12), 2..9).prop_map(|pairs| {
        let mut nodes: Vec<Rational> =
            pairs.into_iter().map(|(top, bottom)| Rational::ratio(top, bottom)).collect();
        nodes.sort();
        nodes.dedup();
        nodes
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn stencils_are_exact_to_their_order_and_not_one_degree_further(
        nodes in strictly_increasing(),
        at in (-40_i64..40, 1_i64..9),
        derivative in 0_usize..4,
    ) {
        prop_assume!(nodes.len() > derivative);
        let at = Rational::ratio(at.0, at.1);
        let stencil = interior::weights(&nodes, &at, derivative).expect("enough nodes");
        let on_monomial = |degree: usize| -> Rational {
            let terms = stencil.nodes().iter().zip(stencil.weights());
            terms.map(|(node, weight)| weight * (node - &at).power(degree as u32)).sum()
        };
        prop_assert!(stencil.order() >= nodes.len() - derivative);
        for degree in 0..derivative + stencil.order() {
            prop_assert_eq!(on_monomial(degree), derivative_at_origin(derivative, degree));
        }
        match stencil.error() {
            Some(error) => {
                let degree = derivative + stencil.order();
                let value = on_monomial(degree) - derivative_at_origin(derivative, degree);
                prop_assert!(!value.is_zero());
                prop_assert_eq!(value, &error.coefficient * factorial(degree));
            }
            None => prop_assert!(derivative == 0 && nodes.contains(&at)),
        }
    }

    #[test]
    fn one_changed_weight_is_noticed(
        nodes in strictly_increasing(),
        index in any::<prop::sample::Index>(),
        change in prop::sample::select(vec![-1_i64, 1]),
    ) {
        let at = Rational::zero();
        let stencil = interior::weights(&nodes, &at, 1).expect("enough nodes");
        let mut weights = stencil.weights().to_vec();
        let place = index.index(weights.len());
        weights[place] += Rational::ratio(change, 1_000_000_007);
        let tampered = Stencil::new(nodes, at, 1, weights, stencil.order());
        let noticed = matches!(tampered, Err(StencilFault::Moment { .. }));
        prop_assert!(noticed);
    }
}

#[test]
fn every_row_of_every_first_derivative_is_exact_and_the_closure_not_further() {
    for order in ORDERS {
        let operator = closure::first_derivative(order).expect("offered").operator();
        assert_eq!((operator.interior_order(), operator.closure_order()), (order, Some(order / 2)));
        let nodes = operator.minimum_nodes() + 5;
        let closed = operator.closure().len();
        let mut closure_fails_beyond = false;
        for row in 0..nodes {
            let inside = row >= closed && row + closed < nodes;
            let reached = if inside { order } else { order / 2 };
            for degree in 0..=reached + 1 {
                let found = operator.apply(&monomial(nodes, row, degree)).expect("enough nodes")[row].clone();
                let exact = found == derivative_at_origin(1, degree);
                if degree <= reached {
                    assert!(exact, "order {order}, row {row}, degree {degree}");
                } else if inside {
                    assert!(!exact, "order {order}, row {row} is exact beyond its order");
                } else {
                    closure_fails_beyond |= !exact;
                }
            }
        }
        assert!(closure_fails_beyond, "order {order}: the closure is better than it says");
    }
}

#[test]
fn first_derivatives_sum_by_parts_on_any_size() {
    for order in ORDERS {
        let first = closure::first_derivative(order).expect("offered");
        for nodes in first.minimum_nodes()..first.minimum_nodes() + 12 {
            let quadratic = quadratic(first, nodes);
            for row in 0..nodes {
                for column in 0..nodes {
                    let found = &quadratic[(row, column)] + &quadratic[(column, row)];
                    let end = i64::from(row + 1 == nodes) - i64::from(row == 0);
                    let expected = if row == column { Rational::from(end) } else { Rational::zero() };
                    assert_eq!(found, expected, "order {order}, {nodes} nodes, entry {row}, {column}");
                }
            }
        }
    }
}

/// H D in full.
fn quadratic(first: &SummationByParts, nodes: usize) -> Matrix {
    let mut matrix = Matrix::zeros(nodes, nodes);
    for row in 0..nodes {
        let (start, weights) = first.operator().row(row, nodes).expect("enough nodes");
        for (column, weight) in (start..).zip(&weights) {
            let column = usize::try_from(column).expect("a closed operator stays on its nodes");
            matrix[(row, column)] = weight * first.norm().weight(row, nodes);
        }
    }
    matrix
}

#[test]
fn periodic_first_derivatives_are_antisymmetric() {
    for order in (2..=16).step_by(2) {
        let first = closure::periodic_first_derivative(order).expect("offered");
        let nodes = first.minimum_nodes() + 1;
        assert_eq!(nodes, order + 2);
        let wave: Vec<Rational> = (0..nodes).map(|node| integer(node * node * node % 17)).collect();
        let slope = first.operator().apply(&wave).expect("enough nodes");
        assert!(Rational::dot(&wave, &slope).is_zero(), "order {order}");
        assert!(slope.iter().any(|value| !value.is_zero()));
    }
}

/// H⁻¹(−M(xˢ)xᵗ + B b u_x) against (b u_x)_x for all monomials on every row: to the closure order near the
/// ends, to the interior order between.
#[test]
fn second_derivatives_are_exact_for_varying_coefficients() {
    for order in ORDERS {
        let form = closure::second_derivative(order).expect("offered");
        assert_eq!((form.interior_order(), form.closure_order()), (order, order / 2));
        let nodes = form.minimum_nodes() + order + 1;
        let rows: Vec<_> = (0..nodes).map(|row| form.row(row, nodes).expect("enough nodes")).collect();
        let closed = form.closure_rows().len();
        let mut fails_beyond = false;
        for s in 0..=order + 2 {
            for t in 1..=order + 2 - s {
                let (b, u) = (monomial(nodes, 0, s), monomial(nodes, 0, t));
                for (row, columns) in rows.iter().enumerate() {
                    let inside = row >= closed && row + closed < nodes;
                    let reached = if inside { order + 1 } else { order / 2 + 1 };
                    if s + t > reached && !inside {
                        continue;
                    }
                    let mut found: Rational = columns
                        .iter()
                        .map(|(column, weight)| {
                            let value: Rational =
                                weight.iter().map(|(node, factor)| factor * &b[*node]).sum();
                            value * &u[*column]
                        })
                        .sum();
                    let flux = integer(t) * integer(row).power((s + t - 1) as u32);
                    if row == 0 {
                        found -= &flux / form.norm().weight(row, nodes);
                    } else if row + 1 == nodes {
                        found += &flux / form.norm().weight(row, nodes);
                    }
                    let exact = match s + t {
                        1 => Rational::zero(),
                        total => integer(t * (total - 1)) * integer(row).power((total - 2) as u32),
                    };
                    if s + t <= reached {
                        assert_eq!(found, exact, "order {order}, row {row}, b = x^{s}, u = x^{t}");
                    } else {
                        fails_beyond |= found != exact;
                    }
                }
            }
        }
        assert!(fails_beyond, "order {order}: the interior is better than it says");
    }
}

/// M(b) = −H·(−H⁻¹M(b)) in full.
fn quadratic_form(form: &SecondDerivativeForm, coefficient: &[Rational]) -> Matrix {
    let mut matrix = form.matrix(coefficient).expect("enough nodes");
    for row in 0..matrix.rows() {
        let height = form.norm().weight(row, coefficient.len());
        for column in 0..matrix.columns() {
            matrix[(row, column)] = -(&matrix[(row, column)] * &height);
        }
    }
    matrix
}

/// M(b) from the squares alone.
fn from_squares(form: &SecondDerivativeForm, coefficient: &[Rational]) -> Matrix {
    let nodes = coefficient.len();
    let mut matrix = Matrix::zeros(nodes, nodes);
    for square in form.squares().terms(nodes).expect("enough nodes") {
        let weight: Rational = square.weight.iter().map(|(node, factor)| factor * &coefficient[*node]).sum();
        for (row, left) in &square.functional {
            for (column, right) in &square.functional {
                matrix[(*row, *column)] += &weight * left * right;
            }
        }
    }
    matrix
}

/// A reproducible sequence of small integers, some of them nought.
fn integers(count: usize, seed: u64) -> Vec<Rational> {
    let mut state = seed;
    (0..count)
        .map(|_| {
            state = state.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
            Rational::from(((state >> 33) % 10) as i64)
        })
        .collect()
}

#[test]
fn second_derivatives_are_semidefinite_sums_of_squares() {
    for order in ORDERS {
        let closed = closure::second_derivative(order).expect("offered");
        let periodic = closure::periodic_second_derivative(order).expect("offered");
        for (form, sizes) in [(closed, [closed.minimum_nodes(), 26]), (periodic, [order + 1, 20])] {
            for (seed, nodes) in sizes.into_iter().enumerate() {
                let coefficient = integers(nodes, seed as u64 + 7);
                let matrix = quadratic_form(form, &coefficient);
                assert_eq!(matrix, from_squares(form, &coefficient), "order {order}, {nodes} nodes");
                assert!(matrix.semidefinite_factors().is_ok(), "order {order}, {nodes} nodes");
                let constant = vec![Rational::one(); nodes];
                assert!(matrix.times_vector(&constant).iter().all(Rational::is_zero));
            }
        }
    }
}

/// The judge of the test above must be able to say no: one negative coefficient makes M(b) indefinite.
#[test]
fn a_negative_coefficient_is_seen_by_the_factors() {
    let form = closure::second_derivative(4).expect("offered");
    let mut coefficient = vec![Rational::one(); 14];
    coefficient[7] = Rational::from(-9);
    assert!(quadratic_form(form, &coefficient).semidefinite_factors().is_err());
}

#[test]
fn constant_rows_are_those_of_the_form() {
    for order in ORDERS {
        let form = closure::second_derivative(order).expect("offered");
        let nodes = form.minimum_nodes() + 3;
        let matrix = form.matrix(&vec![Rational::one(); nodes]).expect("enough nodes");
        let values = integers(nodes, 3);
        let applied = form.constant().apply(&values).expect("enough nodes");
        assert_eq!(applied, matrix.times_vector(&values), "order {order}");
        assert_eq!(form.constant().interior_order(), order);
    }
}

#[test]
fn a_tampered_first_derivative_is_refused() {
    let first = closure::first_derivative(4).expect("offered");
    let interior = interior::centred(1, 4).expect("offered");
    let rows = first.operator().closure().to_vec();
    let whole =
        DifferenceOperator::bounded(interior.clone(), 4, rows.clone(), 2).expect("the operator itself");
    let mut tampered = rows.clone();
    tampered[1].weights[0] += Rational::ratio(1, 1 << 40);
    let refused = DifferenceOperator::bounded(interior.clone(), 4, tampered, 2);
    assert!(matches!(refused, Err(OperatorFault::Row { row: 1, degree: 0, .. })));
    let claimed = DifferenceOperator::bounded(interior.clone(), 4, rows.clone(), 3);
    assert!(matches!(claimed, Err(OperatorFault::Row { .. })));
    let short = DifferenceOperator::bounded(interior.clone(), 4, rows[..1].to_vec(), 2);
    assert!(matches!(short, Err(OperatorFault::TooFewRows { given: 1, needed: 2 })));
    let mut norm = first.norm().left().to_vec();
    norm[0] += Rational::ratio(1, 100);
    norm[1] -= Rational::ratio(1, 100);
    let other_norm = Norm::bounded(norm).expect("still positive, of the same sum");
    assert!(matches!(SummationByParts::new(whole, other_norm), Err(SummationFault::Entry { .. })));
}

/// One-sided rows of full order are exact but do not sum by parts: exactness alone is not energy.
#[test]
fn one_sided_rows_do_not_sum_by_parts() {
    let interior = interior::centred(1, 4).expect("offered");
    let rows: Vec<ClosedRow> = (0..4)
        .map(|row| {
            let nodes: Vec<Rational> = (0..6).map(Rational::from).collect();
            let stencil = interior::weights(&nodes, &Rational::from(row), 1).expect("enough nodes");
            ClosedRow { first: 0, weights: stencil.weights().to_vec() }
        })
        .collect();
    let operator = DifferenceOperator::bounded(interior, 4, rows, 5).expect("exact rows");
    let norm = closure::first_derivative(4).expect("offered").norm().clone();
    assert!(matches!(SummationByParts::new(operator, norm), Err(SummationFault::Entry { .. })));
}

#[test]
fn a_tampered_second_derivative_is_refused() {
    let form = closure::second_derivative(4).expect("offered");
    let rebuilt = |squares: SumOfSquares, interior_order, closure_order| {
        SecondDerivativeForm::bounded(form.norm().clone(), squares, interior_order, closure_order)
    };
    assert!(rebuilt(form.squares().clone(), 4, 2).is_ok());
    let overstated = rebuilt(form.squares().clone(), 4, 3);
    assert!(matches!(overstated, Err(FormFault::NotExact { row: Some(_), .. })));
    assert!(matches!(rebuilt(form.squares().clone(), 2, 2), Err(FormFault::NotNarrow { distance: 2 })));

    let mut left = form.squares().left().to_vec();
    left[5].weight[0].1 += Rational::ratio(1, 1 << 40);
    let heavier = SumOfSquares::bounded(left, form.squares().repeated().to_vec()).expect("still squares");
    assert!(matches!(rebuilt(heavier, 4, 2), Err(FormFault::NotExact { row: Some(_), .. })));

    let mut left = form.squares().left().to_vec();
    left[5].weight[0].1 = Rational::ratio(-1, 1 << 40);
    let negative = SumOfSquares::bounded(left, form.squares().repeated().to_vec());
    assert!(matches!(negative, Err(SquaresFault::NegativeWeight { term: 5, .. })));

    let mut repeated = form.squares().repeated().to_vec();
    for (_, factor) in &mut repeated[1].weight {
        *factor += Rational::ratio(1, 100);
    }
    let wider = SumOfSquares::bounded(form.squares().left().to_vec(), repeated).expect("still squares");
    assert!(rebuilt(wider, 4, 2).is_err());
}

#[test]
fn orders_that_there_are_not_name_those_that_there_are() {
    let fault = closure::first_derivative(3).expect_err("there is no such order");
    let closure::ClosureFault::NotAvailable { order, available } = fault else {
        panic!("an order that is not offered gave another fault: {fault}");
    };
    assert_eq!((order, available), (3, vec![2, 4, 6, 8, 10, 12]));
    assert!(closure::second_derivative(0).is_err());
    assert!(closure::periodic_first_derivative(18).is_err());
}
