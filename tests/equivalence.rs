//! Equivalence: every rule against families worked out by brute force, whole
//! partitions of small grammars, and pairs that must not be taken for the same.

use std::collections::{BTreeMap, BTreeSet};
use std::ops::ControlFlow;

use strandline::comparison::compare;
use strandline::embedding::resolve_derived;
use strandline::equivalence::brute::{Column, LENGTH, ShortTraces, Thresholds};
use strandline::equivalence::{Known, Outcome, Place, RULES, Seen};
use strandline::grammar::{Enumerator, Grammar, Palette, count};
use strandline::kernels::naive;
use strandline::support::TraceId;
use strandline::template::{Formula, Signal, parse};
use strandline::traces::{Channel, Grid, TraceSet};

use crate::judged::{Parts, Sample, grammar, judge, sample_known, sample_traces, traces};

/// Every rule of the table on random formulas: a formula, its normal form and
/// all formulas of its class have one family; all templates of one root class
/// have one family outermost. No rule goes unused.
#[test]
fn every_rule_passes_the_brute_force() {
    let verdict = Sample.judge(6000, 1);
    assert_eq!(verdict.wrong, Vec::<String>::new());
    let all: BTreeSet<&str> = RULES.iter().map(|rule| rule.name).collect();
    let mut used: BTreeSet<&str> = verdict.used.keys().copied().collect();
    used.extend(INSTANCES.iter().map(|instance| instance.0));
    assert_eq!(
        used,
        all,
        "unused: {:?}",
        all.difference(&used).collect::<Vec<_>>()
    );
    assert!(verdict.compared > 3000, "{}", verdict.compared);
    let outermost = RULES.iter().filter(|rule| rule.place == Place::Outermost);
    assert!(outermost.count() > 5);
}

/// One plain instance of each kind of rule, by its name.
const INSTANCES: &[(&str, &str, &str)] = &[
    (
        "order",
        "e and throughout [0, 0] (x <= ? and d)",
        "d and (e and x <= ?)",
    ),
    (
        "fixed",
        "throughout [0, end] (e or throughout [0, end] sometime [0, end] d)",
        "throughout [0, end] e or throughout [0, end] sometime [0, end] d",
    ),
    (
        "fallen",
        "throughout [0, end] (sometime [1 step, end] d or throughout [0, 2 step] e)",
        "throughout [0, end] (sometime [1 step, end] d or e)",
    ),
    (
        "outermost-fixed",
        "throughout [0, 2 step] (e or throughout [0, end] sometime [0, end] d)",
        "throughout [0, 2 step] e or throughout [0, end] sometime [0, end] d",
    ),
    ("repeat", "x <= ? and x <= ?", "x <= ?"),
    (
        "repeat",
        "throughout [0, ?] e and throughout [0, ?] e",
        "throughout [0, ?] e",
    ),
    ("absorb", "e and (e or x <= ?)", "e"),
    ("absorb", "x <= 1 and x <= 2", "x <= 1"),
    (
        "modular",
        "x <= ? and (x <= ? or e)",
        "x <= ? or (x <= ? and e)",
    ),
    (
        "nest",
        "throughout [1 step, 2 step] throughout [0, 3 step] e",
        "throughout [1 step, 5 step] e",
    ),
    (
        "nest-slots",
        "throughout [0, end] throughout [0, ?] e",
        "throughout [0, end] e",
    ),
    (
        "nest-slots",
        "sometime [?, end] sometime [0, 2 step] e",
        "sometime [?, end] e",
    ),
    (
        "strip",
        "throughout [0, end] (e and throughout [0, ?] d)",
        "throughout [0, end] (e and d)",
    ),
    (
        "spread",
        "sometime [0, end] e or sometime [0, end] d",
        "sometime [0, end] (e or d)",
    ),
    (
        "inner",
        "throughout [0, end] (x <= ? or throughout [0, 2 step] (x <= ?))",
        "throughout [0, end] (x <= ?)",
    ),
    ("now", "throughout [0, 0] e", "e"),
    (
        "until-or",
        "(e or sometime [0, end] d) until [0, 2 step] (sometime [0, end] d)",
        "e until [0, 2 step] (sometime [0, end] d)",
    ),
    (
        "until-comes",
        "sometime [0, end] (e until [0, 2 step] (x <= ?))",
        "sometime [0, end] (x <= ?)",
    ),
    (
        "until-spread",
        "e until [0, end] d or e until [0, end] (x <= ?)",
        "e until [0, end] (d or x <= ?)",
    ),
    (
        "until-spread",
        "e until [0, 2 step] d and (x <= ?) until [0, 2 step] d",
        "(e and x <= ?) until [0, 2 step] d",
    ),
    (
        "until-nest",
        "(x <= ? until [0, 2 step] d) until [0, 2 step] d",
        "x <= ? until [0, 2 step] d",
    ),
    (
        "until-nest",
        "e until [0, end] (e until [0, 3 step] (x <= ?))",
        "e until [0, end] (x <= ?)",
    ),
    (
        "last-window",
        "throughout [0, end] sometime [0, end] throughout [0, end] e",
        "throughout [0, end] sometime [0, end] e",
    ),
];

