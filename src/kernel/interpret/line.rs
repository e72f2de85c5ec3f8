//! Applied operators in doubles: at one node, and for many nodes with the same weights at once.

use super::row::{self, Argument, Begin, Pairing, Vectors};
use crate::exact::round::nearest;
use crate::kernel::{LineOperator, Parity};

/// The weights of an operator as doubles, without the interior's zeros.
#[derive(Clone, Debug)]
pub(super) struct Line {
    rule: Rule,
    /// Closure rows at each end.
    rows: usize,
    /// How far interior rows read to either side, of the field or the coefficient.
    reach: usize,
}

#[derive(Clone, Debug)]
enum Rule {
    Constant {
        parity: Parity,
        /// (k, weight of f₊ₖ).
        interior: Vec<(isize, f64)>,
        /// For each row (first node, weights); the weights of the high end follow.
        low: Vec<(usize, Vec<f64>)>,
        high: Vec<(usize, Vec<f64>)>,
    },
    Varying {
        forms: Vec<Vec<(isize, f64)>>,
        closure: Vec<Vec<Column>>,
    },
}

/// The weight of f_node is Σ weight·b_m.
#[derive(Clone, Debug)]
struct Column {
    node: usize,
    weights: Vec<(usize, f64)>,
}

/// Which weights a node uses.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Place {
    Inside,
    Low(usize),
    High(usize),
}

impl Line {
    pub(super) fn of(operator: &LineOperator) -> Line {
        let rule = match operator {
            LineOperator::Constant(constant) => {
                let from = if constant.parity == Parity::Odd { 1 } else { 0 };
                let odd = constant.parity == Parity::Odd;
                let weights = |sign: f64| {
                    let row = |row: &crate::kernel::ClosureRow| {
                        (row.first, row.weights.iter().map(|weight| sign * nearest(weight)).collect())
                    };
                    constant.closure.iter().map(row).collect()
                };
                let interior = constant.interior.iter().enumerate();
                Rule::Constant {
                    parity: constant.parity,
                    interior: interior
                        .filter(|(_, weight)| !weight.is_zero())
                        .map(|(index, weight)| ((index + from) as isize, nearest(weight)))
                        .collect(),
                    low: weights(1.0),
                    high: weights(if odd { -1.0 } else { 1.0 }),
                }
            }
            LineOperator::Varying(varying) => {
                let form = |form: &Vec<(i64, crate::exact::Rational)>| {
                    form.iter().map(|(offset, weight)| (*offset as isize, nearest(weight))).collect()
                };
                let column = |entry: &crate::kernel::VaryingEntry| Column {
                    node: entry.column,
                    weights: entry.weights.iter().map(|(node, weight)| (*node, nearest(weight))).collect(),
                };
                Rule::Varying {
                    forms: varying.forms.iter().map(form).collect(),
                    closure: varying.closure.iter().map(|row| row.iter().map(column).collect()).collect(),
                }
            }
        };
        let reach = operator.reach().max(rule.coefficient_reach());
        Line { rule, rows: operator.closure_rows(), reach }
    }

    pub(super) fn closure_rows(&self) -> usize {
        self.rows
    }

    pub(super) fn reach(&self) -> usize {
        self.reach
    }

    fn place(&self, position: usize, nodes: usize) -> Place {
        if position < self.rows {
            Place::Low(position)
        } else if position + self.rows >= nodes {
            Place::High(nodes - 1 - position)
        } else {
            Place::Inside
        }
    }

