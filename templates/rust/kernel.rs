//! {{ title }}
//!
{{ notes }}//!
//! Made by rimstone {{ version }} from the model with SHA-256 {{ hash }}.
//! Every sum and product is written in the order in which it is computed, and nothing is contracted: threads, vector
//! widths and compilers do not change a bit of the results.

// Names follow the model; loops over rows work on pointers, see `Arrays`.
#![allow(non_snake_case, unsafe_op_in_unsafe_fn, clippy::too_many_arguments, clippy::excessive_precision)]

use crate::driver::{ {{- imports -}} };
use std::alloc::{Layout, alloc_zeroed, dealloc};

/// An array that starts a cache line.
struct Array {
    start: *mut f64,
    length: usize,
}

// SAFETY: an array owns its memory; who writes to it from several threads keeps them apart, see `Arrays`.
unsafe impl Send for Array {}
unsafe impl Sync for Array {}

impl Array {
    const fn empty() -> Array {
        Array { start: std::ptr::null_mut(), length: 0 }
    }

    fn zeros(length: isize) -> Result<Array, String> {
        let refused = || format!("not enough memory for an array of {length} numbers");
        let length = usize::try_from(length).map_err(|_| refused())?;
        let layout = Array::layout(length).ok_or_else(refused)?;
        // SAFETY: the layout is not empty.
        let start = unsafe { alloc_zeroed(layout) }.cast::<f64>();
        if start.is_null() { Err(refused()) } else { Ok(Array { start, length }) }
    }

    fn layout(length: usize) -> Option<Layout> {
        let bytes = length.max(1).checked_mul(size_of::<f64>())?;
        Layout::from_size_align(bytes, 64).ok()
    }

    fn first(&self) -> *mut f64 {
        self.start
    }

    fn values(&self) -> &[f64] {
        if self.length == 0 {
            return &[];
        }
        // SAFETY: `length` numbers stand there, all initialised, and sweeps that write need the solver for themselves.
        unsafe { std::slice::from_raw_parts(self.start, self.length) }
    }

    fn values_mut(&mut self) -> &mut [f64] {
        if self.length == 0 {
            return &mut [];
        }
        // SAFETY: as above.
        unsafe { std::slice::from_raw_parts_mut(self.start, self.length) }
    }
}

impl Drop for Array {
    fn drop(&mut self) {
        if let (false, Some(layout)) = (self.start.is_null(), Array::layout(self.length)) {
            // SAFETY: allocated with this layout.
            unsafe { dealloc(self.start.cast(), layout) };
        }
    }
}

/// What a solver holds.
///
/// Sweeps take it by shared reference and write through pointers. They are sound because each sweep writes every node of
/// its target buffers once, each row belongs to one thread, and no buffer that an operator reads at other nodes is
/// written in the same sweep. The compiler that made this text has checked that, and that every load is in bounds.
#[allow(dead_code, reason = "not every model needs all of it")]
struct Arrays {
{{ members }}}

impl Arrays {
    const fn empty() -> Arrays {
        Arrays {
{{ initial }}        }
    }
}

#[inline(always)]
unsafe fn at(values: *const f64, index: isize) -> f64 {
    *values.offset(index)
}

/// A part of a row that nothing else reaches while it is written.
#[inline(always)]
unsafe fn line<'a>(start: *mut f64, count: isize) -> &'a mut [f64] {
    std::slice::from_raw_parts_mut(start, count as usize)
}

/// Calls `work` with the number of the thread and of the row, for all rows; each thread takes a range of rows.
fn share(team: isize, rows: isize, work: &(impl Fn(isize, isize) + Sync)) {
    let range = |thread: isize| {
        for row in rows * thread / team..rows * (thread + 1) / team {
            work(thread, row);
        }
    };
    if team == 1 {
        return range(0);
    }
    std::thread::scope(|scope| {
        for thread in 1..team {
            if std::thread::Builder::new().spawn_scoped(scope, move || range(thread)).is_err() {
                range(thread);
            }
        }
        range(0);
    });
}

{{ helpers }}{{ operators }}
{{ tables }}
{{ routines }}
{{ fixed }}
{{ description }}
/// The solver.
pub struct Kernel {
    description: Description,
    s: Arrays,
}

impl Kernel {
    /// A solver without arrays; `prepare` makes them.
    pub fn new() -> Kernel {
        Kernel { description: description(), s: Arrays::empty() }
    }
}

impl Default for Kernel {
    fn default() -> Kernel {
        Kernel::new()
    }
}

impl Solver for Kernel {
    fn description(&self) -> &Description {
        &self.description
    }

    fn prepare(&mut self, nodes: &[usize], parameters: &[Option<f64>], threads: usize) -> Result<(), String> {
        let mut s = Arrays::empty();
        if nodes.len() != s.nodes.len() {
            return Err(format!("one number of nodes is needed for each of the {} axes", s.nodes.len()));
        }
        s.points = 1;
        for (axis, count) in nodes.iter().enumerate() {
            let info = &self.description.axes[axis];
            if *count < info.least_nodes {
                return Err(format!("axis {} needs at least {} nodes", info.name, info.least_nodes));
            }
            s.nodes[axis] = isize::try_from(*count).map_err(|_| "too many nodes".to_owned())?;
            s.points = s.points.checked_mul(s.nodes[axis]).ok_or("too many nodes")?;
        }
        s.rows = s.points / s.nodes[s.nodes.len() - 1];
        // Threads cost more than they bring on small grids.
        s.team = if s.points > 20_000 { threads.clamp(1, 4096) as isize } else { 1 };
{{ prepare }}        self.s = s;
        Ok(())
    }

    fn parameter(&self, parameter: usize) -> f64 {
        self.s.parameter[parameter]
    }

    fn parameter_bounds(&self, parameter: usize) -> Option<(f64, f64)> {
        let bounded = self.description.parameters[parameter].bounded;
        bounded.then(|| (self.s.parameter_low[parameter], self.s.parameter_high[parameter]))
    }

    fn parameter_scale(&self, parameter: usize) -> f64 {
        self.s.parameter_scale[parameter]
    }

    fn axis(&self, axis: usize) -> (f64, f64, f64) {
        (self.s.low[axis], self.s.high[axis], self.s.spacing[axis])
    }

    fn start_time(&self) -> f64 {
        self.s.start_time
    }

    fn end_time(&self) -> f64 {
        self.s.end_time
    }

    fn step_duration(&self) -> Option<f64> {
        (self.description.fraction == 0.0).then_some(self.s.step_duration)
    }

    fn every(&self, output: usize) -> Option<f64> {
        self.description.outputs[output].repeated.then(|| self.s.every[output])
    }

    fn place(&self, output: usize) -> Vec<f64> {
        let axes = self.s.nodes.len();
        self.s.place[output * axes..(output + 1) * axes].to_vec()
    }

    fn scale(&self, output: usize) -> f64 {
        self.s.scale[output]
    }

    fn field_scale(&self, field: usize) -> f64 {
        self.s.field_scale[field]
    }

    fn memory_bytes(&self) -> usize {
        let arrays = [{{ arrays }}];
        arrays.iter().map(|array| array.length * size_of::<f64>()).sum()
    }

{{ interface }}}
