//! Staggered pairs against the reference derivation, and their properties.

use proptest::prelude::*;
use rimstone::discretize::interior::{NodeFamily, smallest};
use rimstone::discretize::{closure, interior};
use rimstone::exact::Rational;
use rimstone::scheme::{
    ClosedRow, Norm, NormFault, RowPlace, StaggeredClosure, StaggeredFault, StaggeredPair, Stencil,
};

use super::tables::STAGGERED_PAIRS;
use super::{coefficients, list};

fn row_on(row: &ClosedRow, columns: usize) -> Vec<Rational> {
    let mut full = vec![Rational::zero(); columns.max(row.end())];
    full[row.first..row.end()].clone_from_slice(&row.weights);
    full.truncate(columns);
    full
}

#[test]
fn pairs_of_orders_two_to_eight() {
    for table in STAGGERED_PAIRS {
        let pair = closure::staggered_pair(table.order).expect("offered");
        assert_eq!(pair.node_norm().left(), list(table.node_norm), "order {}", table.order);
        assert_eq!(pair.half_norm().left(), list(table.half_norm), "order {}", table.order);
        let halves = pair.half_norm().left().len();
        for ((quoted, row), height) in table.corner.iter().zip(pair.node_rows()).zip(pair.node_norm().left())
        {
            let found: Vec<Rational> = row_on(row, halves).iter().map(|weight| weight * height).collect();
            assert_eq!(found, list(quoted), "order {}", table.order);
        }
    }
}

/// Reference derivation: the least number of intervals is max(2 bn − 1, 2 bh).
#[test]
fn least_numbers_of_nodes() {
    for (order, intervals) in [(2, 2), (4, 8), (6, 11), (8, 17)] {
        let pair = closure::staggered_pair(order).expect("offered");
        // Order 8 closes 9 rows at nodes and 8 at half points: 17 intervals are 18 nodes.
        assert_eq!(pair.minimum_nodes(), intervals + 1, "order {order}");
        assert_eq!(pair.node_row(0, intervals), None);
    }
}

/// The interior weights of order 4: 9/8, −1/24 (Fornberg 1988, from memory).
#[test]
fn interior_weights() {
    let pair = closure::periodic_staggered_pair(4).expect("offered");
    assert_eq!(pair.interior(), list("9/8 -1/24"));
    assert_eq!(pair.node_row(3, 8), Some((1, list("1/24 -9/8 9/8 -1/24"))));
    assert_eq!(pair.half_row(3, 8), Some((2, list("1/24 -9/8 9/8 -1/24"))));
}

/// Half points of an axis of `nodes` nodes.
fn half_points(nodes: usize) -> Vec<Rational> {
    (0..nodes as i64 - 1).map(|half| Rational::ratio(2 * half + 1, 2)).collect()
}

fn nodes_of(nodes: usize) -> Vec<Rational> {
    (0..nodes as i64).map(Rational::from).collect()
}

fn applied(row: Option<(i64, Vec<Rational>)>, values: &[Rational]) -> Rational {
    let (first, weights) = row.expect("enough nodes");
    weights.iter().zip(&values[first as usize..]).map(|(weight, value)| weight * value).sum()
}

fn powers(points: &[Rational], about: &Rational, degree: usize) -> Vec<Rational> {
    points.iter().map(|point| (point - about).power(degree as u32)).collect()
}

