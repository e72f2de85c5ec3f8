//! First-order systems seen along one axis: q_t + A q_x + … = 0, its normal matrix and the count of entering characteristics.
//!
//! Only fields that are first order in time and have no second derivative of their own along the axis are hyperbolic
//! there; the others need one condition a face for their diffusion and are left out of the matrix's blocks.

use super::calculus::{DerivativeTerm, Variable, derivative_terms, expand, partial};
use super::expression::DerivativeKind;
use super::sign::{Sign, sign};
use super::{AxisId, Expression, Face, FieldId, Model, Side, TimeOrder};
use crate::exact::Rational;

/// Fields coupled by first derivatives along one axis.
#[derive(Clone, Debug)]
pub struct Block {
    /// The axis along which they are coupled.
    pub axis: AxisId,
    /// In the order of the model.
    pub fields: Vec<FieldId>,
    /// A of q_t + A q_x = …, rows and columns in the order of `fields`.
    pub matrix: Vec<Vec<Expression>>,
}

/// The terms of a field's equation that are second derivatives of that field along the axis: factor × coefficient.
pub fn own_second_terms(model: &Model, field: FieldId, axis: AxisId) -> Vec<DerivativeTerm> {
    let Some((terms, _)) = derivative_terms(&model.equations[field.0].right) else { return Vec::new() };
    terms
        .into_iter()
        .filter(|term| match &term.derivative.kind {
            DerivativeKind::Second { axis: along, of, .. } => {
                *along == axis
                    && partial(of, Variable::Field(field), &model.coefficients)
                        .is_none_or(|slope| !slope.is_zero())
            }
            _ => false,
        })
        .collect()
}

/// Whether the field takes part in first-order transport along the axis (hyperbolic there).
pub fn is_hyperbolic(model: &Model, field: FieldId, axis: AxisId) -> bool {
    model.equations[field.0].order == TimeOrder::First && own_second_terms(model, field, axis).is_empty()
}

/// A[f][g] for the given fields; `None` where an equation is not linear in its derivatives or a flux cannot be differentiated.
pub fn matrix(model: &Model, fields: &[FieldId], axis: AxisId) -> Option<Vec<Vec<Expression>>> {
    let mut rows = Vec::new();
    for row in fields {
        let (terms, _) = derivative_terms(&model.equations[row.0].right)?;
        let mut entries = vec![Expression::zero(); fields.len()];
        for term in &terms {
            let DerivativeKind::First { axis: along, of } = &term.derivative.kind else { continue };
            if *along != axis {
                continue;
            }
            for (column, field) in fields.iter().enumerate() {
                let slope = partial(of, Variable::Field(*field), &model.coefficients)?;
                let entry = term.factor.clone().times(slope).negative();
                entries[column] = Expression::sum([entries[column].clone(), entry]);
            }
        }
        rows.push(entries);
    }
    Some(rows)
}

/// The hyperbolic fields along the axis, split into blocks that first derivatives couple. A field that influences no
/// derivative (its column is zero) is only driven: it makes a block of its own with the zero matrix, and nothing enters for it.
pub fn blocks(model: &Model, axis: AxisId) -> Option<Vec<Block>> {
    let fields: Vec<FieldId> =
        (0..model.fields.len()).map(FieldId).filter(|field| is_hyperbolic(model, *field, axis)).collect();
    let mut whole = matrix(model, &fields, axis)?;
    release_driven(&mut whole);
    let mut group: Vec<usize> = (0..fields.len()).collect();
    for row in 0..fields.len() {
        for column in 0..fields.len() {
            if !whole[row][column].is_zero() && group[row] != group[column] {
                let (old, new) = (group[row].max(group[column]), group[row].min(group[column]));
                group.iter_mut().filter(|entry| **entry == old).for_each(|entry| *entry = new);
            }
        }
    }
    let mut result = Vec::new();
    for leader in 0..fields.len() {
        let members: Vec<usize> = (0..fields.len()).filter(|index| group[*index] == leader).collect();
        if members.is_empty() {
            continue;
        }
        result.push(Block {
            axis,
            fields: members.iter().map(|index| fields[*index]).collect(),
            matrix: members
                .iter()
                .map(|row| members.iter().map(|column| whole[*row][*column].clone()).collect())
                .collect(),
        });
    }
    Some(result)
}

/// Takes fields that no derivative acts on out of the coupling: their own eigenvalue is zero and they feed nothing back,
/// so that the speeds of the others do not change. Repeated, as each removal may free another.
fn release_driven(matrix: &mut [Vec<Expression>]) {
    let driven = |matrix: &[Vec<Expression>], field: usize| {
        matrix.iter().all(|row| row[field].is_zero()) && matrix[field].iter().any(|entry| !entry.is_zero())
    };
    while let Some(field) = (0..matrix.len()).find(|field| driven(matrix, *field)) {
        matrix[field].iter_mut().for_each(|entry| *entry = Expression::zero());
    }
}

