//! From a graph of values to a list of operations on rows with few registers.

use super::row::{Binary, Unary, WithProduct};
use crate::kernel::{
    Action, FaceSet, FaceWrite, Kernel, Operation, OperatorId, Source, Sweep, Value, ValueId, Write,
};
use crate::model::Relation;
use std::collections::{HashMap, HashSet};

/// What an operation reads at a node.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Operand {
    /// A fixed or uniform value, by its index in the graph.
    Number(usize),
    Register(usize),
    Buffer(usize),
    /// A buffer that the sweep itself writes, by its place among those.
    Written(usize),
    Table(usize),
    Coordinate(usize),
}

/// Where a row of results goes.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Target {
    Register(usize),
    Written(usize),
}

#[derive(Clone, Debug)]
pub(super) enum Work {
    Unary(Unary, Operand),
    Binary(Binary, Operand, Operand),
    WithProduct(WithProduct, Operand, Operand, Operand),
    Select { left: Operand, relation: Relation, right: Operand, then: Operand, otherwise: Operand },
    Apply { operator: OperatorId, axis: usize, source: Source, coefficient: Option<Source> },
    Noise(u64),
}

#[derive(Clone, Debug)]
pub(super) struct Instruction {
    pub(super) target: Target,
    pub(super) work: Work,
}

/// What happens to a rate at a face, or the values set there.
#[derive(Clone, Debug)]
pub(super) struct AtFace {
    pub(super) axis: usize,
    pub(super) high: bool,
    pub(super) instructions: Vec<Instruction>,
    /// All must hold at a node.
    pub(super) patch: Vec<(Operand, Relation, Operand)>,
    pub(super) effects: Vec<(Effect, Operand)>,
}

/// What is done with a value at a face.
#[derive(Clone, Copy, Debug)]
pub(super) enum Effect {
    AddTo(usize),
    Replace(usize),
    /// Of a written buffer.
    Set(usize),
}

/// One traversal of the grid.
#[derive(Clone, Debug, Default)]
pub(super) struct Program {
    /// Rates, before the face terms.
    pub(super) rates: Vec<Instruction>,
    pub(super) faces: Vec<AtFace>,
    pub(super) writes: Vec<Instruction>,
    /// Copies to written buffers, after everything else.
    pub(super) stores: Vec<(usize, Operand)>,
    /// Buffers that are written.
    pub(super) written: Vec<usize>,
    pub(super) registers: usize,
    /// Fixed and uniform values that are read.
    pub(super) numbers: HashSet<usize>,
}

/// Compiles one program; registers are virtual (one a value) until the end.
struct Compiler<'a> {
    values: &'a [Value],
    written: &'a [usize],
    place: HashMap<ValueId, Operand>,
    /// What the rates are in the writes.
    rates: Vec<Operand>,
    numbers: HashSet<usize>,
    registers: usize,
    /// How often each value is read by another or as a root.
    uses: HashMap<ValueId, usize>,
}

