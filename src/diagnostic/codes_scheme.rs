//! Codes of what only the scheme knows: orders that no closure reaches, grids that are too small.

use crate::code_table;

code_table! {
    ORDER_NOT_REACHED = "E0690", "the order asked for cannot be reached",
        "An axis with boundaries needs closures: stencils of their own near the faces that keep the order and stay stable. \
         They are derived for interior orders up to a largest one. The order in a model file is that of the solution: with interior \
         order 2p a model with first derivatives converges at p + 1, one with second derivatives at min(2p, p + 2). \
         Periodic axes need no closures and go to order 16.",
        wrong "accuracy\n  order 12", right "accuracy\n  order 4";
    TOO_FEW_NODES = "E0990", "an axis has too few nodes for its closures",
        "The closures at the two ends of an axis may not overlap, and every stencil must stay on the grid. \
         The least number of nodes follows from the order; errors become regular from about twice that number on.",
        wrong "x: 0 m to 1 m, 5 nodes", right "x: 0 m to 1 m, 41 nodes";
}
