//! Equivalence: every rule against families worked out by brute force, whole
//! partitions of small grammars, and pairs that must not be taken for the same.

use std::collections::{BTreeMap, BTreeSet};
use std::ops::ControlFlow;

use strandline::equivalence::brute::{ShortTrace, family, short_traces};
use strandline::equivalence::{Outcome, RULES, Seen};
use strandline::grammar::{Canonical, Enumerator, Grammar, Identity, Palette};
use strandline::template::{Formula, Signal, parse};

/// Slot combinations up to which a family is worked out.
const MOST: usize = 400;

fn traces() -> Vec<ShortTrace> {
    let signals = [
        Signal::channel("x"),
        Signal::channel("y"),
        Signal::flag("e"),
        Signal::flag("d"),
    ];
    short_traces(&signals, 60, 7, 1)
}

/// Instances of each rule: its name, and two texts that it makes the same.
const INSTANCES: &[(&str, &str, &str)] = &[
    ("order", "e and x <= ?", "x <= ? and e"),
    ("order", "(e or d) or x <= ?", "d or (x <= ? or e)"),
    ("repeat", "x <= ? and x <= ?", "x <= ?"),
    ("repeat", "x <= ? or x <= ?", "x <= ?"),
    (
        "repeat",
        "throughout [0, ?] e and throughout [0, ?] e",
        "throughout [0, ?] e",
    ),
    (
        "repeat",
        "(x <= ? and y <= ?) and (x <= ? and y <= ?)",
        "x <= ? and y <= ?",
    ),
    ("absorb", "e and (e or x <= ?)", "e"),
    ("absorb", "e or (e and x <= ?)", "e"),
    (
        "swap",
        "x <= ? and (x <= ? or e)",
        "x <= ? or (x <= ? and e)",
    ),
    (
        "nest",
        "throughout [1 step, 2 step] throughout [0, 3 step] e",
        "throughout [1 step, 5 step] e",
    ),
    (
        "nest",
        "sometime [2 step, end] sometime [1 step, 3 step] e",
        "sometime [3 step, end] e",
    ),
    (
        "nest",
        "throughout [0, end] throughout [0, end] (x <= ?)",
        "throughout [0, end] (x <= ?)",
    ),
    (
        "nest-slots",
        "throughout [?, end] throughout [?, end] e",
        "throughout [?, end] e",
    ),
    (
        "nest-slots",
        "throughout [0, end] throughout [0, ?] e",
        "throughout [0, end] e",
    ),
    (
        "nest-slots",
        "sometime [0, end] sometime [?, end] e",
        "sometime [?, end] e",
    ),
    (
        "nest-slots",
        "sometime [?, end] sometime [0, 2 step] e",
        "sometime [?, end] e",
    ),
    (
        "nest-slots",
        "throughout [0, ?] throughout [0, ?] (x <= ?)",
        "throughout [0, ?] (x <= ?)",
    ),
    (
        "nest-slots",
        "throughout [0, end] (sometime [0, ?] sometime [0, ?] e)",
        "throughout [0, end] (sometime [0, ?] e)",
    ),
    (
        "strip",
        "throughout [0, end] (e and throughout [0, ?] d)",
        "throughout [0, end] (e and d)",
    ),
    (
        "strip",
        "sometime [?, end] (e or sometime [0, 2 step] (x <= ?))",
        "sometime [?, end] (e or x <= ?)",
    ),
    (
        "spread",
        "throughout [0, 2 step] e and throughout [0, 2 step] (x <= ?)",
        "throughout [0, 2 step] (e and x <= ?)",
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
    (
        "inner",
        "sometime [0, end] (e and sometime [0, ?] e)",
        "sometime [0, end] e",
    ),
    ("now", "throughout [0, 0] e", "e"),
    (
        "now",
        "sometime [0, 0] (sometime [0, 2 step] e)",
        "sometime [0, 2 step] e",
    ),
    (
        "until-now",
        "e until [0, 0] (sometime [0, 2 step] d)",
        "sometime [0, 2 step] d",
    ),
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
    ("levels", "x <= 1 and x <= 2", "x <= 1"),
    ("levels", "x > 1 or x > 2", "x > 1"),
];

#[test]
fn every_rule_passes_the_brute_force() {
    let traces = traces();
    let mut used = BTreeSet::new();
    for (rule, left, right) in INSTANCES {
        let (a, b) = (parse(left).unwrap(), parse(right).unwrap());
        let families = (family(&a, &traces, 4000), family(&b, &traces, 4000));
        assert!(
            families.0.is_some() && families.0 == families.1,
            "{rule}: {left} / {right}"
        );
        let mut seen = Seen::new();
        let (form, applied) = seen.canonical(&a);
        assert_eq!(form, seen.canonical(&b).0, "{rule}: {left} / {right}");
        let applied_or_other = applied.contains(rule) || seen.canonical(&b).1.contains(rule);
        assert!(applied_or_other, "{rule}: {left} used {applied:?}");
        used.insert(*rule);
    }
    let all: BTreeSet<&str> = RULES.iter().map(|rule| rule.name).collect();
    assert_eq!(used, all);
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
        "throughout [0, ?] e or throughout [0, 5 step] e",
        "throughout [0, ?] e",
    ),
    (
        "sometime [0, ?] (throughout [0, end] e)",
        "throughout [?, end] e",
    ),
    (
        "throughout [0, 1 step] (sometime [0, 2 step] e)",
        "sometime [0, 2 step] (throughout [0, 1 step] e)",
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
        "throughout [0, end] (e or sometime [0, end] d)",
        "throughout [0, end] e or throughout [0, end] (sometime [0, end] d)",
    ),
    (
        "throughout [0, end] (sometime [0, 2 step] e)",
        "throughout [0, end] (sometime [0, end] e)",
    ),
    ("e", "not e"),
];

