//! Kernels built by hand. Weights are of the right shape, not always of the right mathematics: these tests are about bits.

use rimstone::exact::Rational;
use rimstone::kernel::{
    Action, Axis, Buffer, BufferId, Builder, ClosureRow, ConstantOperator, FaceSet, FaceTerm, FaceWrite,
    Field, Kernel, Limit, LineOperator, NamedOperator, Operation, OperatorId, Output, OutputKind, Parameter,
    ParameterId, Parity, Pass, Source, Stage, Step, Sweep, TimePlan, ValueId, VaryingEntry, VaryingOperator,
    Write,
};
use rimstone::model::{Function, Relation};

/// A kernel under construction: the builder and the kernel that its graph goes into.
pub struct Sketch {
    pub builder: Builder,
    pub kernel: Kernel,
}

pub fn ratio(numerator: i64, denominator: i64) -> Rational {
    Rational::ratio(numerator, denominator)
}

impl Sketch {
    /// `axes`: name, least number of nodes, periodic.
    pub fn new(name: &str, axes: &[(&str, usize, bool)]) -> Sketch {
        let mut builder = Builder::new(axes.len());
        let (zero, one) = (builder.whole(0), builder.whole(1));
        let high = builder.literal(ratio(13, 10));
        let axes: Vec<Axis> = axes
            .iter()
            .map(|(name, least_nodes, periodic)| Axis {
                name: (*name).to_owned(),
                unit: "m".to_owned(),
                low: zero,
                high,
                nodes: least_nodes + 5,
                least_nodes: *least_nodes,
                periodic: *periodic,
            })
            .collect();
        let quadrature =
            axes.iter().map(|axis| if axis.periodic { vec![] } else { vec![ratio(1, 2)] }).collect();
        let kernel = Kernel {
            name: name.to_owned(),
            title: format!("Harrowmere: {name}"),
            notes: vec!["du/dt = ...".to_owned()],
            axes,
            parameters: Vec::new(),
            values: Vec::new(),
            operators: Vec::new(),
            buffers: Vec::new(),
            tables: Vec::new(),
            fields: Vec::new(),
            start: Vec::new(),
            step: Vec::new(),
            rotation: Vec::new(),
            state: Vec::new(),
            first_step: Vec::new(),
            limit: Limit { rate: one, state_dependent: false, law: "h^2".to_owned() },
            time: TimePlan {
                start: zero,
                end: one,
                step: Step::OfLimit(ratio(9, 10)),
                method: "euler".to_owned(),
                constant_step: false,
            },
            outputs: Vec::new(),
            interpolation_nodes: 2,
            quadrature,
        };
        Sketch { builder, kernel }
    }

    pub fn finish(self) -> Kernel {
        let (values, tables) = self.builder.finish();
        Kernel { values, tables, ..self.kernel }
    }

    pub fn buffer(&mut self, name: &str) -> BufferId {
        self.kernel.buffers.push(Buffer { name: name.to_owned() });
        BufferId(self.kernel.buffers.len() - 1)
    }

    /// A buffer that is a field and part of the state.
    pub fn field(&mut self, name: &str) -> BufferId {
        let buffer = self.buffer(name);
        let scale = self.builder.whole(1);
        self.kernel.fields.push(Field {
            name: name.to_owned(),
            unit: "K".to_owned(),
            scale,
            buffer,
            bounds: None,
        });
        self.kernel.state.push(buffer);
        buffer
    }

    pub fn parameter(&mut self, name: &str, default: ValueId) -> ValueId {
        let scale = self.builder.whole(1);
        self.kernel.parameters.push(Parameter {
            name: name.to_owned(),
            description: None,
            unit: "1".to_owned(),
            scale,
            default,
            bounds: Some((scale, default)),
        });
        self.builder.value(Operation::Parameter(ParameterId(self.kernel.parameters.len() - 1)))
    }

