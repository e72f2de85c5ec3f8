//! The search for certified second derivatives with a coefficient that varies:
//!
//! M(b) = Dᵀ diag(H b) D + Δ_{p+1}ᵀ W(b) Δ_{p+1} + Σ_{k=p+2}^{2p} w_k Δ_kᵀ diag(A_k b) Δ_k
//!
//! with undivided differences Δ_k, averages A_k that make the interior narrow, and W corrected near the ends
//! so that the closed rows reach order p. The structure follows compatible summation-by-parts operators
//! (after Mattsson 2012, J. Sci. Comput. 51, 650–682; from memory). Not here: the proof, which the
//! constructors in [`crate::scheme`] make.

use crate::exact::{Matrix, Rational, binomial, factorial};
use crate::scheme::{Norm, RepeatedSquare, SecondDerivativeForm, SquareTerm, SumOfSquares, SummationByParts};

use super::{Impossible, first_derivative};

/// Share of the interior weight that boundary differences keep as squares of their own; the excess goes
/// into one square. Chosen for its small error and a spectral radius at the interior's.
const KEPT_SHARE: (i64, i64) = (3, 4);

/// One order k of differences: Δ_k with its weight and its average, to be repeated along the axis.
struct DifferenceFamily {
    /// The factors of Δ_k on its k + 1 nodes.
    factors: Vec<Rational>,
    /// w_k.
    weight: Rational,
    /// A_k on the same nodes; symmetric, of sum one.
    average: Vec<Rational>,
}

/// The differences of an interior of order 2p.
struct Interior {
    half: usize,
    /// D's interior weights c₁ … c_p.
    slopes: Vec<Rational>,
    /// k = p + 1, …, 2p.
    differences: Vec<DifferenceFamily>,
}

pub(super) fn periodic(half: usize) -> Result<SecondDerivativeForm, Impossible> {
    let first = first_derivative::periodic(2 * half)?;
    let interior = Interior::of(&first)?;
    let squares = SumOfSquares::periodic(interior.repeated(0, 0))?;
    Ok(SecondDerivativeForm::periodic(squares, 2 * half)?)
}

pub(super) fn closed(first: &SummationByParts) -> Result<SecondDerivativeForm, Impossible> {
    let interior = Interior::of(first)?;
    let ends = interior.boundary_weights(first)?;
    let closed_rows = first.norm().left().len();
    let mut left = slope_squares(first);
    left.extend(interior.kept_squares(&ends));
    left.extend(interior.excess_square(&ends));
    let squares = SumOfSquares::bounded(left, interior.repeated(closed_rows as i64, ends.len() as i64))?;
    let norm = Norm::bounded(first.norm().left().to_vec())?;
    Ok(SecondDerivativeForm::bounded(norm, squares, 2 * interior.half, interior.half)?)
}

/// (D u)ᵢ² with weight hᵢ bᵢ for every closed row.
fn slope_squares(first: &SummationByParts) -> Vec<SquareTerm> {
    let rows = first.operator().closure().iter().zip(first.norm().left());
    rows.enumerate()
        .map(|(index, (row, height))| SquareTerm {
            functional: present((row.first..).zip(row.weights.iter().cloned())),
            weight: vec![(index, height.clone())],
        })
        .collect()
}

/// The entries that are not nought.
fn present<Node>(entries: impl Iterator<Item = (Node, Rational)>) -> Vec<(Node, Rational)> {
    entries.filter(|(_, factor)| !factor.is_zero()).collect()
}

/// The undivided difference of order k: factors (−1)^(k−j) C(k, j).
pub(super) fn difference(order: usize) -> Vec<Rational> {
    (0..=order)
        .map(|node| {
            let size = binomial(order, node);
            if (order - node) % 2 == 1 { -size } else { size }
        })
        .collect()
}

/// w_k, k = 0, …, 2p: coefficients of sᵏ, s = 4 sin²(θ/2), in the narrow symbol less the symbol of DᵀD.
fn difference_weights(half: usize) -> Vec<Rational> {
    let mut weights = vec![Rational::zero(); 2 * half + 1];
    for (k, weight) in weights.iter_mut().enumerate().take(half + 1).skip(1) {
        *weight += Rational::from(2) * factorial(k - 1).power(2) / factorial(2 * k);
    }
    let slope: Vec<Rational> = (0..half).map(|k| factorial(k).power(2) / factorial(2 * k + 1)).collect();
    for (i, left) in slope.iter().enumerate() {
        for (j, right) in slope.iter().enumerate() {
            let product = left * right;
            weights[i + j + 1] -= &product;
            weights[i + j + 2] += product * Rational::ratio(1, 4);
        }
    }
    weights
}

