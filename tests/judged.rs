//! Small grammars whose every template can be judged by brute force. Used by
//! the tests and by `benchmarks/equivalence.rs`.

use std::collections::{BTreeMap, BTreeSet, HashMap};
use std::ops::ControlFlow;

use strandline::equivalence::brute::{ShortTraces, Thresholds, Verdicts};
use strandline::equivalence::{Flags, Known, Seen};
use strandline::grammar::{Canonical, Enumerator, Grammar, Palette};
use strandline::support::Stream;
use strandline::template::{Formula, Signal, parse};

/// The traces of the judged grammars.
pub(crate) fn signals() -> [Signal; 4] {
    [
        Signal::channel("x"),
        Signal::channel("y"),
        Signal::flag("e"),
        Signal::flag("d"),
    ]
}

/// `count` random traces of [`signals`].
pub(crate) fn traces(count: usize, seed: u64) -> ShortTraces {
    ShortTraces::random(&signals(), |_| false, count, seed)
}

/// A judged grammar: `small`, `mid` or `full`. Without `anywhere`, no window
/// with `end` stands under a bounded one.
pub(crate) fn grammar(name: &str, anywhere: bool, size: u32) -> Grammar {
    let (atoms, windows, untils): (&str, &[&str], &[&str]) = match name {
        "small" => ("\"x\" <= ? | \"e\"", &["[0, ?]"], &[]),
        "mid" => (
            "\"x\" <= ? | \"y\" >= ? | \"e\" | not \"e\"",
            &["[0, ?]"],
            &[],
        ),
        _ => (
            "\"x\" <= ? | \"x\" >= ? | \"y\" <= ? | \"y\" >= ? | \"e\" | not \"e\"",
            &["[0, ?]", "[0, 2 step]"],
            &["[0, ?]"],
        ),
    };
    let (open, open_untils): (&[&str], &[&str]) = match name {
        "small" => (&["[0, end]"], &[]),
        "mid" => (&["[0, end]"], &["[0, end]"]),
        _ => (&["[0, end]", "[?, end]"], &["[0, end]"]),
    };
    let rule = |below: &str, own: &[&str], untils: &[&str]| {
        let mut text = String::new();
        for window in own {
            text += &format!("\n  | throughout {window} {below} | sometime {window} {below}");
        }
        for window in untils {
            text += &format!("\n  | {below} until {window} {below}");
        }
        text
    };
    let connectives = |own: &str| format!("\n  | {own} and {own} | {own} or {own}");
    let text = if anywhere {
        let all: Vec<&str> = windows.iter().chain(open).copied().collect();
        let all_untils: Vec<&str> = untils.iter().chain(open_untils).copied().collect();
        format!(
            "f = {atoms}{}{}\n",
            rule("f", &all, &all_untils),
            connectives("f")
        )
    } else {
        format!(
            "f = {atoms}{}{}{}\nb = {atoms}{}{}\n",
            rule("b", windows, untils),
            rule("f", open, open_untils),
            connectives("f"),
            rule("b", windows, untils),
            connectives("b")
        )
    };
    let head = format!("limit size {size}\nlimit slots 9\nlimit flags 9\ngoal = f\n");
    Grammar::read(name, &(head + &text)).unwrap()
}

/// Uses canonical parts, as a search does.
pub(crate) struct Parts(pub(crate) Seen);

impl Canonical for Parts {
    fn part(&mut self, rule: usize, formula: &Formula) -> Option<Formula> {
        self.0.part(0, rule, formula)
    }
}

/// Canonical parts of one grammar among several.
pub(crate) struct Scoped<'a>(pub(crate) &'a mut Seen, pub(crate) u64);

impl Canonical for Scoped<'_> {
    fn part(&mut self, rule: usize, formula: &Formula) -> Option<Formula> {
        self.0.part(self.1, rule, formula)
    }
}

