//! Building the value graph: equal values are made once, extents are derived, exact numbers fold.
//!
//! The builder never reorders operands: the order in which a caller combines values is the order in which they are computed.

use super::{BufferId, Extent, Operation, OperatorId, Source, Table, TableId, Value, ValueId};
use crate::exact::Rational;
use crate::model::{Function, Relation};
use std::collections::HashMap;

/// A graph under construction, with its tables.
#[derive(Clone, Debug, Default)]
pub struct Builder {
    values: Vec<Value>,
    known: HashMap<Operation, ValueId>,
    tables: Vec<Table>,
    table_of: HashMap<ValueId, TableId>,
    /// Bit a is axis a.
    all_axes: u8,
}

impl Builder {
    /// An empty graph for a grid of that many axes (1 to 3).
    pub fn new(axes: usize) -> Builder {
        Builder { all_axes: ((1u16 << axes) - 1) as u8, ..Builder::default() }
    }

    /// The finished graph and tables.
    pub fn finish(self) -> (Vec<Value>, Vec<Table>) {
        (self.values, self.tables)
    }

    pub fn extent(&self, value: ValueId) -> Extent {
        self.values[value.0].extent
    }

    pub fn operation(&self, value: ValueId) -> &Operation {
        &self.values[value.0].operation
    }

    /// Gives a value a name for readers, unless it has one.
    pub fn name(&mut self, value: ValueId, hint: &str) {
        self.values[value.0].hint.get_or_insert_with(|| hint.to_owned());
    }

    /// The value of an operation; operands must exist. Spatial operands of a varying value are put into tables first.
    pub fn value(&mut self, operation: Operation) -> ValueId {
        if let Some(known) = self.known.get(&operation) {
            return *known;
        }
        let operands = operation.operands();
        let extents: Vec<Extent> = operands.iter().map(|operand| self.extent(*operand)).collect();
        let extent = operation
            .own_extent(self.all_axes)
            .join(extents.iter().copied().fold(Extent::Fixed, Extent::join));
        if extent == Extent::Varying && extents.iter().any(|extent| matches!(extent, Extent::Table(_))) {
            let mut tabled = operation.clone();
            tabled.map_operands(&mut |operand| self.stored(operand));
            return self.value(tabled);
        }
        let id = ValueId(self.values.len());
        self.values.push(Value { operation: operation.clone(), extent, hint: None });
        self.known.insert(operation, id);
        id
    }

    /// A value of table extent as a load from its table; others unchanged.
    pub fn stored(&mut self, value: ValueId) -> ValueId {
        match self.extent(value) {
            Extent::Table(_) => {
                let table = self.table(value);
                self.value(Operation::Table(table))
            }
            _ => value,
        }
    }

    /// The table that holds a value of table extent.
    pub fn table(&mut self, value: ValueId) -> TableId {
        if let Operation::Table(table) = self.values[value.0].operation {
            return table;
        }
        if let Some(known) = self.table_of.get(&value) {
            return *known;
        }
        let axes = match self.extent(value) {
            Extent::Table(axes) => axes,
            _ => u8::MAX,
        };
        let id = TableId(self.tables.len());
        let name = self.values[value.0].hint.clone().unwrap_or_else(|| format!("table {}", id.0));
        self.tables.push(Table { name, axes, value });
        self.table_of.insert(value, id);
        id
    }

    pub fn literal(&mut self, value: Rational) -> ValueId {
        self.value(Operation::Literal(value))
    }

    pub fn whole(&mut self, value: i64) -> ValueId {
        self.literal(Rational::from(value))
    }

    fn as_literal(&self, value: ValueId) -> Option<&Rational> {
        match &self.values[value.0].operation {
            Operation::Literal(number) => Some(number),
            _ => None,
        }
    }

    fn literal_is(&self, value: ValueId, number: i64) -> bool {
        self.as_literal(value).is_some_and(|literal| *literal == Rational::from(number))
    }

    pub fn add(&mut self, a: ValueId, b: ValueId) -> ValueId {
        match (self.as_literal(a), self.as_literal(b)) {
            (Some(x), Some(y)) => {
                let sum = x + y;
                self.literal(sum)
            }
            (Some(x), _) if x.is_zero() => b,
            (_, Some(y)) if y.is_zero() => a,
            _ => match *self.operation(b) {
                Operation::Negate(inner) => self.value(Operation::Subtract(a, inner)),
                _ => self.value(Operation::Add(a, b)),
            },
        }
    }

