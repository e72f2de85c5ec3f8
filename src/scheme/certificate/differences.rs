//! Lines about norms and constant rows, and those of [`SummationByParts`].

use crate::exact::{Rational, factorial};
use crate::scheme::{ClosedRow, Norm, Stencil, SummationByParts};

use super::{Line, Product, Subject};

pub(super) fn summation<'a>(fact: &'a SummationByParts) -> Box<dyn Iterator<Item = Line> + 'a> {
    let operator = fact.operator();
    let order = operator.closure_order().unwrap_or(0);
    let rows = operator
        .closure()
        .iter()
        .enumerate()
        .flat_map(move |(index, row)| row_moments("", index, row, order));
    let lines = norm(fact.norm(), "h", Rational::ratio(1, 2))
        .chain(interior(operator.interior(), operator.interior_order()))
        .chain(rows)
        .chain(entries(fact));
    Box::new(lines)
}

/// hᵢ > 0, and the sum of the closed weights: their number less `missing`.
pub(super) fn norm<'a>(
    norm: &'a Norm,
    name: &'static str,
    missing: Rational,
) -> impl Iterator<Item = Line> + 'a {
    let left = norm.left();
    let positive = left.iter().enumerate().map(move |(index, weight)| {
        Line::positive(Subject::new(format!("{name}[{index}]"), format!("{name}_{{{index}}}")), weight)
    });
    let total = (!left.is_empty()).then(|| {
        let subject = Subject::new(
            format!("sum of {name}[0] … {name}[{}]", left.len() - 1),
            format!("\\sum_{{i=0}}^{{{}}} {name}_i", left.len() - 1),
        );
        let products = left.iter().map(|weight| Product::new(weight, &[])).collect();
        Line::sum(subject, products, Rational::from(left.len() as i64) - missing)
    });
    positive.chain(total)
}

/// The moments of an interior stencil up to its order.
pub(super) fn interior<'a>(stencil: &'a Stencil, order: usize) -> impl Iterator<Item = Line> + 'a {
    (0..stencil.derivative() + order).map(move |degree| {
        let products = stencil
            .nodes()
            .iter()
            .zip(stencil.weights())
            .filter(|(_, weight)| !weight.is_zero())
            .map(|(node, weight)| Product(vec![(weight.clone(), 1), (node - stencil.at(), degree)]))
            .collect();
        let needed = if degree == stencil.derivative() { factorial(degree) } else { Rational::zero() };
        let subject =
            Subject::new(format!("interior, degree {degree}"), format!("\\text{{interior}},\\ m={degree}"));
        Line::sum(subject, products, needed)
    })
}

/// Σ wⱼ (j − row)ᵐ = δ(m, 1) for one closed row of a first derivative.
pub(super) fn row_moments<'a>(
    whose: &'static str,
    index: usize,
    row: &'a ClosedRow,
    order: usize,
) -> impl Iterator<Item = Line> + 'a {
    (0..=order).map(move |degree| {
        let products = (row.first as i64..)
            .zip(&row.weights)
            .filter(|(_, weight)| !weight.is_zero())
            .map(|(node, weight)| Product::new(weight, &[(node - index as i64, degree)]))
            .collect();
        let subject = Subject::new(
            format!("{whose}row {index}, degree {degree}"),
            format!("\\text{{{whose}row }}{index},\\ m={degree}"),
        );
        Line::sum(subject, products, Rational::from(i64::from(degree == 1)))
    })
}

/// hᵢ Dᵢⱼ + hⱼ Dⱼᵢ = Bᵢⱼ for all closed rows i and columns j ≥ i, and wₖ + w₋ₖ = 0 of the interior.
fn entries<'a>(fact: &'a SummationByParts) -> impl Iterator<Item = Line> + 'a {
    let operator = fact.operator();
    let closed = operator.closure().len();
    let nodes = fact.minimum_nodes() + operator.taps().len();
    let weight = move |row: usize, column: usize| {
        let (first, weights) = operator.row(row, nodes).unwrap_or_default();
        let place = usize::try_from(column as i64 - first).ok();
        place.and_then(|place| weights.get(place)).cloned().unwrap_or_else(Rational::zero)
    };
    let corner = (0..closed).flat_map(move |row| {
        (row..nodes).filter_map(move |column| {
            let (over, under) = (weight(row, column), weight(column, row));
            if over.is_zero() && under.is_zero() && row != column {
                return None;
            }
            let height = |index: usize| fact.norm().weight(index, nodes);
            let products = vec![Product::pair(&height(row), &over), Product::pair(&height(column), &under)];
            let needed = Rational::from(if (row, column) == (0, 0) { -1 } else { 0 });
            Some(Line::sum(entry("Q + Qᵀ", "Q+Q^T", row, column), products, needed))
        })
    });
    let reach = operator.left_reach();
    let taps = operator.taps();
    let interior = (0..=reach.min(operator.right_reach())).map(move |distance| {
        let products =
            vec![Product::new(&taps[reach + distance], &[]), Product::new(&taps[reach - distance], &[])];
        let subject = Subject::new(
            format!("interior weights of offsets {distance} and -{distance}"),
            format!("w_{{{distance}}}+w_{{-{distance}}}"),
        );
        Line::sum(subject, products, Rational::zero())
    });
    corner.chain(interior)
}

/// The entry of (matrix + another, transposed) that a line is about, in text and in LaTeX.
pub(super) fn entry(text: &str, latex: &str, row: usize, column: usize) -> Subject {
    Subject::new(format!("{text}, row {row}, column {column}"), format!("({latex})_{{{row},{column}}}"))
}