    pub fn operator(&mut self, name: &str, operator: LineOperator) -> OperatorId {
        self.kernel.operators.push(NamedOperator { name: name.to_owned(), operator });
        OperatorId(self.kernel.operators.len() - 1)
    }

    pub fn literal(&mut self, numerator: i64, denominator: i64) -> ValueId {
        self.builder.literal(ratio(numerator, denominator))
    }

    pub fn coordinate(&mut self, axis: usize) -> ValueId {
        self.builder.value(Operation::Coordinate(axis))
    }

    pub fn load(&mut self, buffer: BufferId) -> ValueId {
        self.builder.load(buffer)
    }

    /// operator(source)/h^power along an axis.
    pub fn derivative(
        &mut self,
        operator: OperatorId,
        axis: usize,
        source: Source,
        coefficient: Option<Source>,
        power: usize,
    ) -> ValueId {
        let mut value = self.builder.apply(operator, axis, source, coefficient);
        let per_step = self.builder.value(Operation::InverseSpacing(axis));
        for _ in 0..power {
            value = self.builder.multiply(value, per_step);
        }
        value
    }

    pub fn dt(&mut self) -> ValueId {
        self.builder.value(Operation::Step)
    }

    pub fn time(&mut self) -> ValueId {
        self.builder.value(Operation::Time)
    }

    /// Starts a buffer from a value of table extent.
    pub fn start(&mut self, buffer: BufferId, value: ValueId) {
        let value = self.builder.stored(value);
        self.kernel.start.push(stage(0, vec![Pass::Sweep(write("initial values", buffer, value))]));
    }

    /// 1 + sin(πx)·cos(2y)…, with a table as its home.
    pub fn bump(&mut self) -> ValueId {
        let pi = self.builder.value(Operation::Pi);
        let mut sum = self.builder.whole(1);
        for axis in 0..self.kernel.axes.len() {
            let x = self.coordinate(axis);
            let angle = self.builder.multiply(pi, x);
            let shift = self.literal(axis as i64 + 1, 3);
            let angle = self.builder.add(angle, shift);
            let wave = self.builder.call(Function::Sin, angle);
            sum = self.builder.add(sum, wave);
        }
        sum
    }
}

pub fn stage(fraction: i64, passes: Vec<Pass>) -> Stage {
    Stage { fraction: Rational::from(fraction), passes }
}

pub fn write(label: &str, buffer: BufferId, value: ValueId) -> Sweep {
    Sweep { label: label.to_owned(), writes: vec![Write { buffer, value }], ..Sweep::default() }
}

pub fn even(interior: &[(i64, i64)], closure: &[(usize, &[(i64, i64)])]) -> LineOperator {
    constant(Parity::Even, interior, closure)
}

pub fn odd(interior: &[(i64, i64)], closure: &[(usize, &[(i64, i64)])]) -> LineOperator {
    constant(Parity::Odd, interior, closure)
}

fn constant(parity: Parity, interior: &[(i64, i64)], closure: &[(usize, &[(i64, i64)])]) -> LineOperator {
    let weights = |list: &[(i64, i64)]| list.iter().map(|(p, q)| ratio(*p, *q)).collect::<Vec<_>>();
    LineOperator::Constant(ConstantOperator {
        parity,
        interior: weights(interior),
        closure: closure
            .iter()
            .map(|(first, list)| ClosureRow { first: *first, weights: weights(list) })
            .collect(),
    })
}

const FOURTH: [(i64, i64); 3] = [(-5, 2), (4, 3), (-1, 12)];

/// Order 4, two closure rows of unlike length.
fn second_fourth() -> LineOperator {
    even(
        &FOURTH,
        &[
            (0, &[(15, 4), (-77, 6), (107, 6), (-13, 1), (61, 12), (-5, 6)]),
            (0, &[(5, 6), (-5, 4), (-1, 3), (7, 6), (-1, 2)]),
        ],
    )
}

