//! A slow reading of a kernel: each node's values by recursion, exactly as the kernel's essay says. The judge of emitted
//! programs; it shares nothing with the printers.

use rimstone::exact::Rational;
use rimstone::exact::round::nearest;
use rimstone::kernel::{
    Action, FaceSet, Kernel, LineOperator, Operation, OutputKind, Parity, Pass, Source, Stage, Sweep,
    ValueId, Write,
};
use rimstone::model::{Function, Relation};

unsafe extern "C" {
    #[link_name = "erf"]
    fn library_erf(x: f64) -> f64;
    #[link_name = "erfc"]
    fn library_erfc(x: f64) -> f64;
}

/// A kernel on a grid.
pub struct Reference<'a> {
    kernel: &'a Kernel,
    nodes: Vec<usize>,
    low: Vec<f64>,
    high: Vec<f64>,
    spacing: Vec<f64>,
    parameters: Vec<f64>,
    tables: Vec<Vec<f64>>,
    pub buffers: Vec<Vec<f64>>,
    last_step: f64,
}

/// Where and when a value is wanted.
struct Place<'p> {
    node: Vec<usize>,
    time: f64,
    step: f64,
    rates: &'p [f64],
}

impl<'a> Reference<'a> {
    pub fn new(kernel: &'a Kernel, nodes: &[usize], given: &[Option<f64>]) -> Reference<'a> {
        let points = nodes.iter().product();
        let axes = nodes.len();
        let mut reference = Reference {
            kernel,
            nodes: nodes.to_vec(),
            low: vec![0.0; axes],
            high: vec![0.0; axes],
            spacing: vec![0.0; axes],
            parameters: Vec::new(),
            tables: Vec::new(),
            buffers: vec![vec![0.0; points]; kernel.buffers.len()],
            last_step: 0.0,
        };
        for (index, parameter) in kernel.parameters.iter().enumerate() {
            let value =
                given.get(index).copied().flatten().unwrap_or_else(|| reference.fixed(parameter.default));
            reference.parameters.push(value);
        }
        for (index, axis) in kernel.axes.iter().enumerate() {
            reference.low[index] = reference.fixed(axis.low);
            reference.high[index] = reference.fixed(axis.high);
            let intervals = if axis.periodic { nodes[index] } else { nodes[index] - 1 };
            reference.spacing[index] = (reference.high[index] - reference.low[index]) / intervals as f64;
        }
        for table in &kernel.tables {
            let mut values = Vec::new();
            for node in reference.all_nodes() {
                let off = (0..axes).any(|axis| table.axes >> axis & 1 == 0 && node[axis] != 0);
                if !off {
                    values.push(
                        reference.value(table.value, &Place { node, time: 0.0, step: 0.0, rates: &[] }),
                    );
                }
            }
            reference.tables.push(values);
        }
        reference
    }

    pub fn fixed(&self, value: ValueId) -> f64 {
        self.value(value, &Place { node: vec![0; self.nodes.len()], time: 0.0, step: 0.0, rates: &[] })
    }

    fn all_nodes(&self) -> Vec<Vec<usize>> {
        let mut all = vec![Vec::new()];
        for count in &self.nodes {
            all = all
                .into_iter()
                .flat_map(|start: Vec<usize>| {
                    (0..*count).map(move |index| start.iter().copied().chain([index]).collect())
                })
                .collect();
        }
        all
    }

    fn linear(&self, node: &[usize]) -> usize {
        node.iter().zip(&self.nodes).fold(0, |sum, (index, count)| sum * count + index)
    }

    fn read(&self, source: Source, node: &[usize]) -> f64 {
        match source {
            Source::Buffer(buffer) => self.buffers[buffer.0][self.linear(node)],
            Source::Table(table) => {
                let axes = self.kernel.tables[table.0].axes;
                let mine = (0..node.len()).filter(|axis| axes >> axis & 1 == 1);
                let place = mine.fold(0, |sum, axis| sum * self.nodes[axis] + node[axis]);
                self.tables[table.0][place]
            }
        }
    }

    fn value(&self, id: ValueId, at: &Place) -> f64 {
        let of = |value: &ValueId| self.value(*value, at);
        match &self.kernel.values[id.0].operation {
            Operation::Literal(number) => nearest(number),
            Operation::Pi => std::f64::consts::PI,
            Operation::Parameter(parameter) => self.parameters[parameter.0],
            Operation::Time => at.time,
            Operation::Step => at.step,
            Operation::InverseSpacing(axis) => 1.0 / self.spacing[*axis],
            Operation::Coordinate(axis) => self.coordinate(*axis, at.node[*axis]),
            Operation::Noise(seed) => noise(*seed, self.linear(&at.node)),
            Operation::Load(buffer) => self.read(Source::Buffer(*buffer), &at.node),
            Operation::Table(table) => self.read(Source::Table(*table), &at.node),
            Operation::Apply { operator, axis, source, coefficient } => self.apply(
                &self.kernel.operators[operator.0].operator,
                *axis,
                *source,
                *coefficient,
                &at.node,
            ),
            Operation::Rate(rate) => at.rates[*rate],
            Operation::Negate(a) => -of(a),
            Operation::Add(a, b) => of(a) + of(b),
            Operation::Subtract(a, b) => of(a) - of(b),
            Operation::Multiply(a, b) => of(a) * of(b),
            Operation::Divide(a, b) => of(a) / of(b),
            Operation::Power(a, b) => of(a).powf(of(b)),
            Operation::Call(function, a) => call(*function, of(a)),
            Operation::Minimum(a, b) => {
                let (a, b) = (of(a), of(b));
                if a < b { a } else { b }
            }
            Operation::Maximum(a, b) => {
                let (a, b) = (of(a), of(b));
                if a > b { a } else { b }
            }
            Operation::Select { left, relation, right, then, otherwise } => {
                if holds(*relation, of(left), of(right)) { of(then) } else { of(otherwise) }
            }
        }
    }

    fn coordinate(&self, axis: usize, index: usize) -> f64 {
        if !self.kernel.axes[axis].periodic && index + 1 == self.nodes[axis] {
            return self.high[axis];
        }
        self.low[axis] + index as f64 * self.spacing[axis]
    }

    fn apply(
        &self,
        operator: &LineOperator,
        axis: usize,
        source: Source,
        coefficient: Option<Source>,
        node: &[usize],
    ) -> f64 {
        let count = self.nodes[axis] as i64;
        let index = node[axis] as i64;
        let rows = operator.closure_rows() as i64;
        let on_line = |source: Source, place: i64| {
            let place = if self.kernel.axes[axis].periodic { place.rem_euclid(count) } else { place };
            let mut moved = node.to_vec();
            moved[axis] = usize::try_from(place).expect("in bounds");
            self.read(source, &moved)
        };
        let f = |place: i64| on_line(source, place);
        let b = |place: i64| on_line(coefficient.expect("a varying operator has a coefficient"), place);
        let edge = index < rows || index >= count - rows;
        let high = index >= rows;
        let row = if high { count - 1 - index } else { index };
        let mirrored = |place: usize| if high { count - 1 - place as i64 } else { place as i64 };
        match (operator, edge) {
            (LineOperator::Constant(operator), true) => {
                let sign = if high && operator.parity == Parity::Odd { -1.0 } else { 1.0 };
                let closure = &operator.closure[row as usize];
                let terms = closure.weights.iter().enumerate();
                sum(terms.map(|(j, weight)| sign * nearest(weight) * f(mirrored(closure.first + j))))
            }
            (LineOperator::Constant(operator), false) => {
                let first = if operator.parity == Parity::Odd { 1 } else { 0 };
                let terms =
                    (first..).zip(&operator.interior).filter(|(_, weight)| **weight != Rational::from(0));
                sum(terms.map(|(k, weight)| {
                    let k: i64 = k;
                    let pair = match (operator.parity, k) {
                        (Parity::Odd, _) => f(index + k) - f(index - k),
                        (Parity::Even, 0) => f(index),
                        (Parity::Even, _) => f(index + k) + f(index - k),
                    };
                    nearest(weight) * pair
                }))
            }
            (LineOperator::Varying(operator), true) => {
                let entries = &operator.closure[row as usize];
                sum(entries.iter().map(|entry| {
                    let factor =
                        sum(entry.weights.iter().map(|(m, weight)| nearest(weight) * b(mirrored(*m))));
                    factor * f(mirrored(entry.column))
                }))
            }
            (LineOperator::Varying(operator), false) => {
                let mut terms = Vec::new();
                for (form, s) in operator.forms.iter().zip(1i64..) {
                    let at = |shift: i64| {
                        sum(form.iter().map(|(offset, w)| nearest(w) * b(index + offset + shift)))
                    };
                    terms.push(at(0) * (f(index + s) - f(index)));
                    terms.push(at(-s) * (f(index - s) - f(index)));
                }
                sum(terms.into_iter())
            }
        }
    }

    fn sweep(&mut self, sweep: &Sweep, time: f64, step: f64) {
        let mut results: Vec<Vec<f64>> = Vec::new();
        for node in self.all_nodes() {
            let mut at = Place { node, time, step, rates: &[] };
            let mut rates: Vec<f64> = sweep.rates.iter().map(|rate| self.value(*rate, &at)).collect();
            for term in &sweep.face_terms {
                if self.on_face(&term.on, &at) {
                    let value = self.value(term.value, &at);
                    rates[term.rate] = match term.action {
                        Action::Add => rates[term.rate] + value,
                        Action::Replace => value,
                    };
                }
            }
            at.rates = &rates;
            results.push(sweep.writes.iter().map(|write| self.value(write.value, &at)).collect());
        }
        self.store(&sweep.writes, results);
    }

    fn store(&mut self, writes: &[Write], results: Vec<Vec<f64>>) {
        for (place, values) in results.into_iter().enumerate() {
            for (write, value) in writes.iter().zip(values) {
                self.buffers[write.buffer.0][place] = value;
            }
        }
    }

    fn on_face(&self, on: &FaceSet, at: &Place) -> bool {
        let place = if on.high { self.nodes[on.axis] - 1 } else { 0 };
        at.node[on.axis] == place
            && on.patch.iter().all(|(left, relation, right)| {
                holds(*relation, self.value(*left, at), self.value(*right, at))
            })
    }

    fn stages(&mut self, stages: &[Stage], time: f64, step: f64, next: f64) {
        for stage in stages {
            let when = if stage.fraction == Rational::from(0) {
                time
            } else if stage.fraction == Rational::from(1) {
                next
            } else {
                time + nearest(&stage.fraction) * step
            };
            for pass in &stage.passes {
                match pass {
                    Pass::Sweep(sweep) => self.sweep(sweep, when, step),
                    Pass::Face(face) => {
                        for node in self.all_nodes() {
                            let at = Place { node, time: when, step, rates: &[] };
                            if self.on_face(&face.on, &at) {
                                let values: Vec<f64> =
                                    face.writes.iter().map(|write| self.value(write.value, &at)).collect();
                                let place = self.linear(&at.node);
                                for (write, value) in face.writes.iter().zip(values) {
                                    self.buffers[write.buffer.0][place] = value;
                                }
                            }
                        }
                    }
                }
            }
        }
    }

    pub fn start(&mut self, time: f64) {
        self.stages(&self.kernel.start, time, 0.0, time);
    }

    pub fn first_step(&mut self, time: f64, step: f64) {
        self.last_step = step;
        self.stages(&self.kernel.first_step, time, step, time + step);
    }

    pub fn advance(&mut self, time: f64, step: f64, next: f64) {
        self.last_step = step;
        self.stages(&self.kernel.step, time, step, next);
        for (a, b) in &self.kernel.rotation {
            self.buffers.swap(a.0, b.0);
        }
    }

    pub fn largest_rate(&self, time: f64) -> f64 {
        let mut most = f64::NEG_INFINITY;
        for node in self.all_nodes() {
            let value = self.value(self.kernel.limit.rate, &Place { node, time, step: 0.0, rates: &[] });
            if value > most || value.is_nan() {
                most = value;
            }
        }
        most
    }

    pub fn output(&mut self, output: usize, time: f64) -> &[f64] {
        let output = &self.kernel.outputs[output];
        if !matches!(output.kind, OutputKind::Maximum { .. }) {
            for sweep in &output.sweeps {
                self.sweep(sweep, time, self.last_step);
            }
        }
        &self.buffers[output.buffer.0]
    }

    pub fn begin_maximum(&mut self, output: usize, time: f64) {
        if let OutputKind::Maximum { begin } = &self.kernel.outputs[output].kind {
            for sweep in begin {
                self.sweep(sweep, time, self.last_step);
            }
        }
    }

    pub fn accumulate_maximum(&mut self, output: usize, time: f64) {
        let output = &self.kernel.outputs[output];
        if matches!(output.kind, OutputKind::Maximum { .. }) {
            for sweep in &output.sweeps {
                self.sweep(sweep, time, self.last_step);
            }
        }
    }
}

/// The first term plain, then one addition after the other.
fn sum(terms: impl Iterator<Item = f64>) -> f64 {
    terms.reduce(|total, term| total + term).expect("a sum has terms")
}

fn holds(relation: Relation, left: f64, right: f64) -> bool {
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
        // SAFETY: functions of the C library without preconditions.
        Function::Erf => unsafe { library_erf(x) },
        Function::Erfc => unsafe { library_erfc(x) },
        Function::Sign => f64::from(i8::from(x > 0.0) - i8::from(x < 0.0)),
        Function::Minimum | Function::Maximum => unreachable!("refused by validation"),
    }
}

fn noise(seed: u64, place: usize) -> f64 {
    let golden = 0x9E37_79B9_7F4A_7C15_u64;
    let mut z = seed.wrapping_mul(golden).wrapping_add(place as u64).wrapping_add(golden);
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    z ^= z >> 31;
    (z >> 11) as f64 * 2f64.powi(-53)
}
