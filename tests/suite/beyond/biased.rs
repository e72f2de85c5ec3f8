//! Biased pairs against the reference derivation, and their properties.

use proptest::prelude::*;
use rimstone::discretize::closure;
use rimstone::exact::Rational;
use rimstone::scheme::{BiasedFault, BiasedPair, Direction, StencilFault};

use super::tables::BIASED_PAIRS;
use super::{coefficients, list, monomial, read};

#[test]
fn pairs_of_orders_one_to_eight() {
    for table in BIASED_PAIRS {
        let pair = closure::biased_pair(table.order).expect("offered");
        let order = table.order;
        assert_eq!(pair.interior().weights(), list(table.forward), "order {order}");
        assert_eq!(pair.interior_order(), order);
        assert_eq!(pair.damping().annihilated(), table.differences, "order {order}");
        let decay = read(table.sigma) * Rational::from(4).power(table.differences as u32);
        assert_eq!(pair.damping().strength(), &decay, "order {order}");
        assert_eq!(pair.central().norm().left(), list(table.norm), "order {order}");
        for (index, quoted) in table.corner.iter().enumerate() {
            let quoted = list(quoted);
            let nodes = pair.minimum_nodes() + quoted.len();
            let height = pair.central().norm().weight(index, nodes);
            let (first, weights) = pair.central().operator().row(index, nodes).expect("enough nodes");
            let mut found = vec![Rational::zero(); quoted.len()];
            for (column, weight) in (first as usize..).zip(&weights) {
                found[column] = weight * &height;
            }
            assert_eq!(found, quoted, "order {order}, row {index}");
        }
    }
}

/// D₊ has the nodes −(p − 1) … p at order 2p − 1 and −(p − 1) … p + 1 at order 2p.
#[test]
fn interiors_use_no_further_nodes() {
    for order in closure::biased_orders() {
        for pair in [closure::biased_pair(order), closure::periodic_biased_pair(order)] {
            let offsets = pair.expect("offered").interior().integer_offsets().expect("whole distances");
            let half = order.div_ceil(2) as i64;
            let last = order as i64 / 2 + 1;
            assert_eq!((offsets.first(), offsets.last()), (Some(&(1 - half)), Some(&last)), "order {order}");
        }
    }
}

/// Reference derivation: least intervals 1, 7, 11, 15 for odd orders and 3, 7, 11, 15 for even ones.
#[test]
fn least_numbers_of_nodes() {
    for (order, nodes) in (1..=8).zip([2, 4, 8, 8, 12, 12, 16, 16]) {
        assert_eq!(closure::biased_pair(order).expect("offered").minimum_nodes(), nodes, "order {order}");
    }
}