fn second_closed() -> LineOperator {
    even(&[(-2, 1), (1, 1)], &[(0, &[(2, 1), (-5, 1), (4, 1), (-1, 1)])])
}

fn first_closed() -> LineOperator {
    odd(
        &[(2, 3), (-1, 12)],
        &[(0, &[(-24, 17), (59, 34), (-4, 17), (-3, 34)]), (0, &[(-1, 2), (0, 1), (1, 2)])],
    )
}

/// Two differences to each side inside; `rows` closure rows.
fn varying(rows: usize) -> LineOperator {
    let forms = vec![
        vec![(0, ratio(1, 3)), (1, ratio(2, 7)), (-1, ratio(1, 9))],
        vec![(0, ratio(-1, 24)), (1, ratio(1, 5)), (2, ratio(-1, 11))],
    ];
    let closure = (0..rows)
        .map(|row| {
            (0..4)
                .map(|column| VaryingEntry {
                    column,
                    weights: (0..=row + column % 2)
                        .map(|node| (node, ratio((node + 2 * column) as i64 - 3, (5 + row) as i64)))
                        .collect(),
                })
                .collect()
        })
        .collect();
    LineOperator::Varying(VaryingOperator { forms, closure })
}

/// One axis, order 4 with closure rows, a parameter, ends held by face terms.
pub fn rod() -> Kernel {
    let mut sketch = Sketch::new("vault rod", &[("x", 8, false)]);
    let u = sketch.field("u");
    let next = sketch.buffer("u next");
    let default = sketch.literal(7, 100);
    let alpha = sketch.parameter("α", default);
    let operator = sketch.operator("second_x_order_4", second_fourth());
    let bump = sketch.bump();
    sketch.start(u, bump);
    let curvature = sketch.derivative(operator, 0, Source::Buffer(u), None, 2);
    sketch.builder.name(curvature, "u_xx");
    let rate = sketch.builder.multiply(alpha, curvature);
    let zero = sketch.builder.whole(0);
    let u_value = sketch.load(u);
    let pull = sketch.builder.negate(u_value);
    let (dt, now) = (sketch.dt(), sketch.load(u));
    let slope = sketch.builder.value(Operation::Rate(0));
    let change = sketch.builder.multiply(dt, slope);
    let result = sketch.builder.add(now, change);
    sketch.kernel.step = vec![stage(
        0,
        vec![Pass::Sweep(Sweep {
            label: "u + dt alpha u_xx */ escaped".to_owned(),
            rates: vec![rate],
            face_terms: vec![
                FaceTerm { on: face(0, false), rate: 0, action: Action::Replace, value: zero },
                FaceTerm { on: face(0, true), rate: 0, action: Action::Add, value: pull },
            ],
            writes: vec![Write { buffer: next, value: result }],
        })],
    )];
    sketch.kernel.rotation = vec![(u, next)];
    let per_step = sketch.builder.value(Operation::InverseSpacing(0));
    let square = sketch.builder.multiply(per_step, per_step);
    let twelve = sketch.builder.whole(12);
    let limit = sketch.builder.multiply(twelve, square);
    sketch.kernel.limit.rate = sketch.builder.multiply(limit, alpha);
    sketch.finish()
}

fn face(axis: usize, high: bool) -> FaceSet {
    FaceSet { axis, high, patch: Vec::new() }
}