    /// At one node; `f` and `b` give the field and the coefficient at a distance along the line.
    pub(super) fn node(
        &self,
        position: usize,
        nodes: usize,
        f: impl Fn(isize) -> f64,
        b: impl Fn(isize) -> f64,
    ) -> f64 {
        let place = self.place(position, nodes);
        let distance = |node: usize| distance(place, node, position, nodes);
        match (&self.rule, place) {
            (Rule::Constant { parity, interior, .. }, Place::Inside) => {
                let term = |(k, weight): &(isize, f64)| match (parity, *k) {
                    (Parity::Odd, k) => weight * (f(k) - f(-k)),
                    (Parity::Even, 0) => weight * f(0),
                    (Parity::Even, k) => weight * (f(k) + f(-k)),
                };
                sum(interior.iter().map(term))
            }
            (Rule::Constant { low, .. }, Place::Low(row)) => {
                let (first, weights) = &low[row];
                sum(weights.iter().enumerate().map(|(j, weight)| weight * f(distance(first + j))))
            }
            (Rule::Constant { high, .. }, Place::High(row)) => {
                let (first, weights) = &high[row];
                sum(weights.iter().enumerate().map(|(j, weight)| weight * f(distance(first + j))))
            }
            (Rule::Varying { forms, .. }, Place::Inside) => {
                let form = |form: &[(isize, f64)], shift: isize| {
                    sum(form.iter().map(|(offset, weight)| weight * b(offset + shift)))
                };
                sum(forms.iter().enumerate().flat_map(|(index, entries)| {
                    let s = index as isize + 1;
                    [form(entries, 0) * (f(s) - f(0)), form(entries, -s) * (f(-s) - f(0))]
                }))
            }
            (Rule::Varying { closure, .. }, Place::Low(row) | Place::High(row)) => {
                sum(closure[row].iter().map(|column| {
                    let weight = sum(column.weights.iter().map(|(m, weight)| weight * b(distance(*m))));
                    weight * f(distance(column.node))
                }))
            }
        }
    }

    /// At many nodes that share the position along the axis or lie inside; `f` and `b` give rows at a distance.
    #[allow(clippy::too_many_arguments, reason = "an operator has that many operands")]
    pub(super) fn nodes<'a>(
        &self,
        vectors: Vectors,
        position: usize,
        nodes: usize,
        f: impl Fn(isize) -> Argument<'a>,
        b: impl Fn(isize) -> Argument<'a>,
        target: &mut [f64],
        weight: &mut [f64],
    ) {
        let (Argument::Row(_), place) = (f(0), self.place(position, nodes)) else {
            // Numbers throughout, unless the coefficient varies along the row.
            for (index, value) in target.iter_mut().enumerate() {
                *value = self.node(position, nodes, |d| f(d).at(index), |d| b(d).at(index));
            }
            return;
        };
        let distance = |node: usize| distance(place, node, position, nodes);
        match (&self.rule, place) {
            (Rule::Constant { parity, interior, .. }, Place::Inside) => {
                inside(vectors, *parity, interior, |d| slice(f(d)), target);
            }
            (Rule::Constant { low, .. }, Place::Low(at)) => {
                let (first, weights) = &low[at];
                let terms =
                    weights.iter().enumerate().map(|(j, weight)| (*weight, slice(f(distance(first + j)))));
                linear(vectors, terms, target);
            }
            (Rule::Constant { high, .. }, Place::High(at)) => {
                let (first, weights) = &high[at];
                let terms =
                    weights.iter().enumerate().map(|(j, weight)| (*weight, slice(f(distance(first + j)))));
                linear(vectors, terms, target);
            }
            (Rule::Varying { forms, .. }, Place::Inside) => {
                let mut begin = Begin::Afresh;
                for (index, form) in forms.iter().enumerate() {
                    let s = index as isize + 1;
                    for (shift, side) in [(0, s), (-s, -s)] {
                        let entries = form.iter().map(|(offset, entry)| (*entry, b(offset + shift)));
                        let c = coefficient(vectors, entries, weight);
                        row::scaled_difference(vectors, begin, target, c, f(side), f(0));
                        begin = Begin::OnTop;
                    }
                }
            }
            (Rule::Varying { closure, .. }, Place::Low(at) | Place::High(at)) => {
                let mut begin = Begin::Afresh;
                for column in &closure[at] {
                    let entries = column.weights.iter().map(|(m, entry)| (*entry, b(distance(*m))));
                    let c = coefficient(vectors, entries, weight);
                    // Taking zero away changes no bit of f.
                    let zero = Argument::Number(0.0);
                    row::scaled_difference(vectors, begin, target, c, f(distance(column.node)), zero);
                    begin = Begin::OnTop;
                }
            }
        }
    }
}

