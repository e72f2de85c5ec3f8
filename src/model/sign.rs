//! Signs and bounds of expressions by exact interval arithmetic, for characteristics, film coefficients and conductivities.
//!
//! The bounds are rigorous where the inputs are: fields range over their stated bounds (anything, where none are stated),
//! coordinates over their axes, free constants over their stated range (their default value, where none is stated).

use super::expression::{Comparison, Expression, Function};
use super::{FieldId, Model};
use crate::exact::Rational;

/// A closed interval; `None` is unbounded on that side.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Interval {
    pub low: Option<Rational>,
    pub high: Option<Rational>,
}

/// What is known of a sign.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Sign {
    Negative,
    NonPositive,
    Zero,
    NonNegative,
    Positive,
    Unknown,
}

impl Interval {
    pub fn all() -> Interval {
        Interval { low: None, high: None }
    }

    pub fn point(value: Rational) -> Interval {
        Interval { low: Some(value.clone()), high: Some(value) }
    }

    fn between(low: i64, high: i64) -> Interval {
        Interval { low: Some(Rational::from(low)), high: Some(Rational::from(high)) }
    }

    fn union(self, other: Interval) -> Interval {
        let pick = |a: Option<Rational>, b: Option<Rational>, smaller: bool| match (a, b) {
            (Some(a), Some(b)) => Some(if (a < b) == smaller { a } else { b }),
            _ => None,
        };
        Interval { low: pick(self.low, other.low, true), high: pick(self.high, other.high, false) }
    }

    fn plus(&self, other: &Interval) -> Interval {
        let add = |a: &Option<Rational>, b: &Option<Rational>| Some(a.as_ref()? + b.as_ref()?);
        Interval { low: add(&self.low, &other.low), high: add(&self.high, &other.high) }
    }

    fn times(&self, other: &Interval) -> Interval {
        let zero = Rational::from(0);
        if *self == Interval::point(zero.clone()) || *other == Interval::point(zero.clone()) {
            return Interval::point(zero);
        }
        match (self.sign(), other.sign()) {
            (Sign::Positive | Sign::NonNegative, Sign::Positive | Sign::NonNegative) => Interval {
                low: self.low.as_ref().zip(other.low.as_ref()).map(|(a, b)| a * b),
                high: self.high.as_ref().zip(other.high.as_ref()).map(|(a, b)| a * b),
            },
            (Sign::Negative | Sign::NonPositive, _) => self.negative().times(other).negative(),
            (_, Sign::Negative | Sign::NonPositive) => self.times(&other.negative()).negative(),
            _ => match (&self.low, &self.high, &other.low, &other.high) {
                (Some(a), Some(b), Some(c), Some(d)) => {
                    let ends = [a * c, a * d, b * c, b * d];
                    Interval { low: ends.iter().min().cloned(), high: ends.iter().max().cloned() }
                }
                _ => Interval::all(),
            },
        }
    }

    fn negative(&self) -> Interval {
        let flip = |end: &Option<Rational>| end.as_ref().map(|value| &Rational::from(0) - value);
        Interval { low: flip(&self.high), high: flip(&self.low) }
    }

    fn inverse(&self) -> Interval {
        match self.sign() {
            Sign::Positive | Sign::Negative => Interval {
                low: self
                    .high
                    .as_ref()
                    .map_or((self.sign() == Sign::Positive).then(|| Rational::from(0)), Rational::recip),
                high: self
                    .low
                    .as_ref()
                    .map_or((self.sign() == Sign::Negative).then(|| Rational::from(0)), Rational::recip),
            },
            Sign::NonNegative => Interval {
                low: Some(self.high.as_ref().and_then(Rational::recip).unwrap_or_else(|| Rational::from(0))),
                high: None,
            },
            _ => Interval::all(),
        }
    }

    /// The sign that holds throughout.
    pub fn sign(&self) -> Sign {
        let zero = Rational::from(0);
        match (&self.low, &self.high) {
            (Some(low), Some(high)) if *low == zero && *high == zero => Sign::Zero,
            (Some(low), _) if *low > zero => Sign::Positive,
            (_, Some(high)) if *high < zero => Sign::Negative,
            (Some(low), _) if *low == zero => Sign::NonNegative,
            (_, Some(high)) if *high == zero => Sign::NonPositive,
            _ => Sign::Unknown,
        }
    }
}

