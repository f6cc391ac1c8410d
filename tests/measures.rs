//! Boundaries: against the definition, and against values from outside.

use strandline::embedding::{embed, resolve};
use strandline::kernels::naive;
use strandline::support::Stream;
use strandline::template::{Formula, Signal, SlotKind, TimeUnit};
use strandline::traces::{Channel, Grid, TraceSet};

use crate::support::{Shapes, random_formula};

/// Random traces of unequal lengths over two channels and two flags, on a grid
/// of half seconds, with few different values and some samples unknown.
fn random_traces(stream: &mut Stream, count: usize, longest: usize) -> TraceSet {
    let lengths: Vec<usize> = (0..count).map(|_| 1 + stream.below(longest)).collect();
    let total = lengths.iter().sum();
    let mut samples = |values: usize, unknown: usize| -> Vec<f64> {
        (0..total)
            .map(|_| match stream.below(100) < unknown {
                true => f64::NAN,
                false => stream.below(values) as f64,
            })
            .collect()
    };
    let channel = |signal: Signal, samples: Vec<f64>| Channel {
        signal,
        unit: Some("mm/s".into()),
        samples,
    };
    let channels = vec![
        channel(Signal::channel("x"), samples(5, 5)),
        channel(Signal::channel("flow rate"), samples(40, 0)),
        channel(Signal::flag("e"), samples(2, 5)),
        channel(Signal::flag("end"), samples(2, 0)),
    ];
    let names = (0..count).map(|n| format!("t{n}")).collect();
    let grid = Grid {
        step: 0.5,
        unit: TimeUnit::Second,
    };
    TraceSet::new(names, &lengths, None, grid, channels)
}

/// At each height the specification is satisfied, and just beyond it is not;
/// `never` and `always` mean what they say. On random templates of all
/// operators and signals.
#[test]
fn heights_are_the_tightest_values_satisfied() {
    let shapes = Shapes::all();
    let (mut checked, mut finite) = (0, 0);
    for case in 0..8000 {
        let mut stream = Stream::new(11, "measures", case);
        let formula = random_formula(&mut stream, &shapes, 3);
        let slots = formula.slots().len();
        if slots == 0 || slots > 2 {
            continue;
        }
        let mut traces = random_traces(&mut stream, 3, 14);
        if resolve(&formula, &mut traces).is_err() {
            continue;
        }
        let embedding = embed(&formula, &traces).unwrap();
        if embedding.columns.is_empty() {
            continue; // a signal without any known sample
        }
        let column = stream.below(embedding.columns.len());
        for (trace, height) in embedding.columns[column].clone().into_iter().enumerate() {
            checked += 1;
            finite += usize::from(height.is_finite());
            check_height(&embedding, column, trace, height, &mut traces);
        }
    }
    assert!(checked > 2000 && finite > 800, "{checked} {finite}");
}

