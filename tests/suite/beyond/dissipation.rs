//! Dissipation: what it leaves alone, what it damps and how fast, and that it gives no energy.

use proptest::prelude::*;
use rimstone::discretize::closure;
use rimstone::exact::{Matrix, Rational};
use rimstone::scheme::{Dissipation, DissipationFault, RepeatedSquare, SquaresFault, SumOfSquares};

use super::{coefficients, monomial};

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    /// Degrees below k = p + 1 vanish for every b. For b = 1 no closed row below k vanishes on degree k; the
    /// interior goes on to 2k − 1 and no further.
    #[test]
    fn rows_vanish_below_their_degree_and_no_further(half in 1_usize..=6, seed in 0_usize..50) {
        let form = closure::dissipation(2 * half).expect("offered");
        let k = half + 1;
        prop_assert_eq!(form.annihilated(), k);
        let nodes = form.minimum_nodes() + 2 * k + 1;
        let varying = form.matrix(&coefficients(nodes, seed)).expect("enough nodes");
        let constant = form.matrix(&vec![Rational::one(); nodes]).expect("enough nodes");
        let closed = form.closure_rows().len();
        for row in 0..nodes {
            for degree in 0..k {
                let value = Rational::dot(varying.row(row), &monomial(nodes, row, degree));
                prop_assert!(value.is_zero(), "row {}, degree {}", row, degree);
            }
            let first_failing = (0..=2 * k)
                .find(|&degree| !Rational::dot(constant.row(row), &monomial(nodes, row, degree)).is_zero());
            let from_end = row.min(nodes - 1 - row);
            if from_end < k {
                prop_assert_eq!(first_failing, Some(k), "row {}", row);
            } else if from_end >= closed {
                prop_assert_eq!(first_failing, Some(2 * k), "row {}", row);
            }
        }
    }
}

/// H A in full, with the sign turned.
fn energy(form: &Dissipation, coefficient: &[Rational]) -> Matrix {
    let nodes = coefficient.len();
    let mut matrix = form.matrix(coefficient).expect("enough nodes");
    for row in 0..nodes {
        let height = -form.norm().weight(row, nodes);
        for column in 0..nodes {
            matrix[(row, column)] = &matrix[(row, column)] * &height;
        }
    }
    matrix
}

#[test]
fn energy_is_only_lost() {
    for order in [2, 4, 6, 8] {
        let closed = closure::dissipation(order).expect("offered");
        let periodic = closure::periodic_dissipation(order).expect("offered");
        for form in [closed, periodic] {
            for nodes in [form.minimum_nodes(), form.minimum_nodes() + 5] {
                let matrix = energy(form, &coefficients(nodes, order));
                assert!(matrix.semidefinite_factors().is_ok(), "order {order}, {nodes} nodes");
            }
        }
        // The judge can say no.
        let mut negative = vec![Rational::one(); closed.minimum_nodes() + 5];
        negative[order / 2] = Rational::from(-100);
        assert!(energy(closed, &negative).semidefinite_factors().is_err());
    }
}

/// The symbol is −sin²ᵏ(θ/2) (numerics of dissipation, from the definition): at θ = π, 2π/3 and π/2 its
/// cosines and it are rational.
#[test]
fn the_symbol_is_a_power_of_the_sine() {
    for order in [2, 4, 6, 8, 10, 12] {
        let form = closure::periodic_dissipation(order).expect("offered");
        let k = order as u32 / 2 + 1;
        let half = Rational::ratio(1, 2);
        let waves = [
            (vec![Rational::one(), Rational::from(-1)], Rational::one()),
            (vec![Rational::one(), -&half, -&half], Rational::ratio(3, 4)),
            (vec![Rational::one(), Rational::zero(), Rational::from(-1), Rational::zero()], half),
        ];
        for (wave, sine_squared) in waves {
            let nodes = 24;
            let values: Vec<Rational> = (0..nodes).map(|node| wave[node % wave.len()].clone()).collect();
            let matrix = form.matrix(&vec![Rational::one(); nodes]).expect("enough nodes");
            let damped: Vec<Rational> = values.iter().map(|value| -(value * sine_squared.power(k))).collect();
            assert_eq!(matrix.times_vector(&values), damped, "order {order}");
        }
    }
}

#[test]
fn constant_rows_are_those_of_the_form() {
    let form = closure::dissipation(6).expect("offered");
    let nodes = form.minimum_nodes() + 9;
    let matrix = form.matrix(&vec![Rational::one(); nodes]).expect("enough nodes");
    let constant = form.constant();
    for (row, closed) in constant.closure.iter().enumerate() {
        let mut full = vec![Rational::zero(); nodes];
        full[closed.first..closed.end()].clone_from_slice(&closed.weights);
        assert_eq!(matrix.row(row), full);
    }
    // Δ₄ᵀΔ₄/4⁴: binomial coefficients of 8 with alternating signs.
    let expected: Vec<Rational> =
        [-70, 56, -28, 8, -1].map(|weight: i64| Rational::ratio(weight, 256)).to_vec();
    assert_eq!(constant.interior, expected);
    assert_eq!(form.minimum_nodes() / 2, constant.closure.len());
}

#[test]
fn what_is_no_dissipation_is_refused() {
    let norm = closure::first_derivative(4).expect("offered").norm().clone();
    let whole = closure::dissipation(4).expect("offered");
    let rebuilt = |squares: SumOfSquares, annihilated, strength| {
        Dissipation::bounded(norm.clone(), squares, annihilated, strength)
    };
    let squares = whole.squares().clone();
    assert_eq!(rebuilt(squares.clone(), 3, Rational::one()).as_ref(), Ok(whole));
    let overstated = rebuilt(squares.clone(), 4, Rational::one());
    assert_eq!(overstated, Err(DissipationFault::NotAnnihilated { term: 0, degree: 3 }));
    let weaker = rebuilt(squares, 3, Rational::ratio(1, 2));
    assert_eq!(weaker, Err(DissipationFault::Strength { found: Box::new(Rational::one()) }));

    let mut square: RepeatedSquare = whole.squares().repeated()[0].clone();
    let change = Rational::ratio(1, 1 << 40);
    square.functional[1].1 += &change;
    square.functional[2].1 -= &change;
    let skew = SumOfSquares::bounded(Vec::new(), vec![square]).expect("still squares");
    assert!(matches!(
        rebuilt(skew, 3, Rational::one()),
        Err(DissipationFault::NotAnnihilated { term: 0, degree: 1 })
    ));
    let periodic = closure::periodic_dissipation(4).expect("offered").squares().clone();
    assert_eq!(rebuilt(periodic, 3, Rational::one()), Err(DissipationFault::EndsDiffer));

    let negative = closure::dissipation_with(&norm, 3, &Rational::from(-1));
    let closure::ClosureFault::Derivation(closure::Impossible::Squares(fault)) =
        negative.expect_err("it would give energy")
    else {
        panic!("the sign of a strength gave another fault");
    };
    assert!(matches!(fault, SquaresFault::NegativeWeight { .. }));
    assert!(closure::dissipation_with(&norm, 0, &Rational::one()).is_err());
}