/// Two axes: closures on both, a varying coefficient over both and one over y alone, patches, two fields at once.
pub fn plate() -> Kernel {
    let mut sketch = Sketch::new("hot plate", &[("y", 8, false), ("x", 8, false)]);
    let (u, v) = (sketch.field("u"), sketch.field("v"));
    let (u_next, v_next) = (sketch.buffer("u_next"), sketch.buffer("v_next"));
    let second = sketch.operator("second order 4", second_fourth());
    let first = sketch.operator("first order 4", first_closed());
    let flux = sketch.operator("flux", varying(3));
    let bump = sketch.bump();
    sketch.start(u, bump);
    let noise = sketch.builder.value(Operation::Noise(77));
    sketch.start(v, noise);
    let half = sketch.literal(1, 2);
    let conductivity = sketch.builder.multiply(half, bump);
    sketch.builder.name(conductivity, "k");
    let k = sketch.builder.table(conductivity);
    let y = sketch.coordinate(0);
    let layer = sketch.builder.call(Function::Exp, y);
    sketch.builder.name(layer, "layer");
    let layer_table = sketch.builder.table(layer);
    let x_part = sketch.derivative(flux, 1, Source::Buffer(u), Some(Source::Table(k)), 2);
    let y_part = sketch.derivative(flux, 0, Source::Buffer(u), Some(Source::Table(k)), 2);
    let y_layer = sketch.derivative(flux, 0, Source::Buffer(v), Some(Source::Table(layer_table)), 2);
    let layer_slope = sketch.derivative(first, 0, Source::Table(layer_table), None, 1);
    let u_x = sketch.derivative(first, 1, Source::Buffer(u), None, 1);
    let v_y = sketch.derivative(second, 0, Source::Buffer(v), None, 2);
    let time = sketch.time();
    let swing = sketch.builder.call(Function::Sin, time);
    let small = sketch.literal(1, 50);
    let swing = sketch.builder.multiply(small, swing);
    let sum = sketch.builder.add(x_part, y_part);
    let source = sketch.builder.add(sum, swing);
    let cross = sketch.builder.multiply(u_x, layer_slope);
    let stored = sketch.builder.stored(layer);
    let cross = sketch.builder.subtract(cross, stored);
    let second_rate = sketch.builder.add(v_y, y_layer);
    let second_rate = sketch.builder.add(second_rate, cross);
    let x_position = sketch.coordinate(1);
    let x_stored = sketch.builder.stored(x_position);
    let patch = vec![(small, Relation::Less, x_stored), (x_stored, Relation::LessOrEqual, half)];
    let hot = sketch.builder.add(x_stored, time);
    let dt = sketch.dt();
    let writes = [(u, u_next), (v, v_next)]
        .into_iter()
        .enumerate()
        .map(|(index, (old, new))| {
            let rate = sketch.builder.value(Operation::Rate(index));
            let change = sketch.builder.multiply(dt, rate);
            let now = sketch.load(old);
            Write { buffer: new, value: sketch.builder.add(now, change) }
        })
        .collect();
    let terms = vec![
        FaceTerm {
            on: FaceSet { axis: 0, high: true, patch: patch.clone() },
            rate: 0,
            action: Action::Add,
            value: hot,
        },
        FaceTerm { on: face(1, false), rate: 1, action: Action::Replace, value: swing },
        FaceTerm {
            on: FaceSet { axis: 1, high: true, patch },
            rate: 0,
            action: Action::Replace,
            value: stored,
        },
    ];
    sketch.kernel.step = vec![stage(
        1,
        vec![Pass::Sweep(Sweep {
            label: "plate".to_owned(),
            rates: vec![source, second_rate],
            face_terms: terms,
            writes,
        })],
    )];
    sketch.kernel.rotation = vec![(u, u_next), (v, v_next)];
    sketch.kernel.limit.rate = {
        let now = sketch.load(u);
        sketch.builder.call(Function::Abs, now)
    };
    sketch.finish()
}