fn check_height(
    embedding: &strandline::embedding::Embedding,
    column: usize,
    trace: usize,
    height: f64,
    traces: &mut TraceSet,
) {
    use strandline::support::TraceId;
    let grid = traces.grid().clone();
    let strict = is_strict(&embedding.formula, embedding.height.index());
    let mut verdict = |value: f64| {
        let specification = embedding.specification(column, value, &grid);
        let resolved = resolve(&specification, traces).unwrap();
        naive::satisfied(&resolved, traces.record(TraceId::at(trace)))
    };
    let slot = embedding.formula.slot(embedding.height).clone();
    let easier = match slot.direction {
        strandline::template::Direction::LargerIsEasier => 1.0,
        strandline::template::Direction::LargerIsHarder => -1.0,
    };
    let what = format!(
        "{} column {column} trace {trace}: {height}",
        embedding.formula
    );
    let (tight, beyond) = match slot.kind {
        // Derived values may be fractions; half of the smallest step between
        // two of them is far above 1e-9.
        SlotKind::Threshold(_) if strict => (height + easier * 1e-9, height),
        SlotKind::Threshold(_) => (height, height - easier * 1e-9),
        SlotKind::Time => (height, height - easier),
    };
    if height.is_finite() {
        assert!(verdict(tight), "not satisfied at its height: {what}");
        if beyond >= lower_bound(embedding) || matches!(slot.kind, SlotKind::Threshold(_)) {
            assert!(!verdict(beyond), "satisfied beyond its height: {what}");
        }
        return;
    }
    let expected = height == embedding.always();
    let values: Vec<f64> = match slot.kind {
        SlotKind::Threshold(_) => vec![-1e6, -3.0, 0.0, 2.0, 17.0, 1e6],
        SlotKind::Time => (lower_bound(embedding) as u32..15).map(f64::from).collect(),
    };
    for value in values {
        let within = value <= traces_length(traces, trace);
        if matches!(slot.kind, SlotKind::Threshold(_)) || within {
            let specification = embedding.specification(column, value, &grid);
            let resolved = resolve(&specification, traces).unwrap();
            let got = naive::satisfied(&resolved, traces.record(TraceId::at(trace)));
            assert_eq!(got, expected, "at {value}: {what}");
        }
    }
}

fn traces_length(traces: &TraceSet, trace: usize) -> f64 {
    traces.length(strandline::support::TraceId::at(trace)) as f64 - 1.0
}

/// The constant lower bound, in steps, of the window whose upper bound is the
/// height: smaller values make no window.
fn lower_bound(embedding: &strandline::embedding::Embedding) -> f64 {
    fn find(formula: &Formula, next: &mut usize, wanted: usize) -> Option<f64> {
        use strandline::template::{Bound, Node, Window};
        let window = |window: &Window, next: &mut usize| {
            let mut found = None;
            for bound in [window.lower(), window.upper()] {
                if bound == Bound::Slot {
                    if *next == wanted {
                        found = Some(match window.lower() {
                            Bound::After(low) => (low.value.value() / 0.5).ceil(),
                            _ => 0.0,
                        });
                    }
                    *next += 1;
                }
            }
            found
        };
        match formula.node() {
            Node::Atom(_) => {
                *next += formula.slots().len();
                None
            }
            Node::And(operands) | Node::Or(operands) => operands
                .iter()
                .find_map(|operand| find(operand, next, wanted)),
            Node::Throughout(w, operand) | Node::Sometime(w, operand) => {
                window(w, next).or_else(|| find(operand, next, wanted))
            }
            Node::Until(w, left, right) => find(left, next, wanted)
                .or_else(|| window(w, next))
                .or_else(|| find(right, next, wanted)),
        }
    }
    find(&embedding.formula, &mut 0, embedding.height.index()).unwrap_or(0.0)
}

/// Whether the atom of a threshold slot is strict.
fn is_strict(formula: &Formula, slot: usize) -> bool {
    use strandline::template::{Atom, Comparison, Node, Threshold};
    fn walk(formula: &Formula, next: &mut usize, slot: usize) -> bool {
        if let Node::Atom(Atom::Compare {
            comparison,
            threshold: Threshold::Slot,
            ..
        }) = formula.node()
        {
            *next += 1;
            return *next == slot + 1
                && matches!(comparison, Comparison::Below | Comparison::Above);
        }
        if let Node::Until(window, left, right) = formula.node() {
            let strict = walk(left, next, slot);
            *next += Formula::sometime(*window, Formula::flag(Signal::flag("e"), false))
                .slots()
                .len();
            return strict | walk(right, next, slot);
        }
        let own = formula.slots().len()
            - formula
                .operands()
                .iter()
                .map(|operand| operand.slots().len())
                .sum::<usize>();
        *next += own;
        let mut strict = false;
        for operand in formula.operands() {
            strict |= walk(operand, next, slot);
        }
        strict
    }
    walk(formula, &mut 0, slot)
}