#[test]
fn plain_instances_of_rules_are_found() {
    let traces = traces(120, 5);
    for (rule, left, right) in INSTANCES {
        let (a, b) = (parse(left).unwrap(), parse(right).unwrap());
        let is_outermost = rule.starts_with("outermost");
        let families = [&a, &b].map(|formula| match is_outermost {
            true => traces.root_family(formula, Thresholds::Beyond, 4000),
            false => traces.family(formula, Thresholds::Beyond, 4000),
        });
        assert!(
            families[0].is_some() && families[0] == families[1],
            "{left}"
        );
        let mut seen = Seen::new(Known::default());
        let mut rules: Vec<&str> = seen.root_steps(&a).1.iter().map(|step| step.0).collect();
        rules.extend(seen.root_steps(&b).1.iter().map(|step| step.0));
        assert!(rules.contains(rule), "{rule}: {left} used {rules:?}");
        assert_eq!(seen.root_number(&a), seen.root_number(&b), "{left}");
        let same_class = seen.class_number(&a) == seen.class_number(&b);
        assert!(same_class || is_outermost, "{left}");
        let answer = compare(&a, &b);
        assert_eq!(answer.same, Some(true), "{left}");
    }
}

/// Pairs that look alike and are not: a rule of thumb says they are the same,
/// and a short trace or a slot value tells them apart.
const DIFFERENT: &[(&str, &str)] = &[
    (
        "throughout [0, 0] (sometime [0, 2 step] e)",
        "sometime [0, 2 step] e",
    ),
    (
        "sometime [0, 0] (throughout [0, 2 step] e)",
        "throughout [0, 2 step] e",
    ),
    (
        "(x <= ? or y <= ?) and (x <= ? or y <= ?)",
        "x <= ? or y <= ?",
    ),
    (
        "(x <= ? and y >= ?) or (x <= ? and y >= ?)",
        "x <= ? and y >= ?",
    ),
    ("x <= ? and (x <= ? or e)", "x <= ?"),
    ("x <= 1 and x <= ?", "x <= ?"),
    (
        "throughout [0, ?] (e and d)",
        "throughout [0, ?] e and throughout [0, ?] d",
    ),
    (
        "sometime [0, ?] (e or d)",
        "sometime [0, ?] e or sometime [0, ?] d",
    ),
    (
        "throughout [?, end] (x <= ? and d)",
        "throughout [?, end] (x <= ?) and throughout [?, end] d",
    ),
    (
        "throughout [0, ?] e or throughout [0, 5 step] e",
        "throughout [0, ?] e",
    ),
    (
        "sometime [0, ?] (throughout [0, end] e)",
        "throughout [?, end] e",
    ),
    (
        "throughout [0, ?] (sometime [0, end] e)",
        "sometime [?, end] e",
    ),
    (
        "throughout [0, 1 step] (sometime [0, 2 step] e)",
        "sometime [0, 2 step] (throughout [0, 1 step] e)",
    ),
    (
        "throughout [1 step, 1 step] (sometime [0, 2 step] e)",
        "sometime [0, 2 step] (throughout [1 step, 1 step] e)",
    ),
    (
        "throughout [2 step, 2 step] e",
        "sometime [2 step, 2 step] e",
    ),
    (
        "throughout [0, 2 step] (sometime [0, 2 step] (throughout [0, 2 step] (sometime [0, 2 step] e)))",
        "throughout [0, 2 step] (sometime [0, 2 step] e)",
    ),
    ("e until [0, 2 step] d", "e until [0, 2 step] (e and d)"),
    (
        "(e or d) until [1 step, 3 step] d",
        "e until [1 step, 3 step] d",
    ),
    (
        "sometime [0, 2 step] (e until [0, 2 step] d)",
        "sometime [0, 2 step] d",
    ),
    (
        "x <= ? until [0, end] (e or d)",
        "x <= ? until [0, end] e or x <= ? until [0, end] d",
    ),
    (
        "(throughout [0, end] e) until [0, 2 step] d",
        "throughout [0, end] e and sometime [0, 2 step] d",
    ),
    (
        "throughout [0, end] (e or sometime [0, end] d)",
        "throughout [0, end] e or throughout [0, end] (sometime [0, end] d)",
    ),
    (
        "throughout [0, end] (sometime [0, 2 step] e)",
        "throughout [0, end] (sometime [0, end] e)",
    ),
    (
        "throughout [0, end] (sometime [0, end] (throughout [1 step, 3 step] e))",
        "sometime [0, end] (throughout [0, end] (throughout [1 step, 3 step] e))",
    ),
    (
        "throughout [0, 2 step] (e or throughout [0, end] d)",
        "throughout [0, 2 step] e or throughout [0, end] d",
    ),
    (
        "x <= ? or sometime [0, 5 step] (x <= ?)",
        "sometime [0, 5 step] (x <= ?)",
    ),
    (
        "throughout [0, 2 s] (throughout [0, 3 s] e)",
        "throughout [0, 5 s] e",
    ),
    ("rises(e)", "e"),
    ("e", "not e"),
];