/// How many characteristics enter, or why that cannot be said.
#[derive(Clone, Debug, PartialEq, Eq)]
pub enum Entering {
    Count(usize),
    /// The sign of this speed is not known from constants and bounds.
    UnknownSign(Expression),
    /// Three or more fields coupled at a face.
    TooLarge(usize),
}

/// sA with s = −1 at the low face, +1 at the high face.
pub fn outward(block: &Block, side: Side) -> Vec<Vec<Expression>> {
    block
        .matrix
        .iter()
        .map(|row| {
            row.iter()
                .map(|entry| if side == Side::High { entry.clone() } else { entry.clone().negative() })
                .collect()
        })
        .collect()
}

/// Number of negative eigenvalues of the outward matrix. Signs are taken at the face: the coordinate along the axis has its
/// value there.
pub fn entering(model: &Model, block: &Block, side: Side) -> Entering {
    let matrix = outward(block, side);
    let face = Face { axis: block.axis, side };
    match matrix.len() {
        1 => match sign_at(&matrix[0][0], model, face) {
            Sign::Negative | Sign::NonPositive => Entering::Count(1),
            Sign::Zero | Sign::Positive | Sign::NonNegative => Entering::Count(0),
            Sign::Unknown => Entering::UnknownSign(matrix[0][0].clone()),
        },
        2 => entering_pair(model, &matrix, face),
        size => Entering::TooLarge(size),
    }
}

fn entering_pair(model: &Model, matrix: &[Vec<Expression>], face: Face) -> Entering {
    let [a, b, c, d] = [&matrix[0][0], &matrix[0][1], &matrix[1][0], &matrix[1][1]];
    let count = |entry: &Expression| match sign_at(entry, model, face) {
        Sign::Negative | Sign::NonPositive => Some(1),
        Sign::Unknown => None,
        _ => Some(0),
    };
    // A triangular pair has its diagonal as eigenvalues.
    if b.is_zero() || c.is_zero() {
        return match (count(a), count(d)) {
            (Some(first), Some(second)) => Entering::Count(first + second),
            (None, _) => Entering::UnknownSign(a.clone()),
            _ => Entering::UnknownSign(d.clone()),
        };
    }
    let determinant = a.clone().times(d.clone()).minus(b.clone().times(c.clone()));
    match sign_at(&determinant, model, face) {
        Sign::Negative | Sign::NonPositive => Entering::Count(1),
        Sign::Positive | Sign::NonNegative | Sign::Zero => {
            let trace = Expression::sum([a.clone(), d.clone()]);
            match sign_at(&trace, model, face) {
                Sign::Negative | Sign::NonPositive => Entering::Count(2),
                Sign::Unknown => Entering::UnknownSign(trace),
                _ => Entering::Count(0),
            }
        }
        Sign::Unknown => Entering::UnknownSign(determinant),
    }
}

/// The expression at a face: coefficients looked through, the normal coordinate at its value there.
pub fn at_face(expression: &Expression, model: &Model, face: Face) -> Expression {
    let place = model.axes.get(face.axis.0).map(|axis| match face.side {
        Side::Low => axis.low.clone(),
        Side::High => axis.high.clone(),
    });
    expand(expression, &model.coefficients).rewrite(&mut |node| match (&node, &place) {
        (Expression::Coordinate(axis), Some(place)) if *axis == face.axis => place.clone(),
        _ => node,
    })
}

/// The sign of an expression at a face.
pub fn sign_at(expression: &Expression, model: &Model, face: Face) -> Sign {
    sign(&at_face(expression, model, face), model)
}

/// Eigenvalues of a block's matrix as expressions: the mean of the diagonal and the root that is added to and subtracted
/// from it; for one field the root is zero. `None` for larger blocks.
pub fn mean_and_root(matrix: &[Vec<Expression>]) -> Option<(Expression, Expression)> {
    let half = |value: Expression| Expression::Number(Rational::ratio(1, 2)).times(value);
    match matrix.len() {
        1 => Some((matrix[0][0].clone(), Expression::zero())),
        2 => {
            let [a, b, c, d] = [&matrix[0][0], &matrix[0][1], &matrix[1][0], &matrix[1][1]];
            let mean = half(Expression::sum([a.clone(), d.clone()]));
            let difference = half(a.clone().minus(d.clone()));
            let radicand = Expression::sum([difference.power(Rational::from(2)), b.clone().times(c.clone())]);
            let root = if radicand.is_zero() { Expression::zero() } else { radicand.square_root() };
            Some((mean, root))
        }
        _ => None,
    }
}
