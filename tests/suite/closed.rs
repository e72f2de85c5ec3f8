//! The examination of a model's own step finds a limit that is too large.

use std::path::Path;

use rimstone::exact::Rational;
use rimstone::kernel::validate::{ValidKernel, validate};
use rimstone::kernel::{Extent, Operation, Value, ValueId};
use rimstone::pipeline;
use rimstone::pipeline::closed::{Closed, examine};

fn kernel(name: &str) -> ValidKernel {
    let path = Path::new(env!("CARGO_MANIFEST_DIR")).join("tests/models/exact").join(name);
    let source = pipeline::read(&path).expect("readable");
    pipeline::compile(&source, &pipeline::Overrides::default()).expect("compiles").0.kernel
}

/// The same kernel with a limit that is so many times too large.
fn with_limit_times(kernel: ValidKernel, times: i64) -> ValidKernel {
    let mut kernel = kernel.into_inner();
    let share = ValueId(kernel.values.len());
    let literal = Operation::Literal(Rational::ratio(1, times));
    kernel.values.push(Value { operation: literal, extent: Extent::Fixed, hint: None });
    let extent = kernel.values[kernel.limit.rate.0].extent;
    let product = Operation::Multiply(share, kernel.limit.rate);
    kernel.limit.rate = ValueId(kernel.values.len());
    kernel.values.push(Value { operation: product, extent, hint: None });
    validate(kernel).expect("still valid")
}

#[test]
fn limits_of_the_law_are_confirmed() {
    for name in ["slab.rim", "pulse.rim", "tube.rim", "transport.rim", "membrane.rim"] {
        assert!(matches!(examine(&kernel(name)), Closed::Confirmed { .. }), "{name}");
    }
}

#[test]
fn a_limit_that_is_too_large_is_lowered() {
    for name in ["slab.rim", "pulse.rim", "tube.rim", "membrane.rim"] {
        let found = examine(&with_limit_times(kernel(name), 2));
        let Closed::Lowered { factor, .. } = found else { panic!("{name}: {found:?}") };
        assert!((0.4..0.75).contains(&factor), "{name}: {factor}");
    }
}