#[test]
fn look_alikes_stay_apart() {
    let traces = traces();
    for (left, right) in DIFFERENT {
        let (a, b) = (parse(left).unwrap(), parse(right).unwrap());
        assert_ne!(
            family(&a, &traces, 4000),
            family(&b, &traces, 4000),
            "{left} / {right}"
        );
        let mut seen = Seen::new();
        assert_ne!(
            seen.canonical(&a).0,
            seen.canonical(&b).0,
            "{left} / {right}"
        );
    }
}

/// A template and its negation count once; slots in other places do not make a
/// new template.
#[test]
fn a_negation_counts_once() {
    let mut seen = Seen::new();
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
}

/// Without `end` under a bounded window, with until.
fn mid() -> Grammar {
    Grammar::read(
        "mid",
        "limit size 5\nlimit slots 4\ngoal = f\n\
         f = \"x\" <= ? | \"y\" >= ? | \"e\" | not \"e\" | throughout [0, end] f | sometime [0, end] f\n  \
         | throughout [0, ?] f | sometime [0, ?] f | f and f | f or f | f until [0, end] f\n",
    )
    .unwrap()
}

/// No two templates of one class have different families: on all templates of
/// a grammar up to size 4 whose families are small enough.
#[test]
fn nothing_is_merged_that_differs() {
    let traces = traces();
    let mut seen = Seen::new();
    let mut enumerator = Enumerator::new(&mid(), &Palette::of(0, 0)).unwrap();
    let mut by_form: BTreeMap<Formula, (Formula, BTreeSet<Vec<u8>>)> = BTreeMap::new();
    let (mut listed, mut compared) = (0, 0);
    for size in 1..=4 {
        let _ = enumerator.for_each(size, &mut Identity, |_, formula| {
            listed += 1;
            let (form, _) = seen.canonical(&formula);
            if let Some(own) = family(&formula, &traces, MOST) {
                let (first, known) = by_form
                    .entry(form)
                    .or_insert_with(|| (formula.clone(), own.clone()));
                compared += 1;
                assert!(*known == own, "{first} and {formula}");
            }
            ControlFlow::Continue(())
        });
    }
    assert!(listed > 760 && compared > 650, "{listed} {compared}");
}

/// Uses canonical parts, as a search does.
struct Parts(Seen);

impl Canonical for Parts {
    fn part(&mut self, rule: usize, formula: &Formula) -> Option<Formula> {
        self.0.part(0, rule, formula)
    }
}

/// Of the templates that a search would keep, few have the family of another
/// one: the share of duplicates that no rule found, up to size 4.
#[test]
fn few_duplicates_are_missed() {
    let traces = traces();
    let mut parts = Parts(Seen::new());
    let mut enumerator = Enumerator::new(&mid(), &Palette::of(0, 0)).unwrap();
    let (mut kept, mut families) = (0, BTreeSet::new());
    for size in 1..=4 {
        let mut forms = BTreeSet::new();
        let _ = enumerator.for_each(size, &mut parts, |parts, formula| {
            forms.insert(parts.0.canonical(&formula).0);
            ControlFlow::Continue(())
        });
        for form in forms.iter().filter(|form| form.size() == size) {
            if let Some(family) = family(form, &traces, MOST) {
                kept += 1;
                families.insert(family);
            }
        }
        parts.0.finish_layer();
    }
    let missed = 1.0 - families.len() as f64 / f64::from(kept);
    assert!(
        kept > 450 && missed < 0.16,
        "{kept} kept, {} families",
        families.len()
    );
}
