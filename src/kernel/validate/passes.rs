//! Faults of sweeps, face passes, the limit and outputs. The graph itself is taken as checked.

use super::{KernelFault, known};
use crate::kernel::{
    BufferId, Extent, FaceSet, Kernel, Operation, Output, OutputKind, Pass, Source, Stage, Sweep, ValueId,
    Write,
};

/// Every pass of the kernel, its limit and its outputs.
pub fn all(kernel: &Kernel) -> Result<(), KernelFault> {
    for stage in kernel.start.iter().chain(&kernel.step).chain(&kernel.first_step) {
        passes_of(kernel, stage)?;
    }
    for (a, b) in &kernel.rotation {
        known("buffer", a.0, kernel.buffers.len())?;
        known("buffer", b.0, kernel.buffers.len())?;
        if a == b {
            return Err(KernelFault::Rotation(*a));
        }
    }
    for buffer in &kernel.state {
        known("buffer", buffer.0, kernel.buffers.len())?;
    }
    node_value(kernel, "the step limit", kernel.limit.rate, &Allowed { rates: 0, applied: true })?;
    for (index, output) in kernel.outputs.iter().enumerate() {
        check_output(kernel, index, output)?;
    }
    Ok(())
}

fn check_output(kernel: &Kernel, index: usize, output: &Output) -> Result<(), KernelFault> {
    let fills = |sweeps: &[Sweep]| {
        let mut writes = sweeps.iter().flat_map(|sweep| &sweep.writes);
        writes.any(|write| write.buffer == output.buffer)
    };
    for sweep in &output.sweeps {
        check_sweep(kernel, sweep)?;
    }
    if !output.sweeps.is_empty() && !fills(&output.sweeps) {
        return Err(KernelFault::OutputSweep(index));
    }
    if let OutputKind::Maximum { begin } = &output.kind {
        for sweep in begin {
            check_sweep(kernel, sweep)?;
        }
        if output.sweeps.is_empty() || !fills(begin) {
            return Err(KernelFault::Maximum(index));
        }
    }
    Ok(())
}

fn passes_of(kernel: &Kernel, stage: &Stage) -> Result<(), KernelFault> {
    for pass in &stage.passes {
        match pass {
            Pass::Sweep(sweep) => check_sweep(kernel, sweep)?,
            Pass::Face(face) => {
                let place = "a face pass";
                check_face(kernel, place, &face.on)?;
                check_writes(kernel, place, &face.writes)?;
                for write in &face.writes {
                    node_value(kernel, place, write.value, &AT_FACE)?;
                }
            }
        }
    }
    Ok(())
}

fn check_sweep(kernel: &Kernel, sweep: &Sweep) -> Result<(), KernelFault> {
    let place = sweep.label.as_str();
    let mut roots = sweep.rates.clone();
    roots.extend(sweep.writes.iter().map(|write| write.value));
    for rate in &sweep.rates {
        node_value(kernel, place, *rate, &Allowed { rates: 0, applied: true })?;
    }
    for term in &sweep.face_terms {
        check_face(kernel, place, &term.on)?;
        known("rate", term.rate, sweep.rates.len())?;
        node_value(kernel, place, term.value, &AT_FACE)?;
    }
    check_writes(kernel, place, &sweep.writes)?;
    for write in &sweep.writes {
        node_value(kernel, place, write.value, &Allowed { rates: sweep.rates.len(), applied: true })?;
    }
    for value in kernel.needed(roots) {
        if let Operation::Apply { source, coefficient, .. } = kernel.values[value.0].operation {
            for read in [Some(source), coefficient].into_iter().flatten() {
                let written = |buffer: BufferId| sweep.writes.iter().any(|write| write.buffer == buffer);
                if let Source::Buffer(buffer) = read
                    && written(buffer)
                {
                    return Err(KernelFault::WritesSource { place: place.to_owned(), buffer });
                }
            }
        }
    }
    Ok(())
}

fn check_writes(kernel: &Kernel, place: &str, writes: &[Write]) -> Result<(), KernelFault> {
    for (index, write) in writes.iter().enumerate() {
        known("buffer", write.buffer.0, kernel.buffers.len())?;
        if writes[..index].iter().any(|other| other.buffer == write.buffer) {
            return Err(KernelFault::WrittenTwice { place: place.to_owned(), buffer: write.buffer });
        }
    }
    Ok(())
}

fn check_face(kernel: &Kernel, place: &str, on: &FaceSet) -> Result<(), KernelFault> {
    known("axis", on.axis, kernel.axes.len())?;
    if kernel.axes[on.axis].periodic {
        return Err(KernelFault::FaceOfPeriodicAxis { place: place.to_owned(), axis: on.axis });
    }
    for (left, _, right) in &on.patch {
        node_value(kernel, place, *left, &AT_FACE)?;
        node_value(kernel, place, *right, &AT_FACE)?;
    }
    Ok(())
}

/// What may occur in a value that is computed at nodes.
struct Allowed {
    /// `Rate(k)` for k below this.
    rates: usize,
    applied: bool,
}

const AT_FACE: Allowed = Allowed { rates: 0, applied: false };

fn node_value(kernel: &Kernel, place: &str, value: ValueId, allowed: &Allowed) -> Result<(), KernelFault> {
    known("value", value.0, kernel.values.len())?;
    if matches!(kernel.values[value.0].extent, Extent::Table(_)) {
        return Err(KernelFault::TableExtent { place: place.to_owned(), value });
    }
    for needed in kernel.needed([value]) {
        match kernel.values[needed.0].operation {
            Operation::Rate(rate) if rate >= allowed.rates => {
                return Err(KernelFault::Rate { place: place.to_owned(), value: needed });
            }
            Operation::Apply { .. } if !allowed.applied => {
                return Err(KernelFault::AppliedAtFace { place: place.to_owned(), value: needed });
            }
            _ => {}
        }
    }
    Ok(())
}