impl Interior {
    fn of(first: &SummationByParts) -> Result<Interior, Impossible> {
        let half = first.operator().interior_order() / 2;
        let taps = first.operator().taps();
        let slopes = taps[first.operator().left_reach() + 1..].to_vec();
        let weights = difference_weights(half);
        let averages = averages(half, &slopes, &weights)?;
        let differences = (half + 1..=2 * half)
            .zip(averages)
            .map(|(k, average)| DifferenceFamily {
                factors: difference(k),
                weight: weights[k].clone(),
                average,
            })
            .collect();
        Ok(Interior { half, slopes, differences })
    }

    /// Δ_{p+1}, whose weights are corrected at the ends.
    fn lowest(&self) -> &DifferenceFamily {
        &self.differences[0]
    }

    /// The repeated squares: D from its first interior row on, the lowest difference from `corrected` on.
    fn repeated(&self, closed_rows: i64, corrected: i64) -> Vec<RepeatedSquare> {
        let reach = self.slopes.len() as i64;
        let slope = |offset: i64| match self.slopes.get((offset.unsigned_abs() as usize).wrapping_sub(1)) {
            Some(weight) if offset < 0 => (offset, -weight),
            Some(weight) => (offset, weight.clone()),
            None => (offset, Rational::zero()),
        };
        let slopes = RepeatedSquare {
            functional: present((-reach..=reach).map(slope)),
            weight: vec![(0, Rational::one())],
            first: closed_rows,
        };
        let differences = self.differences.iter().enumerate().map(|(index, family)| RepeatedSquare {
            functional: (0..).zip(family.factors.iter().cloned()).collect(),
            weight: present((0..).zip(family.average.iter().map(|share| share * &family.weight))),
            first: if index == 0 { corrected } else { 0 },
        });
        std::iter::once(slopes).chain(differences).collect()
    }

    /// v₀, v₁, … up to the last one that differs from w_{p+1}: the row sums that W must have so that closed
    /// rows are of order p. With eᵢ the error of H D on x^(p+1)/(p+1)!, they solve Δᵀv = −Dᵀe.
    fn boundary_weights(&self, first: &SummationByParts) -> Result<Vec<Rational>, Impossible> {
        let factors = &self.lowest().factors;
        let degree = self.half as u32 + 1;
        let rows = first.operator().closure();
        let (height, lower) = (factorial(self.half + 1), factorial(self.half));
        let length = rows.iter().map(|row| row.end()).max().unwrap_or(0) + 2;
        let mut right_side = vec![Rational::zero(); length];
        for ((index, row), norm) in rows.iter().enumerate().zip(first.norm().left()) {
            let nodes = (row.first..).map(|node| Rational::from(node as i64));
            let value: Rational =
                nodes.zip(&row.weights).map(|(node, weight)| node.power(degree) * weight).sum();
            let exact = Rational::from(index as i64).power(degree - 1) / &lower;
            let error = (value / &height - exact) * norm;
            for (node, weight) in (row.first..).zip(&row.weights) {
                right_side[node] -= weight * &error;
            }
        }
        let mut weights: Vec<Rational> = Vec::with_capacity(length);
        for row in 0..length {
            let known: Rational = (1..factors.len().min(row + 1))
                .map(|distance| &factors[distance] * &weights[row - distance])
                .sum();
            weights.push((&right_side[row] - known) / &factors[0]);
        }
        let settled = &self.lowest().weight;
        let corrected = weights.iter().rposition(|weight| weight != settled).map_or(0, |last| last + 1);
        if corrected >= rows.len() {
            return Err(Impossible::BoundaryWeightsUnsettled);
        }
        weights.truncate(corrected);
        Ok(weights)
    }

    /// The part of a boundary weight that its difference keeps as a square of its own.
    fn kept(&self, weight: &Rational) -> Rational {
        let share = Rational::ratio(KEPT_SHARE.0, KEPT_SHARE.1) * &self.lowest().weight;
        weight.clone().min(share).max(Rational::zero())
    }