/// Bounds of a pointwise expression of the model.
pub fn interval(expression: &Expression, model: &Model) -> Interval {
    match expression {
        Expression::Number(value) => Interval::point(value.clone()),
        Expression::Pi => Interval {
            low: Some(Rational::ratio(314_159_265, 100_000_000)),
            high: Some(Rational::ratio(314_159_266, 100_000_000)),
        },
        Expression::Constant(id) => match model.free_constants.get(id.0) {
            Some(constant) => match &constant.bounds {
                Some((low, high)) => interval(low, model).union(interval(high, model)),
                None => interval(&constant.value, model),
            },
            None => Interval::all(),
        },
        Expression::Coefficient(id) => model
            .coefficients
            .get(id.0)
            .map_or_else(Interval::all, |coefficient| interval(&coefficient.value, model)),
        Expression::Coordinate(id) => match model.axes.get(id.0) {
            Some(axis) => interval(&axis.low, model).union(interval(&axis.high, model)),
            None => Interval::all(),
        },
        Expression::Time => Interval {
            low: interval(&model.time.start, model).low,
            high: interval(&model.time.end, model).high,
        },
        Expression::Field(FieldId(index)) => {
            match model.fields.get(*index).and_then(|field| field.bounds.as_ref()) {
                Some((low, high)) => interval(low, model).union(interval(high, model)),
                None => Interval::all(),
            }
        }
        Expression::Sum(items) => items
            .iter()
            .map(|item| interval(item, model))
            .fold(Interval::point(Rational::from(0)), |total, item| total.plus(&item)),
        Expression::Product(items) => product_interval(items, model),
        Expression::Quotient(above, below) => interval(above, model).times(&interval(below, model).inverse()),
        Expression::Power(base, exponent) => power(&interval(base, model), exponent),
        Expression::Call(function, arguments) => {
            call(*function, &arguments.iter().map(|item| interval(item, model)).collect::<Vec<_>>())
        }
        Expression::Cases(cases, otherwise) => cases
            .iter()
            .map(|(_, value): &(Comparison, Expression)| interval(value, model))
            .fold(interval(otherwise, model), Interval::union),
        Expression::Noise(_) => Interval::between(0, 1),
        _ => Interval::all(),
    }
}

/// The sign of a pointwise expression of the model, as far as it can be known.
pub fn sign(expression: &Expression, model: &Model) -> Sign {
    interval(expression, model).sign()
}

/// Equal factors are taken as powers first, so that `x·x` is known to be non-negative.
fn product_interval(items: &[Expression], model: &Model) -> Interval {
    let mut total = Interval::point(Rational::from(1));
    let mut done: Vec<&Expression> = Vec::new();
    for item in items {
        if done.contains(&item) {
            continue;
        }
        done.push(item);
        let count = items.iter().filter(|other| *other == item).count();
        total = total.times(&power(&interval(item, model), &Rational::from(count as i64)));
    }
    total
}

fn power(base: &Interval, exponent: &Rational) -> Interval {
    let positive_base = matches!(base.sign(), Sign::Positive | Sign::NonNegative);
    match exponent.to_i64() {
        Some(whole) if whole.abs() <= 16 => {
            if whole < 0 {
                return power(base, &Rational::from(-whole)).inverse();
            }
            let mut total = Interval::point(Rational::from(1));
            for _ in 0..whole / 2 {
                total = total.times(&square(base));
            }
            if whole % 2 == 1 { total.times(base) } else { total }
        }
        _ if positive_base => {
            let strict = base.sign() == Sign::Positive;
            let one = Rational::from(1);
            let above_one = base.low.as_ref().is_some_and(|low| *low >= one) && *exponent > Rational::from(0);
            // Only the sign and the side of one are used; a tighter bound of an irrational root is never needed.
            let low = if above_one { one } else { Rational::from(0) };
            if strict && !above_one {
                open_positive(base, exponent)
            } else {
                Interval { low: Some(low), high: None }
            }
        }
        _ => Interval::all(),
    }
}

