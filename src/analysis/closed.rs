//! Closed operators as dense matrices on [0, 1], what their eigenvalues say, and the step limits that follow.
//!
//! Model problems of unit speed, diffusivity and impedance, one for each way in which a face is treated. The matrices are built
//! from the same certified operators that are emitted. Eigenvalues do not replace the certificates: a wrong number of conditions
//! and growth before decay leave no mark in them.

use std::fmt;

use super::spectrum::{self, Eigenvalue, NotConverged, Rows};
use super::stability::{one_step_limit, second_order_limit};
use crate::exact::{Rational, round};
use crate::model::Method;
use crate::scheme::{DifferenceOperator, EndRows, SecondDerivativeForm, SummationByParts};

/// Why there is no matrix.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ClosedFault {
    /// The axis needs this many nodes.
    TooFewNodes { needed: usize },
    /// A model problem with ends needs an operator with ends.
    Periodic,
    /// A condition on the flux needs end rows that contain the natural flux.
    NoNaturalFlux,
    /// Not a derivative of the degree that the model problem has.
    Degree { found: usize },
}

/// How the inflow of u_t + u_x = 0 enters at x = 0.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Inflow {
    /// The flux is replaced, with this strength; one is the replacement, less than a half is unstable.
    Flux { strength: f64 },
    /// The value is set: its row and column are known.
    Injected,
}

/// What holds at a face of u_t = u_xx or u_tt = u_xx.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum FaceCondition {
    /// u is given: row and column are known.
    Value,
    /// The flux is given.
    Flux,
    /// Outward flux + factor · u is given.
    Robin { factor: f64 },
}

/// What holds at a face of u_tt = u_xx.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum WaveFace {
    /// u is given.
    Value,
    /// The flux is given.
    Flux,
    /// Outward flux = −impedance · u_t.
    Absorbing { impedance: f64 },
}

/// u_tt = stiffness · u − diag(damping) · u_t.
#[derive(Clone, Debug, PartialEq)]
pub struct ClosedWave {
    /// Square.
    pub stiffness: Rows,
    /// One entry a row of `stiffness`, none negative for impedances that are not.
    pub damping: Vec<f64>,
}

/// What the eigenvalues of a closed operator of first order in time say.
#[derive(Clone, Debug, PartialEq)]
pub struct Examination {
    pub eigenvalues: Vec<Eigenvalue>,
    /// The largest real part.
    pub abscissa: f64,
    /// The largest magnitude.
    pub radius: f64,
    /// Real parts below this have no sign.
    pub tolerance: f64,
}

/// Relative size of real parts without sign: 10⁻⁸ of the spectral radius.
const RELATIVE_TOLERANCE: f64 = 1e-8;
/// How many times n ε ‖A‖ real parts may be rounded.
const ROUNDINGS: f64 = 10.0;

impl Examination {
    /// Whether no mode grows, to the tolerance.
    pub fn is_stable(&self) -> bool {
        self.abscissa <= self.tolerance
    }
}

/// The eigenvalues of A in u_t = A u and what they say.
pub fn examine(rows: &[Vec<f64>]) -> Result<Examination, NotConverged> {
    let eigenvalues = spectrum::eigenvalues(rows)?;
    let radius = spectrum::radius(&eigenvalues);
    let tolerance = (RELATIVE_TOLERANCE * radius).max(spectrum::tolerance(ROUNDINGS, rows));
    let abscissa = spectrum::abscissa(&eigenvalues);
    Ok(Examination { eigenvalues, abscissa, radius, tolerance })
}

/// The longest step of a one-step method for u_t = A u by eigenvalues alone.
pub fn closed_limit(method: Method, rows: &[Vec<f64>]) -> Result<f64, NotConverged> {
    Ok(one_step_limit(&spectrum::eigenvalues(rows)?, method))
}

