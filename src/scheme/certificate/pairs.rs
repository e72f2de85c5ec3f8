//! Lines of pairs of derivatives: staggered ones and biased ones.

use crate::exact::Rational;
use crate::scheme::{BiasedPair, ClosedRow, Direction, StaggeredPair};

use super::differences::{entry, interior, norm, row_moments, summation};
use super::squares::dissipation;
use super::{Line, Product, Subject};

pub(super) fn biased<'a>(fact: &'a BiasedPair) -> Box<dyn Iterator<Item = Line> + 'a> {
    let rows = |direction: Direction, whose: &'static str| {
        let rows = fact.closure_rows(direction).iter().enumerate();
        rows.flat_map(move |(index, row)| row_moments(whose, index, row, fact.closure_order()))
    };
    let lines = summation(fact.central())
        .chain(dissipation(fact.damping()))
        .chain(interior(fact.interior(), fact.interior_order()))
        .chain(rows(Direction::Forward, "forward "))
        .chain(rows(Direction::Backward, "backward "))
        .chain(biased_entries(fact));
    Box::new(lines)
}

/// hᵢ (D₊)ᵢⱼ + hⱼ (D₋)ⱼᵢ = Bᵢⱼ for all closed rows.
fn biased_entries<'a>(fact: &'a BiasedPair) -> impl Iterator<Item = Line> + 'a {
    let closed = fact.closure_rows(Direction::Forward).len();
    let nodes = fact.minimum_nodes() + fact.interior().nodes().len();
    let weight =
        move |direction: Direction, row: usize, column: usize| at(fact.row(direction, row, nodes), column);
    (0..closed).flat_map(move |row| {
        (0..nodes).filter_map(move |column| {
            let over = weight(Direction::Forward, row, column);
            let under = weight(Direction::Backward, column, row);
            if over.is_zero() && under.is_zero() {
                return None;
            }
            let height = |index: usize| fact.central().norm().weight(index, nodes);
            let products = vec![Product::pair(&height(row), &over), Product::pair(&height(column), &under)];
            let needed = Rational::from(if (row, column) == (0, 0) { -1 } else { 0 });
            Some(Line::sum(entry("H D₊ + (H D₋)ᵀ", "HD_++(HD_-)^T", row, column), products, needed))
        })
    })
}

pub(super) fn staggered<'a>(fact: &'a StaggeredPair) -> Box<dyn Iterator<Item = Line> + 'a> {
    let nodes = fact.node_rows().iter().enumerate();
    let halves = fact.half_rows().iter().enumerate();
    let lines = norm(fact.node_norm(), "h", Rational::ratio(1, 2))
        .chain(norm(fact.half_norm(), "g", Rational::zero()))
        .chain(staggered_interior(fact))
        .chain(nodes.flat_map(move |(index, row)| {
            let end_value = fact.node_norm().left().first().and_then(Rational::recip).filter(|_| index == 0);
            staggered_moments("node", 1, index, row, fact.closure_order(), end_value)
        }))
        .chain(halves.flat_map(move |(index, row)| {
            staggered_moments("half point", -1, index, row, fact.closure_order(), None)
        }))
        .chain(staggered_entries(fact));
    Box::new(lines)
}

/// Σ c_k ((k − 1/2)ᵐ − (1/2 − k)ᵐ) = δ(m, 1) up to the interior's order.
fn staggered_interior<'a>(fact: &'a StaggeredPair) -> impl Iterator<Item = Line> + 'a {
    (0..=fact.interior_order()).map(move |degree| {
        let products = fact
            .interior()
            .iter()
            .zip(1_i64..)
            .flat_map(|(weight, k)| {
                let distance = Rational::ratio(2 * k - 1, 2);
                [
                    Product(vec![(weight.clone(), 1), (distance.clone(), degree)]),
                    Product(vec![(-weight, 1), (-distance, degree)]),
                ]
            })
            .collect();
        let subject =
            Subject::new(format!("interior, degree {degree}"), format!("\\text{{interior}},\\ m={degree}"));
        Line::sum(subject, products, Rational::from(i64::from(degree == 1)))
    })
}

/// The moments of a closed row whose points lie `sides`/2 beyond their own count; the end value's −1/h₀ sees
/// degree nought alone.
fn staggered_moments<'a>(
    place: &'static str,
    sides: i64,
    index: usize,
    row: &'a ClosedRow,
    order: usize,
    end_value: Option<Rational>,
) -> impl Iterator<Item = Line> + 'a {
    (0..=order).map(move |degree| {
        let mut products: Vec<Product> = (row.first as i64..)
            .zip(&row.weights)
            .filter(|(_, weight)| !weight.is_zero())
            .map(|(point, weight)| {
                let distance = Rational::ratio(2 * (point - index as i64) + sides, 2);
                Product(vec![(weight.clone(), 1), (distance, degree)])
            })
            .collect();
        if let (0, Some(reciprocal)) = (degree, &end_value) {
            products.push(Product::new(&-reciprocal, &[]));
        }
        let subject = Subject::new(
            format!("{place} {index}, degree {degree}"),
            format!("\\text{{{place} }}{index},\\ m={degree}"),
        );
        Line::sum(subject, products, Rational::from(i64::from(degree == 1)))
    })
}

/// hᵢ (D₊)ᵢⱼ + gⱼ (D₋)ⱼᵢ = 0 without end values, wherever a closed row meets.
fn staggered_entries<'a>(fact: &'a StaggeredPair) -> impl Iterator<Item = Line> + 'a {
    let nodes = fact.minimum_nodes() + 2 * fact.interior().len();
    let halves = fact.halves(nodes);
    let (at_nodes, at_halves) = (fact.node_rows().len(), fact.half_rows().len());
    (0..at_nodes.max(at_halves + fact.interior().len())).flat_map(move |node| {
        (0..halves).filter_map(move |half| {
            let (over, under) = (at(fact.node_row(node, nodes), half), at(fact.half_row(half, nodes), node));
            let closed = node < at_nodes || half < at_halves;
            if !closed || (over.is_zero() && under.is_zero()) {
                return None;
            }
            let products = vec![
                Product::pair(&fact.node_norm().weight(node, nodes), &over),
                Product::pair(&fact.half_norm().weight(half, halves), &under),
            ];
            Some(Line::sum(entry("Q + (H_h D₋)ᵀ", "Q+(H_hD_-)^T", node, half), products, Rational::zero()))
        })
    })
}

/// The weight of a column in a row.
fn at(row: Option<(i64, Vec<Rational>)>, column: usize) -> Rational {
    let (first, weights) = row.unwrap_or_default();
    let place = usize::try_from(column as i64 - first).ok();
    place.and_then(|place| weights.get(place)).cloned().unwrap_or_else(Rational::zero)
}