/// Three axes: a periodic slowest and fastest one, closures between, a coefficient that is a buffer.
pub fn block() -> Kernel {
    let mut sketch = Sketch::new("ice block", &[("z", 9, true), ("y", 8, false), ("x", 9, true)]);
    let (u, b) = (sketch.field("u"), sketch.field("b"));
    let next = sketch.buffer("u_new");
    let open = sketch.operator("second periodic", even(&FOURTH, &[]));
    let closed = sketch.operator("second closed", second_closed());
    let flux = sketch.operator("flux periodic", varying(0));
    let closed_flux = sketch.operator("flux closed", varying(3));
    let slope = sketch.operator("first", odd(&[(2, 3), (0, 1), (-1, 12)], &[]));
    let bump = sketch.bump();
    sketch.start(u, bump);
    sketch.start(b, bump);
    let mut sum = sketch.derivative(open, 0, Source::Buffer(u), None, 2);
    for (operator, axis, coefficient) in [
        (closed, 1, None),
        (open, 2, None),
        (flux, 0, Some(b)),
        (closed_flux, 1, Some(b)),
        (flux, 2, Some(b)),
        (slope, 0, None),
        (slope, 2, None),
    ] {
        let part = sketch.derivative(operator, axis, Source::Buffer(u), coefficient.map(Source::Buffer), 1);
        sum = sketch.builder.add(sum, part);
    }
    // A coefficient over the first and the last axis, so that its strides leave one out.
    let (z, x) = (sketch.coordinate(0), sketch.coordinate(2));
    let slanted = sketch.builder.multiply(z, x);
    let slanted_table = sketch.builder.table(slanted);
    let part = sketch.derivative(flux, 0, Source::Buffer(u), Some(Source::Table(slanted_table)), 1);
    sum = sketch.builder.add(sum, part);
    let stored = sketch.builder.stored(slanted);
    sum = sketch.builder.subtract(sum, stored);
    let dt = sketch.dt();
    let change = sketch.builder.multiply(dt, sum);
    let now = sketch.load(u);
    let result = sketch.builder.add(now, change);
    sketch.kernel.step = vec![stage(0, vec![Pass::Sweep(write("block", next, result))])];
    sketch.kernel.rotation = vec![(u, next)];
    sketch.kernel.limit.rate = sketch.builder.apply(open, 0, Source::Buffer(u), None);
    sketch.finish()
}

/// One periodic axis, two stages at different times, a write without a rate.
pub fn duct() -> Kernel {
    let mut sketch = Sketch::new("duct", &[("x", 7, true)]);
    let u = sketch.field("u");
    let (middle, next) = (sketch.buffer("middle"), sketch.buffer("u_next"));
    let default = sketch.literal(1, 3);
    let speed = sketch.parameter("c", default);
    let first = sketch.operator("first order 6", odd(&[(3, 4), (-3, 20), (1, 60)], &[]));
    let bump = sketch.bump();
    sketch.start(u, bump);
    let time = sketch.time();
    let gust = sketch.builder.call(Function::Cos, time);
    let wind = sketch.builder.add(speed, gust);
    sketch.builder.name(wind, "wind");
    let dt = sketch.dt();
    let half = sketch.literal(1, 2);
    for (source, target, part, fraction) in [(u, middle, half, ratio(0, 1)), (middle, next, dt, ratio(1, 2))]
    {
        let slope = sketch.derivative(first, 0, Source::Buffer(source), None, 1);
        let transport = sketch.builder.multiply(wind, slope);
        let step = if part == half { sketch.builder.multiply(half, dt) } else { dt };
        let change = sketch.builder.multiply(step, transport);
        let now = sketch.load(u);
        let result = sketch.builder.subtract(now, change);
        let sweep = write("transport", target, result);
        sketch.kernel.step.push(Stage { fraction, passes: vec![Pass::Sweep(sweep)] });
    }
    sketch.kernel.rotation = vec![(u, next)];
    sketch.kernel.limit.rate = sketch.builder.call(Function::Abs, wind);
    sketch.finish()
}