/// The longest step for u_tt = L u − C u_t. Leapfrog takes C centred in time, which keeps the limit 2/√ρ(L) for every C ≥ 0; other
/// methods step the system (u, u_t).
pub fn closed_wave_limit(method: Method, wave: &ClosedWave) -> Result<f64, NotConverged> {
    if method == Method::Leapfrog || wave.damping.iter().all(|entry| *entry == 0.0) {
        Ok(second_order_limit(&spectrum::eigenvalues(&wave.stiffness)?, method))
    } else {
        closed_limit(method, &wave.system())
    }
}

/// Angles at which a symbol is sampled.
const ANGLES: usize = 720;

/// Σ w_k e^{ikθ} over the angles of the upper half circle, the weights on consecutive offsets from `first` on: the eigenvalues of the
/// interior alone, conjugates left out.
///
/// Where closed rows are far from normal (dissipation, one-sided weights), powers of one step grow by factors that rise
/// exponentially with the number of nodes although every eigenvalue of the closed operator is in the region: the step limit is
/// the lesser of that of this list and that of the closed eigenvalues.
pub fn interior_symbol(first: i64, weights: &[f64]) -> Vec<Eigenvalue> {
    (0..=ANGLES)
        .map(|index| {
            let angle = std::f64::consts::PI * index as f64 / ANGLES as f64;
            (first..).zip(weights).fold((0.0, 0.0), |(re, im), (offset, weight)| {
                let phase = angle * offset as f64;
                (re + weight * phase.cos(), im + weight * phase.sin())
            })
        })
        .collect()
}

/// u_t = −u_x on [0, 1] with this inflow at 0 and nothing at 1, for an operator that integrates by parts.
pub fn advection(first: &SummationByParts, intervals: usize, inflow: Inflow) -> Result<Rows, ClosedFault> {
    let Inflow::Flux { strength } = inflow else {
        return injected_advection(first.operator(), intervals);
    };
    let mut rows = ended(first.operator(), intervals, 1)?;
    scale(&mut rows, -(intervals as f64));
    rows[0][0] -= strength * intervals as f64 / end_weight(first, intervals);
    Ok(rows)
}

/// As [`advection`] with the value set at 0, for any first derivative with ends.
pub fn injected_advection(operator: &DifferenceOperator, intervals: usize) -> Result<Rows, ClosedFault> {
    let mut rows = ended(operator, intervals, 1)?;
    scale(&mut rows, -(intervals as f64));
    Ok(without(&rows, &[0]))
}

/// u_t = u_xx on [0, 1] with conditions at 0 and 1. Conditions on the flux need end rows that contain it.
pub fn diffusion(
    second: &DifferenceOperator,
    intervals: usize,
    faces: [FaceCondition; 2],
) -> Result<Rows, ClosedFault> {
    let rows = ended(second, intervals, 2)?;
    let norm_weight = match second.end_rows() {
        Some(EndRows::NaturalFlux { norm_weight }) => Some(round::nearest(norm_weight)),
        _ => None,
    };
    conditioned(rows, intervals, norm_weight, faces)
}

/// u_t = (b u_x)_x on [0, 1] with nodal coefficients b, one more than intervals.
pub fn varying_diffusion(
    form: &SecondDerivativeForm,
    coefficient: &[f64],
    faces: [FaceCondition; 2],
) -> Result<Rows, ClosedFault> {
    let nodes = coefficient.len();
    if form.is_periodic() {
        return Err(ClosedFault::Periodic);
    }
    let needed = form.minimum_nodes();
    let mut rows = vec![vec![0.0; nodes]; nodes];
    for (index, row) in rows.iter_mut().enumerate() {
        let forms = form.row(index, nodes).ok_or(ClosedFault::TooFewNodes { needed })?;
        for (column, linear) in forms {
            row[column] =
                linear.iter().map(|(node, factor)| round::nearest(factor) * coefficient[*node]).sum();
        }
    }
    if nodes < 2 {
        return Err(ClosedFault::TooFewNodes { needed });
    }
    let norm_weight = round::nearest(&form.norm().weight(0, nodes));
    conditioned(rows, nodes - 1, Some(norm_weight), faces)
}

