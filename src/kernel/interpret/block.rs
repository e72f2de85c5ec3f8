//! Running a program on a part of one row.

use super::line::Line;
use super::program::{AtFace, Effect, Instruction, Operand, Program, Target, Work};
use super::row::{self, Argument, Vectors};
use super::scalar;
use crate::kernel::Source;

/// Up to three axes.
pub(super) const AXES: usize = 3;

/// The grid that a program runs on: all axes, or those of a table.
#[derive(Clone, Debug)]
pub(super) struct Grid {
    /// By axis; 1 where the grid has no such axis.
    pub(super) sizes: [usize; AXES],
    /// The axis along which memory runs.
    pub(super) fast: usize,
}

impl Grid {
    pub(super) fn points(&self) -> usize {
        self.sizes.iter().product()
    }

    /// Steps in memory along each axis; 0 where there is none.
    pub(super) fn strides(&self, has: impl Fn(usize) -> bool) -> [usize; AXES] {
        let mut strides = [0; AXES];
        let mut stride = 1;
        for axis in (0..AXES).rev().filter(|axis| has(*axis)) {
            strides[axis] = stride;
            stride *= self.sizes[axis];
        }
        strides
    }
}

/// An array and how it lies over the grid.
#[derive(Clone, Copy, Debug)]
pub(super) struct Array<'a> {
    pub(super) data: &'a [f64],
    pub(super) strides: [usize; AXES],
}

/// What programs read and never change while they run.
pub(super) struct Surroundings<'a> {
    pub(super) grid: &'a Grid,
    pub(super) periodic: [bool; AXES],
    pub(super) buffers: Vec<Array<'a>>,
    pub(super) tables: Vec<Array<'a>>,
    /// Along each axis.
    pub(super) coordinates: &'a [Vec<f64>],
    /// Fixed and uniform values by their index in the graph.
    pub(super) numbers: &'a [f64],
    pub(super) lines: &'a [Line],
    pub(super) vectors: Vectors,
}

/// Nodes next to each other in one row.
#[derive(Clone, Copy, Debug)]
pub(super) struct Segment {
    /// Of the first node: index along each axis.
    pub(super) index: [usize; AXES],
    /// Of the first node: row-major.
    pub(super) start: usize,
    pub(super) length: usize,
}

/// Rows to compute in, and the part of the written buffers that belongs to this chunk.
pub(super) struct Desk<'a> {
    pub(super) registers: Vec<Vec<f64>>,
    weight: Vec<f64>,
    pub(super) written: Vec<&'a mut [f64]>,
    /// The node at which the written parts begin.
    pub(super) first: usize,
}

/// Longest and shortest rows that are computed at once.
const LONGEST: usize = 1024;
const SHORTEST: usize = 256;
/// Registers of that many bytes stay in the first cache.
const ROOM: usize = 24 * 1024;

/// How many nodes a program computes at once.
pub(super) fn block_length(registers: usize) -> usize {
    (ROOM / 8 / registers.max(1) / 64 * 64).clamp(SHORTEST, LONGEST)
}

impl<'a> Desk<'a> {
    pub(super) fn new(program: &Program, written: Vec<&'a mut [f64]>, first: usize) -> Desk<'a> {
        let length = block_length(program.registers);
        Desk {
            registers: vec![vec![0.0; length]; program.registers],
            weight: vec![0.0; length],
            written,
            first,
        }
    }
}

impl Surroundings<'_> {
    /// Everything a sweep does at the nodes of a segment.
    pub(super) fn run(&self, program: &Program, desk: &mut Desk<'_>, at: Segment) {
        for instruction in &program.rates {
            self.execute(instruction, desk, at);
        }
        for face in &program.faces {
            self.visit_face(face, desk, at);
        }
        for instruction in &program.writes {
            self.execute(instruction, desk, at);
        }
        for (place, operand) in &program.stores {
            let taken = std::mem::take(&mut desk.written[*place]);
            let from = at.start - desk.first;
            let source = self.argument(*operand, desk, at);
            row::unary(self.vectors, row::Unary::Copy, &mut taken[from..from + at.length], source);
            desk.written[*place] = taken;
        }
    }

