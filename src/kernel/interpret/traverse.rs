//! Visiting all nodes, or those of a face, on one thread or several: the bits are the same, because nodes are independent.

use super::block::{AXES, Desk, Grid, Segment, Surroundings, block_length};
use super::program::Program;
use std::ops::Range;

/// A thread has to have at least that many operations on nodes to do, to be worth starting.
const LEAST_WORK: usize = 200_000;
/// Grids up to this size are left to one thread.
const SMALL_GRID: usize = 20_000;

/// Parts of `0..points`, in order, of about the same size; whole rows where there are enough.
fn chunks(grid: &Grid, cost: usize, threads: usize) -> Vec<Range<usize>> {
    let points = grid.points();
    let useful = if points < SMALL_GRID { 1 } else { points.saturating_mul(cost.max(1)) / LEAST_WORK };
    let count = threads.min(useful).max(1);
    let row = grid.sizes[grid.fast];
    let unit = if points / row >= 8 * count { row } else { 64.min(points) };
    let units = points.div_ceil(unit);
    (0..count)
        .map(|chunk| {
            (chunk * units / count * unit).min(points)..((chunk + 1) * units / count * unit).min(points)
        })
        .filter(|range| !range.is_empty())
        .collect()
}

/// Segments of a range of nodes, none longer than `longest`.
fn segments(grid: &Grid, range: Range<usize>, longest: usize, mut visit: impl FnMut(Segment)) {
    let row_length = grid.sizes[grid.fast];
    let mut start = range.start;
    while start < range.end {
        let along = start % row_length;
        let length = (row_length - along).min(range.end - start).min(longest);
        let mut index = [0; AXES];
        index[grid.fast] = along;
        let mut row = start / row_length;
        for axis in (0..AXES).rev().filter(|axis| *axis != grid.fast) {
            index[axis] = row % grid.sizes[axis];
            row /= grid.sizes[axis];
        }
        visit(Segment { index, start, length });
        start += length;
    }
}

/// Runs a program at all nodes; `written` are the arrays of its written places.
pub(super) fn everywhere(
    around: &Surroundings<'_>,
    program: &Program,
    written: Vec<&mut [f64]>,
    threads: usize,
) {
    let longest = block_length(program.registers);
    let work = |range: Range<usize>, written: Vec<&mut [f64]>| {
        let mut desk = Desk::new(program, written, range.start);
        segments(around.grid, range, longest, |at| around.run(program, &mut desk, at));
    };
    let mut chunks = chunks(around.grid, program.cost(), threads);
    let Some(last) = chunks.pop() else { return };
    std::thread::scope(|scope| {
        let mut rest = written;
        for range in chunks {
            let mut mine = Vec::with_capacity(rest.len());
            let mut later = Vec::with_capacity(rest.len());
            for array in rest {
                let (here, there) = array.split_at_mut(range.len());
                mine.push(here);
                later.push(there);
            }
            rest = later;
            scope.spawn(move || work(range, mine));
        }
        work(last, rest);
    });
}

/// Runs a program of values set at a face.
pub(super) fn at_face(around: &Surroundings<'_>, program: &Program, written: Vec<&mut [f64]>) {
    let grid = around.grid;
    let longest = block_length(program.registers);
    let mut desk = Desk::new(program, written, 0);
    let strides = grid.strides(|_| true);
    for face in &program.faces {
        let node = if face.high { grid.sizes[face.axis] - 1 } else { 0 };
        let range = |axis: usize| if axis == face.axis { node..node + 1 } else { 0..grid.sizes[axis] };
        let along = range(grid.fast);
        let outer: Vec<usize> = (0..AXES).filter(|axis| *axis != grid.fast).collect();
        for first in range(outer[0]) {
            for second in range(outer[1]) {
                let mut from = along.start;
                while from < along.end {
                    let mut index = [0; AXES];
                    (index[outer[0]], index[outer[1]], index[grid.fast]) = (first, second, from);
                    let start = (0..AXES).map(|axis| strides[axis] * index[axis]).sum();
                    let length = (along.end - from).min(longest);
                    around.run(program, &mut desk, Segment { index, start, length });
                    from += length;
                }
            }
        }
    }
}

/// The largest value of a program of one value: `if (v > m || v != v) m = v` in index order from −∞, so that NaN is seen.
pub(super) fn largest(around: &Surroundings<'_>, program: &Program, threads: usize) -> f64 {
    let longest = block_length(program.registers);
    let keep = |largest: f64, value: f64| if value > largest || value.is_nan() { value } else { largest };
    let work = |range: Range<usize>| {
        let mut row = vec![0.0; longest];
        let mut desk = Desk::new(program, vec![&mut row], range.start);
        let mut largest = f64::NEG_INFINITY;
        segments(around.grid, range, longest, |at| {
            desk.first = at.start;
            around.run(program, &mut desk, at);
            for value in &desk.written[0][..at.length] {
                largest = keep(largest, *value);
            }
        });
        largest
    };
    let mut chunks = chunks(around.grid, program.cost(), threads);
    let last = chunks.pop();
    let mut parts = vec![f64::NEG_INFINITY; chunks.len()];
    let end = std::thread::scope(|scope| {
        for (part, range) in parts.iter_mut().zip(chunks) {
            scope.spawn(move || *part = work(range));
        }
        last.map_or(f64::NEG_INFINITY, work)
    });
    parts.into_iter().chain([end]).fold(f64::NEG_INFINITY, keep)
}
