//! Expressions of a checked model: exact, in SI base units, with the structure that the user wrote.
//!
//! Sums and products are n-ary and flat. Constructors fold exact numbers and drop neutral elements; they never expand
//! a product and never reorder what is left, so that the order of operations in a kernel is that of the model.

use super::{AxisId, CoefficientId, ConstantId, FieldId};
use crate::exact::Rational;

/// A pointwise expression with derivatives as leaves.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub enum Expression {
    Number(Rational),
    Pi,
    /// A free constant.
    Constant(ConstantId),
    Coefficient(CoefficientId),
    Coordinate(AxisId),
    Time,
    Field(FieldId),
    /// ∂field/∂t of a field that is second order in time.
    Rate(FieldId),
    /// ∂²field/∂t²; only in equations before they are made explicit.
    SecondRate(FieldId),
    Sum(Vec<Expression>),
    Product(Vec<Expression>),
    Quotient(Box<Expression>, Box<Expression>),
    Power(Box<Expression>, Rational),
    Call(Function, Vec<Expression>),
    /// The value of the first comparison that holds, otherwise the last.
    Cases(Vec<(Comparison, Expression)>, Box<Expression>),
    /// A fixed hash of node index and seed, uniform in [0, 1).
    Noise(u64),
    Derivative(Box<Derivative>),
    /// Outward normal derivative; only in conditions before they are classified.
    Normal(Box<Expression>),
    /// The value of an applied operator of the scheme; only after discretization.
    Applied(usize),
    /// 1/spacing of an axis; only after discretization.
    InverseSpacing(AxisId),
}

/// Elementary functions (ISO 80000-2). `Minimum`, `Maximum` take two or more arguments, the others one.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum Function {
    Sin,
    Cos,
    Tan,
    Exp,
    Log,
    Sqrt,
    Abs,
    Minimum,
    Maximum,
    Tanh,
    Sinh,
    Cosh,
    Erf,
    Erfc,
    Sign,
}

/// How two values are compared.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub enum Relation {
    Less,
    LessOrEqual,
    Greater,
    GreaterOrEqual,
}

/// left RELATION right.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Comparison {
    pub left: Expression,
    pub relation: Relation,
    pub right: Expression,
}

/// A spatial derivative with the structure that was written.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub struct Derivative {
    pub kind: DerivativeKind,
    /// Interior order that the user asked for this operator, before the model's.
    pub order: Option<usize>,
}

/// The kinds of spatial derivative. Arguments and coefficients are pointwise expressions unless said.
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub enum DerivativeKind {
    /// ∂(of)/∂axis.
    First { axis: AxisId, of: Expression },
    /// ∂/∂axis(coefficient ∂(of)/∂axis), conservation form.
    Second { axis: AxisId, coefficient: Expression, of: Expression },
    /// ∂/∂outer(coefficient ∂(of)/∂inner), outer ≠ inner.
    Mixed { outer: AxisId, inner: AxisId, coefficient: Expression, of: Expression },
    /// ∂ⁿ(of)/∂axisⁿ with n = 3 or 4, periodic axes only.
    Higher { axis: AxisId, degree: usize, of: Expression },
}

impl Expression {
    pub fn zero() -> Expression {
        Expression::Number(Rational::from(0))
    }

    pub fn one() -> Expression {
        Expression::Number(Rational::from(1))
    }

    pub fn number(value: Rational) -> Expression {
        Expression::Number(value)
    }

    pub fn is_zero(&self) -> bool {
        matches!(self, Expression::Number(value) if value.is_zero())
    }

    pub fn is_one(&self) -> bool {
        matches!(self, Expression::Number(value) if *value == Rational::from(1))
    }

    /// Flat sum; numbers are gathered into one term at the place of the first.
    pub fn sum(terms: impl IntoIterator<Item = Expression>) -> Expression {
        let mut flat = Vec::new();
        for term in terms {
            match term {
                Expression::Sum(inner) => flat.extend(inner),
                other => flat.push(other),
            }
        }
        let flat = gather(flat, Rational::from(0), |a, b| a + b);
        match flat.len() {
            0 => Expression::zero(),
            1 => flat.into_iter().next().unwrap_or_else(Expression::zero),
            _ => Expression::Sum(flat),
        }
    }