/// A positive rational below every value of base^exponent, so that the sign stays known.
fn open_positive(base: &Interval, exponent: &Rational) -> Interval {
    let one = Rational::from(1);
    let positive = *exponent > Rational::from(0);
    let end = if positive { base.low.clone() } else { base.high.as_ref().and_then(Rational::recip) };
    match end {
        // For 0 < b < 1 and 0 < e ≤ 1, b^e ≥ b; larger exponents are bounded by the next whole power.
        Some(value) if value < one => {
            let magnitude = exponent.abs();
            let whole =
                (1..=16u32).find(|whole| Rational::from(i64::from(*whole)) >= magnitude).unwrap_or(16);
            Interval { low: Some(value.power(whole)), high: None }
        }
        Some(_) => Interval { low: Some(one), high: None },
        None => Interval { low: Some(Rational::from(0)), high: None },
    }
}

fn square(base: &Interval) -> Interval {
    let positive = match base.sign() {
        Sign::Negative | Sign::NonPositive => base.negative(),
        Sign::Unknown => {
            let larger = match (&base.low, &base.high) {
                (Some(low), Some(high)) => Some(low.abs().max(high.abs())),
                _ => None,
            };
            return Interval { low: Some(Rational::from(0)), high: larger.map(|value| &value * &value) };
        }
        _ => base.clone(),
    };
    positive.times(&positive)
}

fn call(function: Function, arguments: &[Interval]) -> Interval {
    let first = arguments.first().cloned().unwrap_or_else(Interval::all);
    match function {
        Function::Sin | Function::Cos | Function::Tanh | Function::Erf | Function::Sign => {
            Interval::between(-1, 1)
        }
        Function::Erfc => Interval::between(0, 2),
        // exp is positive: e^x ≥ 2^(−n) for x ≥ −n·ln 2, and a coarse power of two is enough for a sign.
        Function::Exp => match &first.low {
            Some(low) if *low > Rational::from(-64) => {
                Interval { low: Rational::from(2).pow(-96), high: exp_high(&first) }
            }
            _ => Interval { low: Some(Rational::from(0)), high: exp_high(&first) },
        },
        Function::Cosh => Interval { low: Some(Rational::from(1)), high: None },
        Function::Sqrt => power(&first, &Rational::ratio(1, 2)),
        Function::Abs => match first.sign() {
            Sign::Positive | Sign::NonNegative | Sign::Zero => first,
            Sign::Negative | Sign::NonPositive => first.negative(),
            Sign::Unknown => {
                let magnitude =
                    first.low.as_ref().zip(first.high.as_ref()).map(|(a, b)| a.abs().max(b.abs()));
                Interval { low: Some(Rational::from(0)), high: magnitude }
            }
        },
        Function::Minimum => extreme(arguments, true),
        Function::Maximum => extreme(arguments, false),
        Function::Tan | Function::Log | Function::Sinh => Interval::all(),
    }
}

fn exp_high(argument: &Interval) -> Option<Rational> {
    match &argument.high {
        Some(high) if *high <= Rational::from(0) => Some(Rational::from(1)),
        _ => None,
    }
}

fn extreme(arguments: &[Interval], smallest: bool) -> Interval {
    let mut result: Option<Interval> = None;
    for item in arguments {
        result = Some(match result {
            None => item.clone(),
            Some(old) => {
                // min: the high end is the least known high, the low end needs both; max the other way round.
                let both = |a: &Option<Rational>, b: &Option<Rational>| match (a, b) {
                    (Some(a), Some(b)) => Some(if smallest { a.min(b).clone() } else { a.max(b).clone() }),
                    _ => None,
                };
                let either = |a: &Option<Rational>, b: &Option<Rational>| match (a, b) {
                    (Some(a), Some(b)) => Some(if smallest { a.min(b).clone() } else { a.max(b).clone() }),
                    (Some(a), None) | (None, Some(a)) => Some(a.clone()),
                    (None, None) => None,
                };
                if smallest {
                    Interval { low: both(&old.low, &item.low), high: either(&old.high, &item.high) }
                } else {
                    Interval { low: either(&old.low, &item.low), high: both(&old.high, &item.high) }
                }
            }
        });
    }
    result.unwrap_or_else(Interval::all)
}