#[test]
fn look_alikes_stay_apart() {
    for (left, right) in DIFFERENT {
        let (a, b) = (parse(left).unwrap(), parse(right).unwrap());
        let answer = compare(&a, &b);
        assert_eq!(answer.same, Some(false), "{left} / {right}");
        let witness = answer.witness.unwrap();
        assert!(!witness.records.is_empty(), "{left} / {right}");
    }
}

/// What a witness says is so: on its records the filled template has the
/// verdicts given, by the evaluator that follows the definition, and the other
/// one (here without slots) differs on one of them.
#[test]
fn witnesses_hold() {
    for (left, right) in DIFFERENT {
        let (a, b) = (parse(left).unwrap(), parse(right).unwrap());
        let witness = compare(&a, &b).witness.unwrap();
        let filled = parse(&witness.specification).unwrap();
        let other = if witness.template == 1 { &b } else { &a };
        let mut differs = 0;
        for record in &witness.records {
            let length = record.samples.values().next().unwrap().len();
            let channels = record.samples.iter().map(|(name, samples)| Channel {
                signal: match name.as_str() {
                    "x" | "y" => Signal::channel(name),
                    _ => Signal::flag(name),
                },
                unit: None,
                samples: samples.clone(),
            });
            let step: f64 = witness.step.split(' ').next().unwrap().parse().unwrap();
            let mut grid = Grid::samples();
            if witness.step.ends_with(" s") {
                grid.step = step;
                grid.unit = strandline::template::TimeUnit::Second;
            }
            let mut set = TraceSet::new(
                vec!["r".to_owned()],
                &[length],
                None,
                grid,
                channels.collect(),
            );
            let mut verdict = |formula: &Formula| {
                let resolved = strandline::embedding::resolve(formula, &mut set).unwrap();
                naive::satisfied(&resolved, set.record(TraceId::at(0)))
            };
            assert_eq!(verdict(&filled), record.satisfied, "{left} / {right}");
            if other.is_specification() {
                differs += usize::from(verdict(other) != record.satisfied);
            }
        }
        assert!(differs > 0 || !other.is_specification(), "{left} / {right}");
    }
}