    /// The first number of an operand's row, and the rest as far as the segment goes.
    fn argument<'s>(&'s self, operand: Operand, desk: &'s Desk<'_>, at: Segment) -> Argument<'s> {
        let along = |array: &Array<'s>| {
            let from = (0..AXES).map(|axis| array.strides[axis] * at.index[axis]).sum::<usize>();
            if array.strides[self.grid.fast] == 0 {
                Argument::Number(array.data[from])
            } else {
                Argument::Row(&array.data[from..from + at.length])
            }
        };
        match operand {
            Operand::Number(value) => Argument::Number(self.numbers[value]),
            Operand::Register(register) => Argument::Row(&desk.registers[register][..at.length]),
            Operand::Buffer(buffer) => {
                Argument::Row(&self.buffers[buffer].data[at.start..at.start + at.length])
            }
            Operand::Written(place) => {
                let from = at.start - desk.first;
                Argument::Row(&desk.written[place][from..from + at.length])
            }
            Operand::Table(table) => along(&self.tables[table]),
            Operand::Coordinate(axis) if axis == self.grid.fast => {
                let from = at.index[axis];
                Argument::Row(&self.coordinates[axis][from..from + at.length])
            }
            Operand::Coordinate(axis) => Argument::Number(self.coordinates[axis][at.index[axis]]),
        }
    }

    fn execute(&self, instruction: &Instruction, desk: &mut Desk<'_>, at: Segment) {
        match instruction.target {
            Target::Register(register) => {
                let mut taken = std::mem::take(&mut desk.registers[register]);
                self.compute(&instruction.work, &mut taken[..at.length], desk, at);
                desk.registers[register] = taken;
            }
            Target::Written(place) => {
                let taken = std::mem::take(&mut desk.written[place]);
                let from = at.start - desk.first;
                self.compute(&instruction.work, &mut taken[from..from + at.length], desk, at);
                desk.written[place] = taken;
            }
        }
    }

    fn compute(&self, work: &Work, target: &mut [f64], desk: &mut Desk<'_>, at: Segment) {
        let vectors = self.vectors;
        match work {
            Work::Unary(kind, a) => row::unary(vectors, *kind, target, self.argument(*a, desk, at)),
            Work::Binary(kind, a, b) => {
                let (a, b) = (self.argument(*a, desk, at), self.argument(*b, desk, at));
                row::binary(vectors, *kind, target, a, b);
            }
            Work::WithProduct(kind, a, b, c) => {
                let argument = |operand: &Operand| self.argument(*operand, desk, at);
                row::with_product(vectors, *kind, target, argument(a), argument(b), argument(c));
            }
            Work::Select { left, relation, right, then, otherwise } => {
                let argument = |operand: &Operand| self.argument(*operand, desk, at);
                let (left, right) = (argument(left), argument(right));
                row::select(vectors, *relation, target, left, right, argument(then), argument(otherwise));
            }
            Work::Noise(seed) => {
                for (index, value) in target.iter_mut().enumerate() {
                    *value = scalar::noise(*seed, (at.start + index) as u64);
                }
            }
            Work::Apply { operator, axis, source, coefficient } => {
                let line = &self.lines[operator.0];
                let field = self.array(*source);
                let coefficient = coefficient.map_or(field, |source| self.array(source));
                if *axis == self.grid.fast {
                    self.along_row(line, field, coefficient, target, &mut desk.weight, at);
                } else {
                    self.across_rows(line, *axis, field, coefficient, target, &mut desk.weight, at);
                }
            }
        }
    }

    fn array(&self, source: Source) -> Array<'_> {
        match source {
            Source::Buffer(buffer) => self.buffers[buffer.0],
            Source::Table(table) => self.tables[table.0],
        }
    }

    /// An operator along another axis: whole rows, weights of the row's place.
    #[allow(clippy::too_many_arguments, reason = "an operator has that many operands")]
    fn across_rows(
        &self,
        line: &Line,
        axis: usize,
        field: Array<'_>,
        coefficient: Array<'_>,
        target: &mut [f64],
        weight: &mut [f64],
        at: Segment,
    ) {
        let (position, nodes) = (at.index[axis], self.grid.sizes[axis]);
        let neighbour = |distance: isize| match position as isize + distance {
            before if before < 0 => (before + nodes as isize) as usize,
            after if after >= nodes as isize => after as usize - nodes,
            inside => inside as usize,
        };
        let tap = |array: Array<'_>, distance: isize| -> (usize, bool) {
            let mut index = at.index;
            index[axis] = neighbour(distance);
            let from = (0..AXES).map(|axis| array.strides[axis] * index[axis]).sum();
            (from, array.strides[self.grid.fast] != 0)
        };
        let length = target.len();
        let row_of = |array: Array<'_>, distance: isize| tap(array, distance);
        let f = |distance: isize| match row_of(field, distance) {
            (from, true) => Argument::Row(&field.data[from..from + length]),
            (from, false) => Argument::Number(field.data[from]),
        };
        let b = |distance: isize| match row_of(coefficient, distance) {
            (from, true) => Argument::Row(&coefficient.data[from..from + length]),
            (from, false) => Argument::Number(coefficient.data[from]),
        };
        line.nodes(self.vectors, position, nodes, f, b, target, &mut weight[..length]);
    }

    /// An operator along the row itself: single nodes near the ends, the rest at once.
    fn along_row(
        &self,
        line: &Line,
        field: Array<'_>,
        coefficient: Array<'_>,
        target: &mut [f64],
        weight: &mut [f64],
        at: Segment,
    ) {
        let fast = self.grid.fast;
        let nodes = self.grid.sizes[fast];
        let (start, end) = (at.index[fast], at.index[fast] + target.len());
        let edge = if self.periodic[fast] { line.reach() } else { line.closure_rows() };
        let low = edge.clamp(start, end);
        let high = nodes.saturating_sub(edge).clamp(low, end);
        let base = |array: &Array<'_>| {
            (0..AXES)
                .filter(|axis| *axis != fast)
                .map(|axis| array.strides[axis] * at.index[axis])
                .sum::<usize>()
        };
        let (f_row, b_row) = (&field.data[base(&field)..], &coefficient.data[base(&coefficient)..]);
        let (f_step, b_step) = (field.strides[fast], coefficient.strides[fast]);
        for position in (start..low).chain(high..end) {
            let neighbour = |distance: isize| match position as isize + distance {
                before if before < 0 => (before + nodes as isize) as usize,
                after if after >= nodes as isize => after as usize - nodes,
                inside => inside as usize,
            };
            let f = |distance: isize| f_row[neighbour(distance) * f_step];
            let b = |distance: isize| b_row[neighbour(distance) * b_step];
            target[position - start] = line.node(position, nodes, f, b);
        }
        if high > low {
            let length = high - low;
            let part = |row, step, distance| part(row, step, low, length, distance);
            let f = |distance: isize| part(f_row, f_step, distance);
            let b = |distance: isize| part(b_row, b_step, distance);
            line.nodes(
                self.vectors,
                low,
                nodes,
                f,
                b,
                &mut target[low - start..high - start],
                &mut weight[..length],
            );
        }
    }

    /// Applies what happens at a face to those nodes of the segment that lie on it.
    fn visit_face(&self, face: &AtFace, desk: &mut Desk<'_>, at: Segment) {
        let index = if face.high { self.grid.sizes[face.axis] - 1 } else { 0 };
        let first = at.index[face.axis];
        let (offset, here) = if face.axis != self.grid.fast {
            if first != index {
                return;
            }
            (0, at)
        } else {
            if index < first || index >= first + at.length {
                return;
            }
            let offset = index - first;
            let mut here = at;
            here.index[face.axis] = index;
            here.start += offset;
            here.length = 1;
            (offset, here)
        };
        for instruction in &face.instructions {
            self.execute(instruction, desk, here);
        }
        for node in 0..here.length {
            let value = |operand: Operand| self.argument(operand, desk, here).at(node);
            if !face
                .patch
                .iter()
                .all(|(left, relation, right)| scalar::holds(value(*left), *relation, value(*right)))
            {
                continue;
            }
            for (effect, operand) in &face.effects {
                let value = self.argument(*operand, desk, here).at(node);
                match effect {
                    Effect::AddTo(slot) => desk.registers[*slot][offset + node] += value,
                    Effect::Replace(slot) => desk.registers[*slot][offset + node] = value,
                    Effect::Set(place) => desk.written[*place][here.start - desk.first + node] = value,
                }
            }
        }
    }
}

/// `length` nodes of a row from `low` on, moved by a distance; a table without the axis is one number.
fn part(row: &[f64], step: usize, low: usize, length: usize, distance: isize) -> Argument<'_> {
    if step == 0 {
        return Argument::Number(row[0]);
    }
    let from = (low as isize + distance) as usize;
    Argument::Row(&row[from..from + length])
}
