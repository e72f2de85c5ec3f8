//! From the words of a command to one stencil: reading the request, all faults at once.
//!
//! Knows no command line library; words come as text.

use std::fmt;

use crate::discretize::WeightsFault;
use crate::discretize::interior::{LargestRequest, NodeFamily};
use crate::discretize::weights::{self, NodeChoice, WeightsRequest};
use crate::emit::weights::{ErrorTerm, WeightsTable};
use crate::exact::{ParseRationalError, Rational};
use crate::scheme::Stencil;

/// The request as it was written; nothing where nothing was written.
#[derive(Clone, PartialEq, Eq, Debug, Default)]
pub struct WrittenRequest {
    /// `--derivative`.
    pub derivative: Option<String>,
    /// `--order`.
    pub order: Option<String>,
    /// `--from`.
    pub from: Option<String>,
    /// Whether `--halfway` was given.
    pub halfway: bool,
    /// `--nodes`.
    pub nodes: Option<String>,
    /// `--at`.
    pub at: Option<String>,
}

/// What can be wrong with a request for weights.
#[derive(Clone, PartialEq, Eq, Debug)]
pub enum RequestFault {
    /// No derivative is named.
    NoDerivative,
    /// An option that takes a whole number has something else.
    NotWhole { option: &'static str, found: String },
    /// Neither an order nor nodes are given.
    NoNodes,
    /// Listed nodes and an option that chooses nodes.
    NodesTwice { option: &'static str },
    /// A listed node or the point is not a number.
    NotANumber { option: &'static str, found: String, why: ParseRationalError },
    /// The listed numbers have more digits in all than can be worked with at once.
    TooManyDigits { bits: u64, most: u64 },
    /// There are no such weights.
    Weights(WeightsFault),
}

/// Bound on (number of nodes) · (binary digits of the nodes and the point in all): the size to which the
/// fractions of the weights can grow. 64 nodes of five decimals each keep it.
const MOST_WORK: u64 = 200_000;
/// Most characters of a faulty word that a message repeats.
const QUOTED: usize = 40;

/// Reads a request and derives its table.
pub fn table(written: &WrittenRequest) -> Result<WeightsTable, Vec<RequestFault>> {
    let request = read(written)?;
    let stencil = weights::derive(&request).map_err(|fault| vec![RequestFault::Weights(fault)])?;
    Ok(as_table(&stencil))
}

/// Reads a request; every fault of its words is told.
pub fn read(written: &WrittenRequest) -> Result<WeightsRequest, Vec<RequestFault>> {
    let mut faults = Vec::new();
    let derivative = match &written.derivative {
        None => {
            faults.push(RequestFault::NoDerivative);
            None
        }
        Some(word) => {
            whole("--derivative", word, LargestRequest::DERIVATIVE, &mut faults, |given, highest| {
                WeightsFault::DerivativeTooHigh { given, highest }
            })
        }
    };
    let at = match &written.at {
        None => Some(Rational::zero()),
        Some(word) => number("--at", word, &mut faults),
    };
    let nodes = match &written.nodes {
        Some(list) => listed(list, written, &mut faults),
        None => family(written, &mut faults),
    };
    if let (Some(derivative), Some(NodeChoice::Listed(nodes))) = (derivative, &nodes)
        && nodes.len() < derivative + 1
    {
        let fault = WeightsFault::TooFewNodes { given: nodes.len(), needed: derivative + 1 };
        faults.push(RequestFault::Weights(fault));
    }
    match (derivative, nodes, at) {
        (Some(derivative), Some(nodes), Some(at)) if faults.is_empty() => {
            check_digits(&nodes, &at)?;
            Ok(WeightsRequest { derivative, nodes, at })
        }
        _ => Err(faults),
    }
}

fn listed(list: &str, written: &WrittenRequest, faults: &mut Vec<RequestFault>) -> Option<NodeChoice> {
    let others = [
        ("--order", written.order.is_some()),
        ("--from", written.from.is_some()),
        ("--halfway", written.halfway),
    ];
    let twice = others.iter().filter(|(_, given)| *given);
    faults.extend(twice.map(|(option, _)| RequestFault::NodesTwice { option }));
    let given = list.split(',').count();
    if given > LargestRequest::NODES {
        let fault = WeightsFault::TooManyNodes { given, most: LargestRequest::NODES };
        faults.push(RequestFault::Weights(fault));
        return None;
    }
    let read: Vec<Rational> = list.split(',').filter_map(|word| number("--nodes", word, faults)).collect();
    let mut sorted = read.clone();
    sorted.sort();
    let mut repeated: Vec<&Rational> =
        sorted.windows(2).filter(|pair| pair[0] == pair[1]).map(|pair| &pair[0]).collect();
    repeated.dedup();
    faults.extend(
        repeated
            .into_iter()
            .map(|node| RequestFault::Weights(WeightsFault::RepeatedNode { node: node.clone() })),
    );
    (read.len() == given).then_some(NodeChoice::Listed(read))
}

fn family(written: &WrittenRequest, faults: &mut Vec<RequestFault>) -> Option<NodeChoice> {
    let left = written.from.as_ref().map(|word| {
        whole("--from", word, LargestRequest::NODES - 1, faults, |given, _| WeightsFault::TooManyNodes {
            given: given.saturating_add(1),
            most: LargestRequest::NODES,
        })
    });
    let Some(word) = &written.order else {
        faults.push(RequestFault::NoNodes);
        return None;
    };
    let order = whole("--order", word, LargestRequest::ORDER, faults, order_not_available)?;
    if order == 0 {
        faults.push(RequestFault::Weights(order_not_available(0, LargestRequest::ORDER)));
        return None;
    }
    let family = match (left, written.halfway) {
        (None, false) => NodeFamily::Centred,
        (None, true) => NodeFamily::Halfway,
        (Some(left), false) => NodeFamily::Biased { left: left? },
        (Some(left), true) => NodeFamily::BiasedHalfway { left: left? },
    };
    Some(NodeChoice::Family { family, order })
}

fn order_not_available(given: usize, highest: usize) -> WeightsFault {
    WeightsFault::OrderNotAvailable { given, available: (1..=highest).collect() }
}

/// A whole number from nought to `most`; beyond it the fault that `beyond` makes.
fn whole(
    option: &'static str,
    word: &str,
    most: usize,
    faults: &mut Vec<RequestFault>,
    beyond: impl FnOnce(usize, usize) -> WeightsFault,
) -> Option<usize> {
    let digits = word.trim();
    if digits.is_empty() || !digits.bytes().all(|byte| byte.is_ascii_digit()) {
        faults.push(RequestFault::NotWhole { option, found: quoted(word) });
        return None;
    }
    let number = digits.parse().unwrap_or(usize::MAX);
    if number > most {
        faults.push(RequestFault::Weights(beyond(number, most)));
        return None;
    }
    Some(number)
}

fn number(option: &'static str, word: &str, faults: &mut Vec<RequestFault>) -> Option<Rational> {
    match word.parse() {
        Ok(number) => Some(number),
        Err(why) => {
            faults.push(RequestFault::NotANumber { option, found: quoted(word), why });
            None
        }
    }
}

fn quoted(word: &str) -> String {
    let mut short: String = word.trim().chars().take(QUOTED).collect();
    if short.len() < word.trim().len() {
        short.push('…');
    }
    short
}

/// Bounds the size of the fractions to come, and with it the work.
fn check_digits(nodes: &NodeChoice, at: &Rational) -> Result<(), Vec<RequestFault>> {
    let listed = match nodes {
        NodeChoice::Listed(nodes) => nodes.as_slice(),
        NodeChoice::Family { .. } => &[],
    };
    let size = |value: &Rational| value.numerator().bits() + value.denominator().bits();
    // Every node's distance from the point enters, so the point's digits count once for each node.
    let count = listed.len().max(LargestRequest::ORDER) as u64;
    let bits = listed.iter().map(size).sum::<u64>() + size(at) * count;
    let most = MOST_WORK / count;
    if bits > most { Err(vec![RequestFault::TooManyDigits { bits, most }]) } else { Ok(()) }
}

fn as_table(stencil: &Stencil) -> WeightsTable {
    WeightsTable {
        derivative: stencil.derivative(),
        at: stencil.at().clone(),
        nodes: stencil.nodes().to_vec(),
        weights: stencil.weights().to_vec(),
        order: stencil.order(),
        error: stencil.error().map(|error| ErrorTerm {
            coefficient: error.coefficient.clone(),
            derivative: error.derivative,
            power: error.power,
        }),
    }
}

impl RequestFault {
    /// The code of the fault, for scripts.
    pub fn code(&self) -> &'static str {
        match self {
            RequestFault::NoDerivative => "W001",
            RequestFault::NotWhole { .. } => "W002",
            RequestFault::NoNodes => "W003",
            RequestFault::NodesTwice { .. } => "W004",
            RequestFault::NotANumber { .. } => "W005",
            RequestFault::TooManyDigits { .. } => "W006",
            RequestFault::Weights(fault) => match fault {
                WeightsFault::TooFewNodes { .. } => "W007",
                WeightsFault::TooManyNodes { .. } => "W008",
                WeightsFault::DerivativeTooHigh { .. } => "W009",
                WeightsFault::OrderNotAvailable { .. } => "W010",
                WeightsFault::RepeatedNode { .. } => "W011",
                WeightsFault::Refused(_) => "W012",
            },
        }
    }
}

impl fmt::Display for RequestFault {
    fn fmt(&self, formatter: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            RequestFault::NoDerivative => formatter.write_str(
                "which derivative? Add --derivative 1 (0 for interpolation, 2 for the second derivative, …)",
            ),
            RequestFault::NotWhole { option, found } => {
                write!(formatter, "{option} takes a whole number such as 2, not `{found}`")
            }
            RequestFault::NoNodes => formatter.write_str(
                "which nodes? Add --order 4 for as many as that order needs, or list them: --nodes -1,0,1",
            ),
            RequestFault::NodesTwice { option } => {
                write!(formatter, "{option} chooses nodes and --nodes lists them: leave one of them out")
            }
            RequestFault::NotANumber { option, found, why } => {
                write!(formatter, "{option}: `{found}`: {why}")
            }
            RequestFault::TooManyDigits { bits, most } => write!(
                formatter,
                "the nodes and the point have {bits} binary digits to work with, at most {most} are accepted: shorten them"
            ),
            RequestFault::Weights(WeightsFault::OrderNotAvailable { given, available }) => {
                let highest = available.last().copied().unwrap_or(0);
                write!(formatter, "order {given} is not offered: choose one from 1 to {highest}")
            }
            RequestFault::Weights(fault) => fault.fmt(formatter),
        }
    }
}

impl std::error::Error for RequestFault {}

#[cfg(test)]
mod tests {
    use super::*;