impl<'a> Compiler<'a> {
    fn new(values: &'a [Value], written: &'a [usize]) -> Compiler<'a> {
        Compiler {
            values,
            written,
            place: HashMap::new(),
            rates: Vec::new(),
            numbers: HashSet::new(),
            registers: 0,
            uses: HashMap::new(),
        }
    }

    fn fresh(&mut self) -> usize {
        self.registers += 1;
        self.registers - 1
    }

    fn is_number(&self, value: ValueId) -> bool {
        use crate::kernel::Extent;
        matches!(self.values[value.0].extent, Extent::Fixed | Extent::Uniform)
    }

    /// All values that the roots need, operands before users, and how often each is read.
    fn needed(&mut self, roots: &[ValueId]) -> Vec<ValueId> {
        let mut found: HashSet<ValueId> = HashSet::new();
        let mut open: Vec<ValueId> = roots.to_vec();
        for root in roots {
            *self.uses.entry(*root).or_default() += 1;
        }
        while let Some(value) = open.pop() {
            if self.is_number(value) || self.place.contains_key(&value) || !found.insert(value) {
                continue;
            }
            for operand in self.values[value.0].operation.operands() {
                *self.uses.entry(operand).or_default() += 1;
                open.push(operand);
            }
        }
        let mut order: Vec<ValueId> = found.into_iter().collect();
        order.sort();
        order
    }

    fn buffer(&self, buffer: usize) -> Operand {
        match self.written.iter().position(|written| *written == buffer) {
            Some(place) => Operand::Written(place),
            None => Operand::Buffer(buffer),
        }
    }

    fn operand(&mut self, value: ValueId) -> Operand {
        if self.is_number(value) {
            self.numbers.insert(value.0);
            return Operand::Number(value.0);
        }
        self.place[&value]
    }

    /// The instructions for what the roots need beyond what is there already.
    fn compile(&mut self, roots: &[ValueId]) -> Vec<Instruction> {
        let order = self.needed(roots);
        let mut instructions = Vec::new();
        for value in order {
            let operation = &self.values[value.0].operation;
            let direct = match operation {
                Operation::Load(buffer) => Some(self.buffer(buffer.0)),
                Operation::Table(table) => Some(Operand::Table(table.0)),
                Operation::Coordinate(axis) => Some(Operand::Coordinate(*axis)),
                Operation::Rate(rate) => Some(self.rates[*rate]),
                _ => None,
            };
            if let Some(operand) = direct {
                self.place.insert(value, operand);
                continue;
            }
            if self.joins_its_user(value) {
                continue;
            }
            let work = self.work(value);
            let register = self.fresh();
            self.place.insert(value, Operand::Register(register));
            instructions.push(Instruction { target: Target::Register(register), work });
        }
        instructions
    }

    /// A product with one use, by a sum or a difference, is computed there.
    fn joins_its_user(&self, value: ValueId) -> bool {
        let product = matches!(self.values[value.0].operation, Operation::Multiply(..));
        product
            && self.uses.get(&value) == Some(&1)
            && self.values[value.0 + 1..].iter().enumerate().any(|(offset, user)| {
                let user_id = ValueId(value.0 + 1 + offset);
                self.uses.contains_key(&user_id) && self.product_of(user_id, &user.operation) == Some(value)
            })
    }

    /// The operand of a sum or difference that is computed with it, if any.
    fn product_of(&self, user: ValueId, operation: &Operation) -> Option<ValueId> {
        let (Operation::Add(a, b) | Operation::Subtract(a, b)) = operation else { return None };
        if self.is_number(user) {
            return None;
        }
        let alone = |value: ValueId| {
            matches!(self.values[value.0].operation, Operation::Multiply(..))
                && !self.is_number(value)
                && self.uses.get(&value) == Some(&1)
                && !self.place.contains_key(&value)
        };
        [*b, *a].into_iter().find(|value| alone(*value))
    }

    fn work(&mut self, value: ValueId) -> Work {
        let values = self.values;
        let operation = &values[value.0].operation;
        if let Some(product) = self.product_of(value, operation)
            && let Operation::Multiply(x, y) = values[product.0].operation
        {
            let (Operation::Add(a, b) | Operation::Subtract(a, b)) = *operation else {
                unreachable!("only sums and differences take a product in")
            };
            let subtracts = matches!(operation, Operation::Subtract(..));
            let (how, other) = match (subtracts, product == b) {
                (false, true) => (WithProduct::Add, a),
                (false, false) => (WithProduct::Add, b),
                (true, true) => (WithProduct::Subtract, a),
                (true, false) => (WithProduct::SubtractFrom, b),
            };
            return Work::WithProduct(how, self.operand(other), self.operand(x), self.operand(y));
        }
        let mut binary =
            |kind: Binary, a: &ValueId, b: &ValueId| Work::Binary(kind, self.operand(*a), self.operand(*b));
        match operation {
            Operation::Add(a, b) => binary(Binary::Add, a, b),
            Operation::Subtract(a, b) => binary(Binary::Subtract, a, b),
            Operation::Multiply(a, b) => binary(Binary::Multiply, a, b),
            Operation::Divide(a, b) => binary(Binary::Divide, a, b),
            Operation::Power(a, b) => binary(Binary::Power, a, b),
            Operation::Minimum(a, b) => binary(Binary::Minimum, a, b),
            Operation::Maximum(a, b) => binary(Binary::Maximum, a, b),
            Operation::Negate(a) => Work::Unary(Unary::Negate, self.operand(*a)),
            Operation::Call(function, a) => Work::Unary(Unary::Call(*function), self.operand(*a)),
            Operation::Select { left, relation, right, then, otherwise } => Work::Select {
                left: self.operand(*left),
                relation: *relation,
                right: self.operand(*right),
                then: self.operand(*then),
                otherwise: self.operand(*otherwise),
            },
            Operation::Apply { operator, axis, source, coefficient } => {
                Work::Apply { operator: *operator, axis: *axis, source: *source, coefficient: *coefficient }
            }
            Operation::Noise(seed) => Work::Noise(*seed),
            // The others are numbers or read directly.
            Operation::Literal(_)
            | Operation::Pi
            | Operation::Parameter(_)
            | Operation::Time
            | Operation::Step
            | Operation::InverseSpacing(_)
            | Operation::Coordinate(_)
            | Operation::Load(_)
            | Operation::Table(_)
            | Operation::Rate(_) => Work::Unary(Unary::Copy, self.operand(value)),
        }
    }

    /// What happens at a face; it computes everything anew, in registers of its own.
    fn at_face(&mut self, on: &FaceSet, effects: &[(Effect, ValueId)]) -> AtFace {
        let mut inner = Compiler::new(self.values, self.written);
        let mut roots: Vec<ValueId> = on.patch.iter().flat_map(|(left, _, right)| [*left, *right]).collect();
        roots.extend(effects.iter().map(|(_, value)| *value));
        inner.registers = self.registers;
        let mut instructions = inner.compile(&roots);
        let patch = on
            .patch
            .iter()
            .map(|(left, relation, right)| (inner.operand(*left), *relation, inner.operand(*right)));
        let patch = patch.collect();
        let mut placed = Vec::new();
        for (effect, value) in effects {
            let mut operand = inner.operand(*value);
            // Values of a node stand before the first write of the node.
            if matches!(operand, Operand::Written(_)) {
                let register = inner.fresh();
                instructions.push(Instruction {
                    target: Target::Register(register),
                    work: Work::Unary(Unary::Copy, operand),
                });
                operand = Operand::Register(register);
            }
            placed.push((*effect, operand));
        }
        self.registers = inner.registers;
        self.numbers.extend(inner.numbers);
        AtFace { axis: on.axis, high: on.high, instructions, patch, effects: placed }
    }
}