/// A template and its negation count once; slots in other places do not make a
/// new template; constants are none.
#[test]
fn a_negation_counts_once() {
    let mut seen = Seen::new(Known::default());
    let mut outcome = |text: &str| seen.template(&parse(text).unwrap());
    assert!(matches!(
        outcome("throughout [0, end] (x <= ?)"),
        Outcome::New(_)
    ));
    assert_eq!(outcome("sometime [0, end] (x > ?)"), Outcome::Duplicate);
    assert_eq!(
        outcome("throughout [0, end] (throughout [0, ?] (x <= ?))"),
        Outcome::Duplicate
    );
    assert!(matches!(
        outcome("sometime [0, end] (x >= ?)"),
        Outcome::New(_)
    ));
    assert_eq!(
        outcome("sometime [0, end] throughout [0, end] sometime [0, 2 step] (x <= ?)"),
        Outcome::Constant
    );
    assert!(matches!(outcome("throughout [0, ?] e"), Outcome::New(_)));
    assert_eq!(outcome("sometime [0, ?] not e"), Outcome::Duplicate);
}

/// Where a signal has unknown samples, what needs them known is left alone.
#[test]
fn unknown_samples_stop_rules() {
    let gaps = Known {
        with_gaps: BTreeSet::from(["e".into()]),
    };
    for (left, right) in [
        ("e or not e", "d or not d"),
        (
            "sometime [0, end] e or sometime [0, end] not e",
            "d or not d",
        ),
        (
            "throughout [0, end] sometime [0, end] e",
            "sometime [0, end] throughout [0, end] e",
        ),
    ] {
        let (a, b) = (parse(left).unwrap(), parse(right).unwrap());
        let mut known = Seen::new(Known::default());
        assert_eq!(known.class_number(&a), known.class_number(&b), "{left}");
        let mut unknown = Seen::new(gaps.clone());
        assert_ne!(unknown.class_number(&a), unknown.class_number(&b), "{left}");
    }
    assert!(!Known::default().everywhere(parse("rises(e)").unwrap().signals().first().unwrap()));
}

/// The short-trace evaluator against the one that follows the definition, on
/// random formulas, at all starts, unknown samples included.
#[test]
fn the_judge_agrees_with_the_definition() {
    let sample = Sample;
    let short = sample_traces(24, 3);
    let mut compared = 0;
    for number in 0..400 {
        let formula = sample.formula(number, 9);
        if !formula.is_specification() {
            continue;
        }
        let verdicts = &short.members(&formula, Thresholds::Beyond, 10).unwrap()[0];
        for start in 0..LENGTH {
            let set = ends(&short, start);
            let resolved = resolve_derived(&formula, &set).unwrap();
            for trace in set.traces() {
                let expected = naive::satisfied(&resolved, set.record(trace));
                let own = verdicts.root[trace.index()] >> start & 1 == 1;
                assert_eq!(own, expected, "{formula} from {start}");
                compared += 1;
            }
        }
    }
    assert!(compared > 5000, "{compared}");
}

/// The ends of short traces from a start on, as a trace set.
fn ends(short: &ShortTraces, start: usize) -> TraceSet {
    let channel = |column: &Column| Channel {
        signal: column.signal.clone(),
        unit: None,
        samples: column
            .samples
            .iter()
            .flat_map(|samples| samples[start..].iter().map(|s| s.unwrap_or(f64::NAN)))
            .collect(),
    };
    let names = (0..short.len()).map(|n| format!("t{n}")).collect();
    let lengths = vec![LENGTH - start; short.len()];
    let channels = short.columns.iter().map(channel).collect();
    TraceSet::new(names, &lengths, None, Grid::samples(), channels)
}

/// Whole partitions against brute force, and the share of duplicates that no
/// rule found. The limits are those asked of the project; what is reached is
/// in DEVELOPERS.md.
#[test]
fn partitions_of_small_grammars_are_right() {
    for (name, anywhere, size, most) in [
        ("small", true, 5, 0.09),
        ("mid", false, 4, 0.03),
        ("mid", true, 4, 0.05),
        ("full", false, 3, 0.03),
    ] {
        let grammar = grammar(name, anywhere, size);
        let verdict = judge(&grammar, &traces(200, 1), Thresholds::InRange, 1000);
        assert_eq!(verdict.wrong, Vec::<String>::new(), "{name}");
        let missed = verdict.missed_share();
        assert!(missed <= most, "{name} {anywhere} {size}: {missed}");
        assert!(verdict.compared > 30, "{name}: {}", verdict.compared);
    }
}

