//! The search for staggered pairs: Q between half points and nodes, with a norm for each.
//!
//! Unknown are both norms' weights and Q's corner of `at_nodes` × `at_halves` entries. Exactness of rows and
//! columns is linear in them. Freedom goes first into norm weights close to one, then into the least errors
//! of rows and columns, degree after degree. Not here: the proof, which the constructor of
//! [`StaggeredPair`] makes.

use crate::discretize::interior;
use crate::exact::{AffineSolution, Matrix, Rational, Residual};
use crate::scheme::{ClosedRow, Norm, StaggeredClosure, StaggeredPair, Stencil};

use super::Impossible;
use super::stages::{Search, distances_from_one};

/// The truncation stages end at the degree 2p + this, as for one grid.
const LAST_DEGREE_BEYOND_ORDER: usize = 6;

/// How the pair of one order is derived.
pub(super) struct Recipe {
    pub(super) order: usize,
    /// Closed rows at nodes.
    pub(super) at_nodes: usize,
    /// Closed rows at half points.
    pub(super) at_halves: usize,
}

/// Where the unknowns are, and the interior weights.
struct Layout {
    half: usize,
    at_nodes: usize,
    at_halves: usize,
    /// c₁ … c_p.
    interior: Vec<Rational>,
}

pub(super) fn periodic(order: usize) -> Result<StaggeredPair, Impossible> {
    Ok(StaggeredPair::periodic(&halfway(order)?, order)?)
}

pub(super) fn closed(recipe: &Recipe) -> Result<StaggeredPair, Impossible> {
    let stencil = halfway(recipe.order)?;
    let half = recipe.order / 2;
    let layout = Layout {
        half,
        at_nodes: recipe.at_nodes,
        at_halves: recipe.at_halves,
        interior: stencil.weights()[half..].to_vec(),
    };
    let family = layout.exact_family()?;
    let mut search = Search::new(&family);
    let norms = layout.at_nodes + layout.at_halves;
    if search.leaves_free(norms) {
        search.narrow(distances_from_one(norms, layout.unknowns()));
    }
    for degree in half + 1..=recipe.order + LAST_DEGREE_BEYOND_ORDER {
        if search.is_decided() {
            break;
        }
        search.narrow(layout.conditions(degree));
    }
    let unknowns = family.at(&search.coordinates()?);
    Ok(StaggeredPair::bounded(&stencil, recipe.order, layout.closure(&unknowns)?)?)
}

fn halfway(order: usize) -> Result<Stencil, Impossible> {
    let at = Rational::zero();
    Ok(interior::smallest(interior::NodeFamily::Halfway, &at, 1, order)?)
}

impl Layout {
    fn unknowns(&self) -> usize {
        self.at_nodes + self.at_halves + self.at_nodes * self.at_halves
    }

    /// The place of Q's entry among the unknowns: row after row behind the norms.
    fn place(&self, node: usize, half: usize) -> usize {
        self.at_nodes + self.at_halves + node * self.at_halves + half
    }

    /// The interior's entry of Q: c_k where the half point lies k − 1/2 to the right, −c_k to the left.
    fn beyond(&self, node: usize, half: usize) -> Rational {
        let (weight, sign) = match half.checked_sub(node) {
            Some(distance) => (self.interior.get(distance), 1),
            None => (self.interior.get(node - half - 1), -1),
        };
        weight.map_or_else(Rational::zero, |weight| weight * Rational::from(sign))
    }

    /// Q's entry as a condition sees it: an unknown in the corner, a number elsewhere.
    fn add_entry(&self, condition: &mut Residual, node: usize, half: usize, value: &Rational) {
        if node < self.at_nodes && half < self.at_halves {
            condition.row[self.place(node, half)] += value;
        } else {
            condition.constant += self.beyond(node, half) * value;
        }
    }

    fn blank(&self) -> Residual {
        let row = vec![Rational::zero(); self.unknowns()];
        Residual { row, constant: Rational::zero(), weight: Rational::one() }
    }

