//! Strongly connected parts of a matrix's graph. The matrix is block triangular in them, so its eigenvalues are theirs.

/// One visit of the depth-first walk: where it stands and which target comes next.
struct Visit {
    node: usize,
    next_target: usize,
}

/// Strongly connected parts of the graph i → j where entry (i, j) is not zero (Tarjan 1972, with its own stack of visits instead
/// of recursion). Each part is ascending.
pub(super) fn strongly_connected(rows: &[Vec<f64>]) -> Vec<Vec<usize>> {
    let mut walk = Walk {
        rows,
        order: vec![None; rows.len()],
        lowest: vec![0; rows.len()],
        open: vec![false; rows.len()],
        path: Vec::new(),
        found: Vec::new(),
        count: 0,
    };
    for root in 0..rows.len() {
        if walk.order[root].is_none() {
            walk.from(root);
        }
    }
    walk.found
}

struct Walk<'a> {
    rows: &'a [Vec<f64>],
    /// When a node was first met.
    order: Vec<Option<usize>>,
    /// The earliest open node that is known to be reachable.
    lowest: Vec<usize>,
    /// Met, and its part not complete.
    open: Vec<bool>,
    path: Vec<usize>,
    found: Vec<Vec<usize>>,
    count: usize,
}

impl Walk<'_> {
    fn from(&mut self, root: usize) {
        let mut visits = vec![self.enter(root)];
        while let Some(visit) = visits.last_mut() {
            let node = visit.node;
            let Some(target) = (visit.next_target..self.rows.len()).find(|j| self.rows[node][*j] != 0.0)
            else {
                visits.pop();
                self.leave(node);
                if let Some(parent) = visits.last() {
                    self.lowest[parent.node] = self.lowest[parent.node].min(self.lowest[node]);
                }
                continue;
            };
            visit.next_target = target + 1;
            match self.order[target] {
                None => {
                    let entered = self.enter(target);
                    visits.push(entered);
                }
                Some(order) if self.open[target] => self.lowest[node] = self.lowest[node].min(order),
                Some(_) => {}
            }
        }
    }

    fn enter(&mut self, node: usize) -> Visit {
        self.order[node] = Some(self.count);
        self.lowest[node] = self.count;
        self.count += 1;
        self.open[node] = true;
        self.path.push(node);
        Visit { node, next_target: 0 }
    }

    /// A node that reaches nothing earlier completes a part: itself and all that was met after it.
    fn leave(&mut self, node: usize) {
        if self.order[node] != Some(self.lowest[node]) {
            return;
        }
        let start = self.path.iter().rposition(|member| *member == node).unwrap_or(0);
        let mut part = self.path.split_off(start);
        for member in &part {
            self.open[*member] = false;
        }
        part.sort_unstable();
        self.found.push(part);
    }
}