/// u_tt = u_xx on [0, 1] with conditions at 0 and 1.
pub fn wave(
    second: &DifferenceOperator,
    intervals: usize,
    faces: [WaveFace; 2],
) -> Result<ClosedWave, ClosedFault> {
    let stiffness = diffusion(
        second,
        intervals,
        faces.map(|face| match face {
            WaveFace::Value => FaceCondition::Value,
            WaveFace::Flux | WaveFace::Absorbing { .. } => FaceCondition::Flux,
        }),
    )?;
    let mut damping = vec![0.0; stiffness.len()];
    let last = damping.len().saturating_sub(1);
    for (place, face) in [0, last].into_iter().zip(faces) {
        if let (WaveFace::Absorbing { impedance }, Some(EndRows::NaturalFlux { norm_weight })) =
            (face, second.end_rows())
        {
            damping[place] += impedance * intervals as f64 / round::nearest(norm_weight);
        }
    }
    Ok(ClosedWave { stiffness, damping })
}

impl ClosedWave {
    /// The matrix of (u, u_t): [0, 1; stiffness, −damping].
    pub fn system(&self) -> Rows {
        let size = self.stiffness.len();
        let mut rows = vec![vec![0.0; 2 * size]; 2 * size];
        for index in 0..size {
            rows[index][size + index] = 1.0;
            rows[size + index][..size].copy_from_slice(&self.stiffness[index]);
            rows[size + index][size + index] = -self.damping[index];
        }
        rows
    }

    /// The matrix of one leapfrog step with the damping centred in time, on (u_n, u_{n−1}):
    /// (1 + dt C/2) u_{n+1} = (2 + dt² L) u_n − (1 − dt C/2) u_{n−1}.
    pub fn leapfrog_step(&self, step: f64) -> Rows {
        let size = self.stiffness.len();
        let mut rows = vec![vec![0.0; 2 * size]; 2 * size];
        for index in 0..size {
            let half = 0.5 * step * self.damping[index];
            for (column, entry) in self.stiffness[index].iter().enumerate() {
                rows[index][column] = step * step * entry / (1.0 + half);
            }
            rows[index][index] += 2.0 / (1.0 + half);
            rows[index][size + index] = -(1.0 - half) / (1.0 + half);
            rows[size + index][index] = 1.0;
        }
        rows
    }
}

/// p_t = −v_x, v_t = −p_x on [0, 1]; at each face the incoming characteristic is `reflection` times the outgoing one, p + v running
/// to the right. Unknowns: all p, then all v. Energy does not grow for |reflection| ≤ 1.
pub fn acoustics(
    first: &SummationByParts,
    intervals: usize,
    reflection: [f64; 2],
) -> Result<Rows, ClosedFault> {
    let derivative = ended(first.operator(), intervals, 1)?;
    let (nodes, per_length) = (derivative.len(), intervals as f64);
    let mut rows = vec![vec![0.0; 2 * nodes]; 2 * nodes];
    for (index, weights) in derivative.iter().enumerate() {
        for (column, weight) in weights.iter().enumerate() {
            rows[index][nodes + column] = -per_length * weight;
            rows[nodes + index][column] = -per_length * weight;
        }
    }
    let pull = per_length / end_weight(first, intervals);
    // At 0: p + v ← reflection (p − v). At 1: p − v ← reflection (p + v). Half of each pull goes to p, half to ±v.
    for (node, outward, reflection) in [(0, -1.0, reflection[0]), (nodes - 1, 1.0, reflection[1])] {
        let (of_p, of_v) = (1.0 - reflection, -outward * (1.0 + reflection));
        rows[node][node] -= 0.5 * pull * of_p;
        rows[node][nodes + node] -= 0.5 * pull * of_v;
        rows[nodes + node][node] += 0.5 * pull * outward * of_p;
        rows[nodes + node][nodes + node] += 0.5 * pull * outward * of_v;
    }
    Ok(rows)
}