fn applied(pair: &BiasedPair, direction: Direction, index: usize, values: &[Rational]) -> Rational {
    let (first, weights) = pair.row(direction, index, values.len()).expect("enough nodes");
    weights.iter().zip(&values[first as usize..]).map(|(weight, value)| weight * value).sum()
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    /// Interiors reach their order and no more; the rows that S closes stop at its closure order: p at order
    /// 2p, p − 1 at 2p − 1.
    #[test]
    fn rows_are_exact_to_their_degree_and_not_further(order in 1_usize..=8, more in 0_usize..4) {
        let pair = closure::biased_pair(order).expect("offered");
        prop_assert_eq!(pair.closure_order(), order / 2);
        let nodes = pair.minimum_nodes() + 2 + more;
        let closed = pair.closure_rows(Direction::Forward).len();
        for direction in [Direction::Forward, Direction::Backward] {
            for row in 0..nodes {
                let first = (0..=order + 1)
                    .find(|&degree| {
                        let found = applied(pair, direction, row, &monomial(nodes, row, degree));
                        found != Rational::from(i64::from(degree == 1))
                    })
                    .expect("no row is exact beyond the interior's order");
                let from_end = row.min(nodes - 1 - row);
                if from_end >= closed {
                    prop_assert_eq!(first, order + 1, "row {}", row);
                } else if from_end < order / 2 {
                    prop_assert_eq!(first, order / 2 + 1, "row {} {}", row, direction);
                } else {
                    prop_assert!(first > order / 2, "row {} {}", row, direction);
                }
            }
        }
    }

    /// uᵀH D₊v + vᵀH D₋u is the flux through the ends, and uᵀH D₊u is it halved less a sum of squares.
    #[test]
    fn pairs_integrate_by_parts_and_lose_energy(order in 1_usize..=8, seed in 0_usize..99) {
        let pair = closure::biased_pair(order).expect("offered");
        let nodes = pair.minimum_nodes() + 3;
        let (u, v) = (coefficients(nodes, seed), coefficients(nodes, seed + 5));
        let (mut both, mut forward) = (Rational::zero(), Rational::zero());
        for row in 0..nodes {
            let height = pair.central().norm().weight(row, nodes);
            both += &height * &u[row] * applied(pair, Direction::Forward, row, &v);
            both += &height * &v[row] * applied(pair, Direction::Backward, row, &u);
            forward += &height * &u[row] * applied(pair, Direction::Forward, row, &u);
        }
        prop_assert_eq!(both, &u[nodes - 1] * &v[nodes - 1] - &u[0] * &v[0]);
        let flux = (u[nodes - 1].power(2) - u[0].power(2)) * Rational::ratio(1, 2);
        let mut squares = Rational::zero();
        for square in pair.damping().squares().terms(nodes).expect("enough nodes") {
            let value: Rational = square.functional.iter().map(|(node, factor)| factor * &u[*node]).sum();
            let weight: Rational = square.weight.iter().map(|(_, factor)| factor).sum();
            squares += weight * value.power(2);
        }
        prop_assert!(squares.is_positive());
        prop_assert_eq!(forward, flux - squares);
    }
}

#[test]
fn directions_mirror_each_other() {
    for order in [3, 4] {
        let pair = closure::biased_pair(order).expect("offered");
        let nodes = pair.minimum_nodes() + 3;
        let values = coefficients(nodes, 4);
        let reversed: Vec<Rational> = values.iter().rev().cloned().collect();
        for row in 0..nodes {
            let forward = applied(pair, Direction::Forward, row, &values);
            let backward = applied(pair, Direction::Backward, nodes - 1 - row, &reversed);
            assert_eq!(forward, -backward, "order {order}, row {row}");
        }
    }
}

#[test]
fn what_is_no_pair_is_refused() {
    let pair = closure::biased_pair(4).expect("offered");
    let (central, damping) = (pair.central().clone(), pair.damping().clone());
    let rebuilt = |damping, interior, closure| BiasedPair::new(central.clone(), damping, interior, closure);
    assert_eq!(rebuilt(damping.clone(), 4, 2).as_ref(), Ok(pair));
    let overstated = rebuilt(damping.clone(), 4, 3);
    assert!(matches!(overstated, Err(BiasedFault::Row { row: 0, degree: 3, .. })));
    let interior = rebuilt(damping, 5, 2);
    assert!(matches!(interior, Err(BiasedFault::Interior(StencilFault::Moment { degree: 5, .. }))));

    // Odd order 3 with its closure order claimed one too high: impossible for any such pair.
    let odd = closure::biased_pair(3).expect("offered");
    let claimed = BiasedPair::new(odd.central().clone(), odd.damping().clone(), 3, 2);
    assert!(matches!(claimed, Err(BiasedFault::Row { row: 0, degree: 2, .. })));
    let other_norm = BiasedPair::new(odd.central().clone(), pair.damping().clone(), 3, 1);
    assert_eq!(other_norm, Err(BiasedFault::NormsDiffer));

    // Damping that sees degree one spoils the rows; damping of another strength spoils nothing but the order.
    let norm = central.norm().clone();
    let low = closure::dissipation_with(&norm, 1, &Rational::one()).expect("a dissipation");
    assert!(matches!(rebuilt(low, 2, 2), Err(BiasedFault::Interior(_) | BiasedFault::Row { .. })));
    let wide = closure::dissipation_with(&norm, 3, &Rational::ratio(1, 3)).expect("a dissipation");
    assert_eq!(rebuilt(wide, 4, 2).map(|pair| pair.interior().nodes().len()), Ok(7));
    assert!(closure::biased_pair(9).is_err());
    assert!(closure::biased_pair(0).is_err());
}
