//! One-sided ends, reflected ends, and tables that the user gives.

use proptest::prelude::*;
use rimstone::discretize::given::{GivenEnds, GivenFault, GivenWeights};
use rimstone::discretize::one_sided::{mirrored, one_sided, one_sided_with};
use rimstone::discretize::{closure, interior};
use rimstone::exact::{Rational, factorial};
use rimstone::scheme::{DifferenceOperator, EndRows, Extension, OperatorFault, StencilFault};

use super::{list, monomial};

/// The degree of the first monomial about `row` on which the row is not the derivative.
fn first_failing(operator: &DifferenceOperator, row: usize, nodes: usize) -> Option<usize> {
    (0..30).find(|&degree| {
        let found = operator.apply(&monomial(nodes, row, degree)).expect("enough nodes")[row].clone();
        let exact = if degree == operator.derivative() { factorial(degree) } else { Rational::zero() };
        found != exact
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    #[test]
    fn one_sided_rows_keep_the_order_and_no_more(derivative in 1_usize..=2, half in 1_usize..=5) {
        let order = 2 * half;
        let operator = one_sided(derivative, order).expect("offered");
        prop_assert_eq!(operator.closure_order(), Some(order));
        let nodes = operator.minimum_nodes() + 3;
        for row in 0..nodes {
            prop_assert_eq!(first_failing(&operator, row, nodes), Some(derivative + order), "row {}", row);
        }
    }

    /// On functions with the extension the ends lose nothing: all powers of their parity up to the interior's
    /// last, and not the next.
    #[test]
    fn reflected_ends_lose_no_order(derivative in 1_usize..=4, half in 1_usize..=6, odd in any::<bool>()) {
        let extension = if odd { Extension::Odd } else { Extension::Even };
        let operator = mirrored(derivative, 2 * half, extension).expect("offered");
        prop_assert_eq!(operator.end_rows(), Some(&EndRows::Mirrored(extension)));
        let nodes = operator.minimum_nodes() + 2;
        let closed = operator.closure().len();
        for row in 0..closed {
            let mut next = None;
            for degree in (usize::from(odd)..derivative + 2 * half + 6).step_by(2) {
                let found = operator.apply(&monomial(nodes, 0, degree)).expect("enough nodes")[row].clone();
                let exact = match degree.checked_sub(derivative) {
                    None => Rational::zero(),
                    Some(left) => {
                        factorial(degree) / factorial(left) * Rational::from(row as i64).power(left as u32)
                    }
                };
                if found != exact {
                    next = Some(degree);
                    break;
                }
            }
            // Where the derivative is odd about the end, symmetry makes row nought exact for all powers.
            if row == 0 && (derivative % 2 == 1) != odd {
                prop_assert_eq!(next, None);
            } else {
                // The first power of the parity that the interior's order does not cover and that does not
                // vanish by symmetry: at row nought the derivative's own parity decides, elsewhere any does.
                let next = next.expect("the weights are no exact derivative");
                prop_assert!(next >= derivative + 2 * half && next <= derivative + 2 * half + 1, "row {}", row);
            }
        }
        // The right end is the mirror image: reflecting a function reflects the result, with its sign.
        let values: Vec<Rational> = (0..nodes as i64).map(|node| Rational::from(node * node * node - 5 * node)).collect();
        let reversed: Vec<Rational> = values.iter().rev().cloned().collect();
        let one = operator.apply(&values).expect("enough nodes");
        let mut other = operator.apply(&reversed).expect("enough nodes");
        other.reverse();
        let sign = Rational::from(if derivative % 2 == 1 { -1 } else { 1 });
        let signed: Vec<Rational> = other.iter().map(|value| value * &sign).collect();
        prop_assert_eq!(one, signed);
    }
}

/// B. Fornberg, Math. Comp. 51 (1988) 699-706, table 3 (from memory).
#[test]
fn one_sided_rows_of_order_four() {
    let operator = one_sided(1, 4).expect("offered");
    assert_eq!(operator.closure()[0].weights, list("-25/12 4 -3 4/3 -1/4"));
    assert_eq!(operator.closure()[1].weights, list("-1/4 -5/6 3/2 -1/2 1/12"));
    assert_eq!(operator.closure().len(), 2);
}

#[test]
fn ends_of_another_order_are_what_they_say() {
    let operator = one_sided_with(1, 6, 4).expect("offered");
    assert_eq!((operator.interior_order(), operator.closure_order()), (6, Some(4)));
    let nodes = operator.minimum_nodes() + 4;
    assert_eq!(first_failing(&operator, 0, nodes), Some(5));
    assert!(one_sided(1, 5).is_err());
    assert!(one_sided(5, 4).is_err());
    assert!(one_sided_with(1, 4, 1000).is_err());
}

/// Heat in a rod whose ends are insulated (even) or held at nought (odd): the usual weights (common practice).
#[test]
fn reflected_second_differences() {
    let even = mirrored(2, 2, Extension::Even).expect("offered");
    assert_eq!(even.closure()[0].weights, list("-2 2"));
    let odd = mirrored(2, 4, Extension::Odd).expect("offered");
    assert_eq!(odd.closure()[1].weights, list("0 -29/12 4/3 -1/12"));
}

fn table() -> GivenWeights {
    let operator = closure::first_derivative(4).expect("offered").operator();
    GivenWeights {
        derivative: 1,
        interior_order: 4,
        interior: (-2..).zip(list("1/12 -2/3 0 2/3 -1/12")).collect(),
        ends: Some(GivenEnds { order: 2, rows: operator.closure().to_vec() }),
    }
}

#[test]
fn a_true_table_is_taken() {
    let derived = closure::first_derivative(4).expect("offered").operator();
    assert_eq!(table().operator().as_ref(), Ok(derived));
    let periodic = GivenWeights { ends: None, ..table() }.operator().expect("true");
    assert!(periodic.is_periodic());
    assert_eq!(periodic.interior(), &interior::centred(1, 4).expect("offered"));
}

#[test]
fn an_untrue_table_is_refused() {
    let mut wrong = table();
    wrong.interior[4].1 = Rational::ratio(1, 12);
    assert!(matches!(wrong.operator(), Err(GivenFault::Interior(StencilFault::Moment { degree: 0, .. }))));
    let overstated = GivenWeights { interior_order: 6, ..table() }.operator();
    assert!(matches!(overstated, Err(GivenFault::Interior(StencilFault::Moment { degree: 5, .. }))));
    let mut ends = table();
    if let Some(given) = &mut ends.ends {
        given.rows[3].weights[0] += Rational::ratio(1, 1 << 50);
    }
    let fault = ends.operator();
    assert!(matches!(fault, Err(GivenFault::Operator(OperatorFault::Row { row: 3, degree: 0, .. }))));
    let upwind = GivenWeights {
        interior_order: 1,
        interior: vec![(-1, Rational::from(-1)), (0, Rational::one())],
        ..table()
    };
    assert_eq!(upwind.operator(), Err(GivenFault::Operator(OperatorFault::NotMirrorable)));
    let nothing = GivenWeights { interior: Vec::new(), ..table() };
    assert_eq!(nothing.operator(), Err(GivenFault::Interior(StencilFault::NoNodes)));
    let far = GivenWeights { interior: vec![(i64::MIN, Rational::one())], ..table() };
    assert!(matches!(far.operator(), Err(GivenFault::TooLarge { .. })));
    let high = GivenWeights { interior_order: usize::MAX, ..table() };
    assert!(matches!(high.operator(), Err(GivenFault::TooLarge { .. })));
}

/// Folding is checked, not believed: an even fold of an operator is no odd one.
#[test]
fn a_reflection_with_too_high_an_order_is_refused() {
    let stencil = interior::centred(2, 4).expect("offered");
    assert!(DifferenceOperator::mirrored(stencil.clone(), 4, Extension::Even).is_ok());
    let overstated = DifferenceOperator::mirrored(stencil, 6, Extension::Even);
    assert!(matches!(overstated, Err(OperatorFault::InteriorOrder { found: 4, claimed: 6 })));
    let biased = interior::smallest(interior::NodeFamily::Biased { left: 1 }, &Rational::zero(), 1, 3)
        .expect("offered");
    let fault = DifferenceOperator::mirrored(biased, 3, Extension::Even);
    assert_eq!(fault, Err(OperatorFault::NotMirrorable));
}