/// What the judge found.
#[derive(Debug, Default)]
pub(crate) struct Verdict {
    /// For each size: candidates built from canonical parts, and classes among
    /// them that are new.
    pub(crate) layers: Vec<(usize, usize)>,
    /// Representatives whose family was worked out.
    pub(crate) checked: usize,
    /// Different families among them.
    pub(crate) families: usize,
    /// Different root classes among them, and different families outermost.
    pub(crate) roots: (usize, usize),
    /// Candidates compared with the representative of their class.
    pub(crate) compared: usize,
    /// Pairs that were taken for the same and are not.
    pub(crate) wrong: Vec<String>,
    /// Pairs that are the same and were not found to be.
    pub(crate) missed: Vec<(Formula, Formula)>,
    /// The same, outermost.
    pub(crate) missed_roots: Vec<(Formula, Formula)>,
    /// Candidates with too many members.
    pub(crate) skipped: usize,
}

impl Verdict {
    /// The share of representatives that have the family of another.
    pub(crate) fn missed_share(&self) -> f64 {
        1.0 - self.families as f64 / self.checked.max(1) as f64
    }

    /// The same for whole templates.
    pub(crate) fn missed_root_share(&self) -> f64 {
        1.0 - self.roots.1 as f64 / self.roots.0.max(1) as f64
    }
}

type Family = BTreeSet<u128>;
/// The first formula of each class, with its family where it was worked out.
type Classes = HashMap<usize, (Formula, Option<Family>)>;

/// Judges all candidates of a grammar.
pub(crate) fn judge(
    grammar: &Grammar,
    traces: &ShortTraces,
    thresholds: Thresholds,
    most: usize,
) -> Verdict {
    let mut parts = Parts(Seen::new(Known::default()));
    let mut verdict = Verdict::default();
    let candidates = candidates(grammar, &mut parts, &mut verdict);
    let (mut classes, mut roots) = (Classes::new(), Classes::new());
    let (mut layer, mut left) = (0, verdict.layers[0].0);
    for formula in &candidates {
        while left == 0 {
            layer += 1;
            left = verdict.layers[layer].0;
        }
        left -= 1;
        let members = traces.members(formula, thresholds, most);
        let family = |digest: fn(&Verdicts) -> u128| -> Option<Family> {
            Some(members.as_ref()?.iter().map(digest).collect())
        };
        verdict.skipped += usize::from(members.is_none());
        let class = parts.0.class_number(formula);
        if !classes.contains_key(&class) {
            verdict.layers[layer].1 += 1;
        }
        let root = parts.0.root_number(formula);
        let own = family(Verdicts::digest);
        compare_in(&mut classes, class, formula, own, &mut verdict);
        let own = family(Verdicts::root_digest);
        compare_in(&mut roots, root, formula, own, &mut verdict);
        if let Some(members) = &members {
            wrong_flags(&mut parts.0, formula, members, &mut verdict.wrong);
        }
    }
    (verdict.checked, verdict.families, verdict.missed) = distinct(&classes);
    let (checked, families, missed) = distinct(&roots);
    verdict.roots = (checked, families);
    verdict.missed_roots = missed;
    verdict
}

/// All candidates of a grammar, built from canonical parts, layer by layer.
fn candidates(grammar: &Grammar, parts: &mut Parts, verdict: &mut Verdict) -> Vec<Formula> {
    let mut enumerator = Enumerator::new(grammar, &Palette::of(0, 0)).unwrap();
    let mut candidates = Vec::new();
    for size in 1..=grammar.limits.size {
        let before = candidates.len();
        let _ = enumerator.for_each(size, parts, |parts, formula| {
            parts.0.class_number(&formula);
            candidates.push(formula);
            ControlFlow::Continue(())
        });
        parts.0.finish_layer();
        verdict.layers.push((candidates.len() - before, 0));
    }
    candidates
}

/// Compares a formula with the first of its class.
fn compare_in(
    known: &mut Classes,
    number: usize,
    formula: &Formula,
    family: Option<Family>,
    verdict: &mut Verdict,
) {
    match known.get(&number) {
        None => {
            known.insert(number, (formula.clone(), family));
        }
        Some((first, Some(before))) => {
            if let Some(family) = family {
                verdict.compared += 1;
                if family != *before {
                    verdict.wrong.push(format!("{first}  ~  {formula}"));
                }
            }
        }
        Some(_) => {}
    }
}

