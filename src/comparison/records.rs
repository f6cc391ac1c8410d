//! Short records to try two templates on.

use std::collections::BTreeSet;

use crate::equivalence::brute::{Column, LENGTH, ShortTraces};
use crate::support::{Stream, TraceId};
use crate::template::{Atom, Bound, Duration, Formula, Kind, Node, Signal, Threshold, TimeUnit};
use crate::traces::{Channel, Grid, TraceSet};

/// Steps of a grid on which two templates may differ: their durations, and
/// halves and thirds of them. `None` where all durations are in steps.
pub(super) fn step_choices(formulas: [&Formula; 2]) -> Vec<Option<f64>> {
    let mut seconds = BTreeSet::new();
    let mut note = |duration: Duration| {
        if let Some(unit) = duration.unit.seconds()
            && !duration.is_zero()
        {
            // As bits: positive numbers keep their order.
            seconds.insert((duration.value.value() * unit).to_bits());
        }
    };
    for formula in formulas {
        durations(formula, &mut note);
    }
    if seconds.is_empty() {
        return vec![None];
    }
    let whole: Vec<f64> = seconds.into_iter().map(f64::from_bits).collect();
    let parts = [1.0, 2.0, 3.0];
    let choices = parts
        .iter()
        .flat_map(|part| whole.iter().map(move |seconds| Some(seconds / part)));
    choices.take(9).collect()
}

fn durations(formula: &Formula, note: &mut impl FnMut(Duration)) {
    let window = match formula.node() {
        Node::Throughout(window, _) | Node::Sometime(window, _) => Some(window),
        Node::Until(window, ..) => Some(window),
        _ => None,
    };
    for bound in window.iter().flat_map(|w| [w.lower(), w.upper()]) {
        if let Bound::After(duration) = bound {
            note(duration);
        }
    }
    for signal in formula.signals() {
        signal_durations(&signal, note);
    }
    for operand in formula.operands() {
        durations(operand, note);
    }
}

fn signal_durations(signal: &Signal, note: &mut impl FnMut(Duration)) {
    if let Signal::Derived(derivation) = signal {
        if let Some(duration) = derivation.duration {
            note(duration);
        }
        for argument in &derivation.arguments {
            signal_durations(argument, note);
        }
    }
}

/// The recorded channels and flags that some formulas read.
fn recorded(signals: &[Signal], found: &mut Vec<Signal>) {
    for signal in signals {
        match signal {
            Signal::Recorded { .. } if !found.contains(signal) => found.push(signal.clone()),
            Signal::Recorded { .. } => {}
            Signal::Derived(derivation) => recorded(&derivation.arguments, found),
        }
    }
}

/// Values for channels: 0 to 3, and the numbers that the formulas compare
/// with, one less and one more.
fn values(formulas: [&Formula; 2]) -> Vec<f64> {
    let mut values = vec![0.0, 1.0, 2.0, 3.0];
    for formula in formulas {
        formula.for_each_atom(&mut |atom| {
            if let Atom::Compare {
                threshold: Threshold::Number(number, _),
                ..
            } = atom
            {
                let number = number.value();
                values.extend([number - 1.0, number, number + 1.0]);
            }
        });
    }
    values.sort_unstable_by(f64::total_cmp);
    values.dedup();
    values
}

/// Random records for two formulas, with the signals that they read; `None`
/// when a signal cannot be derived.
pub(super) fn records(
    formulas: [&Formula; 2],
    step: Option<f64>,
    count: usize,
    seed: u64,
) -> Option<(ShortTraces, TraceSet)> {
    let mut read: Vec<Signal> = Vec::new();
    for formula in formulas {
        for signal in formula.signals() {
            if !read.contains(&signal) {
                read.push(signal);
            }
        }
    }
    let mut bases = Vec::new();
    recorded(&read, &mut bases);
    let pool = values(formulas);
    let channels = bases.iter().enumerate().map(|(place, signal)| Channel {
        signal: signal.clone(),
        unit: None,
        samples: samples(signal, &pool, count, seed, place),
    });
    let names = (1..=count).map(|number| format!("r{number}")).collect();
    let grid = match step {
        Some(step) => Grid {
            step,
            unit: TimeUnit::Second,
        },
        None => Grid::samples(),
    };
    let mut traces = TraceSet::new(names, &vec![LENGTH; count], None, grid, channels.collect());
    let mut columns = Vec::new();
    for signal in read {
        let id = traces.derive(&signal).ok()?;
        let rows = traces.traces().map(|trace| {
            let samples = traces.samples(id, trace);
            std::array::from_fn(|at| (!samples[at].is_nan()).then_some(samples[at]))
        });
        let samples = rows.collect();
        columns.push(Column { signal, samples });
    }
    Some((ShortTraces::of(columns, step), traces))
}

fn samples(signal: &Signal, pool: &[f64], count: usize, seed: u64, place: usize) -> Vec<f64> {
    let mut all = Vec::with_capacity(count * LENGTH);
    for number in 0..count {
        let mut stream = Stream::new(seed, "records", (number * 64 + place) as u64);
        let hold = [1, 1, 2, 5][stream.below(4)];
        let draw = |stream: &mut Stream| match signal.kind() {
            Kind::Flag => stream.below(2) as f64,
            Kind::Numeric => pool[stream.below(pool.len())],
        };
        let mut last = draw(&mut stream);
        for _ in 0..LENGTH {
            if stream.below(hold) == 0 {
                last = draw(&mut stream);
            }
            all.push(last);
        }
    }
    all
}

/// The samples of the recorded channels on the end of a record that starts at
/// an instant, by name.
pub(super) fn recorded_samples(
    traces: &TraceSet,
    trace: usize,
    start: usize,
) -> Vec<(String, Vec<f64>)> {
    traces
        .recorded()
        .iter()
        .map(|channel| {
            let id = traces.signal_id(&channel.signal);
            let samples = id.map_or(&[][..], |id| traces.samples(id, TraceId::at(trace)));
            (channel.signal.to_string(), samples[start..].to_vec())
        })
        .collect()
}
