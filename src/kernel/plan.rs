//! The wave: an order for the passes of one or several steps in which rows are used again while they are in cache.
//!
//! A plan says only *when* a pass visits which slab (all nodes of one index of the slowest axis, or one block of nodes where
//! there is one axis); what is computed there is the business of the passes. Passes of successive steps are levels. At
//! position J of the wave every level, in order, visits slab J − shift(level). This is legal when, for any two levels,
//! the later one lags far enough behind the earlier one that
//! - what it reads has been made (it trails by its own reach where the earlier level wrote what it reads), and
//! - what it overwrites has been read (it trails by the earlier level's reach where it writes what that level reads).
//!
//! The first and the last `ends` slabs of a bounded axis, whose closures reach further, count as one slab each. The same
//! shifts make bands of slabs independent that shrink by shift(level) at inner ends; the wedges between them come after.
//!
//! Only C follows this plan so far.

use super::{BufferId, Kernel, LineOperator, Operation, Pass, Source, ValueId};
use std::collections::BTreeMap;

/// Most slabs at an end that count as one; a kernel that needs more keeps the plain order.
const MOST_ENDS: usize = 24;

/// See the module.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct Wave {
    /// For each pass of a step, by how many slabs it trails the first.
    pub shift: Vec<usize>,
    /// By how many slabs a step trails the one before.
    pub step_shift: usize,
    /// Slabs at each end of a bounded axis that are visited together; nothing on a periodic axis.
    pub ends: usize,
    /// After so many steps the rotation has put every buffer back to its place.
    pub period: usize,
    /// Arrays of the full grid that a step touches.
    pub arrays: usize,
}

/// What a pass touches: buffer → reach along the slowest axis; and what it writes.
struct Access {
    reads: BTreeMap<BufferId, usize>,
    writes: Vec<BufferId>,
}

/// The wave of the kernel's step; nothing when the step has no passes or its closures are too wide.
pub fn wave(kernel: &Kernel) -> Option<Wave> {
    let passes: Vec<&Pass> = kernel.step.iter().flat_map(|stage| &stage.passes).collect();
    let line = kernel.axes.len() == 1;
    let accesses: Vec<Access> = passes.iter().map(|pass| access(kernel, pass, line)).collect();
    if accesses.is_empty() || (line && kernel.axes[0].periodic) {
        return None;
    }
    let ends = match (kernel.axes[0].periodic, line) {
        (true, _) => 0,
        (false, true) => 1,
        (false, false) => passes.iter().map(|pass| ends(kernel, pass)).max().unwrap_or(1).max(1),
    };
    if ends > MOST_ENDS {
        return None;
    }
    let turns = turns(kernel);
    let period = turns.len();
    let mut shift: Vec<usize> = Vec::new();
    for (later, access) in accesses.iter().enumerate() {
        let earlier = accesses[..later].iter().zip(&shift);
        let lags = earlier.filter_map(|(other, own)| Some(own + lag(other, access, &turns[0])?));
        let lag = lags.max().unwrap_or(0).max(shift.last().copied().unwrap_or(0));
        shift.push(lag);
    }
    let mut step_shift = shift.last().copied().unwrap_or(0);
    for between in 1..=period {
        for (earlier, first) in accesses.iter().zip(&shift) {
            for (later, second) in accesses.iter().zip(&shift) {
                if let Some(lag) = lag(earlier, later, &turns[between % period]) {
                    let missing = (lag + first).saturating_sub(*second);
                    step_shift = step_shift.max(missing.div_ceil(between));
                }
            }
        }
    }
    Some(Wave { shift, step_shift, ends, period, arrays: arrays(kernel, &passes, &accesses) })
}

/// By how much the later level must trail the earlier one; `place` says where the later level's buffers stand.
fn lag(earlier: &Access, later: &Access, place: &[usize]) -> Option<usize> {
    let stands = |buffer: &BufferId| BufferId(place[buffer.0]);
    let flow = later.reads.iter().filter(|(buffer, _)| earlier.writes.contains(&stands(buffer)));
    let kept = later.writes.iter().filter_map(|buffer| earlier.reads.get(&stands(buffer)));
    let same = later.writes.iter().filter(|buffer| earlier.writes.contains(&stands(buffer))).map(|_| 0);
    flow.map(|(_, reach)| *reach).chain(kept.copied()).chain(same).max()
}