fn written_buffers(writes: &[Write]) -> Vec<usize> {
    let mut written: Vec<usize> = Vec::new();
    for write in writes {
        if !written.contains(&write.buffer.0) {
            written.push(write.buffer.0);
        }
    }
    written
}

impl Program {
    /// Of a sweep.
    pub(super) fn sweep(kernel: &Kernel, sweep: &Sweep) -> Program {
        let written = written_buffers(&sweep.writes);
        let mut compiler = Compiler::new(&kernel.values, &written);
        let mut program = Program { written: written.clone(), ..Program::default() };
        program.rates = compiler.compile(&sweep.rates);
        let mut slots = HashMap::new();
        for (index, rate) in sweep.rates.iter().enumerate() {
            let mut operand = compiler.operand(*rate);
            if sweep.face_terms.iter().any(|term| term.rate == index) {
                let slot = compiler.fresh();
                let work = Work::Unary(Unary::Copy, operand);
                program.rates.push(Instruction { target: Target::Register(slot), work });
                operand = Operand::Register(slot);
                slots.insert(index, slot);
            }
            compiler.rates.push(operand);
        }
        for term in &sweep.face_terms {
            let slot = slots[&term.rate];
            let effect = match term.action {
                Action::Add => Effect::AddTo(slot),
                Action::Replace => Effect::Replace(slot),
            };
            let face = compiler.at_face(&term.on, &[(effect, term.value)]);
            program.faces.push(face);
        }
        let roots: Vec<ValueId> = sweep.writes.iter().map(|write| write.value).collect();
        program.writes = compiler.compile(&roots);
        for write in &sweep.writes {
            let place = written.iter().position(|buffer| *buffer == write.buffer.0).unwrap_or(0);
            let mut operand = compiler.operand(write.value);
            // A row of a written buffer has to be read before any store.
            if let Operand::Written(_) = operand {
                let register = compiler.fresh();
                let work = Work::Unary(Unary::Copy, operand);
                program.writes.push(Instruction { target: Target::Register(register), work });
                operand = Operand::Register(register);
            }
            program.stores.push((place, operand));
        }
        program.registers = compiler.registers;
        program.numbers = compiler.numbers;
        program.rate_in_place();
        program.write_directly();
        program.reuse_registers();
        program
    }