    /// Flat product; numbers are gathered into one factor in front. Zero absorbs the rest.
    pub fn product(factors: impl IntoIterator<Item = Expression>) -> Expression {
        let mut flat = Vec::new();
        for factor in factors {
            match factor {
                Expression::Product(inner) => flat.extend(inner),
                other => flat.push(other),
            }
        }
        let mut number = Rational::from(1);
        let mut rest = Vec::new();
        for factor in flat {
            match factor {
                Expression::Number(value) => number = &number * &value,
                other => rest.push(other),
            }
        }
        if number.is_zero() {
            return Expression::zero();
        }
        if number != Rational::from(1) {
            rest.insert(0, Expression::Number(number));
        }
        match rest.len() {
            0 => Expression::one(),
            1 => rest.into_iter().next().unwrap_or_else(Expression::one),
            _ => Expression::Product(rest),
        }
    }

    pub fn negative(self) -> Expression {
        Expression::product([Expression::Number(Rational::from(-1)), self])
    }

    pub fn minus(self, other: Expression) -> Expression {
        Expression::sum([self, other.negative()])
    }

    pub fn times(self, other: Expression) -> Expression {
        Expression::product([self, other])
    }

    /// Quotient; exact numbers fold, equal factors above and below cancel. A division by the number zero is kept as
    /// written (`check` refuses it).
    pub fn over(self, other: Expression) -> Expression {
        let mut above = factors(self);
        let mut below = factors(other);
        if below.iter().any(Expression::is_zero) {
            return Expression::Quotient(
                Box::new(Expression::product(above)),
                Box::new(Expression::product(below)),
            );
        }
        let mut index = 0;
        while index < above.len() {
            let twin = below
                .iter()
                .position(|factor| *factor == above[index] && !matches!(factor, Expression::Number(_)));
            match twin {
                Some(place) => {
                    below.remove(place);
                    above.remove(index);
                }
                None => index += 1,
            }
        }
        let mut number = Rational::from(1);
        let mut rest = Vec::new();
        for factor in below {
            match factor {
                Expression::Number(value) => number = &number * &value,
                other => rest.push(other),
            }
        }
        if let Some(inverse) = number.recip() {
            above.insert(0, Expression::Number(inverse));
        }
        let above = Expression::product(above);
        if rest.is_empty() || above.is_zero() {
            return above;
        }
        Expression::Quotient(Box::new(above), Box::new(Expression::product(rest)))
    }

    /// Power with a rational exponent; integer powers of exact numbers fold (small exponents only).
    pub fn power(self, exponent: Rational) -> Expression {
        if exponent.is_zero() {
            return Expression::one();
        }
        if exponent == Rational::from(1) {
            return self;
        }
        if let (Expression::Number(base), Some(whole @ -64..=64)) = (&self, exponent.to_i64())
            && let Some(value) = base.pow(whole as i32)
        {
            return Expression::Number(value);
        }
        Expression::Power(Box::new(self), exponent)
    }

    /// Square root, kept exact as a power.
    pub fn square_root(self) -> Expression {
        self.power(Rational::ratio(1, 2))
    }

    /// The direct children.
    pub fn children(&self) -> Vec<&Expression> {
        match self {
            Expression::Sum(items) | Expression::Product(items) | Expression::Call(_, items) => {
                items.iter().collect()
            }
            Expression::Quotient(a, b) => vec![a, b],
            Expression::Power(base, _) => vec![base],
            Expression::Normal(of) => vec![of],
            Expression::Cases(cases, otherwise) => {
                let mut all = Vec::new();
                for (comparison, value) in cases {
                    all.extend([&comparison.left, &comparison.right, value]);
                }
                all.push(otherwise);
                all
            }
            Expression::Derivative(derivative) => match &derivative.kind {
                DerivativeKind::First { of, .. } | DerivativeKind::Higher { of, .. } => vec![of],
                DerivativeKind::Second { coefficient, of, .. }
                | DerivativeKind::Mixed { coefficient, of, .. } => {
                    vec![coefficient, of]
                }
            },
            _ => Vec::new(),
        }
    }

