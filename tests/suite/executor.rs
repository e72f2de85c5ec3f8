//! The executor against a slow reading of the same kernel, bit for bit: hand-built kernels and whole models.

use crate::emission::kernels;
use crate::emission::reference::Reference;
use rimstone::exact::Rational;
use rimstone::kernel::interpret::Executor;
use rimstone::kernel::{ClosureRow, ConstantOperator, Kernel, LineOperator, Parity, validate};
use rimstone::pipeline;
use std::path::Path;

/// The first place where two arrays differ in any bit.
fn differs(found: &[f64], wanted: &[f64]) -> Option<usize> {
    assert_eq!(found.len(), wanted.len());
    found.iter().zip(wanted).position(|(found, wanted)| {
        found.to_bits() != wanted.to_bits() && !(found.is_nan() && wanted.is_nan())
    })
}

fn prepared(kernel: &Kernel, nodes: &[usize], threads: usize) -> Executor {
    let mut executor = Executor::new(validate(kernel.clone()).expect("a kernel of the tests is valid"));
    executor.prepare(nodes, &[], threads).expect("memory for a small grid");
    executor
}

/// Everything that a run can see, after each of some steps.
fn states(kernel: &Kernel, nodes: &[usize], steps: usize) -> Vec<Vec<f64>> {
    let mut slow = Reference::new(kernel, nodes, &[]);
    let mut seen = Vec::new();
    let (step, mut time) = (0.0009765625 * 1.1, 0.3);
    slow.start(time);
    slow.first_step(time, step);
    (0..kernel.outputs.len()).for_each(|output| slow.begin_maximum(output, time));
    for _ in 0..steps {
        seen.push(vec![slow.largest_rate(time)]);
        slow.advance(time, step, time + step);
        time += step;
        for output in 0..kernel.outputs.len() {
            slow.accumulate_maximum(output, time);
            seen.push(slow.output(output, time).to_vec());
        }
        seen.extend(kernel.state.iter().map(|buffer| slow.buffers[buffer.0].clone()));
    }
    seen
}

/// The same by the executor, compared as it goes.
fn compare(kernel: &Kernel, nodes: &[usize], threads: usize, wanted: &[Vec<f64>], steps: usize) {
    let mut executor = prepared(kernel, nodes, threads);
    let mut wanted = wanted.iter();
    let mut same = |what: &str, found: &[f64]| {
        let wanted = wanted.next().expect("as many arrays as the slow reading gave");
        if let Some(place) = differs(found, wanted) {
            panic!(
                "{} on {nodes:?}, {threads} threads, {what}: {:e} for {:e} at {place}",
                kernel.name, found[place], wanted[place]
            );
        }
    };
    let (step, mut time) = (0.0009765625 * 1.1, 0.3);
    executor.start(time);
    executor.first_step(time, step);
    (0..kernel.outputs.len()).for_each(|output| executor.begin_maximum(output, time));
    for _ in 0..steps {
        same("rate", &[executor.largest_rate(time)]);
        executor.advance(time, step, time + step);
        time += step;
        for (index, output) in kernel.outputs.iter().enumerate() {
            executor.fill_output(index, time);
            same(&output.name, executor.buffer(output.buffer));
        }
        kernel.state.iter().for_each(|buffer| same("state", executor.buffer(*buffer)));
    }
    assert!(wanted.next().is_none(), "every array was compared");
}

fn agree(kernel: &Kernel, nodes: &[usize], steps: usize) {
    let wanted = states(kernel, nodes, steps);
    for threads in 1..=4 {
        compare(kernel, nodes, threads, &wanted, steps);
    }
}

#[test]
fn hand_built_kernels() {
    for (kernel, sizes) in kernels::all() {
        for nodes in sizes {
            agree(&kernel, &nodes, 3);
        }
    }
}

/// One row that several threads share, so that parts begin inside it.
#[test]
fn long_rows() {
    for (place, nodes) in [(0, 110_003), (3, 130_001)] {
        let (kernel, _) = kernels::all().swap_remove(place);
        agree(&kernel, &[nodes], 1);
    }
}

