//! `rimstone weights`.

use clap::Args;

use crate::emit::weights as layout;
use crate::pipeline::weights::{self, WrittenRequest};

use super::{Ending, complain, print};

const EXAMPLES: &str = "\
Examples:
  rimstone weights --derivative 2 --order 4               centred: -1/12, 4/3, -5/2, 4/3, -1/12
  rimstone weights --derivative 1 --order 3 --from 0      one-sided, at the left end
  rimstone weights --derivative 1 --order 4 --halfway     nodes half a step to both sides
  rimstone weights --derivative 1 --nodes -1,0,1.5 --at 1/4
  rimstone weights --derivative 2 --order 2 --json";

/// Words of the command.
#[derive(Args)]
#[command(after_help = EXAMPLES)]
pub(super) struct Arguments {
    /// Which derivative: 1, 2, …; 0 interpolates
    #[arg(long, value_name = "D", allow_hyphen_values = true)]
    derivative: Option<String>,
    /// Order of accuracy; as many nodes as it needs, centred unless --from says otherwise
    #[arg(long, value_name = "P", allow_hyphen_values = true)]
    order: Option<String>,
    /// With --order: K nodes to the left of the evaluation node; 0 is one-sided
    #[arg(long, value_name = "K", allow_hyphen_values = true)]
    from: Option<String>,
    /// With --order: nodes at ±1/2, ±3/2, …
    #[arg(long)]
    halfway: bool,
    /// The nodes in units of the spacing, as -1,0,1/2,1.5
    #[arg(long, value_name = "A,B,C", allow_hyphen_values = true)]
    nodes: Option<String>,
    /// Where the derivative is taken, in units of the spacing [default: 0]
    #[arg(long, value_name = "X", allow_hyphen_values = true)]
    at: Option<String>,
    /// One line of JSON
    #[arg(long, group = "layout")]
    json: bool,
    /// A LaTeX formula
    #[arg(long, group = "layout")]
    latex: bool,
    /// C arrays, each fraction beside its double
    #[arg(long, group = "layout")]
    c: bool,
    /// Rust arrays, each fraction beside its double
    #[arg(long, group = "layout")]
    rust: bool,
}

pub(super) fn run(arguments: &Arguments) -> Ending {
    let written = WrittenRequest {
        derivative: arguments.derivative.clone(),
        order: arguments.order.clone(),
        from: arguments.from.clone(),
        halfway: arguments.halfway,
        nodes: arguments.nodes.clone(),
        at: arguments.at.clone(),
    };
    let table = match weights::table(&written) {
        Ok(table) => table,
        Err(faults) => {
            for fault in &faults {
                complain(&format!("error[{}]: {fault}\n", fault.code()));
            }
            complain("For examples: rimstone weights --help\n");
            return Ending::Faults;
        }
    };
    let text = match arguments {
        Arguments { json: true, .. } => Ok(layout::json(&table)),
        Arguments { latex: true, .. } => Ok(layout::latex(&table)),
        Arguments { c: true, .. } => layout::c(&table),
        Arguments { rust: true, .. } => layout::rust(&table),
        _ => Ok(layout::text(&table)),
    };
    match text {
        Ok(text) => print(&text),
        Err(beyond) => {
            complain(&format!("error[W013]: no double holds {}; --json prints it exactly\n", beyond.value));
            Ending::Faults
        }
    }
}