    /// Rebuilds the expression bottom-up through the folding constructors, replacing each node by `change` of it.
    pub fn rewrite(&self, change: &mut dyn FnMut(Expression) -> Expression) -> Expression {
        let rebuilt = match self {
            Expression::Sum(items) => {
                Expression::sum(items.iter().map(|item| item.rewrite(change)).collect::<Vec<_>>())
            }
            Expression::Product(items) => {
                Expression::product(items.iter().map(|item| item.rewrite(change)).collect::<Vec<_>>())
            }
            Expression::Call(function, items) => {
                Expression::Call(*function, items.iter().map(|item| item.rewrite(change)).collect())
            }
            Expression::Quotient(a, b) => a.rewrite(change).over(b.rewrite(change)),
            Expression::Power(base, exponent) => base.rewrite(change).power(exponent.clone()),
            Expression::Normal(of) => Expression::Normal(Box::new(of.rewrite(change))),
            Expression::Cases(cases, otherwise) => {
                let cases = cases
                    .iter()
                    .map(|(comparison, value)| (comparison.rewrite(change), value.rewrite(change)))
                    .collect();
                Expression::Cases(cases, Box::new(otherwise.rewrite(change)))
            }
            Expression::Derivative(derivative) => {
                let kind = match &derivative.kind {
                    DerivativeKind::First { axis, of } => {
                        DerivativeKind::First { axis: *axis, of: of.rewrite(change) }
                    }
                    DerivativeKind::Higher { axis, degree, of } => {
                        DerivativeKind::Higher { axis: *axis, degree: *degree, of: of.rewrite(change) }
                    }
                    DerivativeKind::Second { axis, coefficient, of } => DerivativeKind::Second {
                        axis: *axis,
                        coefficient: coefficient.rewrite(change),
                        of: of.rewrite(change),
                    },
                    DerivativeKind::Mixed { outer, inner, coefficient, of } => DerivativeKind::Mixed {
                        outer: *outer,
                        inner: *inner,
                        coefficient: coefficient.rewrite(change),
                        of: of.rewrite(change),
                    },
                };
                Expression::Derivative(Box::new(Derivative { kind, order: derivative.order }))
            }
            leaf => leaf.clone(),
        };
        change(rebuilt)
    }

    /// Whether any node, this one included, satisfies the test.
    pub fn any(&self, test: &dyn Fn(&Expression) -> bool) -> bool {
        test(self) || self.children().into_iter().any(|child| child.any(test))
    }
}

impl Comparison {
    fn rewrite(&self, change: &mut dyn FnMut(Expression) -> Expression) -> Comparison {
        Comparison {
            left: self.left.rewrite(change),
            relation: self.relation,
            right: self.right.rewrite(change),
        }
    }
}

/// The factors of a product, or the expression alone.
pub fn factors(expression: Expression) -> Vec<Expression> {
    match expression {
        Expression::Product(items) => items,
        other => vec![other],
    }
}

/// The terms of a sum, or the expression alone.
pub fn terms(expression: Expression) -> Vec<Expression> {
    match expression {
        Expression::Sum(items) => items,
        other => vec![other],
    }
}

fn gather(
    items: Vec<Expression>,
    neutral: Rational,
    combine: fn(&Rational, &Rational) -> Rational,
) -> Vec<Expression> {
    let mut number: Option<(usize, Rational)> = None;
    let mut rest: Vec<Expression> = Vec::with_capacity(items.len());
    for item in items {
        match item {
            Expression::Number(value) => {
                number = Some(match number {
                    None => (rest.len(), value),
                    Some((place, old)) => (place, combine(&old, &value)),
                });
            }
            other => rest.push(other),
        }
    }
    if let Some((place, value)) = number
        && value != neutral
    {
        rest.insert(place, Expression::Number(value));
    }
    rest
}