/// Interiors and closure rows with more terms than are summed in one loop, and one with a zero inside.
#[test]
fn long_operators() {
    let weights = |count: i64| (1..=count).map(|k| Rational::ratio(2 * k - 7, 3 * k)).collect::<Vec<_>>();
    for (parity, count) in [(Parity::Odd, 5), (Parity::Odd, 9), (Parity::Even, 6), (Parity::Even, 10)] {
        for closed in [false, true] {
            let (mut kernel, _) = kernels::all().swap_remove(if closed { 1 } else { 3 });
            let mut interior = weights(count);
            interior[2] = Rational::zero();
            let rows = if closed { count as usize } else { 0 };
            let closure = (0..rows).map(|row| ClosureRow { first: row % 2, weights: weights(13) }).collect();
            let wide = LineOperator::Constant(ConstantOperator { parity, interior, closure });
            let least = wide.least_nodes();
            for operator in &mut kernel.operators {
                if let LineOperator::Constant(_) = operator.operator {
                    operator.operator = wide.clone();
                }
            }
            for axis in &mut kernel.axes {
                axis.least_nodes = axis.least_nodes.max(least);
                axis.nodes = axis.nodes.max(axis.least_nodes);
            }
            let nodes: Vec<usize> = kernel.axes.iter().map(|axis| axis.least_nodes).collect();
            agree(&kernel, &nodes, 2);
            let nodes: Vec<usize> =
                nodes.iter().enumerate().map(|(axis, least)| least + 5 + 3 * axis).collect();
            agree(&kernel, &nodes, 2);
        }
    }
}

#[test]
fn whole_models() {
    let mut count = 0;
    for folder in ["tests/models/exact", "demo-models"] {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join(folder);
        for entry in std::fs::read_dir(&folder).expect("the models are there") {
            let path = entry.expect("an entry").path();
            if path.extension().is_none_or(|ending| ending != "rim") {
                continue;
            }
            let source = pipeline::read(&path).expect("a readable model");
            let Ok((compiled, _)) = pipeline::compile(&source, &pipeline::Overrides::default()) else {
                continue;
            };
            count += 1;
            let kernel: &Kernel = &compiled.kernel;
            let least: Vec<usize> = kernel.axes.iter().map(|axis| axis.least_nodes).collect();
            let more: Vec<usize> =
                least.iter().enumerate().map(|(axis, least)| least + 3 + 2 * axis).collect();
            for nodes in [least, more] {
                agree(kernel, &nodes, 2);
            }
        }
    }
    assert!(count >= 10, "models that compile: {count}");
}

#[test]
fn a_changed_weight_is_seen() {
    let (kernel, sizes) = kernels::all().swap_remove(0);
    let nodes = &sizes[1];
    let wanted = states(&kernel, nodes, 2);
    let mut changed = kernel.clone();
    let LineOperator::Constant(operator) = &mut changed.operators[0].operator else {
        panic!("the first operator of the first kernel is constant");
    };
    operator.interior[0] = &operator.interior[0] + &Rational::ratio(1, 1 << 40);
    let found = states(&changed, nodes, 2);
    assert!(found.iter().zip(&wanted).any(|(found, wanted)| differs(found, wanted).is_some()));
    compare(&changed, nodes, 1, &found, 2);
}

#[test]
fn sizes_that_cannot_be_served_are_refused() {
    let (kernel, _) = kernels::all().swap_remove(1);
    let mut executor = Executor::new(validate(kernel).expect("valid"));
    assert!(executor.prepare(&[7, 70], &[], 1).is_err_and(|reason| reason.contains("too few")));
    assert!(executor.prepare(&[70], &[], 1).is_err_and(|reason| reason.contains("2 axes")));
    assert!(executor.prepare(&[1 << 30, 1 << 30], &[], 1).is_err_and(|reason| reason.contains("memory")));
}
