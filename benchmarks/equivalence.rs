//! How good and how fast the dropping of equivalent templates is.
//!
//! Run by hand: `cargo bench --bench equivalence -- judge full restricted 4`, and
//! `random`, `rate`, `benefit` likewise; without words a short round of all.
//! Records stand in `benchmarks/records.md`.
#![allow(
    clippy::print_stdout,
    clippy::unwrap_used,
    reason = "a program whose purpose is to print what it measured"
)]

#[path = "../tests/judged.rs"]
#[allow(dead_code, reason = "shared with the tests")]
mod judged;

use std::ops::ControlFlow;
use std::time::{Duration, Instant};

use strandline::equivalence::brute::Thresholds;
use strandline::equivalence::{Known, Outcome, Seen};
use strandline::grammar::{Enumerator, Palette, count};
use strandline::scoring::LabelledScore;
use strandline::search::{BatchRecord, Budget, Kept, Limits, Observer, Settings, harvest, palette};
use strandline::traces::{LoadOptions, load};

fn main() {
    let arguments: Vec<String> = std::env::args()
        .skip(1)
        .filter(|argument| argument != "--bench")
        .collect();
    let words: Vec<&str> = arguments.iter().map(String::as_str).collect();
    let number = |text: &str| text.parse::<u32>().unwrap();
    match words.as_slice() {
        ["judge", name, place, size, shown @ ..] => {
            let shown = shown.first().map_or(0, |text| number(text));
            judge(name, *place == "anywhere", number(size), shown as usize);
        }
        ["random", count, seed] => random(number(count), number(seed)),
        ["rate", name, place, size] => rate(name, *place == "anywhere", number(size)),
        ["benefit", path, size] => benefit(path, number(size)),
        // What `cargo bench` runs: every part, short.
        [] => {
            judge("mid", false, 4, 0);
            random(2000, 1);
            rate("full", true, 5);
        }
        _ => println!(
            "judge small|mid|full restricted|anywhere SIZE [SHOWN]\nrandom COUNT SEED\n\
             rate small|mid|full restricted|anywhere SIZE\nbenefit TRACES SIZE"
        ),
    }
}

/// Whole partitions against brute force; `shown` of the duplicates that no rule
/// found are listed.
fn judge(name: &str, anywhere: bool, size: u32, shown: usize) {
    let grammar = judged::grammar(name, anywhere, size);
    let traces = judged::traces(256, 1);
    let place = if anywhere { "anywhere" } else { "restricted" };
    for thresholds in [Thresholds::InRange, Thresholds::Beyond] {
        let verdict = judged::judge(&grammar, &traces, thresholds, 1500);
        println!(
            "{name} {place} {size} {thresholds:?}: candidates and classes {:?}; {} classes \
             checked, {} families, missed {:.2} %; outermost {:?}, missed {:.2} %; {} pairs \
             compared, {} wrong, {} skipped",
            verdict.layers,
            verdict.checked,
            verdict.families,
            100.0 * verdict.missed_share(),
            verdict.roots,
            100.0 * verdict.missed_root_share(),
            verdict.compared,
            verdict.wrong.len(),
            verdict.skipped
        );
        assert_eq!(verdict.wrong, Vec::<String>::new());
        for (a, b) in verdict.missed.iter().take(shown) {
            println!("  {a}   is   {b}");
        }
    }
}

/// Random formulas against their normal forms and classes.
fn random(count: u32, seed: u32) {
    let verdict = judged::Sample.judge(u64::from(count), u64::from(seed));
    println!(
        "{count} random formulas: {} pairs compared, {} wrong; rules applied {:?}",
        verdict.compared,
        verdict.wrong.len(),
        verdict.used
    );
    assert_eq!(verdict.wrong, Vec::<String>::new());
}

/// Resident memory of this process in bytes.
fn resident() -> usize {
    let text = std::fs::read_to_string("/proc/self/statm").unwrap_or_default();
    let pages: usize = text
        .split(' ')
        .nth(1)
        .and_then(|n| n.parse().ok())
        .unwrap_or(0);
    pages * 4096
}

