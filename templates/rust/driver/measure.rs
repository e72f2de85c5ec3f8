//! Gauges and integrals: numbers made of an array.

use super::{Description, Solver};

/// Nodes along one axis and their weights.
pub struct Interpolation {
    index: Vec<usize>,
    weight: Vec<f64>,
}

impl Interpolation {
    /// For each axis: Lagrange on nodes centred around the place, shifted inward at faces, wrapped on periodic axes.
    pub fn at(
        about: &Description,
        solver: &dyn Solver,
        nodes: &[usize],
        place: &[f64],
    ) -> Vec<Interpolation> {
        let along = |(axis, place): (usize, &f64)| {
            let (low, _, spacing) = solver.axis(axis);
            let reach = if about.axes[axis].periodic { Reach::Wrapped } else { Reach::Shifted };
            Interpolation::along((place - low) / spacing, nodes[axis], about.interpolation_nodes, reach)
        };
        place.iter().enumerate().map(along).collect()
    }

    fn along(at: f64, nodes: usize, wanted: usize, reach: Reach) -> Interpolation {
        let nodes = nodes as i64;
        let nearest = (at + 0.5).floor();
        let (mut first, count) = if (at - nearest).abs() <= 1e-9 {
            (nearest as i64, 1)
        } else {
            let count = (wanted as i64).clamp(1, nodes);
            let even = count % 2 == 0;
            let first =
                if even { at.floor() as i64 - (count / 2 - 1) } else { nearest as i64 - (count - 1) / 2 };
            (first, count)
        };
        if reach == Reach::Shifted {
            first = first.min(nodes - count).max(0);
        }
        let weight = |i: i64| {
            let others = (0..count).filter(|j| *j != i);
            others.fold(1.0, |weight, j| weight * ((at - (first + j) as f64) / (i - j) as f64))
        };
        Interpolation {
            index: (0..count).map(|i| (first + i).rem_euclid(nodes) as usize).collect(),
            weight: (0..count).map(weight).collect(),
        }
    }
}

#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Reach {
    Wrapped,
    Shifted,
}

/// Tensor product, from the last axis outwards.
pub fn interpolate(along: &[Interpolation], nodes: &[usize], values: &[f64]) -> f64 {
    inner(along, nodes, values, 0)
}

fn inner(along: &[Interpolation], nodes: &[usize], values: &[f64], base: usize) -> f64 {
    let Some(((here, along), (count, nodes))) = along.split_first().zip(nodes.split_first()) else {
        return values[base];
    };
    let mut sum = 0.0;
    for (index, weight) in here.index.iter().zip(&here.weight) {
        sum += weight * inner(along, nodes, values, base * count + index);
    }
    sum
}

/// The weight of a node along an axis, in units of the spacing.
fn quadrature_weight(listed: &[f64], nodes: usize, index: usize) -> f64 {
    let mirrored = nodes - 1 - index;
    listed.get(index).or_else(|| listed.get(mirrored)).copied().unwrap_or(1.0)
}

/// Sums of rows in increasing index, then the rows in order, then the spacings.
pub fn integrate(about: &Description, nodes: &[usize], spacings: &[f64], values: &[f64]) -> f64 {
    let Some((length, outer)) = nodes.split_last() else { return 0.0 };
    let weight = |axis: usize, index: usize| quadrature_weight(&about.quadrature[axis], nodes[axis], index);
    let mut sum = 0.0;
    for (row, values) in values.chunks_exact(*length).enumerate() {
        let mut rest = row;
        let mut index = vec![0; outer.len()];
        for (axis, count) in outer.iter().enumerate().rev() {
            index[axis] = rest % count;
            rest /= count;
        }
        let outer_weight =
            index.iter().enumerate().fold(1.0, |product, (axis, index)| product * weight(axis, *index));
        let mut part = 0.0;
        for (k, value) in values.iter().enumerate() {
            part += weight(outer.len(), k) * value;
        }
        sum += outer_weight * part;
    }
    spacings.iter().fold(sum, |sum, spacing| sum * spacing)
}