/// How many classes have a family that was worked out, how many different
/// families these are, and the pairs of classes with one family.
fn distinct(known: &Classes) -> (usize, usize, Vec<(Formula, Formula)>) {
    let mut by_family: BTreeMap<&Family, &Formula> = BTreeMap::new();
    let mut missed = Vec::new();
    let mut all: Vec<_> = known.values().collect();
    all.sort_by_key(|(formula, _)| (formula.size(), formula.to_string()));
    let mut checked = 0;
    for (formula, family) in all {
        let Some(family) = family else { continue };
        checked += 1;
        if let Some(first) = by_family.get(family) {
            missed.push(((*first).clone(), formula.clone()));
        } else {
            by_family.insert(family, formula);
        }
    }
    (checked, by_family.len(), missed)
}

/// Notes facts that are said of a family and do not hold.
fn wrong_flags(seen: &mut Seen, formula: &Formula, members: &[Verdicts], wrong: &mut Vec<String>) {
    let flags = seen.flags(formula);
    let mut expect = |flag: Flags, name: &str, holds: bool| {
        if flags.has(flag) && !holds {
            wrong.push(format!("{name} of {formula}"));
        }
    };
    let all = |holds: &dyn Fn(&Verdicts) -> bool| members.iter().all(holds);
    expect(Flags::SINGLETON, "one member", members.len() == 1);
    expect(Flags::ROOT_WEAK, "root weak", all(&|m| m.root == m.weak));
    expect(
        Flags::ROOT_STRONG,
        "root strong",
        all(&|m| m.root == m.strong),
    );
    expect(Flags::SAME, "same", all(&|m| m.weak == m.strong));
    let moves = |m: &Verdicts, up: bool| {
        let rows = m.weak.iter().chain(&m.strong);
        rows.copied().all(|bits| {
            let next = bits >> 1 | if up { 0x80 } else { 0 };
            let kept = if up { 0xff } else { 0x7f };
            if up {
                bits & !next == 0
            } else {
                next & kept & !bits == 0
            }
        })
    };
    expect(Flags::UP, "up", all(&|m| moves(m, true)));
    expect(Flags::DOWN, "down", all(&|m| moves(m, false)));
    if members.len() > 40 {
        return;
    }
    let digests: BTreeSet<u128> = members.iter().map(Verdicts::digest).collect();
    let pairs = |holds: &dyn Fn(&Verdicts, &Verdicts) -> bool| {
        members.iter().all(|a| members.iter().all(|b| holds(a, b)))
    };
    let nested = |a: &Verdicts, b: &Verdicts| {
        let meet = a.joined(b, |a, b| a & b);
        meet == *a || meet == *b
    };
    let meets = |a: &Verdicts, b: &Verdicts| digests.contains(&a.joined(b, |a, b| a & b).digest());
    let joins = |a: &Verdicts, b: &Verdicts| digests.contains(&a.joined(b, |a, b| a | b).digest());
    expect(Flags::CHAIN, "chain", pairs(&nested));
    expect(Flags::MEET, "meet", pairs(&meets));
    expect(Flags::JOIN, "join", pairs(&joins));
}

/// The signals of [`Sample`]: as [`signals`], and a flag and a channel with
/// unknown samples.
fn sample_signals() -> Vec<Signal> {
    let mut all = signals().to_vec();
    all.extend([Signal::channel("v"), Signal::flag("u")]);
    all
}

/// What is known of the signals of [`Sample`].
pub(crate) fn sample_known() -> Known {
    Known {
        with_gaps: BTreeSet::from(["u".into(), "v".into()]),
    }
}

/// Random traces of the signals of [`Sample`].
pub(crate) fn sample_traces(count: usize, seed: u64) -> ShortTraces {
    let known = sample_known();
    ShortTraces::random(
        &sample_signals(),
        |signal| !known.everywhere(signal),
        count,
        seed,
    )
}

/// Random formulas over few atoms, so that rules meet what they are for.
#[derive(Debug, Default)]
pub(crate) struct Sample;

/// What was found about random formulas.
#[derive(Debug, Default)]
pub(crate) struct SampleVerdict {
    /// How often each rule was applied.
    pub(crate) used: BTreeMap<&'static str, usize>,
    /// Pairs compared.
    pub(crate) compared: usize,
    /// Pairs that were taken for the same and are not.
    pub(crate) wrong: Vec<String>,
}

impl Sample {
    /// A random formula of at most about `size` nodes.
    pub(crate) fn formula(&self, number: u64, size: usize) -> Formula {
        let mut stream = Stream::new(7, "formulas", number);
        let size = 1 + stream.below(size);
        let pool = stream.below(4);
        let text = Self::text(&mut stream, size, pool);
        parse(&text).unwrap()
    }