    fn kept_squares(&self, ends: &[Rational]) -> Vec<SquareTerm> {
        let family = self.lowest();
        ends.iter()
            .map(|weight| self.kept(weight))
            .enumerate()
            .filter(|(_, kept)| !kept.is_zero())
            .map(|(first, kept)| SquareTerm {
                functional: (first..).zip(family.factors.iter().cloned()).collect(),
                weight: present((first..).zip(family.average.iter().map(|share| share * &kept))),
            })
            .collect()
    }

    /// What the boundary weights exceed the kept parts by, as one square: the functional is the mean of the
    /// differences and the weight their sum, so that W(1)1 = v. Some excesses are negative at orders 10 and
    /// 12. The closure's order sees of the weight its sum for b = 1 alone, so there the positive ones are
    /// averaged and scaled to the sum: no factor is negative.
    fn excess_square(&self, ends: &[Rational]) -> Option<SquareTerm> {
        let family = self.lowest();
        let excess: Vec<Rational> = ends.iter().map(|weight| weight - self.kept(weight)).collect();
        let total: Rational = excess.iter().sum();
        if total.is_zero() {
            return None;
        }
        let positive: Rational = excess.iter().filter(|part| part.is_positive()).sum();
        let scale = total.checked_div(&positive)?;
        let mut functional = vec![Rational::zero(); ends.len() + self.half + 1];
        let mut weight = functional.clone();
        for (first, part) in excess.iter().enumerate() {
            for (offset, (factor, share)) in family.factors.iter().zip(&family.average).enumerate() {
                functional[first + offset] += part * factor / &total;
                if part.is_positive() {
                    weight[first + offset] += part * share * &scale;
                }
            }
        }
        Some(SquareTerm {
            functional: present(functional.into_iter().enumerate()),
            weight: present(weight.into_iter().enumerate()),
        })
    }
}

/// A_k, k = p + 1, …, 2p: the symmetric averages of sum one for which the interior of M(b) reaches p nodes
/// for every b. The conditions are those on the coefficient of b₀ in every entry.
fn averages(
    half: usize,
    slopes: &[Rational],
    weights: &[Rational],
) -> Result<Vec<Vec<Rational>>, Impossible> {
    let orders = half + 1..=2 * half;
    // Unknown number `starts[k − p − 1] + o` is the share of node o (and of k − o) in A_k.
    let mut starts = Vec::new();
    let mut unknowns = 0;
    for k in orders.clone() {
        starts.push(unknowns);
        unknowns += k / 2 + 1;
    }
    let place = |k: usize, node: usize| starts[k - half - 1] + node.min(k - node);
    let mut rows = Vec::new();
    let mut right_side = Vec::new();
    for k in orders.clone() {
        let mut row = vec![Rational::zero(); unknowns];
        for node in 0..=k {
            row[place(k, node)] += Rational::one();
        }
        rows.push(row);
        right_side.push(Rational::one());
    }
    let slope = |offset: i64| match offset.unsigned_abs() as usize {
        distance if distance == 0 || distance > half => Rational::zero(),
        distance if offset < 0 => -&slopes[distance - 1],
        distance => slopes[distance - 1].clone(),
    };
    let reach = 2 * half as i64;
    let differences: Vec<Vec<Rational>> = orders.clone().map(difference).collect();
    for left in -reach..=reach {
        for right in left + half as i64 + 1..=reach {
            let mut row = vec![Rational::zero(); unknowns];
            for (k, factors) in orders.clone().zip(&differences) {
                for start in -(k as i64)..=0 {
                    let factor =
                        |node: i64| usize::try_from(node - start).ok().and_then(|at| factors.get(at));
                    if let (Some(one), Some(other)) = (factor(left), factor(right)) {
                        row[place(k, start.unsigned_abs() as usize)] += one * other * &weights[k];
                    }
                }
            }
            rows.push(row);
            right_side.push(-(slope(left) * slope(right)));
        }
    }
    let system = Matrix::from_rows(rows).expect("all conditions have one entry an unknown");
    let solution = system.solve_affine(&right_side)?;
    if !solution.directions.is_empty() {
        return Err(Impossible::AveragesNotUnique);
    }
    Ok(orders.map(|k| (0..=k).map(|node| solution.particular[place(k, node)].clone()).collect()).collect())
}