    /// (Q yᵈ)ᵢ − hᵢ d i^(d−1) − [i = 0][d = 0], to be nought.
    fn node_condition(&self, node: usize, degree: usize) -> Residual {
        let mut condition = self.blank();
        for half in 0..self.at_halves.max(self.at_nodes + self.half) {
            self.add_entry(&mut condition, node, half, &half_point(half).power(degree as u32));
        }
        match degree.checked_sub(1) {
            Some(lower) => condition.row[node] -= slope(&Rational::from(node as i64), degree, lower),
            None if node == 0 => condition.constant -= Rational::one(),
            None => {}
        }
        condition
    }

    /// −(Qᵀ xᵈ)ⱼ − hⱼ d yⱼ^(d−1), to be nought.
    fn half_condition(&self, half: usize, degree: usize) -> Residual {
        let mut condition = self.blank();
        for node in 0..self.at_nodes.max(self.at_halves + self.half) {
            let value = -Rational::from(node as i64).power(degree as u32);
            self.add_entry(&mut condition, node, half, &value);
        }
        if let Some(lower) = degree.checked_sub(1) {
            condition.row[self.at_nodes + half] -= slope(&half_point(half), degree, lower);
        }
        condition
    }

    /// All conditions of one degree.
    fn conditions(&self, degree: usize) -> Vec<Residual> {
        let at_nodes = (0..self.at_nodes).map(|node| self.node_condition(node, degree));
        let at_halves = (0..self.at_halves).map(|half| self.half_condition(half, degree));
        at_nodes.chain(at_halves).collect()
    }

    /// All unknowns for which every closed row is exact up to the degree p.
    fn exact_family(&self) -> Result<AffineSolution, Impossible> {
        let conditions: Vec<Residual> = (0..=self.half).flat_map(|degree| self.conditions(degree)).collect();
        let right_side: Vec<Rational> = conditions.iter().map(|condition| -&condition.constant).collect();
        let rows = conditions.into_iter().map(|condition| condition.row).collect();
        let system = Matrix::from_rows(rows).expect("all conditions have one entry an unknown");
        Ok(system.solve_affine(&right_side)?)
    }

    fn closure(&self, unknowns: &[Rational]) -> Result<StaggeredClosure, Impossible> {
        let (node_heights, rest) = unknowns.split_at(self.at_nodes);
        let half_heights = &rest[..self.at_halves];
        let entry = |node: usize, half: usize| {
            if node < self.at_nodes && half < self.at_halves {
                unknowns[self.place(node, half)].clone()
            } else {
                self.beyond(node, half)
            }
        };
        let halves = self.at_halves.max(self.at_nodes + self.half);
        let nodes = self.at_nodes.max(self.at_halves + self.half);
        let node_rows = node_heights.iter().enumerate().map(|(node, height)| {
            trimmed((0..halves).map(|half| entry(node, half).checked_div(height)).collect())
        });
        let half_rows = half_heights.iter().enumerate().map(|(half, height)| {
            trimmed((0..nodes).map(|node| (-entry(node, half)).checked_div(height)).collect())
        });
        Ok(StaggeredClosure {
            order: self.half,
            node_norm: Norm::bounded(node_heights.to_vec())?,
            half_norm: Norm::halfway(half_heights.to_vec())?,
            node_rows: node_rows.collect::<Option<_>>().ok_or(Impossible::NormNotUnique)?,
            half_rows: half_rows.collect::<Option<_>>().ok_or(Impossible::NormNotUnique)?,
        })
    }
}

/// j + 1/2.
fn half_point(half: usize) -> Rational {
    Rational::from(half as i64) + Rational::ratio(1, 2)
}

/// d xˡ with l = d − 1.
fn slope(point: &Rational, degree: usize, lower: usize) -> Rational {
    Rational::from(degree as i64) * point.power(lower as u32)
}

/// A row without the noughts at its ends; nothing if a weight is nothing.
fn trimmed(weights: Option<Vec<Rational>>) -> Option<ClosedRow> {
    let weights = weights?;
    let first = weights.iter().take_while(|weight| weight.is_zero()).count();
    let end = weights.iter().rposition(|weight| !weight.is_zero()).map_or(first, |last| last + 1);
    Some(ClosedRow { first, weights: weights[first..end].to_vec() })
}