/// For each step of a period, the place of each buffer: swapping contents after a step is renaming in the next.
fn turns(kernel: &Kernel) -> Vec<Vec<usize>> {
    let first: Vec<usize> = (0..kernel.buffers.len()).collect();
    let mut turns = vec![first.clone()];
    let mut place = first.clone();
    loop {
        for (a, b) in &kernel.rotation {
            place.swap(a.0, b.0);
        }
        if place == first {
            return turns;
        }
        turns.push(place.clone());
    }
}

/// The values that a pass evaluates.
fn values(kernel: &Kernel, pass: &Pass) -> Vec<ValueId> {
    let mut roots: Vec<ValueId> = Vec::new();
    match pass {
        Pass::Sweep(sweep) => {
            roots.extend(&sweep.rates);
            roots.extend(sweep.writes.iter().map(|write| write.value));
            for term in &sweep.face_terms {
                roots.push(term.value);
                roots.extend(term.on.patch.iter().flat_map(|(left, _, right)| [*left, *right]));
            }
        }
        Pass::Face(face) => {
            roots.extend(face.writes.iter().map(|write| write.value));
            roots.extend(face.on.patch.iter().flat_map(|(left, _, right)| [*left, *right]));
        }
    }
    kernel.needed(roots)
}

fn access(kernel: &Kernel, pass: &Pass, line: bool) -> Access {
    let mut reads: BTreeMap<BufferId, usize> = BTreeMap::new();
    let mut read = |buffer: BufferId, reach: usize| {
        let known = reads.entry(buffer).or_insert(reach);
        *known = reach.max(*known);
    };
    for value in values(kernel, pass) {
        match kernel.values[value.0].operation {
            Operation::Load(buffer) => read(buffer, 0),
            Operation::Apply { operator, axis, source, coefficient } => {
                let reach = kernel.operators[operator.0].operator.interior_reach();
                // Blocks of a line are longer than any reach.
                let slabs = if axis > 0 {
                    0
                } else if line {
                    1
                } else {
                    reach
                };
                for array in [Some(source), coefficient] {
                    if let Some(Source::Buffer(buffer)) = array {
                        read(buffer, slabs);
                    }
                }
            }
            _ => {}
        }
    }
    let writes = match pass {
        Pass::Sweep(sweep) => sweep.writes.iter().map(|write| write.buffer).collect(),
        Pass::Face(face) => face.writes.iter().map(|write| write.buffer).collect(),
    };
    Access { reads, writes }
}

/// Slabs at an end that must be visited together, so that none of their reads goes further than the wave allows.
fn ends(kernel: &Kernel, pass: &Pass) -> usize {
    let operators =
        values(kernel, pass).into_iter().filter_map(|value| match kernel.values[value.0].operation {
            Operation::Apply { operator, axis: 0, .. } => Some(&kernel.operators[operator.0].operator),
            _ => None,
        });
    let least = |line: &LineOperator| {
        line.closure_rows().max(line.closure_width().saturating_sub(line.interior_reach()))
    };
    operators.map(least).max().unwrap_or(0)
}

fn arrays(kernel: &Kernel, passes: &[&Pass], accesses: &[Access]) -> usize {
    let mut touched: Vec<Source> = Vec::new();
    for access in accesses {
        touched.extend(access.reads.keys().chain(&access.writes).map(|buffer| Source::Buffer(*buffer)));
    }
    let all = (1u16 << kernel.axes.len()) - 1;
    let whole = |table: usize| u16::from(kernel.tables[table].axes) == all;
    for pass in passes {
        for value in values(kernel, pass) {
            match kernel.values[value.0].operation {
                Operation::Table(table) if whole(table.0) => touched.push(Source::Table(table)),
                Operation::Apply { source, coefficient, .. } => {
                    let tables = [Some(source), coefficient].into_iter().flatten();
                    touched.extend(
                        tables.filter(|array| matches!(array, Source::Table(table) if whole(table.0))),
                    );
                }
                _ => {}
            }
        }
    }
    let mut unique: Vec<Source> = Vec::new();
    for array in touched {
        if !unique.contains(&array) {
            unique.push(array);
        }
    }
    unique.len()
}
