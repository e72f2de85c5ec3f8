//! The door of kernels: each fault is made in a good kernel and must be the one that is named.

use super::kernels::{block, drum, duct, plate, rod};
use rimstone::exact::Rational;
use rimstone::kernel::{
    Action, BufferId, Extent, FaceSet, FaceTerm, Function, Kernel, KernelFault, LineOperator, Operation,
    OperatorId, OutputKind, Parameter, Pass, Source, Sweep, TableId, Value, ValueId, Write, validate,
};

fn refused(mut kernel: Kernel, spoil: impl FnOnce(&mut Kernel)) -> KernelFault {
    validate(kernel.clone()).expect("good before it is spoiled");
    spoil(&mut kernel);
    validate(kernel).map(|_| ()).expect_err("spoiled")
}

fn push(kernel: &mut Kernel, operation: Operation, extent: Extent) -> ValueId {
    kernel.values.push(Value { operation, extent, hint: None });
    ValueId(kernel.values.len() - 1)
}

fn find(kernel: &Kernel, wanted: impl Fn(&Operation) -> bool) -> ValueId {
    let place = kernel.values.iter().position(|value| wanted(&value.operation));
    ValueId(place.expect("the kernel has such a value"))
}

fn sweep(kernel: &mut Kernel) -> &mut Sweep {
    match &mut kernel.step[0].passes[0] {
        Pass::Sweep(sweep) => sweep,
        Pass::Face(_) => panic!("the first pass of a step is a sweep"),
    }
}

fn constant(kernel: &mut Kernel) -> &mut rimstone::kernel::ConstantOperator {
    match &mut kernel.operators[0].operator {
        LineOperator::Constant(operator) => operator,
        LineOperator::Varying(_) => panic!("the first operator is constant"),
    }
}

#[test]
fn axes_and_lists() {
    assert_eq!(refused(rod(), |kernel| kernel.axes.clear()), KernelFault::AxisCount(0));
    assert_eq!(refused(rod(), |kernel| kernel.axes[0].nodes = 7), KernelFault::AxisNodes(0));
    assert_eq!(refused(rod(), |kernel| kernel.interpolation_nodes = 0), KernelFault::AxisNodes(0));
    assert_eq!(refused(rod(), |kernel| kernel.interpolation_nodes = 9), KernelFault::AxisNodes(0));
    assert_eq!(
        refused(rod(), |kernel| kernel.quadrature.clear()),
        KernelFault::Length { what: "quadrature", needs: 1, has: 0 }
    );
    let long = refused(rod(), |kernel| kernel.quadrature[0] = vec![Rational::from(1); 5]);
    assert_eq!(long, KernelFault::AxisNodes(0), "weights of both ends would overlap on 8 nodes");
}

#[test]
fn operators_that_leave_the_grid() {
    let few = refused(rod(), |kernel| kernel.axes[0].least_nodes = 5);
    assert_eq!(few, KernelFault::TooFewNodes { operator: OperatorId(0), axis: 0, needs: 6 });
    let short = refused(rod(), |kernel| constant(kernel).closure.truncate(1));
    assert_eq!(short, KernelFault::BeyondEdge { operator: OperatorId(0), axis: 0 });
    let wide = refused(rod(), |kernel| constant(kernel).closure[1].first = 4);
    assert_eq!(wide, KernelFault::TooFewNodes { operator: OperatorId(0), axis: 0, needs: 9 });
    let closed = refused(rod(), |kernel| kernel.axes[0].periodic = true);
    assert_eq!(closed, KernelFault::ClosureOnPeriodicAxis { operator: OperatorId(0), axis: 0 });
    let open = refused(duct(), |kernel| kernel.axes[0].periodic = false);
    assert_eq!(open, KernelFault::BeyondEdge { operator: OperatorId(0), axis: 0 });
    assert_eq!(
        refused(rod(), |kernel| constant(kernel).closure[0].weights.clear()),
        KernelFault::EmptyRow(OperatorId(0))
    );
    let far = refused(block(), |kernel| {
        if let LineOperator::Varying(operator) = &mut kernel.operators[2].operator {
            operator.forms[0][0].0 = 5;
        }
    });
    assert_eq!(far, KernelFault::TooFewNodes { operator: OperatorId(2), axis: 0, needs: 11 });
}

#[test]
fn the_graph() {
    let order = refused(rod(), |kernel| {
        let last = ValueId(kernel.values.len());
        push(kernel, Operation::Negate(last), Extent::Fixed);
    });
    assert!(matches!(order, KernelFault::OperandOrder { .. }), "{order:?}");
    let extent = refused(rod(), |kernel| {
        let value = find(kernel, |operation| *operation == Operation::Step);
        kernel.values[value.0].extent = Extent::Fixed;
    });
    assert!(matches!(extent, KernelFault::WrongExtent { derived: Extent::Uniform, .. }), "{extent:?}");
    let loose = refused(rod(), |kernel| {
        let place = find(kernel, |operation| matches!(operation, Operation::Coordinate(0)));
        let load = find(kernel, |operation| matches!(operation, Operation::Load(_)));
        push(kernel, Operation::Add(place, load), Extent::Varying);
    });
    assert!(matches!(loose, KernelFault::NotStored { .. }), "{loose:?}");
    let call = refused(rod(), |kernel| {
        push(kernel, Operation::Call(Function::Minimum, ValueId(0)), Extent::Fixed);
    });
    assert!(matches!(call, KernelFault::TwoOperandCall(_)), "{call:?}");
    let unknown = refused(rod(), |kernel| {
        push(kernel, Operation::Load(BufferId(9)), Extent::Varying);
    });
    assert_eq!(unknown, KernelFault::Unknown { what: "buffer", index: 9 });
    let coefficient = refused(rod(), |kernel| {
        let apply = Operation::Apply {
            operator: OperatorId(0),
            axis: 0,
            source: Source::Buffer(BufferId(0)),
            coefficient: Some(Source::Buffer(BufferId(1))),
        };
        push(kernel, apply, Extent::Varying);
    });
    assert!(matches!(coefficient, KernelFault::CoefficientMismatch(_)), "{coefficient:?}");
    let lacking = refused(plate(), |kernel| {
        let layer = kernel.tables.iter().position(|table| table.axes == 1).expect("a table over y");
        let source = Source::Table(TableId(layer));
        let apply = Operation::Apply { operator: OperatorId(0), axis: 1, source, coefficient: None };
        push(kernel, apply, Extent::Varying);
    });
    assert!(matches!(lacking, KernelFault::SourceLacksAxis { .. }), "{lacking:?}");
}