/// Leapfrog in place on two axes, a level before the start, outputs of every kind.
pub fn drum() -> Kernel {
    let mut sketch = Sketch::new("drum", &[("y", 5, false), ("x", 5, true)]);
    let u = sketch.field("u");
    let old = sketch.buffer("u_old");
    sketch.kernel.state.push(old);
    sketch.kernel.time.constant_step = true;
    let closed = sketch.operator("second closed", second_closed());
    let open = sketch.operator("second open", even(&[(-2, 1), (1, 1)], &[]));
    let bump = sketch.bump();
    sketch.start(u, bump);
    let y_part = sketch.derivative(closed, 0, Source::Buffer(u), None, 2);
    let x_part = sketch.derivative(open, 1, Source::Buffer(u), None, 2);
    let sum = sketch.builder.add(y_part, x_part);
    let dt = sketch.dt();
    let dt2 = sketch.builder.multiply(dt, dt);
    let pull = sketch.builder.multiply(dt2, sum);
    let two = sketch.builder.whole(2);
    let (now, before) = (sketch.load(u), sketch.load(old));
    let doubled = sketch.builder.multiply(two, now);
    let inertia = sketch.builder.subtract(doubled, before);
    let result = sketch.builder.add(inertia, pull);
    sketch.kernel.step = vec![stage(0, vec![Pass::Sweep(write("leapfrog", old, result))])];
    sketch.kernel.rotation = vec![(u, old)];
    let half = sketch.literal(1, 2);
    let back = sketch.builder.multiply(half, pull);
    let back = sketch.builder.add(now, back);
    sketch.kernel.first_step = vec![stage(0, vec![Pass::Sweep(write("level before", old, back))])];
    let zero = sketch.builder.whole(0);
    sketch.start(old, zero);
    let rim = FaceWrite { on: face(0, true), writes: vec![Write { buffer: u, value: zero }] };
    sketch.kernel.start.push(stage(0, vec![Pass::Face(rim)]));
    outputs(&mut sketch, u, old);
    sketch.finish()
}

fn outputs(sketch: &mut Sketch, u: BufferId, old: BufferId) {
    let (speed, highest) = (sketch.buffer("speed"), sketch.buffer("highest"));
    let (now, before, dt) = (sketch.load(u), sketch.load(old), sketch.dt());
    let difference = sketch.builder.subtract(now, before);
    let rate = sketch.builder.divide(difference, dt);
    let size = sketch.builder.call(Function::Abs, now);
    let kept = sketch.load(highest);
    let larger = sketch.builder.value(Operation::Maximum(size, kept));
    let (scale, every) = (sketch.builder.whole(1), sketch.literal(1, 4));
    let place = vec![every, every];
    let mut add =
        |name: &str, kind: OutputKind, sweeps: Vec<Sweep>, buffer: BufferId, every: Option<ValueId>| {
            let (name, unit) = (name.to_owned(), "m/s".to_owned());
            sketch.kernel.outputs.push(Output { name, unit, scale, kind, sweeps, buffer, every });
        };
    add("speed", OutputKind::Snapshot, vec![write("speed", speed, rate)], speed, Some(every));
    add("middle", OutputKind::Gauge(place), Vec::new(), u, None);
    add("mean", OutputKind::Integral, Vec::new(), u, None);
    let begin = vec![write("begin", highest, size)];
    add("highest", OutputKind::Maximum { begin }, vec![write("keep", highest, larger)], highest, None);
}