/// The first degree on which D₊ (with exact end values) or D₋ fails at a point.
fn first_failing(pair: &StaggeredPair, place: RowPlace, nodes: usize) -> Option<usize> {
    let (halves, on_nodes) = (half_points(nodes), nodes_of(nodes));
    (0..20).find(|&degree| {
        let found = match place {
            RowPlace::Half(half) => {
                applied(pair.half_row(half, nodes), &powers(&on_nodes, &halves[half], degree))
            }
            RowPlace::Node(node) => {
                let about = &on_nodes[node];
                let inside = applied(pair.node_row(node, nodes), &powers(&halves, about, degree));
                let height = pair.node_norm().weight(node, nodes);
                // (x − x₀)ᵈ at the end itself.
                let end = Rational::from(i64::from(degree == 0)) / height;
                if node == 0 {
                    inside - end
                } else if node + 1 == nodes {
                    inside + end
                } else {
                    inside
                }
            }
        };
        found != Rational::from(i64::from(degree == 1))
    })
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(12))]

    /// Closed rows are exact up to degree p, interior ones up to 2p and no further; of the closed rows at
    /// least one stops at p.
    #[test]
    fn rows_are_exact_to_their_degree_and_not_further(half in 1_usize..=4, more in 0_usize..5) {
        let order = 2 * half;
        let pair = closure::staggered_pair(order).expect("offered");
        let nodes = pair.minimum_nodes() + more;
        let at_nodes = (0..nodes).map(RowPlace::Node);
        let at_halves = (0..nodes - 1).map(RowPlace::Half);
        let mut stops = false;
        for place in at_nodes.chain(at_halves) {
            let closed = match place {
                RowPlace::Node(node) => node.min(nodes - 1 - node) < pair.node_rows().len(),
                RowPlace::Half(half) => half.min(nodes - 2 - half) < pair.half_rows().len(),
            };
            let first = first_failing(pair, place, nodes).expect("no row is exact for all powers");
            if closed {
                prop_assert!(first > half, "{} of {} nodes fails at {}", place, nodes, first);
                stops |= first == half + 1;
            } else {
                prop_assert_eq!(first, order + 1);
            }
        }
        // The one-row closure of order 2 loses nothing at half points, but at the end nodes it does.
        prop_assert!(stops);
    }

    /// pᵀH_n D₊v + vᵀH_h D₋p is the flux through the ends, whatever p, v and the end values are.
    #[test]
    fn pairs_integrate_by_parts(half in 1_usize..=4, more in 0_usize..6, seed in 0_usize..99) {
        let pair = closure::staggered_pair(2 * half).expect("offered");
        let nodes = pair.minimum_nodes() + more;
        let (p, v) = (coefficients(nodes, seed), coefficients(nodes - 1, seed + 1));
        let ends = coefficients(2, seed + 2);
        let mut energy = Rational::zero();
        for (node, value) in p.iter().enumerate() {
            let height = pair.node_norm().weight(node, nodes);
            let mut rate = applied(pair.node_row(node, nodes), &v);
            if node == 0 {
                rate -= &ends[0] / &height;
            }
            if node + 1 == nodes {
                rate += &ends[1] / &height;
            }
            energy += value * height * rate;
        }
        for (index, value) in v.iter().enumerate() {
            let height = pair.half_norm().weight(index, nodes - 1);
            energy += value * height * applied(pair.half_row(index, nodes), &p);
        }
        prop_assert_eq!(energy, &p[nodes - 1] * &ends[1] - &p[0] * &ends[0]);
    }
}

fn halfway(order: usize) -> Stencil {
    smallest(NodeFamily::Halfway, &Rational::zero(), 1, order).expect("offered")
}

fn parts(pair: &StaggeredPair) -> StaggeredClosure {
    StaggeredClosure {
        order: pair.closure_order(),
        node_norm: pair.node_norm().clone(),
        half_norm: pair.half_norm().clone(),
        node_rows: pair.node_rows().to_vec(),
        half_rows: pair.half_rows().to_vec(),
    }
}

#[test]
fn what_is_no_pair_is_refused() {
    let pair = closure::staggered_pair(4).expect("offered");
    let rebuilt = |closure| StaggeredPair::bounded(&halfway(4), 4, closure);
    assert_eq!(rebuilt(parts(pair)).as_ref(), Ok(pair));

    let change = Rational::ratio(1, 1 << 40);
    let mut tampered = parts(pair);
    tampered.node_rows[0].weights[1] += &change;
    assert!(matches!(
        rebuilt(tampered),
        Err(StaggeredFault::Row { place: RowPlace::Node(0), degree: 0, .. })
    ));
    let mut tampered = parts(pair);
    tampered.half_rows[2].weights[1] += &change;
    assert!(matches!(
        rebuilt(tampered),
        Err(StaggeredFault::Row { place: RowPlace::Half(2), degree: 0, .. })
    ));

    // Exact rows that do not integrate by parts: a third difference added in one direction alone.
    let mut tampered = parts(pair);
    for (weight, factor) in tampered.half_rows[1].weights.iter_mut().zip([-1, 3, -3, 1]) {
        *weight += Rational::ratio(factor, 1 << 20);
    }
    assert!(matches!(rebuilt(tampered), Err(StaggeredFault::Entry { half: 1, .. })));

    let overstated = StaggeredClosure { order: 3, ..parts(pair) };
    assert!(matches!(rebuilt(overstated), Err(StaggeredFault::Row { degree: 3, .. })));
    let mut short = parts(pair);
    short.node_rows.pop();
    assert_eq!(rebuilt(short), Err(StaggeredFault::ClosuresDiffer { rows: 2, norm: 3 }));
    let mut none = parts(pair);
    (none.node_norm, none.node_rows) = (Norm::periodic(), Vec::new());
    assert_eq!(rebuilt(none), Err(StaggeredFault::TooFewRows { given: 0, needed: 2 }));
    let centred = interior::centred(1, 4).expect("offered");
    let fault = StaggeredPair::bounded(&centred, 4, parts(pair));
    assert_eq!(fault, Err(StaggeredFault::NotHalfway));
    let claimed = StaggeredPair::periodic(&halfway(4), 6);
    assert_eq!(claimed, Err(StaggeredFault::InteriorOrder { found: 4, claimed: 6 }));
    let total = Norm::halfway(list("79/72 5/6 13/12 70/72"));
    assert!(matches!(total, Err(NormFault::WrongTotal { .. })));
    assert!(closure::staggered_pair(10).is_err());
}
