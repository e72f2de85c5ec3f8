//! The law of the step limit for a model: one pointwise expression, evaluated when the program runs.
//!
//! From the frozen-coefficient symbol: odd derivatives fill an interval of the imaginary axis of half length I, even ones an interval
//! of the negative real axis of length R, both sums over the axes of (largest symbol of the stencil) × coefficient / spacingⁿ.
//! A method whose region holds the triangle with corners ±iβᵢ and −βᵣ (times its combined factor) allows 1/(I/βᵢ + R/βᵣ).
//! Fields coupled in both directions enter through √(m_fg m_gf), which does not depend on units; where the couplings of first
//! derivatives form a star (acoustics: pressure with each velocity) they add in squares.
//! Closed operators were never found to allow less than the interior; `closed` checks that for every order used here.

use super::stability::Extents;
use super::symbol;
use crate::exact::{Rational, round};
use crate::model::calculus::{Variable, derivative_terms, partial};
use crate::model::expression::DerivativeKind;
use crate::model::{AxisId, Expression, FieldId, Function, Method, Model, TimeOrder, Treatment};
use crate::scheme::{LimitLaw, Scheme};

/// The law for the model's method, its scheme and the method's stability extents.
pub fn law(model: &Model, scheme: &Scheme, extents: &Extents) -> LimitLaw {
    let reader = Reader { model, scheme };
    let first: Vec<FieldId> = fields_of(model, TimeOrder::First);
    let second: Vec<FieldId> = fields_of(model, TimeOrder::Second);
    let mut rates = Vec::new();
    let mut words = Vec::new();
    if !first.is_empty() {
        let odd = reader.radius(&first, Parity::Odd);
        let even = Expression::sum([reader.radius(&first, Parity::Even), reader.face_rate(&first)]);
        rates.push(combine(model, odd, even, extents, &mut words));
    }
    if !second.is_empty() {
        let stiffness = Expression::sum([
            reader.radius(&second, Parity::Even),
            reader.radius(&second, Parity::Odd),
            reader.face_rate(&second),
        ]);
        let frequency = if stiffness.is_zero() { stiffness } else { stiffness.square_root() };
        let (share, word) = match model.time.method {
            Method::Leapfrog => (Rational::ratio(1, 2), "leapfrog: dt ≤ 2/√ρ".to_owned()),
            _ => (
                inverse(extents.imaginary),
                format!("dt ≤ {:.6}/√ρ on the imaginary axis", extents.imaginary),
            ),
        };
        words.push(word);
        rates.push(Expression::Number(share).times(frequency));
    }
    let rate = match rates.len() {
        0 => Expression::zero(),
        1 => rates.remove(0),
        _ => Expression::Call(Function::Maximum, rates),
    };
    words.push(reader.radii());
    LimitLaw { rate, text: words.join("; "), closed_factor: Rational::from(1) }
}

fn combine(
    model: &Model,
    odd: Expression,
    even: Expression,
    extents: &Extents,
    words: &mut Vec<String>,
) -> Expression {
    match (odd.is_zero(), even.is_zero()) {
        (true, _) => {
            words.push(format!("dt ≤ {:.6}/R on the negative real axis", extents.real));
            Expression::Number(inverse(extents.real)).times(even)
        }
        (false, true) => {
            words.push(format!("dt ≤ {:.6}/I on the imaginary axis", extents.imaginary));
            Expression::Number(inverse(extents.imaginary)).times(odd)
        }
        (false, false) if extents.imaginary <= 0.0 => {
            // Forward Euler: |1 + dt λ| ≤ 1 on every mode asks for dt ≤ 2R/(R² + I²); the long waves ask for dt ≤ 2k/a².
            words.push(
                "dt ≤ 1/(R/2 + Σ a²/(2k)): diffusion carries the transport of a forward Euler step"
                    .to_owned(),
            );
            let reader = Reader { model, scheme: &Scheme::empty() };
            Expression::sum([Expression::Number(inverse(extents.real)).times(even), reader.long_waves()])
        }
        (false, false) => {
            words.push(format!(
                "dt ≤ {:.6}/(I/{:.6} + R/{:.6}), the triangle inside the stability region",
                extents.combined, extents.imaginary, extents.real
            ));
            let both = Expression::sum([
                Expression::Number(inverse(extents.imaginary)).times(odd),
                Expression::Number(inverse(extents.real)).times(even),
            ]);
            Expression::Number(inverse(extents.combined)).times(both)
        }
    }
}

