//! {{ title }}
//!
{{ notes }}//!
//! Made by rimstone {{ version }} from the model with SHA-256 {{ hash }}.
//! Every sum and product is written in the order in which it is computed, and nothing is contracted: threads, vector
//! widths and compilers do not change a bit of the results.

// Names follow the model; loops over rows work on pointers, see `Arrays`.
#![allow(non_snake_case, unsafe_op_in_unsafe_fn)]
#![allow(clippy::too_many_arguments, clippy::excessive_precision, clippy::approx_constant, clippy::missing_safety_doc)]

use crate::driver::{ {{- imports -}} };
use std::alloc::{Layout, alloc_zeroed, dealloc};
use std::sync::atomic::{AtomicUsize, Ordering};
use std::sync::{Arc, Condvar, Mutex, MutexGuard};
use std::thread::JoinHandle;

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
fn share(s: &Arrays, rows: isize, work: &(impl Fn(isize, isize) + Sync)) {
    let range = |thread: isize| {
        for row in rows * thread / s.team..rows * (thread + 1) / s.team {
            work(thread, row);
        }
    };
    match &s.crew {
        None => range(0),
        Some(crew) => crew.run(&range),
    }
}

/// Threads that wait for work.
struct Crew {
    shared: Arc<Shared>,
    members: Vec<JoinHandle<()>>,
}

struct Shared {
    order: Mutex<Order>,
    given: Condvar,
    done: Condvar,
    /// Counts orders; looked at before a thread goes to sleep.
    number: AtomicUsize,
    /// Members that have not finished the present order.
    busy: AtomicUsize,
}

#[derive(Clone, Copy)]
struct Order {
    number: usize,
    work: Option<Work>,
}

/// Work with its lifetime forgotten; `Crew::run` returns only after all have let go of it.
#[derive(Clone, Copy)]
struct Work(*const (dyn Fn(isize) + Sync));

// SAFETY: what it points at may be called from several threads, and lives while they do.
unsafe impl Send for Work {}

/// Looks at a counter before a thread sleeps; some microseconds.
const PATIENCE: usize = 4000;

impl Crew {
    /// A crew of at most `wanted` threads, the caller's not counted; fewer when the system gives no more.
    fn of(wanted: usize) -> Option<Crew> {
        let shared = Arc::new(Shared {
            order: Mutex::new(Order { number: 0, work: None }),
            given: Condvar::new(),
            done: Condvar::new(),
            number: AtomicUsize::new(0),
            busy: AtomicUsize::new(0),
        });
        let start = |thread: usize| {
            let shared = Arc::clone(&shared);
            std::thread::Builder::new().spawn(move || shared.obey(thread as isize))
        };
        let members: Vec<JoinHandle<()>> = (1..=wanted).map_while(|thread| start(thread).ok()).collect();
        (!members.is_empty()).then_some(Crew { shared, members })
    }

    /// Calls `work` with 0 here and with 1, 2, ... on the other threads; returns when all are done.
    fn run(&self, work: &(dyn Fn(isize) + Sync)) {
        // SAFETY: only the lifetime changes, and `Waiting` waits until no thread uses the work any more.
        let work_for_all = Work(unsafe {
            std::mem::transmute::<*const (dyn Fn(isize) + Sync + '_), *const (dyn Fn(isize) + Sync + 'static)>(work)
        });
        self.shared.busy.store(self.members.len(), Ordering::Release);
        self.shared.give(Some(work_for_all));
        let _waiting = Waiting(&self.shared);
        work(0);
    }
}

/// Waits when it goes out of scope, also when the work panics.
struct Waiting<'a>(&'a Shared);

impl Drop for Waiting<'_> {
    fn drop(&mut self) {
        let done = || self.0.busy.load(Ordering::Acquire) == 0;
        for _ in 0..PATIENCE {
            if done() {
                return;
            }
            std::hint::spin_loop();
        }
        let mut order = self.0.lock();
        while !done() {
            order = self.0.done.wait(order).unwrap_or_else(|poisoned| poisoned.into_inner());
        }
    }
}

impl Drop for Crew {
    fn drop(&mut self) {
        self.shared.give(None);
        for member in self.members.drain(..) {
            // A member that panicked has nothing left to do.
            let _ = member.join();
        }
    }
}

impl Shared {
    fn lock(&self) -> MutexGuard<'_, Order> {
        self.order.lock().unwrap_or_else(|poisoned| poisoned.into_inner())
    }

    fn give(&self, work: Option<Work>) {
        let mut order = self.lock();
        *order = Order { number: order.number + 1, work };
        self.number.store(order.number, Ordering::Release);
        self.given.notify_all();
    }

    /// The life of a member: order after order, until there is no work in one.
    fn obey(&self, thread: isize) {
        let mut last = 0;
        loop {
            for _ in 0..PATIENCE {
                if self.number.load(Ordering::Acquire) != last {
                    break;
                }
                std::hint::spin_loop();
            }
            let mut order = self.lock();
            while order.number == last {
                order = self.given.wait(order).unwrap_or_else(|poisoned| poisoned.into_inner());
            }
            let Order { number, work } = *order;
            drop(order);
            last = number;
            let Some(work) = work else { return };
            let _finished = Finished(self);
            // SAFETY: the giver waits for `Finished`.
            unsafe { (*work.0)(thread) };
        }
    }
}

/// Tells the giver, also when the work panics.
struct Finished<'a>(&'a Shared);

impl Drop for Finished<'_> {
    fn drop(&mut self) {
        if self.0.busy.fetch_sub(1, Ordering::AcqRel) == 1 {
            let _order = self.0.lock();
            self.0.done.notify_all();
        }
    }
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
        if s.points > 20_000 && threads > 1 {
            s.crew = Crew::of(threads.min(4096) - 1);
        }
        s.team = 1 + s.crew.as_ref().map_or(0, |crew| crew.members.len() as isize);
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
