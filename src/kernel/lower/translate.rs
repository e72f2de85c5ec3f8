//! Model expressions to graph values: here the order of operations is chosen, once for all back ends.
//!
//! Products gather what is fixed, then what is uniform, then what is spatial, so that the least is left to do at each node;
//! a division by something that does not vary becomes a multiplication by its reciprocal.

use crate::exact::Rational;
use crate::kernel::{BufferId, Builder, Extent, Operation, ParameterId, ValueId};
use crate::model::expression::factors;
use crate::model::{Coefficient, Expression, FieldId, Function};

/// Where the unknowns of a stage stand.
#[derive(Clone, Debug)]
pub(super) struct Binding {
    pub(super) field: Vec<BufferId>,
    /// ∂u/∂t of fields of second order in time.
    pub(super) rate: Vec<Option<ValueId>>,
    /// Values of applied operators, once known.
    pub(super) applied: Vec<Option<ValueId>>,
    /// Time is taken this fraction of the step away from the stage's time.
    pub(super) shift: Rational,
}

impl Binding {
    /// For expressions that hold no unknowns.
    pub(super) fn fixed() -> Binding {
        Binding { field: Vec::new(), rate: Vec::new(), applied: Vec::new(), shift: Rational::zero() }
    }
}

/// Translates expressions under a binding.
pub(super) struct Translation<'a> {
    pub(super) builder: &'a mut Builder,
    pub(super) coefficients: &'a [Coefficient],
}