    fn written(options: &[(&str, &str)]) -> WrittenRequest {
        let word = |name: &str| {
            options.iter().find(|(option, _)| *option == name).map(|(_, word)| (*word).to_string())
        };
        WrittenRequest {
            derivative: word("derivative"),
            order: word("order"),
            from: word("from"),
            halfway: word("halfway").is_some(),
            nodes: word("nodes"),
            at: word("at"),
        }
    }

    fn codes(options: &[(&str, &str)]) -> Vec<&'static str> {
        match table(&written(options)) {
            Ok(table) => panic!("accepted: {table:?}"),
            Err(faults) => faults.iter().map(RequestFault::code).collect(),
        }
    }

    #[test]
    fn all_faults_are_told_at_once() {
        assert_eq!(codes(&[]), ["W001", "W003"]);
        let several = [("order", "x"), ("nodes", "1,z,1"), ("at", "y")];
        assert_eq!(codes(&several), ["W001", "W005", "W004", "W005", "W011"]);
        assert_eq!(codes(&[("derivative", "-1"), ("order", "2.5"), ("from", "")]), ["W002", "W002", "W002"]);
        assert_eq!(codes(&[("derivative", "99"), ("order", "0")]), ["W009", "W010"]);
        assert_eq!(codes(&[("derivative", "2"), ("nodes", "0,1")]), ["W007"]);
        assert_eq!(codes(&[("derivative", "1"), ("order", "2"), ("from", "64")]), ["W008"]);
    }

