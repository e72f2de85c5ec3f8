//! A second meaning of a kernel: node by node, straight from the essay in `kernel`, slow and with no cleverness.
//!
//! It shares no code with the executor or the back ends; agreement with it to the last bit is what their tests ask for.

use rimstone::exact::{Rational, round};
use rimstone::kernel::{
    Action, BufferId, ConstantOperator, FaceSet, Kernel, LineOperator, Operation, Parity, Pass, Source,
    Stage, Sweep, ValueId, VaryingOperator,
};
use rimstone::model::{Function, Relation};

unsafe extern "C" {
    fn erf(x: f64) -> f64;
    fn erfc(x: f64) -> f64;
}

/// A kernel at given sizes, with its arrays.
pub struct Reference<'a> {
    kernel: &'a Kernel,
    pub nodes: Vec<usize>,
    parameters: Vec<f64>,
    buffers: Vec<Vec<f64>>,
    tables: Vec<Vec<f64>>,
    time: f64,
    step: f64,
}

type Node = Vec<usize>;

impl<'a> Reference<'a> {
    /// Default parameters; tables evaluated; buffers zero.
    pub fn new(kernel: &'a Kernel, nodes: &[usize]) -> Reference<'a> {
        let points = nodes.iter().product();
        let mut reference = Reference {
            kernel,
            nodes: nodes.to_vec(),
            parameters: Vec::new(),
            buffers: vec![vec![0.0; points]; kernel.buffers.len()],
            tables: Vec::new(),
            time: 0.0,
            step: 0.0,
        };
        for parameter in &kernel.parameters {
            let value = reference.fixed(parameter.default);
            reference.parameters.push(value);
        }
        for table in &kernel.tables {
            let values =
                (0..points).map(|index| reference.value(table.value, &reference.node(index), &[])).collect();
            reference.tables.push(values);
        }
        reference
    }

    pub fn fixed(&self, value: ValueId) -> f64 {
        self.value(value, &vec![0; self.nodes.len()], &[])
    }

    pub fn buffer(&self, id: BufferId) -> &[f64] {
        &self.buffers[id.0]
    }

    pub fn start(&mut self, time: f64) {
        self.run(&self.kernel.start, time, 0.0, time);
    }

    pub fn first_step(&mut self, time: f64, step: f64) {
        self.run(&self.kernel.first_step, time, step, time + step);
    }

    pub fn advance(&mut self, time: f64, step: f64, next: f64) {
        self.run(&self.kernel.step, time, step, next);
        for (a, b) in &self.kernel.rotation {
            self.buffers.swap(a.0, b.0);
        }
    }

    /// The largest value of the limit's rate.
    pub fn largest_rate(&mut self, time: f64) -> f64 {
        self.time = time;
        let mut largest = f64::NEG_INFINITY;
        for index in 0..self.points() {
            let value = self.value(self.kernel.limit.rate, &self.node(index), &[]);
            if value > largest || value.is_nan() {
                largest = value;
            }
        }
        largest
    }

    /// Fills and returns the buffer of an output.
    pub fn output(&mut self, index: usize, time: f64) -> Vec<f64> {
        self.time = time;
        for sweep in &self.kernel.outputs[index].sweeps {
            self.sweep(sweep);
        }
        self.buffers[self.kernel.outputs[index].buffer.0].clone()
    }

    fn run(&mut self, stages: &[Stage], time: f64, step: f64, next: f64) {
        self.step = step;
        for stage in stages {
            let fraction = round::nearest(&stage.fraction);
            self.time = if fraction == 0.0 {
                time
            } else if fraction == 1.0 {
                next
            } else {
                time + fraction * step
            };
            for pass in &stage.passes {
                match pass {
                    Pass::Sweep(sweep) => self.sweep(sweep),
                    Pass::Face(face) => {
                        for index in 0..self.points() {
                            let node = self.node(index);
                            if self.on(&face.on, &node) {
                                let values: Vec<f64> = face
                                    .writes
                                    .iter()
                                    .map(|write| self.value(write.value, &node, &[]))
                                    .collect();
                                for (write, value) in face.writes.iter().zip(values) {
                                    self.buffers[write.buffer.0][index] = value;
                                }
                            }
                        }
                    }
                }
            }
        }
    }

    fn sweep(&mut self, sweep: &Sweep) {
        let mut results: Vec<Vec<f64>> = Vec::new();
        for index in 0..self.points() {
            let node = self.node(index);
            let mut rates: Vec<f64> = sweep.rates.iter().map(|rate| self.value(*rate, &node, &[])).collect();
            for term in &sweep.face_terms {
                if self.on(&term.on, &node) {
                    let value = self.value(term.value, &node, &[]);
                    match term.action {
                        Action::Add => rates[term.rate] += value,
                        Action::Replace => rates[term.rate] = value,
                    }
                }
            }
            results.push(sweep.writes.iter().map(|write| self.value(write.value, &node, &rates)).collect());
        }
        for (index, values) in results.into_iter().enumerate() {
            for (write, value) in sweep.writes.iter().zip(values) {
                self.buffers[write.buffer.0][index] = value;
            }
        }
    }

    fn points(&self) -> usize {
        self.nodes.iter().product()
    }

    fn node(&self, mut index: usize) -> Node {
        let mut node = vec![0; self.nodes.len()];
        for axis in (0..self.nodes.len()).rev() {
            node[axis] = index % self.nodes[axis];
            index /= self.nodes[axis];
        }
        node
    }

    fn index(&self, node: &Node) -> usize {
        node.iter().zip(&self.nodes).fold(0, |index, (place, count)| index * count + place)
    }

    fn on(&self, set: &FaceSet, node: &Node) -> bool {
        let end = if set.high { self.nodes[set.axis] - 1 } else { 0 };
        node[set.axis] == end
            && set.patch.iter().all(|(left, relation, right)| {
                holds(self.value(*left, node, &[]), *relation, self.value(*right, node, &[]))
            })
    }

    fn spacing(&self, axis: usize) -> f64 {
        let facts = &self.kernel.axes[axis];
        let (low, high) = (self.fixed(facts.low), self.fixed(facts.high));
        let intervals = if facts.periodic { self.nodes[axis] } else { self.nodes[axis] - 1 };
        (high - low) / intervals as f64
    }

    fn value(&self, id: ValueId, node: &Node, rates: &[f64]) -> f64 {
        let mut memo = vec![None; self.kernel.values.len()];
        self.evaluate(id, node, rates, &mut memo)
    }

    fn evaluate(&self, id: ValueId, node: &Node, rates: &[f64], memo: &mut Vec<Option<f64>>) -> f64 {
        if let Some(known) = memo[id.0] {
            return known;
        }
        let of = |this: &Self, id: ValueId, memo: &mut Vec<Option<f64>>| this.evaluate(id, node, rates, memo);
        let value = match &self.kernel.values[id.0].operation {
            Operation::Literal(number) => round::nearest(number),
            Operation::Pi => std::f64::consts::PI,
            Operation::Parameter(parameter) => self.parameters[parameter.0],
            Operation::Time => self.time,
            Operation::Step => self.step,
            Operation::InverseSpacing(axis) => 1.0 / self.spacing(*axis),
            Operation::Coordinate(axis) => {
                let facts = &self.kernel.axes[*axis];
                if !facts.periodic && node[*axis] + 1 == self.nodes[*axis] {
                    self.fixed(facts.high)
                } else {
                    self.fixed(facts.low) + node[*axis] as f64 * self.spacing(*axis)
                }
            }
            Operation::Noise(seed) => noise(*seed, self.index(node) as u64),
            Operation::Load(buffer) => self.buffers[buffer.0][self.index(node)],
            Operation::Table(table) => self.tables[table.0][self.index(node)],
            Operation::Apply { operator, axis, source, coefficient } => {
                let line = self.line(*source, node, *axis);
                let place = node[*axis];
                let periodic = self.kernel.axes[*axis].periodic;
                match &self.kernel.operators[operator.0].operator {
                    LineOperator::Constant(operator) => constant(operator, &line, place, periodic),
                    LineOperator::Varying(operator) => {
                        let b = self.line(
                            coefficient.expect("a varying operator has a coefficient"),
                            node,
                            *axis,
                        );
                        varying(operator, &line, &b, place, periodic)
                    }
                }
            }
            Operation::Rate(index) => rates[*index],
            Operation::Negate(a) => -of(self, *a, memo),
            Operation::Add(a, b) => of(self, *a, memo) + of(self, *b, memo),
            Operation::Subtract(a, b) => of(self, *a, memo) - of(self, *b, memo),
            Operation::Multiply(a, b) => of(self, *a, memo) * of(self, *b, memo),
            Operation::Divide(a, b) => of(self, *a, memo) / of(self, *b, memo),
            Operation::Power(a, b) => of(self, *a, memo).powf(of(self, *b, memo)),
            Operation::Minimum(a, b) => {
                let (a, b) = (of(self, *a, memo), of(self, *b, memo));
                if a < b { a } else { b }
            }
            Operation::Maximum(a, b) => {
                let (a, b) = (of(self, *a, memo), of(self, *b, memo));
                if a > b { a } else { b }
            }
            Operation::Call(function, a) => call(*function, of(self, *a, memo)),
            Operation::Select { left, relation, right, then, otherwise } => {
                if holds(of(self, *left, memo), *relation, of(self, *right, memo)) {
                    of(self, *then, memo)
                } else {
                    of(self, *otherwise, memo)
                }
            }
        };
        memo[id.0] = Some(value);
        value
    }

    fn line(&self, source: Source, node: &Node, axis: usize) -> Vec<f64> {
        let mut place = node.clone();
        (0..self.nodes[axis])
            .map(|index| {
                place[axis] = index;
                match source {
                    Source::Buffer(buffer) => self.buffers[buffer.0][self.index(&place)],
                    Source::Table(table) => self.tables[table.0][self.index(&place)],
                }
            })
            .collect()
    }
}

fn wrapped(line: &[f64], place: usize, offset: i64) -> f64 {
    line[(place as i64 + offset).rem_euclid(line.len() as i64) as usize]
}

fn constant(operator: &ConstantOperator, line: &[f64], place: usize, periodic: bool) -> f64 {
    let weight = |w: &Rational| round::nearest(w);
    let last = line.len() - 1;
    let rows = operator.closure.len();
    let mirrored = !periodic && place + rows > last;
    if !periodic && (place < rows || mirrored) {
        let row = if mirrored { &operator.closure[last - place] } else { &operator.closure[place] };
        let sign = if mirrored && operator.parity == Parity::Odd { -1.0 } else { 1.0 };
        let mut total: Option<f64> = None;
        for (index, w) in row.weights.iter().enumerate() {
            let column = if mirrored { last - (row.first + index) } else { row.first + index };
            let part = (sign * weight(w)) * line[column];
            total = Some(total.map_or(part, |sum| sum + part));
        }
        return total.unwrap_or(0.0);
    }
    let mut total: Option<f64> = None;
    for (index, w) in operator.interior.iter().enumerate() {
        let w = weight(w);
        let part = match operator.parity {
            Parity::Odd => {
                let k = index as i64 + 1;
                w * (wrapped(line, place, k) - wrapped(line, place, -k))
            }
            Parity::Even if index == 0 => w * line[place],
            Parity::Even => {
                let k = index as i64;
                w * (wrapped(line, place, k) + wrapped(line, place, -k))
            }
        };
        total = Some(total.map_or(part, |sum| sum + part));
    }
    total.unwrap_or(0.0)
}

fn varying(operator: &VaryingOperator, line: &[f64], b: &[f64], place: usize, periodic: bool) -> f64 {
    let last = line.len() - 1;
    let rows = operator.closure.len();
    let mirrored = !periodic && place + rows > last;
    if !periodic && (place < rows || mirrored) {
        let row = if mirrored { &operator.closure[last - place] } else { &operator.closure[place] };
        let at =
            |values: &[f64], column: usize| if mirrored { values[last - column] } else { values[column] };
        let mut total: Option<f64> = None;
        for entry in row {
            let mut form: Option<f64> = None;
            for (node, weight) in &entry.weights {
                let part = round::nearest(weight) * at(b, *node);
                form = Some(form.map_or(part, |sum| sum + part));
            }
            let part = form.unwrap_or(0.0) * at(line, entry.column);
            total = Some(total.map_or(part, |sum| sum + part));
        }
        return total.unwrap_or(0.0);
    }
    let mut total: Option<f64> = None;
    for (index, form) in operator.forms.iter().enumerate() {
        let s = index as i64 + 1;
        for (shift, reach) in [(0, s), (-s, -s)] {
            let mut weight: Option<f64> = None;
            for (offset, factor) in form {
                let part = round::nearest(factor) * wrapped(b, place, offset + shift);
                weight = Some(weight.map_or(part, |sum| sum + part));
            }
            let part = weight.unwrap_or(0.0) * (wrapped(line, place, reach) - line[place]);
            total = Some(total.map_or(part, |sum| sum + part));
        }
    }
    total.unwrap_or(0.0)
}

fn holds(left: f64, relation: Relation, right: f64) -> bool {
    match relation {
        Relation::Less => left < right,
        Relation::LessOrEqual => left <= right,
        Relation::Greater => left > right,
        Relation::GreaterOrEqual => left >= right,
    }
}

fn call(function: Function, x: f64) -> f64 {
    match function {
        Function::Sin => x.sin(),
        Function::Cos => x.cos(),
        Function::Tan => x.tan(),
        Function::Exp => x.exp(),
        Function::Log => x.ln(),
        Function::Sqrt => x.sqrt(),
        Function::Abs => x.abs(),
        Function::Tanh => x.tanh(),
        Function::Sinh => x.sinh(),
        Function::Cosh => x.cosh(),
        // SAFETY: pure functions of the C library.
        Function::Erf => unsafe { erf(x) },
        // SAFETY: as above.
        Function::Erfc => unsafe { erfc(x) },
        Function::Sign => f64::from(i8::from(x > 0.0)) - f64::from(i8::from(x < 0.0)),
        Function::Minimum | Function::Maximum => {
            unreachable!("two-argument functions are operations of their own")
        }
    }
}

fn noise(seed: u64, index: u64) -> f64 {
    const GOLDEN: u64 = 0x9E37_79B9_7F4A_7C15;
    let mut z = seed.wrapping_mul(GOLDEN).wrapping_add(index).wrapping_add(GOLDEN);
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    z ^= z >> 31;
    (z >> 11) as f64 * (1.0 / 9_007_199_254_740_992.0)
}