/// 1/value as an exact number that is not too small; a method that allows nothing gives a rate without bound in practice.
fn inverse(value: f64) -> Rational {
    let exact = round::from_f64(value).unwrap_or_else(Rational::zero);
    exact.recip().unwrap_or_else(|| Rational::from(1_000_000_000))
}

fn fields_of(model: &Model, order: TimeOrder) -> Vec<FieldId> {
    model.equations.iter().filter(|equation| equation.order == order).map(|equation| equation.field).collect()
}

#[derive(Clone, Copy, PartialEq, Eq)]
enum Parity {
    Odd,
    Even,
}

/// One part of the symbol: number of derivatives and magnitude (1/time for first-order equations).
struct Part {
    degree: usize,
    size: Expression,
}

struct Reader<'a> {
    model: &'a Model,
    scheme: &'a Scheme,
}

impl Reader<'_> {
    /// Bound of the spectral radius of the part of that parity, over a group of fields.
    fn radius(&self, fields: &[FieldId], parity: Parity) -> Expression {
        let sizes: Vec<Vec<Expression>> = fields
            .iter()
            .map(|row| fields.iter().map(|column| self.size(*row, *column, parity)).collect())
            .collect();
        let diagonal = |index: usize| sizes[index][index].clone();
        let pair = |a: usize, b: usize| {
            if sizes[a][b].is_zero() || sizes[b][a].is_zero() {
                Expression::zero()
            } else {
                sizes[a][b].clone().times(sizes[b][a].clone())
            }
        };
        let partners = |index: usize| -> Vec<usize> {
            (0..fields.len()).filter(|other| *other != index && !pair(index, *other).is_zero()).collect()
        };
        let own: Vec<Expression> = (0..fields.len()).map(diagonal).collect();
        let mut couplings = Vec::new();
        for index in 0..fields.len() {
            let others = partners(index);
            let centre_of_star = others.iter().all(|other| partners(*other).len() == 1);
            let arm_of_star = others.len() == 1 && partners(others[0]).len() > 1;
            couplings.push(if others.is_empty() || arm_of_star {
                // An arm is bounded by its centre's row.
                Expression::zero()
            } else if centre_of_star {
                Expression::sum(others.iter().map(|other| pair(index, *other)).collect::<Vec<_>>())
                    .square_root()
            } else {
                Expression::sum(
                    others.iter().map(|other| pair(index, *other).square_root()).collect::<Vec<_>>(),
                )
            });
        }
        Expression::sum([largest(own), largest(couplings)])
    }

    fn size(&self, row: FieldId, column: FieldId, parity: Parity) -> Expression {
        let parts = self.parts(&self.model.equations[row.0].right, column);
        let wanted = parts.into_iter().filter(|part| (part.degree % 2 == 1) == (parity == Parity::Odd));
        Expression::sum(wanted.map(|part| part.size).collect::<Vec<_>>())
    }

    /// The symbol of ∂expression/∂field, part by part.
    fn parts(&self, expression: &Expression, field: FieldId) -> Vec<Part> {
        let Some((terms, rest)) = derivative_terms(expression) else { return Vec::new() };
        let mut parts = Vec::new();
        if let Some(slope) = partial(&rest, Variable::Field(field), &self.model.coefficients)
            && !slope.is_zero()
        {
            parts.push(Part { degree: 0, size: magnitude(slope) });
        }
        for term in terms {
            let (inner, gain, degree) = match &term.derivative.kind {
                DerivativeKind::First { axis, of } => (of, self.gain(*axis, 1), 1),
                DerivativeKind::Second { axis, coefficient, of } => {
                    (of, magnitude(coefficient.clone()).times(self.gain(*axis, 2)), 2)
                }
                DerivativeKind::Mixed { outer, inner, coefficient, of } => {
                    let both = self.gain(*outer, 1).times(self.gain(*inner, 1));
                    (of, magnitude(coefficient.clone()).times(both), 2)
                }
                DerivativeKind::Higher { axis, degree, of } => (of, self.gain(*axis, *degree), *degree),
            };
            for part in self.parts(inner, field) {
                let size = Expression::product([magnitude(term.factor.clone()), gain.clone(), part.size]);
                parts.push(Part { degree: part.degree + degree, size });
            }
        }
        parts
    }

    /// Largest symbol of the axis's stencil for the n-th derivative, over spacingⁿ.
    fn gain(&self, axis: AxisId, degree: usize) -> Expression {
        let order = self.scheme.axes.get(axis.0).map_or(2, |facts| 2 * facts.half_order);
        let radius = round::from_f64(symbol::radius(degree, order)).unwrap_or_else(Rational::one);
        Expression::Number(radius)
            .times(Expression::InverseSpacing(axis).power(Rational::from(degree as i64)))
    }

    /// What flux conditions that depend on the field itself (Robin) add at the face.
    fn face_rate(&self, fields: &[FieldId]) -> Expression {
        let mut added = Vec::new();
        for correction in &self.scheme.corrections {
            let by_flux = self.model.conditions.iter().any(|condition| {
                condition.face == correction.face
                    && matches!(&condition.treatment, Treatment::Flux { field, .. } if *field == correction.field)
            });
            if by_flux
                && fields.contains(&correction.field)
                && let Some(slope) =
                    partial(&correction.value, Variable::Field(correction.field), &self.model.coefficients)
                && !slope.is_zero()
            {
                added.push(magnitude(slope));
            }
        }
        Expression::sum(added)
    }

    /// Σ a²/(2k) over axes: what the long waves of forward Euler ask for.
    fn long_waves(&self) -> Expression {
        let mut parts = Vec::new();
        for equation in &self.model.equations {
            let Some((terms, _)) = derivative_terms(&equation.right) else { continue };
            for axis in (0..self.model.axes.len()).map(AxisId) {
                let mut speed = Vec::new();
                let mut diffusion = Vec::new();
                for term in &terms {
                    match &term.derivative.kind {
                        DerivativeKind::First { axis: along, of } if *along == axis => {
                            if let Some(slope) =
                                partial(of, Variable::Field(equation.field), &self.model.coefficients)
                            {
                                speed.push(term.factor.clone().times(slope));
                            }
                        }
                        DerivativeKind::Second { axis: along, coefficient, of } if *along == axis => {
                            if let Some(slope) =
                                partial(of, Variable::Field(equation.field), &self.model.coefficients)
                            {
                                diffusion.push(Expression::product([
                                    term.factor.clone(),
                                    coefficient.clone(),
                                    slope,
                                ]));
                            }
                        }
                        _ => {}
                    }
                }
                let (speed, diffusion) = (Expression::sum(speed), Expression::sum(diffusion));
                if !speed.is_zero() && !diffusion.is_zero() {
                    let square = speed.power(Rational::from(2));
                    parts.push(square.over(Expression::Number(Rational::from(2)).times(diffusion)));
                }
            }
        }
        Expression::sum(parts)
    }

    fn radii(&self) -> String {
        let per_axis: Vec<String> = self
            .model
            .axes
            .iter()
            .zip(&self.scheme.axes)
            .map(|(axis, facts)| {
                let order = 2 * facts.half_order;
                format!(
                    "{}: order {order}, largest symbol {:.6} (first), {:.6} (second derivative)",
                    axis.name,
                    symbol::radius(1, order),
                    symbol::radius(2, order)
                )
            })
            .collect();
        per_axis.join("; ")
    }
}

/// The largest of some magnitudes; zeros and repetitions are left out.
fn largest(values: Vec<Expression>) -> Expression {
    let mut kept: Vec<Expression> = Vec::new();
    for value in values {
        if !value.is_zero() && !kept.contains(&value) {
            kept.push(value);
        }
    }
    match kept.len() {
        0 => Expression::zero(),
        1 => kept.remove(0),
        _ => Expression::Call(Function::Maximum, kept),
    }
}

/// |expression|, without the sign of a leading number.
fn magnitude(expression: Expression) -> Expression {
    match &expression {
        Expression::Number(number) => Expression::Number(number.abs()),
        Expression::Product(items) => {
            Expression::product(items.iter().cloned().map(magnitude).collect::<Vec<_>>())
        }
        Expression::Quotient(above, below) => magnitude((**above).clone()).over(magnitude((**below).clone())),
        Expression::Pi | Expression::InverseSpacing(_) => expression,
        Expression::Power(base, exponent) if matches!(**base, Expression::InverseSpacing(_)) => {
            Expression::Power(base.clone(), exponent.clone())
        }
        _ => Expression::Call(Function::Abs, vec![expression]),
    }
}