impl Translation<'_> {
    pub(super) fn value(&mut self, expression: &Expression, binding: &Binding) -> ValueId {
        match expression {
            Expression::Number(number) => self.builder.literal(number.clone()),
            Expression::Pi => self.builder.value(Operation::Pi),
            Expression::Constant(id) => self.builder.value(Operation::Parameter(ParameterId(id.0))),
            Expression::Coefficient(id) => {
                let coefficient = &self.coefficients[id.0];
                let value = self.value(&coefficient.value, binding);
                self.builder.name(value, &coefficient.name);
                value
            }
            Expression::Coordinate(axis) => self.builder.value(Operation::Coordinate(axis.0)),
            Expression::Time => self.time(&binding.shift),
            Expression::Field(FieldId(field)) => self.builder.load(binding.field[*field]),
            Expression::Rate(FieldId(field)) => match binding.rate[*field] {
                Some(value) => value,
                None => self.builder.whole(0),
            },
            Expression::Sum(items) => self.sum(items, binding),
            Expression::Product(_) | Expression::Quotient(..) => self.product(expression, binding),
            Expression::Power(base, exponent) => {
                let base = self.value(base, binding);
                self.power(base, exponent)
            }
            Expression::Call(function, arguments) => self.call(*function, arguments, binding),
            Expression::Cases(cases, otherwise) => {
                let mut result = self.value(otherwise, binding);
                for (comparison, then) in cases.iter().rev() {
                    let left = self.value(&comparison.left, binding);
                    let right = self.value(&comparison.right, binding);
                    let then = self.value(then, binding);
                    result = self.builder.select(left, comparison.relation, right, then, result);
                }
                result
            }
            Expression::Noise(seed) => self.builder.value(Operation::Noise(*seed)),
            Expression::InverseSpacing(axis) => self.builder.value(Operation::InverseSpacing(axis.0)),
            Expression::Applied(index) => match binding.applied[*index] {
                Some(value) => value,
                None => self.builder.whole(0),
            },
            // Neither survives discretization: derivatives have become `Applied`, normal derivatives face terms.
            Expression::Derivative(_) | Expression::Normal(_) | Expression::SecondRate(_) => {
                self.builder.whole(0)
            }
        }
    }

    fn time(&mut self, shift: &Rational) -> ValueId {
        let time = self.builder.value(Operation::Time);
        if shift.is_zero() {
            return time;
        }
        let step = self.builder.value(Operation::Step);
        let shift = self.builder.literal(shift.clone());
        let distance = self.builder.multiply(shift, step);
        self.builder.add(time, distance)
    }

    fn sum(&mut self, items: &[Expression], binding: &Binding) -> ValueId {
        let mut total: Option<ValueId> = None;
        for item in items {
            let (negative, magnitude) = signed(item);
            let value = self.value(&magnitude, binding);
            total = Some(match (total, negative) {
                (None, false) => value,
                (None, true) => self.builder.negate(value),
                (Some(sum), false) => self.builder.add(sum, value),
                (Some(sum), true) => self.builder.subtract(sum, value),
            });
        }
        total.unwrap_or_else(|| self.builder.whole(0))
    }

    /// Products and quotients as one list of factors and divisors.
    fn product(&mut self, expression: &Expression, binding: &Binding) -> ValueId {
        let mut above = Vec::new();
        let mut below = Vec::new();
        self.gather(expression, false, binding, &mut above, &mut below);
        let mut divisors = Vec::new();
        for divisor in below {
            if self.builder.extent(divisor) == Extent::Varying {
                divisors.push(divisor);
            } else {
                let one = self.builder.whole(1);
                let reciprocal = self.builder.divide(one, divisor);
                above.push(reciprocal);
            }
        }
        let numerator = self.ordered_product(above);
        match self.ordered(divisors) {
            Some(divisor) => self.builder.divide(numerator, divisor),
            None => numerator,
        }
    }

    fn gather(
        &mut self,
        expression: &Expression,
        inverted: bool,
        binding: &Binding,
        above: &mut Vec<ValueId>,
        below: &mut Vec<ValueId>,
    ) {
        match expression {
            Expression::Product(_) => {
                for factor in factors(expression.clone()) {
                    self.gather(&factor, inverted, binding, above, below);
                }
            }
            Expression::Quotient(numerator, divisor) => {
                self.gather(numerator, inverted, binding, above, below);
                self.gather(divisor, !inverted, binding, above, below);
            }
            _ => {
                let value = self.value(expression, binding);
                if inverted { below.push(value) } else { above.push(value) }
            }
        }
    }

    fn ordered_product(&mut self, values: Vec<ValueId>) -> ValueId {
        self.ordered(values).unwrap_or_else(|| self.builder.whole(1))
    }

    /// Fixed first, then uniform, then by table, then varying; the order within each class is that of the list.
    fn ordered(&mut self, values: Vec<ValueId>) -> Option<ValueId> {
        let mut classes: Vec<(Extent, ValueId)> = Vec::new();
        for value in values {
            let extent = self.builder.extent(value);
            match classes.iter_mut().find(|(own, _)| *own == extent) {
                Some((_, total)) => *total = self.builder.multiply(*total, value),
                None => classes.push((extent, value)),
            }
        }
        classes.sort_by_key(|(extent, _)| *extent);
        let mut total = None;
        for (_, value) in classes {
            total = Some(match total {
                None => value,
                Some(product) => self.builder.multiply(product, value),
            });
        }
        total
    }

    /// Whole exponents up to 16 by repeated squaring, halves through square roots, others by the library's power.
    fn power(&mut self, base: ValueId, exponent: &Rational) -> ValueId {
        if exponent.is_negative() {
            let positive = self.power(base, &exponent.abs());
            let one = self.builder.whole(1);
            return self.builder.divide(one, positive);
        }
        if let Some(whole @ 0..=16) = exponent.to_i64() {
            return self.whole_power(base, whole as u32);
        }
        let doubled = exponent * &Rational::from(2);
        if let Some(odd @ 1..=9) = doubled.to_i64() {
            let root = self.builder.call(Function::Sqrt, base);
            let whole = self.whole_power(base, (odd / 2) as u32);
            return self.builder.multiply(whole, root);
        }
        let exponent = self.builder.literal(exponent.clone());
        self.builder.value(Operation::Power(base, exponent))
    }

    fn whole_power(&mut self, base: ValueId, exponent: u32) -> ValueId {
        match exponent {
            0 => self.builder.whole(1),
            1 => base,
            _ => {
                let half = self.whole_power(base, exponent / 2);
                let square = self.builder.multiply(half, half);
                if exponent.is_multiple_of(2) { square } else { self.builder.multiply(square, base) }
            }
        }
    }

    fn call(&mut self, function: Function, arguments: &[Expression], binding: &Binding) -> ValueId {
        let values: Vec<ValueId> = arguments.iter().map(|argument| self.value(argument, binding)).collect();
        let Some((first, rest)) = values.split_first() else { return self.builder.whole(0) };
        match function {
            Function::Minimum | Function::Maximum => {
                let mut result = *first;
                for value in rest {
                    let operation = if function == Function::Minimum {
                        Operation::Minimum(result, *value)
                    } else {
                        Operation::Maximum(result, *value)
                    };
                    result = self.builder.value(operation);
                }
                result
            }
            _ => self.builder.call(function, *first),
        }
    }
}

/// The sign of a term and its magnitude, by its leading exact number.
fn signed(term: &Expression) -> (bool, Expression) {
    let leads_negative = match term {
        Expression::Number(number) => number.is_negative(),
        Expression::Product(items) => {
            matches!(items.first(), Some(Expression::Number(number)) if number.is_negative())
        }
        Expression::Quotient(above, _) => signed(above).0,
        _ => false,
    };
    if leads_negative { (true, term.clone().negative_through()) } else { (false, term.clone()) }
}

impl Expression {
    /// −expression, taken into the numerator of a quotient so that no new factor appears.
    fn negative_through(self) -> Expression {
        match self {
            Expression::Quotient(above, below) => {
                Expression::Quotient(Box::new(above.negative_through()), below)
            }
            other => other.negative(),
        }
    }
}
