//! The meaning: every slot is monotone, and negation turns every verdict, on
//! random formulas and traces with unknown samples and unequal lengths.

use strandline::embedding::resolve;
use strandline::kernels::{Level, Plan, Resolved, Role, Worker, naive};
use strandline::support::{Finite, Stream, TraceId};
use strandline::template::{
    Bound, Direction, Duration, Formula, Node, Signal, SlotKind, SlotValue, TimeUnit,
};
use strandline::traces::{Channel, Grid, TraceSet};

use crate::support::{Shapes, random_formula};

fn random_trace(stream: &mut Stream) -> TraceSet {
    let length = 1 + stream.below(9);
    let mut samples = |values: usize| -> Vec<f64> {
        let mut sample = || match stream.below(8) {
            0 => f64::NAN,
            _ => stream.below(values) as f64,
        };
        (0..length).map(|_| sample()).collect()
    };
    let mut channel = |signal: Signal, values: usize| Channel {
        signal,
        unit: Some("mm/s".into()),
        samples: samples(values),
    };
    let channels = vec![
        channel(Signal::channel("x"), 5),
        channel(Signal::channel("flow rate"), 5),
        channel(Signal::flag("e"), 2),
        channel(Signal::flag("end"), 2),
    ];
    let grid = Grid {
        step: 0.5,
        unit: TimeUnit::Second,
    };
    TraceSet::new(vec!["t".to_owned()], &[length], None, grid, channels)
}

/// Values for all slots, the slot `at` being given.
fn fill(formula: &Formula, stream: &mut Stream, at: usize, value: u32) -> Formula {
    let values: Vec<Option<SlotValue>> = formula
        .slots()
        .iter()
        .enumerate()
        .map(|(position, slot)| {
            let number = if position == at {
                value
            } else {
                7 + stream.below(4) as u32
            };
            Some(match slot.kind {
                SlotKind::Threshold(_) => {
                    SlotValue::Threshold(Finite::new(f64::from(number) - 6.5).unwrap())
                }
                SlotKind::Time => SlotValue::Time(Duration::steps(number)),
            })
        })
        .collect();
    formula.fill(&values)
}

fn verdict(formula: &Formula, traces: &mut TraceSet) -> Option<bool> {
    let resolved = resolve(formula, traces).ok()?;
    Some(naive::satisfied(&resolved, traces.record(TraceId(0))))
}

/// Whether all constant lower bounds are small enough that no filling makes an
/// empty window.
fn has_small_bounds(formula: &Formula) -> bool {
    let own = match formula.node() {
        Node::Throughout(window, _) | Node::Sometime(window, _) | Node::Until(window, _, _) => {
            match window.lower() {
                Bound::After(low) => low.value.value() <= 1.5,
                _ => true,
            }
        }
        _ => true,
    };
    own && formula.operands().into_iter().all(has_small_bounds)
}

#[test]
fn every_slot_is_monotone() {
    let shapes = Shapes::all();
    let (mut checks, mut changes) = (0, 0);
    for case in 0..6000 {
        let mut stream = Stream::new(21, "monotone", case);
        let formula = random_formula(&mut stream, &shapes, 4);
        if formula.slots().is_empty() || !has_small_bounds(&formula) {
            continue;
        }
        let at = stream.below(formula.slots().len());
        let mut traces = random_trace(&mut stream);
        let seed = stream.next_u64();
        let mut before: Option<bool> = None;
        for value in 3..14 {
            let filled = fill(&formula, &mut Stream::new(seed, "fill", 0), at, value);
            let Some(now) = verdict(&filled, &mut traces) else {
                break;
            };
            if let Some(before) = before {
                checks += 1;
                changes += i32::from(before != now);
                let allowed = match formula.slots()[at].direction {
                    Direction::LargerIsEasier => now || !before,
                    Direction::LargerIsHarder => before || !now,
                };
                assert!(allowed, "{formula}, slot {at} at {value}");
            }
            before = Some(now);
        }
    }
    assert!(checks > 20_000 && changes > 300, "{checks} {changes}");
}