/// Functions, comparisons, literals that libraries read, names that want to be something else.
pub fn front() -> Kernel {
    let mut sketch = Sketch::new("double \"*/ #include\n", &[("for", 4, false), ("\u{202e}int", 4, false)]);
    let u = sketch.field("sin");
    let v = sketch.field("s");
    let (next, other) = (sketch.buffer("t"), sketch.buffer("dt??/"));
    sketch.kernel.notes.push("evil */ note // \\".to_owned());
    let operator = sketch.operator("while", second_closed());
    let bump = sketch.bump();
    sketch.start(u, bump);
    let noise = sketch.builder.value(Operation::Noise(3));
    sketch.start(v, noise);
    let (a, b) = (sketch.load(u), sketch.load(v));
    let exponent = sketch.literal(5, 2);
    let half = sketch.literal(1, 2);
    let size = sketch.builder.call(Function::Abs, a);
    let power = sketch.builder.value(Operation::Power(size, exponent));
    let other_power = sketch.builder.value(Operation::Power(exponent, b));
    let mut sum = sketch.builder.add(power, other_power);
    for function in [
        Function::Tanh,
        Function::Erf,
        Function::Erfc,
        Function::Sign,
        Function::Sinh,
        Function::Cosh,
        Function::Tan,
    ] {
        let part = sketch.builder.call(function, b);
        sum = sketch.builder.add(sum, part);
    }
    let root = sketch.builder.call(Function::Sqrt, size);
    let one = sketch.builder.whole(1);
    let shifted = sketch.builder.add(size, one);
    let log = sketch.builder.call(Function::Log, shifted);
    let sum = sketch.builder.subtract(sum, log);
    let chosen = sketch.builder.select(a, Relation::GreaterOrEqual, b, root, sum);
    let bounded = sketch.builder.value(Operation::Minimum(chosen, exponent));
    let bounded = sketch.builder.value(Operation::Maximum(bounded, half));
    let fixed = sketch.builder.call(Function::Sin, half);
    let cube = sketch.builder.value(Operation::Power(fixed, exponent));
    let default = sketch.builder.add(cube, one);
    let parameter = sketch.parameter("NULL", default);
    let mixed = sketch.builder.multiply(parameter, cube);
    let x_part = sketch.derivative(operator, 1, Source::Buffer(u), None, 1);
    let y_part = sketch.derivative(operator, 0, Source::Buffer(v), None, 1);
    let spread = sketch.builder.subtract(x_part, y_part);
    let dividing = sketch.builder.divide(spread, shifted);
    let inner = sketch.builder.subtract(mixed, dividing);
    let difference = sketch.builder.subtract(bounded, inner);
    let negative = sketch.literal(-1, 3);
    let scaled = sketch.builder.multiply(difference, negative);
    let product = sketch.builder.multiply(b, scaled);
    let nested = sketch.builder.multiply(a, product);
    let deep = sketch.builder.negate(nested);
    let first = sketch.builder.add(a, deep);
    let time = sketch.time();
    let swing = sketch.builder.value(Operation::Power(time, exponent));
    let second = sketch.builder.multiply(swing, nested);
    let writes = vec![Write { buffer: next, value: first }, Write { buffer: other, value: second }];
    let sweep = Sweep { label: "everything ??/ \\".to_owned(), writes, ..Sweep::default() };
    let turned = sketch.builder.negate(b);
    let patch = vec![(a, Relation::Greater, b)];
    let edge = FaceWrite {
        on: FaceSet { axis: 1, high: false, patch },
        writes: vec![Write { buffer: u, value: turned }, Write { buffer: v, value: a }],
    };
    let top = FaceWrite { on: face(0, false), writes: vec![Write { buffer: v, value: fixed }] };
    sketch.kernel.step = vec![stage(1, vec![Pass::Sweep(sweep), Pass::Face(edge), Pass::Face(top)])];
    sketch.kernel.rotation = vec![(u, next), (v, other)];
    sketch.finish()
}

/// All of them, with the numbers of nodes to run them on.
pub fn all() -> Vec<(Kernel, Vec<Vec<usize>>)> {
    vec![
        (rod(), vec![vec![8], vec![41], vec![20_011]]),
        (plate(), vec![vec![8, 8], vec![11, 70], vec![160, 140]]),
        (block(), vec![vec![9, 8, 9], vec![10, 9, 13], vec![28, 27, 31]]),
        (duct(), vec![vec![7], vec![33], vec![20_003]]),
        (drum(), vec![vec![5, 5], vec![12, 9]]),
        (front(), vec![vec![4, 4], vec![5, 9]]),
    ]
}