    #[test]
    fn hostile_words_cost_nothing() {
        let many = vec!["0"; 100_000].join(",");
        assert_eq!(codes(&[("derivative", "1"), ("nodes", &many)]), ["W008"]);
        assert_eq!(codes(&[("derivative", "1"), ("nodes", "0,1e999999999")]), ["W005"]);
        let long = format!("0.{}", "3".repeat(1990));
        assert_eq!(codes(&[("derivative", "1"), ("order", "4"), ("at", &long)]), ["W006"]);
        let endless = "9".repeat(10_000);
        assert_eq!(codes(&[("derivative", &endless), ("order", &endless)]), ["W009", "W010"]);
    }

    #[test]
    fn nodes_are_read_exactly_and_put_into_order() {
        let options = [("derivative", "1"), ("nodes", "0.5, -1/2,1e0,-1"), ("at", "1/4")];
        let table = table(&written(&options)).expect("a good request");
        let expected: Vec<Rational> =
            [(-1, 1), (-1, 2), (1, 2), (1, 1)].map(|(top, bottom)| Rational::ratio(top, bottom)).to_vec();
        assert_eq!((table.nodes, table.at), (expected, Rational::ratio(1, 4)));
        assert_eq!(table.order, 3);
    }

    #[test]
    fn families_follow_the_options() {
        let nodes = |options: &[(&str, &str)]| -> Vec<String> {
            let table = table(&written(options)).expect("a good request");
            table.nodes.iter().map(Rational::to_string).collect()
        };
        assert_eq!(nodes(&[("derivative", "2"), ("order", "2")]), ["-1", "0", "1"]);
        assert_eq!(nodes(&[("derivative", "1"), ("order", "2"), ("from", "0")]), ["0", "1", "2"]);
        assert_eq!(nodes(&[("derivative", "1"), ("order", "2"), ("halfway", "")]), ["-1/2", "1/2"]);
    }
}