    pub fn subtract(&mut self, a: ValueId, b: ValueId) -> ValueId {
        match (self.as_literal(a), self.as_literal(b)) {
            (Some(x), Some(y)) => {
                let difference = x - y;
                self.literal(difference)
            }
            (_, Some(y)) if y.is_zero() => a,
            (Some(x), _) if x.is_zero() => self.negate(b),
            _ => self.value(Operation::Subtract(a, b)),
        }
    }

    pub fn negate(&mut self, a: ValueId) -> ValueId {
        match self.operation(a) {
            Operation::Literal(number) => {
                let negative = -number;
                self.literal(negative)
            }
            Operation::Negate(inner) => *inner,
            _ => self.value(Operation::Negate(a)),
        }
    }

    pub fn multiply(&mut self, a: ValueId, b: ValueId) -> ValueId {
        match (self.as_literal(a), self.as_literal(b)) {
            (Some(x), Some(y)) => {
                let product = x * y;
                self.literal(product)
            }
            (Some(x), _) if x.is_zero() => a,
            (_, Some(y)) if y.is_zero() => b,
            _ if self.literal_is(a, 1) => b,
            _ if self.literal_is(b, 1) => a,
            _ if self.literal_is(a, -1) => self.negate(b),
            _ => self.value(Operation::Multiply(a, b)),
        }
    }

    pub fn divide(&mut self, a: ValueId, b: ValueId) -> ValueId {
        if let (Some(x), Some(inverse)) = (self.as_literal(a), self.as_literal(b).and_then(Rational::recip)) {
            let quotient = x * &inverse;
            return self.literal(quotient);
        }
        if self.literal_is(b, 1) {
            return a;
        }
        self.value(Operation::Divide(a, b))
    }

    pub fn call(&mut self, function: Function, argument: ValueId) -> ValueId {
        self.value(Operation::Call(function, argument))
    }

    pub fn load(&mut self, buffer: BufferId) -> ValueId {
        self.value(Operation::Load(buffer))
    }

    pub fn apply(
        &mut self,
        operator: OperatorId,
        axis: usize,
        source: Source,
        coefficient: Option<Source>,
    ) -> ValueId {
        self.value(Operation::Apply { operator, axis, source, coefficient })
    }

    pub fn select(
        &mut self,
        left: ValueId,
        relation: Relation,
        right: ValueId,
        then: ValueId,
        otherwise: ValueId,
    ) -> ValueId {
        self.value(Operation::Select { left, relation, right, then, otherwise })
    }
}

impl Extent {
    /// The extent of something made of both.
    pub fn join(self, other: Extent) -> Extent {
        match (self, other) {
            (Extent::Table(a), Extent::Table(b)) => Extent::Table(a | b),
            (Extent::Table(_), Extent::Uniform) | (Extent::Uniform, Extent::Table(_)) => Extent::Varying,
            (a, b) => a.max(b),
        }
    }
}

impl Operation {
    /// The values it is made of, in order.
    pub fn operands(&self) -> Vec<ValueId> {
        match self {
            Operation::Negate(a) | Operation::Call(_, a) => vec![*a],
            Operation::Add(a, b)
            | Operation::Subtract(a, b)
            | Operation::Multiply(a, b)
            | Operation::Divide(a, b)
            | Operation::Power(a, b)
            | Operation::Minimum(a, b)
            | Operation::Maximum(a, b) => vec![*a, *b],
            Operation::Select { left, right, then, otherwise, .. } => vec![*left, *right, *then, *otherwise],
            _ => Vec::new(),
        }
    }

    fn map_operands(&mut self, change: &mut dyn FnMut(ValueId) -> ValueId) {
        match self {
            Operation::Negate(a) | Operation::Call(_, a) => *a = change(*a),
            Operation::Add(a, b)
            | Operation::Subtract(a, b)
            | Operation::Multiply(a, b)
            | Operation::Divide(a, b)
            | Operation::Power(a, b)
            | Operation::Minimum(a, b)
            | Operation::Maximum(a, b) => {
                *a = change(*a);
                *b = change(*b);
            }
            Operation::Select { left, right, then, otherwise, .. } => {
                for operand in [left, right, then, otherwise] {
                    *operand = change(*operand);
                }
            }
            _ => {}
        }
    }

    /// The extent of the operation itself, without its operands.
    pub fn own_extent(&self, all_axes: u8) -> Extent {
        match self {
            Operation::Time | Operation::Step => Extent::Uniform,
            Operation::Coordinate(axis) => Extent::Table(1 << axis),
            Operation::Noise(_) => Extent::Table(all_axes),
            Operation::Load(_) | Operation::Apply { .. } | Operation::Rate(_) | Operation::Table(_) => {
                Extent::Varying
            }
            _ => Extent::Fixed,
        }
    }
}