#[test]
fn tables_and_fixed_values() {
    assert_eq!(refused(rod(), |kernel| kernel.tables[0].axes = 0), KernelFault::TableAxes(TableId(0)));
    assert_eq!(refused(rod(), |kernel| kernel.tables[0].axes = 2), KernelFault::TableAxes(TableId(0)));
    assert_eq!(refused(plate(), |kernel| kernel.tables[0].axes = 1), KernelFault::TableValue(TableId(0)));
    let late = refused(rod(), |kernel| {
        kernel.time.end = find(kernel, |operation| *operation == Operation::Step);
    });
    assert!(matches!(late, KernelFault::NotFixed { what: "end time", .. }), "{late:?}");
    let circular = refused(rod(), |kernel| {
        let own = find(kernel, |operation| matches!(operation, Operation::Parameter(_)));
        kernel.parameters[0] = Parameter { default: own, ..kernel.parameters[0].clone() };
    });
    assert_eq!(circular, KernelFault::ParameterOrder { parameter: 0 });
    let grid = refused(rod(), |kernel| {
        kernel.axes[0].high = find(kernel, |operation| matches!(operation, Operation::InverseSpacing(_)));
    });
    assert_eq!(grid, KernelFault::ParameterOrder { parameter: 1 });
}

#[test]
fn sweeps() {
    let twice = refused(rod(), |kernel| {
        let write = sweep(kernel).writes[0].clone();
        sweep(kernel).writes.push(write);
    });
    assert!(matches!(twice, KernelFault::WrittenTwice { buffer: BufferId(1), .. }), "{twice:?}");
    let source = refused(rod(), |kernel| sweep(kernel).writes[0].buffer = BufferId(0));
    assert!(matches!(source, KernelFault::WritesSource { buffer: BufferId(0), .. }), "{source:?}");
    let rate = refused(rod(), |kernel| sweep(kernel).rates.clear());
    assert!(matches!(rate, KernelFault::Unknown { what: "rate", index: 0 }), "{rate:?}");
    let rate = refused(rod(), |kernel| {
        sweep(kernel).face_terms.clear();
        sweep(kernel).rates.clear();
    });
    assert!(matches!(rate, KernelFault::Rate { .. }), "{rate:?}");
    let table = refused(rod(), |kernel| {
        let place = find(kernel, |operation| matches!(operation, Operation::Coordinate(_)));
        sweep(kernel).writes[0].value = place;
    });
    assert!(matches!(table, KernelFault::TableExtent { .. }), "{table:?}");
    let applied = refused(rod(), |kernel| {
        let apply = find(kernel, |operation| matches!(operation, Operation::Apply { .. }));
        sweep(kernel).face_terms[0].value = apply;
    });
    assert!(matches!(applied, KernelFault::AppliedAtFace { .. }), "{applied:?}");
    let face = refused(duct(), |kernel| {
        let on = FaceSet { axis: 0, high: false, patch: Vec::new() };
        sweep(kernel).rates.push(ValueId(0));
        sweep(kernel).face_terms.push(FaceTerm { on, rate: 0, action: Action::Add, value: ValueId(0) });
    });
    assert!(matches!(face, KernelFault::FaceOfPeriodicAxis { axis: 0, .. }), "{face:?}");
    let limit = refused(rod(), |kernel| {
        kernel.limit.rate = find(kernel, |operation| matches!(operation, Operation::Rate(_)));
    });
    assert!(matches!(limit, KernelFault::Rate { .. }), "{limit:?}");
    let swap = refused(rod(), |kernel| kernel.rotation[0].1 = BufferId(0));
    assert_eq!(swap, KernelFault::Rotation(BufferId(0)));
}

#[test]
fn outputs() {
    let other = refused(drum(), |kernel| kernel.outputs[0].buffer = BufferId(0));
    assert_eq!(other, KernelFault::OutputSweep(0));
    assert_eq!(refused(drum(), |kernel| kernel.outputs[3].sweeps.clear()), KernelFault::Maximum(3));
    let begin = refused(drum(), |kernel| {
        if let OutputKind::Maximum { begin } = &mut kernel.outputs[3].kind {
            begin[0].writes[0] = Write { buffer: BufferId(2), value: ValueId(0) };
        }
    });
    assert_eq!(begin, KernelFault::Maximum(3));
    let place = refused(drum(), |kernel| kernel.outputs[1].kind = OutputKind::Gauge(Vec::new()));
    assert_eq!(place, KernelFault::Length { what: "gauge place", needs: 2, has: 0 });
}