    /// Of values set at a face.
    pub(super) fn face(kernel: &Kernel, face: &FaceWrite) -> Program {
        let written = written_buffers(&face.writes);
        let mut compiler = Compiler::new(&kernel.values, &written);
        let effects: Vec<(Effect, ValueId)> = face
            .writes
            .iter()
            .map(|write| {
                let place = written.iter().position(|buffer| *buffer == write.buffer.0).unwrap_or(0);
                (Effect::Set(place), write.value)
            })
            .collect();
        let at_face = compiler.at_face(&face.on, &effects);
        let mut program = Program {
            faces: vec![at_face],
            registers: compiler.registers,
            numbers: compiler.numbers,
            ..Program::default()
        };
        program.written = written;
        program.reuse_registers();
        program
    }

    /// Of one value, stored to a single array that is no buffer of the kernel.
    pub(super) fn value(values: &[Value], value: ValueId) -> Program {
        let mut compiler = Compiler::new(values, &[]);
        let writes = compiler.compile(&[value]);
        let stores = vec![(0, compiler.operand(value))];
        let mut program = Program {
            writes,
            stores,
            registers: compiler.registers,
            numbers: compiler.numbers,
            ..Program::default()
        };
        program.write_directly();
        program.reuse_registers();
        program
    }

    fn instructions(&self) -> impl Iterator<Item = &Instruction> {
        self.rates.iter().chain(self.faces.iter().flat_map(|face| &face.instructions)).chain(&self.writes)
    }

    /// How many operations a node costs, roughly.
    pub(super) fn cost(&self) -> usize {
        self.rates.len() + self.writes.len() + self.stores.len()
    }

    /// Registers that face terms change.
    fn slots(&self) -> HashSet<usize> {
        let slot = |(effect, _): &(Effect, Operand)| match effect {
            Effect::AddTo(slot) | Effect::Replace(slot) => Some(*slot),
            Effect::Set(_) => None,
        };
        self.faces.iter().flat_map(|face| &face.effects).filter_map(slot).collect()
    }

    /// How often each operand is read, and by which instruction last (one past all of them: by a face or a store).
    fn reads(&self) -> HashMap<Operand, (usize, usize)> {
        let mut reads: HashMap<Operand, (usize, usize)> = HashMap::new();
        let mut count = |at: usize, operand: Operand| {
            let entry = reads.entry(operand).or_default();
            *entry = (entry.0 + 1, entry.1.max(at));
        };
        for (at, instruction) in self.instructions().enumerate() {
            instruction.work.operands().into_iter().for_each(|operand| count(at, operand));
        }
        let end = self.instructions().count();
        for face in &self.faces {
            face.patch
                .iter()
                .flat_map(|(left, _, right)| [*left, *right])
                .for_each(|operand| count(end, operand));
            face.effects.iter().for_each(|(_, operand)| count(end, *operand));
        }
        self.stores.iter().for_each(|(_, operand)| count(end, *operand));
        reads
    }

    /// A rate that nothing else reads is computed in the register that face terms change.
    fn rate_in_place(&mut self) {
        let reads = self.reads();
        let slots = self.slots();
        let mut renamed: HashMap<usize, usize> = HashMap::new();
        self.rates.retain(|instruction| match (instruction.target, &instruction.work) {
            (Target::Register(slot), Work::Unary(Unary::Copy, Operand::Register(register)))
                if slots.contains(&slot)
                    && !slots.contains(register)
                    && reads.get(&Operand::Register(*register)).is_some_and(|(count, _)| *count == 1) =>
            {
                renamed.insert(*register, slot);
                false
            }
            _ => true,
        });
        for instruction in &mut self.rates {
            if let Target::Register(register) = &mut instruction.target
                && let Some(slot) = renamed.get(register)
            {
                *register = *slot;
            }
        }
    }