impl Rule {
    fn coefficient_reach(&self) -> usize {
        let Rule::Varying { forms, .. } = self else { return 0 };
        let reach = |(index, form): (usize, &Vec<(isize, f64)>)| {
            let s = index as isize + 1;
            form.iter()
                .map(|(offset, _)| offset.unsigned_abs().max((offset - s).unsigned_abs()))
                .max()
                .unwrap_or(0)
        };
        forms.iter().enumerate().map(reach).max().unwrap_or(0)
    }
}

/// From the node at `position` to a node of a closure row, counted from the end where the row stands.
#[inline]
fn distance(place: Place, node: usize, position: usize, nodes: usize) -> isize {
    let node = if matches!(place, Place::High(_)) { nodes - 1 - node } else { node };
    node as isize - position as isize
}

/// The first term plain, the others added in order; zero when there are none.
fn sum(mut terms: impl Iterator<Item = f64>) -> f64 {
    match terms.next() {
        Some(first) => terms.fold(first, |sum, term| sum + term),
        None => 0.0,
    }
}

/// Rows of a field whose centre is a row are rows.
fn slice(argument: Argument<'_>) -> &[f64] {
    match argument {
        Argument::Row(row) => row,
        Argument::Number(_) => &[],
    }
}

const GROUP: usize = 6;

fn linear<'a>(vectors: Vectors, terms: impl Iterator<Item = (f64, &'a [f64])>, target: &mut [f64]) {
    let mut group: [(f64, &[f64]); GROUP] = [(0.0, &[]); GROUP];
    let mut filled = 0;
    let mut begin = Begin::Afresh;
    for term in terms {
        if filled == GROUP {
            row::linear(vectors, begin, target, &group);
            begin = Begin::OnTop;
            filled = 0;
        }
        group[filled] = term;
        filled += 1;
    }
    row::linear(vectors, begin, target, &group[..filled]);
}

fn inside<'a>(
    vectors: Vectors,
    parity: Parity,
    interior: &[(isize, f64)],
    f: impl Fn(isize) -> &'a [f64],
    target: &mut [f64],
) {
    let (pairing, mut rest, mut begin) = match (parity, interior) {
        (Parity::Odd, all) => (Pairing::Difference, all, Begin::Afresh),
        (Parity::Even, [(0, weight), rest @ ..]) => {
            row::linear(vectors, Begin::Afresh, target, &[(*weight, f(0))]);
            (Pairing::Sum, rest, Begin::OnTop)
        }
        (Parity::Even, all) => (Pairing::Sum, all, Begin::Afresh),
    };
    let mut group: [(f64, &[f64], &[f64]); 4] = [(0.0, &[], &[]); 4];
    loop {
        let count = rest.len().min(4);
        for (term, (k, weight)) in group.iter_mut().zip(rest) {
            *term = (*weight, f(*k), f(-k));
        }
        if count > 0 || begin == Begin::Afresh {
            row::paired(vectors, begin, pairing, target, &group[..count]);
        }
        rest = &rest[count..];
        begin = Begin::OnTop;
        if rest.is_empty() {
            return;
        }
    }
}

/// Σ weight·b as a number or as a row in `weight`.
fn coefficient<'a, 'b>(
    vectors: Vectors,
    entries: impl Iterator<Item = (f64, Argument<'a>)> + Clone,
    weight: &'b mut [f64],
) -> Argument<'b> {
    if entries.clone().all(|(_, argument)| matches!(argument, Argument::Number(_))) {
        return Argument::Number(sum(entries.map(|(entry, argument)| entry * argument.at(0))));
    }
    linear(vectors, entries.map(|(entry, argument)| (entry, slice(argument))), weight);
    Argument::Row(weight)
}