/// The operator on a whole axis of unit spacing, closed or periodic.
pub fn dense(operator: &DifferenceOperator, nodes: usize) -> Result<Rows, ClosedFault> {
    let needed = operator.minimum_nodes();
    if nodes < needed || nodes == 0 {
        return Err(ClosedFault::TooFewNodes { needed });
    }
    let interior: Vec<f64> = operator.taps().iter().map(round::nearest).collect();
    let closed = operator.closure().len();
    let mut rows = vec![vec![0.0; nodes]; nodes];
    for (index, row) in rows.iter_mut().enumerate() {
        let near_end = index < closed || index + closed >= nodes;
        let (first, weights) = if near_end {
            let (first, weights) = operator.row(index, nodes).ok_or(ClosedFault::TooFewNodes { needed })?;
            (first, weights.iter().map(round::nearest).collect())
        } else {
            (index as i64 - operator.left_reach() as i64, interior.clone())
        };
        for (column, weight) in (first..).zip(weights) {
            row[column.rem_euclid(nodes as i64) as usize] += weight;
        }
    }
    Ok(rows)
}

/// The operator between two ends, of the right degree.
fn ended(operator: &DifferenceOperator, intervals: usize, degree: usize) -> Result<Rows, ClosedFault> {
    if operator.derivative() != degree {
        return Err(ClosedFault::Degree { found: operator.derivative() });
    }
    if operator.is_periodic() {
        return Err(ClosedFault::Periodic);
    }
    if intervals == 0 {
        return Err(ClosedFault::TooFewNodes { needed: operator.minimum_nodes().max(2) });
    }
    dense(operator, intervals + 1)
}

/// Second-derivative rows of unit spacing, with conditions at both ends, on [0, 1].
fn conditioned(
    mut rows: Rows,
    intervals: usize,
    norm_weight: Option<f64>,
    faces: [FaceCondition; 2],
) -> Result<Rows, ClosedFault> {
    let per_length = intervals as f64;
    scale(&mut rows, per_length * per_length);
    let last = rows.len() - 1;
    let mut known = Vec::new();
    for (node, face) in [0, last].into_iter().zip(faces) {
        match (face, norm_weight) {
            (FaceCondition::Value, _) => known.push(node),
            (_, None) => return Err(ClosedFault::NoNaturalFlux),
            (FaceCondition::Flux, Some(_)) => {}
            (FaceCondition::Robin { factor }, Some(weight)) => {
                rows[node][node] -= factor * per_length / weight;
            }
        }
    }
    Ok(without(&rows, &known))
}

fn scale(rows: &mut Rows, factor: f64) {
    rows.iter_mut().flatten().for_each(|entry| *entry *= factor);
}

/// Rows and columns that are left when values at some nodes are known.
fn without(rows: &Rows, known: &[usize]) -> Rows {
    let kept: Vec<usize> = (0..rows.len()).filter(|index| !known.contains(index)).collect();
    kept.iter().map(|i| kept.iter().map(|j| rows[*i][*j]).collect()).collect()
}

/// The norm's weight of the end node.
fn end_weight(first: &SummationByParts, intervals: usize) -> f64 {
    let weight: Rational = first.norm().weight(0, intervals + 1);
    round::nearest(&weight)
}

impl fmt::Display for ClosedFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            ClosedFault::TooFewNodes { needed } => write!(formatter, "the operator needs {needed} nodes"),
            ClosedFault::Periodic => write!(formatter, "the operator is for a periodic axis, without faces"),
            ClosedFault::NoNaturalFlux => {
                write!(formatter, "a condition on the flux needs an operator whose end rows contain it")
            }
            ClosedFault::Degree { found } => {
                write!(formatter, "the operator is for the derivative of degree {found}")
            }
        }
    }
}

impl std::error::Error for ClosedFault {}
