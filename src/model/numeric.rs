//! Numbers for warnings: pointwise expressions evaluated in double precision.
//!
//! Floating-point numbers are used here for warnings and their texts only; nothing that is emitted, and no refusal,
//! rests on them. Free constants stand at their defaults. What has no value here (noise, derivatives) gives `None`.

use super::expression::{Comparison, Expression, Function, Relation};
use super::{AxisId, Model};
use crate::exact::round;

/// A place, a time and, where they are needed, the values of the fields; all in SI base units.
#[derive(Clone, Debug, Default)]
pub struct Point {
    /// One for each axis.
    pub coordinates: Vec<f64>,
    pub time: f64,
    /// By index of the field; `None` where unknown.
    pub fields: Vec<Option<f64>>,
}

/// The value of an expression at a point.
pub fn evaluate(expression: &Expression, model: &Model, point: &Point) -> Option<f64> {
    let value = |inner: &Expression| evaluate(inner, model, point);
    Some(match expression {
        Expression::Number(number) => round::nearest(number),
        Expression::Pi => std::f64::consts::PI,
        Expression::Constant(id) => value(&model.free_constants.get(id.0)?.value)?,
        Expression::Coefficient(id) => value(&model.coefficients.get(id.0)?.value)?,
        Expression::Coordinate(axis) => *point.coordinates.get(axis.0)?,
        Expression::Time => point.time,
        Expression::Field(field) => point.fields.get(field.0).copied().flatten()?,
        Expression::Sum(items) => items.iter().map(value).sum::<Option<f64>>()?,
        Expression::Product(items) => items.iter().map(value).product::<Option<f64>>()?,
        Expression::Quotient(above, below) => value(above)? / value(below)?,
        Expression::Power(base, exponent) => match exponent.to_i64() {
            Some(whole) if whole.abs() <= 64 => value(base)?.powi(whole as i32),
            _ => value(base)?.powf(round::nearest(exponent)),
        },
        Expression::Call(function, arguments) => {
            call(*function, &arguments.iter().map(value).collect::<Option<Vec<_>>>()?)?
        }
        Expression::Cases(cases, otherwise) => {
            for (comparison, result) in cases {
                if holds(comparison, model, point)? {
                    return value(result);
                }
            }
            value(otherwise)?
        }
        Expression::Rate(_)
        | Expression::Noise(_)
        | Expression::Derivative(_)
        | Expression::Normal(_)
        | Expression::Applied(_)
        | Expression::SecondRate(_)
        | Expression::InverseSpacing(_) => return None,
    })
}

/// Whether a comparison holds at a point.
pub fn holds(comparison: &Comparison, model: &Model, point: &Point) -> Option<bool> {
    let (left, right) =
        (evaluate(&comparison.left, model, point)?, evaluate(&comparison.right, model, point)?);
    Some(match comparison.relation {
        Relation::Less => left < right,
        Relation::LessOrEqual => left <= right,
        Relation::Greater => left > right,
        Relation::GreaterOrEqual => left >= right,
    })
}

/// Coordinates of all nodes of an axis.
pub fn nodes(model: &Model, axis: AxisId) -> Option<Vec<f64>> {
    let (low, spacing, count) = grid(model, axis)?;
    Some((0..count).map(|index| low + spacing * index as f64).collect())
}

/// The spacing of an axis.
pub fn spacing(model: &Model, axis: AxisId) -> Option<f64> {
    grid(model, axis).map(|(_, spacing, _)| spacing)
}

fn grid(model: &Model, axis: AxisId) -> Option<(f64, f64, usize)> {
    let found = model.axes.get(axis.0)?;
    let nowhere = Point::default();
    let low = evaluate(&found.low, model, &nowhere)?;
    let high = evaluate(&found.high, model, &nowhere)?;
    let parts = if found.periodic { found.nodes } else { found.nodes.checked_sub(1)? };
    (parts > 0).then(|| (low, (high - low) / parts as f64, found.nodes))
}

fn call(function: Function, arguments: &[f64]) -> Option<f64> {
    let first = *arguments.first()?;
    Some(match function {
        Function::Sin => first.sin(),
        Function::Cos => first.cos(),
        Function::Tan => first.tan(),
        Function::Exp => first.exp(),
        Function::Log => first.ln(),
        Function::Sqrt => first.sqrt(),
        Function::Abs => first.abs(),
        Function::Minimum => arguments.iter().copied().fold(first, f64::min),
        Function::Maximum => arguments.iter().copied().fold(first, f64::max),
        Function::Tanh => first.tanh(),
        Function::Sinh => first.sinh(),
        Function::Cosh => first.cosh(),
        Function::Erf => error_function(first),
        Function::Erfc => 1.0 - error_function(first),
        Function::Sign => {
            if first == 0.0 {
                0.0
            } else {
                first.signum()
            }
        }
    })
}

/// erf by its series with positive terms, 2/√π e^(−x²) Σ 2ⁿ x^(2n+1)/(1·3·…·(2n+1)) (Abramowitz & Stegun 7.1.6, from memory).
fn error_function(x: f64) -> f64 {
    if x.abs() > 6.0 {
        return x.signum();
    }
    let mut term = x;
    let mut sum = x;
    for n in 1..200 {
        term *= 2.0 * x * x / f64::from(2 * n + 1);
        sum += term;
    }
    2.0 / std::f64::consts::PI.sqrt() * (-x * x).exp() * sum
}

#[cfg(test)]
mod tests {
    use super::error_function;

    /// Values of a table (Abramowitz & Stegun, table 7.1, from memory).
    #[test]
    fn the_error_function_meets_the_table() {
        for (x, known) in [(0.0, 0.0), (0.5, 0.520_499_877_8), (1.0, 0.842_700_792_9), (2.0, 0.995_322_265_0)]
        {
            assert!((error_function(x) - known).abs() < 1e-9, "{x}");
            assert!((error_function(-x) + known).abs() < 1e-9, "{x}");
        }
    }
}