    /// The last operation before a store writes to the buffer itself where nothing reads either later.
    fn write_directly(&mut self) {
        let reads = self.reads();
        let slots = self.slots();
        let made: HashMap<Target, usize> =
            self.instructions().enumerate().map(|(at, instruction)| (instruction.target, at)).collect();
        let stores = std::mem::take(&mut self.stores);
        let sole = |place: usize| stores.iter().filter(|(other, _)| *other == place).count() == 1;
        for (place, operand) in &stores {
            let register = match operand {
                Operand::Register(register)
                    if reads.get(operand).is_some_and(|(count, _)| *count == 1)
                        && !slots.contains(register)
                        && sole(*place)
                        && reads.get(&Operand::Written(*place)).is_none_or(|(_, last)| {
                            made.get(&Target::Register(*register)).is_some_and(|made| last < made)
                        }) =>
                {
                    *register
                }
                _ => {
                    self.stores.push((*place, *operand));
                    continue;
                }
            };
            for instruction in self.rates.iter_mut().chain(&mut self.writes) {
                if instruction.target == Target::Register(register) {
                    instruction.target = Target::Written(*place);
                }
            }
        }
    }

    /// Gives registers that are not read any more to later results, so that few rows stay in the cache.
    fn reuse_registers(&mut self) {
        let mut last: HashMap<usize, usize> = HashMap::new();
        let mut pinned: HashSet<usize> = HashSet::new();
        let mut pin = |operand: &Operand| {
            if let Operand::Register(register) = operand {
                pinned.insert(*register);
            }
        };
        for face in &self.faces {
            face.patch.iter().for_each(|(left, _, right)| [left, right].into_iter().for_each(&mut pin));
            for (effect, operand) in &face.effects {
                pin(operand);
                if let Effect::AddTo(slot) | Effect::Replace(slot) = effect {
                    pin(&Operand::Register(*slot));
                }
            }
        }
        self.stores.iter().for_each(|(_, operand)| pin(operand));
        for (at, instruction) in self.instructions().enumerate() {
            for operand in instruction.work.operands() {
                if let Operand::Register(register) = operand {
                    last.insert(register, at);
                }
            }
        }
        let mut free: Vec<usize> = Vec::new();
        let mut given: HashMap<usize, usize> = HashMap::new();
        let mut count = 0;
        let all = self.rates.iter_mut().chain(self.faces.iter_mut().flat_map(|face| &mut face.instructions));
        for (at, instruction) in all.chain(&mut self.writes).enumerate() {
            let mut done: Vec<usize> = Vec::new();
            instruction.work.change_operands(&mut |operand| {
                if let Operand::Register(register) = operand {
                    if last.get(register) == Some(&at) && !pinned.contains(register) {
                        done.push(*register);
                    }
                    *register = given[register];
                }
            });
            if let Target::Register(register) = &mut instruction.target {
                let place = free.pop().unwrap_or_else(|| {
                    count += 1;
                    count - 1
                });
                given.insert(*register, place);
                *register = place;
            }
            done.sort_unstable();
            done.dedup();
            free.extend(done.iter().map(|register| given[register]));
        }
        let place = |operand: &mut Operand| {
            if let Operand::Register(register) = operand {
                *register = given[register];
            }
        };
        for face in &mut self.faces {
            for (left, _, right) in &mut face.patch {
                place(left);
                place(right);
            }
            for (effect, operand) in &mut face.effects {
                place(operand);
                if let Effect::AddTo(slot) | Effect::Replace(slot) = effect {
                    *slot = given[slot];
                }
            }
        }
        self.stores.iter_mut().for_each(|(_, operand)| place(operand));
        self.registers = count;
    }
}

impl Work {
    fn operands(&self) -> Vec<Operand> {
        let mut found = Vec::new();
        self.clone().change_operands(&mut |operand| found.push(*operand));
        found
    }

    fn change_operands(&mut self, change: &mut dyn FnMut(&mut Operand)) {
        match self {
            Work::Unary(_, a) => change(a),
            Work::Binary(_, a, b) => {
                change(a);
                change(b);
            }
            Work::WithProduct(_, a, b, c) => {
                change(a);
                change(b);
                change(c);
            }
            Work::Select { left, right, then, otherwise, .. } => {
                [left, right, then, otherwise].into_iter().for_each(change);
            }
            Work::Apply { .. } | Work::Noise(_) => {}
        }
    }
}
