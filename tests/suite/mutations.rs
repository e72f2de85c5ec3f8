//! Damaged models: what remains of a demo model after random slips is checked or refused, and never makes the compiler stumble.

use std::fs;
use std::path::{Path, PathBuf};

use proptest::prelude::*;
use rimstone::diagnostic::terminal::{Colour, render};
use rimstone::pipeline;
use rimstone::source::SourceFile;

fn demos() -> Vec<String> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("demo-models");
    let mut found: Vec<PathBuf> = fs::read_dir(folder)
        .expect("demo models")
        .map(|entry| entry.expect("readable").path())
        .filter(|path| path.extension().is_some_and(|extension| extension == "rim"))
        .collect();
    found.sort();
    found.iter().map(|path| fs::read_to_string(path).expect("text")).collect()
}

/// One slip; numbers are taken modulo what there is.
#[derive(Clone, Debug)]
enum Slip {
    DeleteLine(usize),
    DoubleLine(usize),
    SwapLines(usize, usize),
    DeleteWord(usize),
    DoubleWord(usize),
    SwapWords(usize, usize),
    /// A word of one model put in place of another.
    Put(usize, &'static str),
    Bytes(usize, Vec<u8>),
}

const WORDS: [&str; 40] = [
    "0",
    "-1",
    "1e300",
    "1e-300",
    "1e400",
    "x",
    "y",
    "t",
    "T",
    "u",
    "k",
    "π",
    "∂T/∂x",
    "∂u/∂t",
    "∂²u/∂x²",
    "Δ",
    "∇·(∇T)",
    "sin(x)",
    "cases(x < 0: 1, otherwise: 0)",
    "noise(seed 1)",
    "δ(x)",
    "(",
    ")",
    "^64",
    "^(1/2)",
    "/ 0",
    "* 0",
    "2 nodes",
    "1 cells",
    "periodic",
    "free",
    "between 0 and 1",
    "low",
    "start",
    "order 16",
    "step 1 s",
    "leapfrog",
    "euler",
    "every",
    "1e9 nodes",
];

fn slip() -> impl Strategy<Value = Slip> {
    let place = || any::<u16>().prop_map(usize::from);
    prop_oneof![
        place().prop_map(Slip::DeleteLine),
        place().prop_map(Slip::DoubleLine),
        (place(), place()).prop_map(|(a, b)| Slip::SwapLines(a, b)),
        place().prop_map(Slip::DeleteWord),
        place().prop_map(Slip::DoubleWord),
        (place(), place()).prop_map(|(a, b)| Slip::SwapWords(a, b)),
        (place(), proptest::sample::select(WORDS.to_vec())).prop_map(|(a, word)| Slip::Put(a, word)),
        (place(), proptest::collection::vec(any::<u8>(), 1..6)).prop_map(|(a, bytes)| Slip::Bytes(a, bytes)),
    ]
}

/// Words with the spaces and line ends between them as pieces of their own.
fn pieces(text: &str) -> Vec<String> {
    let mut pieces: Vec<String> = Vec::new();
    let mut blank = None;
    for letter in text.chars() {
        if blank != Some(letter.is_whitespace()) {
            pieces.push(String::new());
            blank = Some(letter.is_whitespace());
        }
        pieces.last_mut().expect("just pushed").push(letter);
    }
    pieces
}

fn damaged(bytes: Vec<u8>, slip: &Slip) -> Vec<u8> {
    if let Slip::Bytes(at, put) = slip {
        let mut bytes = bytes;
        let at = at % bytes.len().max(1);
        let end = (at + put.len()).min(bytes.len());
        bytes.splice(at..end, put.iter().copied());
        return bytes;
    }
    let Ok(text) = String::from_utf8(bytes.clone()) else { return bytes };
    let mut lines: Vec<String> = text.split_inclusive('\n').map(str::to_owned).collect();
    let mut words = pieces(&text);
    let places: Vec<usize> = (0..words.len()).filter(|index| !words[*index].trim().is_empty()).collect();
    if places.is_empty() {
        return bytes;
    }
    let word = |at: &usize| places[at % places.len()];
    let line = |at: &usize| at % lines.len();
    match slip {
        Slip::DeleteLine(at) => {
            let at = line(at);
            lines.remove(at);
            return lines.concat().into_bytes();
        }
        Slip::DoubleLine(at) => {
            let at = line(at);
            lines.insert(at, lines[at].clone());
            return lines.concat().into_bytes();
        }
        Slip::SwapLines(a, b) => {
            let (a, b) = (line(a), line(b));
            lines.swap(a, b);
            return lines.concat().into_bytes();
        }
        Slip::DeleteWord(at) => words[word(at)].clear(),
        Slip::DoubleWord(at) => {
            let at = word(at);
            let twice = format!("{0} {0}", words[at]);
            words[at] = twice;
        }
        Slip::SwapWords(a, b) => words.swap(word(a), word(b)),
        Slip::Put(at, put) => words[word(at)] = (*put).to_owned(),
        Slip::Bytes(..) => {}
    }
    words.concat().into_bytes()
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 1500, failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn no_slip_makes_the_compiler_stumble(which in any::<u8>(), slips in proptest::collection::vec(slip(), 1..4)) {
        let demos = demos();
        let sound = demos[usize::from(which) % demos.len()].clone().into_bytes();
        let bytes = slips.iter().fold(sound, damaged);
        let source = SourceFile::from_bytes("damaged.rim", bytes);
        let checked = pipeline::check(&source);
        prop_assert_eq!(checked.model.is_none(), checked.diagnostics.has_errors());
        for one in &checked.diagnostics {
            prop_assert!(!one.message.is_empty() && !one.labels.is_empty());
            for label in &one.labels {
                prop_assert!(source.text().get(label.span.start as usize..label.span.end as usize).is_some(), "{}", one.message);
            }
        }
        prop_assert_eq!(render(&checked.diagnostics, &source, Colour::Plain).is_empty(), checked.diagnostics.is_empty());
    }
}