    fn text(stream: &mut Stream, size: usize, pool: usize) -> String {
        if size <= 1 {
            let atoms: &[&str] = match pool {
                0 => &["e", "not e"],
                1 => &["e", "not e", "x <= ?", "d"],
                2 => &["x <= 1", "x <= 2", "x > 1", "x <= ?", "e", "y >= ?"],
                _ => &["u", "not u", "v <= ?", "e", "v <= 1"],
            };
            return atoms[stream.below(atoms.len())].to_owned();
        }
        if stream.below(5) < 3 || size == 2 {
            let windows = [
                "[0, end]",
                "[0, end]",
                "[0, ?]",
                "[?, end]",
                "[0, 2 step]",
                "[1 step, 3 step]",
                "[2 step, 4 step]",
                "[1 step, end]",
                "[0, 0]",
            ];
            let window = windows[stream.below(windows.len())];
            let kind = ["throughout", "sometime"][stream.below(2)];
            let part = Self::text(stream, size - 1, pool);
            return format!("{kind} {window} ({part})");
        }
        let left_size = 1 + stream.below(size - 2);
        let left = Self::text(stream, left_size, pool);
        let right = if stream.below(4) == 0 {
            left.clone()
        } else {
            Self::text(stream, size - 1 - left_size, pool)
        };
        match stream.below(3) {
            0 => format!("({left}) and ({right})"),
            1 => format!("({left}) or ({right})"),
            _ => {
                let windows = [
                    "[0, end]",
                    "[0, 2 step]",
                    "[0, ?]",
                    "[1 step, 3 step]",
                    "[0, 0]",
                ];
                let window = windows[stream.below(windows.len())];
                format!("({left}) until {window} ({right})")
            }
        }
    }

    /// Judges so many random formulas: each against its normal form, and those
    /// of one class (and of one root class) against each other.
    pub(crate) fn judge(&self, count: u64, seed: u64) -> SampleVerdict {
        let traces = sample_traces(160, seed);
        let family = |formula: &Formula| traces.family(formula, Thresholds::Beyond, 1500);
        let root = |formula: &Formula| traces.root_family(formula, Thresholds::Beyond, 1500);
        let mut verdict = SampleVerdict::default();
        let mut seen = Seen::new(sample_known());
        let mut classes: HashMap<usize, Formula> = HashMap::new();
        let mut roots: HashMap<usize, Formula> = HashMap::new();
        for number in 0..count {
            let formula = self.formula(number + seed * 1_000_000_007, 7);
            let (form, rules) = seen.canonical(&formula);
            let steps = seen.root_steps(&formula).1;
            for rule in rules.into_iter().chain(steps.iter().map(|step| step.0)) {
                *verdict.used.entry(rule).or_default() += 1;
            }
            if form != formula && !Self::agree(&formula, &form, &family, &mut verdict) {
                verdict.wrong.push(format!("{formula}  ->  {form}"));
            }
            let class = seen.class_number(&formula);
            let first = classes
                .entry(class)
                .or_insert_with(|| formula.clone())
                .clone();
            if first != formula && !Self::agree(&formula, &first, &family, &mut verdict) {
                verdict.wrong.push(format!("{formula}  ~  {first}"));
            }
            let number = seen.root_number(&formula);
            let first = roots
                .entry(number)
                .or_insert_with(|| formula.clone())
                .clone();
            if first != formula && !Self::agree(&formula, &first, &root, &mut verdict) {
                verdict
                    .wrong
                    .push(format!("{formula}  ~ outermost ~  {first}"));
            }
            if let Some(members) = traces.members(&formula, Thresholds::Beyond, 40) {
                wrong_flags(&mut seen, &formula, &members, &mut verdict.wrong);
            }
        }
        verdict
    }

    fn agree(
        a: &Formula,
        b: &Formula,
        family: &dyn Fn(&Formula) -> Option<BTreeSet<u128>>,
        verdict: &mut SampleVerdict,
    ) -> bool {
        match (family(a), family(b)) {
            (Some(a), Some(b)) => {
                verdict.compared += 1;
                a == b
            }
            _ => true,
        }
    }
}