/// The e-graph against plain hash-consing, layer by layer, on one core.
fn rate(name: &str, anywhere: bool, size: u32) {
    let grammar = judged::grammar(name, anywhere, size);
    for bytes in [usize::MAX, 0] {
        let mut parts = judged::Parts(Seen::bounded(Known::default(), bytes));
        let mut enumerator = Enumerator::new(&grammar, &Palette::of(0, 0)).unwrap();
        let start = resident();
        for size in 1..=size {
            let (mut candidates, mut new) = (0_usize, 0_usize);
            let mut inside = Duration::ZERO;
            let whole = Instant::now();
            let _ = enumerator.for_each(size, &mut parts, |parts, formula| {
                let begin = Instant::now();
                new += usize::from(matches!(parts.0.template(&formula), Outcome::New(_)));
                inside += begin.elapsed();
                candidates += 1;
                ControlFlow::Continue(())
            });
            let begin = Instant::now();
            parts.0.finish_layer();
            let rebuild = begin.elapsed();
            inside += rebuild;
            println!(
                "{} size {size}: {candidates} candidates, {new} new, {:.0} thousand/s ({:.0} with listing), rebuild {:.2} s, nodes and classes {:?}, resident {:.0} MB, told {:.0} MB",
                if bytes == 0 { "plain" } else { "e-graph" },
                candidates as f64 / inside.as_secs_f64() / 1e3,
                candidates as f64 / whole.elapsed().as_secs_f64() / 1e3,
                rebuild.as_secs_f64(),
                parts.0.size(),
                (resident() - start) as f64 / 1e6,
                parts.0.bytes() as f64 / 1e6,
            );
        }
    }
}

/// What dropping equivalent templates saves on a data set: the shipped grammars
/// up to a size.
fn benefit(path: &str, size: u32) {
    struct Silent;
    impl Observer for Silent {
        fn batch(&mut self, _: &BatchRecord, _: &[Kept]) -> Result<(), String> {
            Ok(())
        }
        fn wants_to_stop(&self) -> bool {
            false
        }
        fn known_score(&self, _: &str) -> Option<LabelledScore> {
            None
        }
    }
    let mut traces = load(path.as_ref(), &LoadOptions::default()).unwrap().traces;
    let settings = Settings {
        grammars: Vec::new(),
        use_labels: true,
        hold_out: 0.0,
        seed: 1,
    };
    let grammars = settings.open_grammars().unwrap();
    let palette = palette(&traces);
    let raw: u128 = grammars
        .iter()
        .map(|grammar| count(grammar, &palette, Some(size)).unwrap().total())
        .sum();
    let begin = Instant::now();
    let mut seen = Seen::new(Known::default());
    for (scope, grammar) in grammars.iter().enumerate() {
        let mut parts = judged::Scoped(&mut seen, scope as u64);
        let mut enumerator = Enumerator::new(grammar, &palette).unwrap();
        for size in 1..=size {
            let _ = enumerator.for_each(size, &mut parts, |parts, formula| {
                parts.0.template(&formula);
                ControlFlow::Continue(())
            });
            parts.0.finish_layer();
        }
    }
    let comparing = begin.elapsed().as_secs_f64();
    let limits = Limits {
        templates: usize::MAX,
        size: Some(size),
        ..Limits::default()
    };
    let begin = Instant::now();
    let harvest = harvest(
        &mut traces,
        &grammars,
        &settings,
        &Budget::start(limits),
        &mut Silent,
    )
    .unwrap();
    let whole = begin.elapsed().as_secs_f64();
    let counts = harvest.counts;
    let each = (whole - comparing) / counts.distinct as f64;
    println!(
        "{path} up to size {size}: {raw} templates by the recurrence, {} candidates, {} distinct, {} constant and {} the same on this data, {} scored; comparing took {comparing:.2} s, all {whole:.1} s; without comparing about {:.1} s",
        counts.listed,
        counts.distinct,
        counts.constant,
        counts.folded,
        counts.scored,
        each * raw as f64
    );
}