/// With thresholds beyond the data, and on all records of up to four samples
/// of one channel and one flag.
#[test]
fn exhaustive_records_agree() {
    let all = ShortTraces::exhaustive(&[Signal::channel("x"), Signal::flag("e")], 3);
    assert_eq!(all.len(), 512);
    let grammar = grammar("small", true, 5);
    let verdict = judge(&grammar, &all, Thresholds::Beyond, 1000);
    assert_eq!(verdict.wrong, Vec::<String>::new());
    assert!(verdict.compared > 100, "{}", verdict.compared);
}

/// Raw counts by size, ordered operands, as the recurrence of the published
/// sequences gives them; the grammar's own counts take equal operands unordered
/// and are checked by listing.
#[test]
fn raw_counts_follow_the_recurrence() {
    // SMALL: 2 atoms, 4 unary, 2 binary; MID: 4, 4, 3; FULL: 6, 8, 4.
    for (name, atoms, unary, binary, expected) in [
        ("small", 2, 4, 2, [2, 8, 40, 224, 1344, 8448]),
        ("mid", 4, 4, 3, [4, 16, 112, 832, 6784, 57_856]),
        ("full", 6, 8, 4, [6, 48, 528, 6528, 86_784, 1_210_368]),
    ] {
        let mut ordered: Vec<u128> = vec![0, atoms];
        for size in 2..=6 {
            let pairs: u128 = (1..size - 1)
                .map(|left| ordered[left] * ordered[size - 1 - left])
                .sum();
            ordered.push(unary * ordered[size - 1] + binary * pairs);
        }
        assert_eq!(ordered[1..], expected, "{name}");
        let grammar = grammar(name, true, 4);
        let counted = count(&grammar, &Palette::of(0, 0), None).unwrap();
        let mut enumerator = Enumerator::new(&grammar, &Palette::of(0, 0)).unwrap();
        for size in 1..=4_u32 {
            let mut listed = 0_u128;
            let _ = enumerator.for_each(size, &mut strandline::grammar::Identity, |_, _| {
                listed += 1;
                ControlFlow::Continue(())
            });
            assert_eq!(listed, counted.of[size as usize], "{name} {size}");
        }
    }
}

/// The plain table that takes over when memory is short keeps nearly the same
/// templates apart, and never more than the e-graph; whatever the bound, the
/// listing goes on.
#[test]
fn short_memory_changes_little() {
    let grammar = grammar("mid", true, 5);
    let kept = |bytes: usize| {
        let mut parts = Parts(Seen::bounded(Known::default(), bytes));
        let mut enumerator = Enumerator::new(&grammar, &Palette::of(0, 0)).unwrap();
        let mut forms = Vec::new();
        for size in 1..=5 {
            let _ = enumerator.for_each(size, &mut parts, |parts, formula| {
                if let Outcome::New(form) = parts.0.template(&formula) {
                    forms.push(form);
                }
                ControlFlow::Continue(())
            });
            parts.0.finish_layer();
        }
        (forms, parts.0.is_frozen(), parts.0.bytes())
    };
    let (all, frozen, bytes) = kept(usize::MAX);
    assert!(!frozen);
    let (half, froze, fewer) = kept(bytes / 3);
    assert!(froze && fewer < bytes, "{fewer} {bytes}");
    let (none, _, _) = kept(0);
    for other in [&half, &none] {
        let gap = other.len().abs_diff(all.len());
        assert!(gap * 200 <= all.len(), "{} {}", other.len(), all.len());
    }
    assert_eq!(kept(bytes / 3).0, half);
}

/// The same listing twice keeps the same forms in the same order.
#[test]
fn deduplication_is_deterministic() {
    let mut forms: Vec<BTreeMap<usize, String>> = Vec::new();
    for _ in 0..2 {
        let grammar: Grammar = grammar("mid", true, 4);
        let mut parts = Parts(Seen::new(Known::default()));
        let mut enumerator = Enumerator::new(&grammar, &Palette::of(0, 0)).unwrap();
        let mut kept = BTreeMap::new();
        for size in 1..=4 {
            let _ = enumerator.for_each(size, &mut parts, |parts, formula| {
                if let Outcome::New(form) = parts.0.template(&formula) {
                    kept.insert(kept.len(), form.to_string());
                }
                ControlFlow::Continue(())
            });
            parts.0.finish_layer();
        }
        forms.push(kept);
    }
    assert_eq!(forms[0], forms[1]);
    assert!(!sample_known().with_gaps.is_empty());
}