#[test]
fn negation_turns_every_verdict() {
    let shapes = Shapes {
        until: false,
        ..Shapes::all()
    };
    let (mut checks, mut satisfied) = (0, 0);
    for case in 0..6000 {
        let mut stream = Stream::new(22, "duality", case);
        let formula = random_formula(&mut stream, &shapes, 4);
        // An atom under no temporal operator is read weak, and so is its
        // negation: where it is not known, both hold.
        let outermost_atom = matches!(formula.node(), Node::Atom(_));
        if !has_small_bounds(&formula) || outermost_atom || has_outermost_atom(&formula) {
            continue;
        }
        let mut traces = random_trace(&mut stream);
        let filled = fill(&formula, &mut stream, usize::MAX, 0);
        let negation = filled.negated().unwrap();
        if let (Some(own), Some(other)) = (
            verdict(&filled, &mut traces),
            verdict(&negation, &mut traces),
        ) {
            checks += 1;
            satisfied += i32::from(own);
            assert_ne!(own, other, "{filled}");
        }
    }
    assert!(
        checks > 2000 && satisfied > 500 && satisfied < checks - 500,
        "{checks} {satisfied}"
    );
}

fn has_outermost_atom(formula: &Formula) -> bool {
    match formula.node() {
        Node::Atom(_) => true,
        Node::And(parts) | Node::Or(parts) => parts.iter().any(has_outermost_atom),
        _ => false,
    }
}

/// Templates for a batch, with roles for their slots: the first is solved, the
/// others lie on grids.
fn batch(stream: &mut Stream, traces: &mut TraceSet) -> Vec<(Resolved, Vec<Role>)> {
    let shapes = Shapes::all();
    let mut batch = Vec::new();
    while batch.len() < 40 {
        let formula = random_formula(stream, &shapes, 4);
        let slots = formula.slots();
        if slots.is_empty() || slots.len() > 3 || !has_small_bounds(&formula) {
            continue;
        }
        let Ok(resolved) = resolve(&formula, traces) else {
            continue;
        };
        let height = stream.below(slots.len());
        let role = |(at, slot): (usize, &strandline::template::Slot)| match &slot.kind {
            _ if at == height => Role::Height,
            SlotKind::Threshold(_) => Role::Levels(vec![0.5, 1.0, 2.5, 3.0]),
            SlotKind::Time => Role::Steps([3, 4, 7, 12, 90].into_iter().collect()),
        };
        let roles = slots.iter().enumerate().map(role).collect();
        batch.push((resolved, roles));
    }
    batch
}

fn long_traces(stream: &mut Stream) -> TraceSet {
    let lengths: Vec<usize> = (0..4).map(|_| 1 + stream.below(150)).collect();
    let total: usize = lengths.iter().sum();
    let mut samples = |values: usize| -> Vec<f64> {
        let mut sample = || match stream.below(12) {
            0 => f64::NAN,
            _ => stream.below(values) as f64,
        };
        (0..total).map(|_| sample()).collect()
    };
    let signals = [
        (Signal::channel("x"), 5),
        (Signal::channel("flow rate"), 30),
        (Signal::flag("e"), 2),
        (Signal::flag("end"), 2),
    ];
    let channels = signals.map(|(signal, values)| Channel {
        signal,
        unit: Some("mm/s".into()),
        samples: samples(values),
    });
    let names = (0..4).map(|n| format!("t{n}")).collect();
    let grid = Grid {
        step: 0.5,
        unit: TimeUnit::Second,
    };
    TraceSet::new(names, &lengths, None, grid, channels.into())
}

/// A batch gives what its templates give one by one, in both codes and at all
/// levels that the machine has.
#[test]
fn batches_codes_and_levels_agree() {
    let mut compared = 0;
    for case in 0..25 {
        let mut stream = Stream::new(23, "batches", case);
        let mut traces = long_traces(&mut stream);
        let batch = batch(&mut stream, &mut traces);
        let plan_of = |members: &[(Resolved, Vec<Role>)]| {
            let mut plan = Plan::new();
            for (resolved, roles) in members {
                plan.add(resolved, roles, &traces);
            }
            plan
        };
        let whole = plan_of(&batch);
        for trace in traces.traces() {
            let record = traces.record(trace);
            let mut one_by_one = Vec::new();
            for member in &batch {
                let plan = plan_of(std::slice::from_ref(member));
                one_by_one.extend(Worker::<u32>::at(&plan, Level::Portable).demands(record));
            }
            for level in Level::ALL.into_iter().filter(|level| level.is_here()) {
                let narrow = Worker::<u16>::at(&whole, level).demands(record);
                assert_eq!(narrow, one_by_one, "{}", level.name());
                let wide = Worker::<u32>::at(&whole, level).demands(record);
                assert_eq!(wide, one_by_one, "{}", level.name());
                compared += narrow.len();
            }
        }
        let alone: usize = batch
            .iter()
            .map(|member| plan_of(std::slice::from_ref(member)).passes())
            .sum();
        assert!(whole.passes() < alone, "{} {alone}", whole.passes());
    }
    assert!(compared > 10_000, "{compared}");
}
