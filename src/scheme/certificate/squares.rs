//! Lines about sums of squares, and those of the forms that stand on them.

use crate::exact::Rational;
use crate::scheme::{Dissipation, SecondDerivativeForm, SumOfSquares};

use super::differences::{interior, norm};
use super::{Line, Product, Subject};

/// A square with its nodes counted from the left end or from its anchor.
struct Square {
    name: String,
    functional: Vec<(i64, Rational)>,
    weight: Vec<(i64, Rational)>,
}

pub(super) fn form<'a>(fact: &'a SecondDerivativeForm) -> Box<dyn Iterator<Item = Line> + 'a> {
    let lines = norm(fact.norm(), "h", Rational::ratio(1, 2))
        .chain(certificate(fact.squares(), 1))
        .chain(interior(fact.constant().interior(), fact.interior_order()))
        .chain(interior_exactness(fact))
        .chain(row_exactness(fact));
    Box::new(lines)
}

pub(super) fn dissipation<'a>(fact: &'a Dissipation) -> Box<dyn Iterator<Item = Line> + 'a> {
    let sawtooth = || {
        let signs = |offset: usize| if offset.is_multiple_of(2) { 1 } else { -1 };
        let interior = &fact.constant().interior;
        let products = (0..interior.len())
            .rev()
            .map(|offset| (offset, &interior[offset]))
            .chain(interior.iter().enumerate().skip(1))
            .map(|(offset, weight)| Product::new(weight, &[(signs(offset), 1)]))
            .collect();
        let subject = Subject::new("interior on the sawtooth", "\\text{interior on the sawtooth }(-1)^i");
        Line::sum(subject, products, -fact.strength())
    };
    let lines = norm(fact.norm(), "h", Rational::ratio(1, 2))
        .chain(certificate(fact.squares(), fact.annihilated()))
        .chain(std::iter::once_with(sawtooth));
    Box::new(lines)
}

/// β ≥ 0 of every square, and that its functional vanishes on the degrees below `annihilated`.
fn certificate<'a>(squares: &'a SumOfSquares, annihilated: usize) -> impl Iterator<Item = Line> + 'a {
    let left = squares.left().iter().enumerate().map(|(index, square)| {
        let signed = |entries: &[(usize, Rational)]| {
            entries.iter().map(|(node, factor)| (*node as i64, factor.clone())).collect()
        };
        Square {
            name: format!("square {index}"),
            functional: signed(&square.functional),
            weight: signed(&square.weight),
        }
    });
    let repeated = squares.repeated().iter().enumerate().map(|(index, square)| Square {
        name: format!("repeated square {index}"),
        functional: square.functional.clone(),
        weight: square.weight.clone(),
    });
    left.chain(repeated).flat_map(move |square| square.lines(annihilated))
}

impl Square {
    fn lines(&self, annihilated: usize) -> Vec<Line> {
        let name = &self.name;
        let latex = format!("\\text{{{name}}}");
        let weights = self.weight.iter().map(|(node, factor)| {
            let subject =
                Subject::new(format!("{name}, factor of b[{node}]"), format!("{latex},\\ \\beta_{{{node}}}"));
            Line::not_negative(subject, factor)
        });
        let moments = (0..annihilated).map(|degree| {
            let products = self
                .functional
                .iter()
                .map(|(node, factor)| Product::new(factor, &[(*node, degree)]))
                .collect();
            let subject = Subject::new(
                format!("{name} on degree {degree}"),
                format!("{latex}\\text{{ on }}x^{{{degree}}}"),
            );
            Line::sum(subject, products, Rational::zero())
        });
        weights.chain(moments).collect()
    }
}

/// The interior row of −M(b) at node nought on b = x^s, u = x^t.
fn interior_exactness<'a>(fact: &'a SecondDerivativeForm) -> impl Iterator<Item = Line> + 'a {
    degrees(fact.interior_order() + 1).map(move |(s, t)| {
        // W_l(b)(u_l − u_0) with u_0 = 0 for t > 0; for t = 0 every difference is nought.
        let mut products = Vec::new();
        for (index, form) in fact.interior_forms().iter().enumerate() {
            let distance = index as i64 + 1;
            for (offset, factor) in form {
                let value = |column: i64| [(offset + column.min(0), s), (column, t)];
                if t > 0 {
                    products.push(Product::new(factor, &value(distance)));
                    products.push(Product::new(factor, &value(-distance)));
                }
            }
        }
        let subject = Subject::new(
            format!("interior on b = x^{s}, u = x^{t}"),
            format!("\\text{{interior}},\\ b=x^{{{s}}},\\ u=x^{{{t}}}"),
        );
        Line::sum(subject, products, exact(0, s, t))
    })
}

/// Every closed row with its exact flux on b = x^s, u = x^t.
fn row_exactness<'a>(fact: &'a SecondDerivativeForm) -> impl Iterator<Item = Line> + 'a {
    let reciprocal = fact.norm().left().first().and_then(Rational::recip);
    fact.closure_rows().iter().enumerate().flat_map(move |(index, row)| {
        let reciprocal = reciprocal.clone();
        degrees(fact.closure_order() + 1).map(move |(s, t)| {
            let mut products: Vec<Product> = row
                .columns
                .iter()
                .flat_map(|(column, form)| {
                    form.iter().map(move |(node, factor)| {
                        Product::new(factor, &[(*node as i64, s), (*column as i64, t)])
                    })
                })
                .collect();
            // The outward flux of b = 1, u = x at the left end is −1; all other monomials have none there.
            if let (0, 0, 1, Some(reciprocal)) = (index, s, t, &reciprocal) {
                products.push(Product::new(&-reciprocal, &[]));
            }
            let subject = Subject::new(
                format!("row {index} on b = x^{s}, u = x^{t}"),
                format!("\\text{{row }}{index},\\ b=x^{{{s}}},\\ u=x^{{{t}}}"),
            );
            Line::sum(subject, products, exact(index, s, t))
        })
    })
}

/// All (s, t) with s + t ≤ total.
fn degrees(total: usize) -> impl Iterator<Item = (usize, usize)> {
    (0..=total).flat_map(move |s| (0..=total - s).map(move |t| (s, t)))
}

/// t(s + t − 1) i^(s + t − 2): the value of (x^s (x^t)')' at i.
fn exact(node: usize, s: usize, t: usize) -> Rational {
    match (s + t).checked_sub(2) {
        None => Rational::zero(),
        Some(remaining) => {
            let factor = Rational::from((t * (s + t - 1)) as i64);
            factor * Rational::from(node as i64).power(remaining as u32)
        }
    }
}
