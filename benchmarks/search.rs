//! Where the time of a search goes: exact boundaries against the evaluator that
//! follows the definition, by bisection, on the same templates and traces.
//!
//! Run by hand: `cargo bench --bench search`. It asserts that both give the
//! same heights, and prints ratios measured side by side in one run.
#![allow(
    clippy::print_stdout,
    clippy::unwrap_used,
    reason = "a program whose purpose is to print what it measured"
)]

use std::time::{Duration, Instant};

use strandline::embedding::{embed, resolve};
use strandline::kernels::naive;
use strandline::support::{Stream, TraceId};
use strandline::template::{Signal, parse};
use strandline::traces::{Channel, Grid, TraceSet};

const TRACES: usize = 40;
const SAMPLES: usize = 300;

/// Random walks and a flag that comes on now and then.
fn traces() -> TraceSet {
    let mut stream = Stream::new(1, "bench", 0);
    let mut level = 0.0;
    let walk = (0..TRACES * SAMPLES)
        .map(|_| {
            level = 0.95 * level + stream.normal();
            (level * 100.0_f64).round() / 100.0
        })
        .collect();
    let flag = (0..TRACES * SAMPLES)
        .map(|_| f64::from(u8::from(stream.below(20) == 0)))
        .collect();
    let channel = |signal, samples| Channel {
        signal,
        unit: None,
        samples,
    };
    let channels = vec![
        channel(Signal::channel("x"), walk),
        channel(Signal::flag("e"), flag),
    ];
    let names = (0..TRACES).map(|n| format!("t{n}")).collect();
    TraceSet::new(names, &[SAMPLES; TRACES], None, Grid::samples(), channels)
}

/// The height of a template without axes on one trace, by bisection over the
/// values that occur.
fn bisected(text: &str, traces: &mut TraceSet, trace: usize, values: &[f64]) -> f64 {
    let holds = |value: f64, traces: &mut TraceSet| {
        let formula = parse(&text.replace('?', &value.to_string())).unwrap();
        let resolved = resolve(&formula, traces).unwrap();
        naive::satisfied(&resolved, traces.record(TraceId::at(trace)))
    };
    let (mut low, mut high) = (0, values.len() - 1);
    while low < high {
        let middle = usize::midpoint(low, high);
        if holds(values[middle], traces) {
            high = middle;
        } else {
            low = middle + 1;
        }
    }
    values[high]
}

fn main() {
    let mut set = traces();
    for text in [
        "throughout [0, end] (x <= ?)",
        "sometime [0, 100] (throughout [0, 20] (x <= ?))",
        "throughout [0, end] (e implies sometime [0, 10] (x <= ?))",
    ] {
        let formula = parse(text).unwrap();
        resolve(&formula, &mut set).unwrap();
        let mut fast = Duration::MAX;
        let mut heights = Vec::new();
        for _ in 0..20 {
            let start = Instant::now();
            heights = embed(&formula, &set).unwrap().columns.remove(0);
            fast = fast.min(start.elapsed());
        }
        let mut values: Vec<f64> = set.channels()[0].samples.clone();
        values.sort_by(f64::total_cmp);
        values.dedup();
        let start = Instant::now();
        for (trace, height) in heights.iter().enumerate() {
            let expected = bisected(text, &mut set, trace, &values);
            assert!(
                height.total_cmp(&expected).is_eq(),
                "{text}: {height} and {expected}"
            );
        }
        let ratio = start.elapsed().as_secs_f64() / fast.as_secs_f64();
        println!("{text}: definition by bisection / exact boundary = {ratio:.0}");
    }
}
