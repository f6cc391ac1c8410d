//! Grammars: counts against published sequences, enumeration against counts,
//! and mistakes shown at their place.

use std::collections::BTreeSet;
use std::ops::ControlFlow;

use strandline::grammar::{
    Enumerator, Grammar, Identity, Palette, Portion, SHIPPED, count, report,
};
use strandline::template::{Formula, parse};

fn read(text: &str) -> Grammar {
    Grammar::read("test", text).unwrap_or_else(|error| panic!("{error}"))
}

fn list(grammar: &Grammar, palette: &Palette, size: u32) -> Vec<Formula> {
    let mut found = Vec::new();
    let mut enumerator = Enumerator::new(grammar, palette).unwrap();
    let _ = enumerator.for_each(size, &mut Identity, |_, formula| {
        found.push(formula);
        ControlFlow::Continue(())
    });
    found
}

/// A grammar with so many leaves, unary operators, ordered binary operators
/// and commutative ones.
fn shape(leaves: usize, unary: usize, ordered: usize, commutative: usize) -> Grammar {
    let mut alternatives: Vec<String> = (1..=leaves).map(|n| format!("\"e{n}\"")).collect();
    alternatives.extend((1..=unary).map(|n| format!("sometime [0, {n} step] f")));
    alternatives.extend((1..=ordered).map(|n| format!("f until [0, {n} step] f")));
    alternatives.extend(
        ["f and f", "f or f"]
            .iter()
            .take(commutative)
            .map(ToString::to_string),
    );
    read(&format!(
        "limit size 12\ngoal = f\nf = {}\n",
        alternatives.join(" | ")
    ))
}

/// Numbers of trees by size (number of nodes), by recurrence up to the length
/// of `expected` and by enumeration while that is quick.
fn check_counts(grammar: &Grammar, expected: &[u128]) {
    let palette = Palette::of(0, 0);
    let counts = count(grammar, &palette, Some(expected.len() as u32)).unwrap();
    assert_eq!(&counts.of[1..], expected);
    for (size, number) in expected
        .iter()
        .enumerate()
        .take_while(|(_, n)| **n < 20_000)
    {
        let listed = list(grammar, &palette, size as u32 + 1);
        assert_eq!(listed.len() as u128, *number, "size {}", size + 1);
        assert!(
            listed
                .iter()
                .all(|formula| formula.size() == size as u32 + 1)
        );
    }
}

/// Ordered binary trees with unary nodes: Motzkin numbers (OEIS A001006), and
/// tables derived from the closed form T(n) = sum Cat(k) C(n-1, 2k) l^(k+1)
/// u^(n-1-2k) b^k; (1, 2, 1) gives the Catalan numbers (A000108) and (1, 1, 2)
/// A025235 (that id is from memory).
#[test]
fn ordered_counts_are_the_published_sequences() {
    check_counts(&shape(1, 1, 1, 0), &[1, 1, 2, 4, 9, 21, 51, 127, 323, 835]);
    check_counts(
        &shape(1, 2, 1, 0),
        &[1, 2, 5, 14, 42, 132, 429, 1430, 4862, 16796],
    );
    check_counts(
        &shape(1, 1, 2, 0),
        &[1, 1, 3, 7, 21, 61, 191, 603, 1961, 6457],
    );
    check_counts(
        &shape(2, 1, 1, 0),
        &[2, 2, 6, 14, 42, 122, 382, 1206, 3922, 12914],
    );
    check_counts(
        &shape(2, 2, 2, 0),
        &[2, 4, 16, 64, 288, 1344, 6528, 32512, 165_376, 855_040],
    );
    check_counts(&shape(1, 0, 1, 0), &[1, 0, 1, 0, 2, 0, 5, 0, 14, 0]);
}

/// The same with operands in no order: Wedderburn-Etherington numbers (OEIS
/// A001190: by nodes with one unary operator, A001190(n+1)), and the derived
/// tables for commutative operators.
#[test]
fn unordered_counts_are_the_published_sequences() {
    check_counts(&shape(1, 1, 0, 1), &[1, 1, 2, 3, 6, 11, 23, 46, 98, 207]);
    check_counts(&shape(1, 0, 0, 1), &[1, 0, 1, 0, 1, 0, 2, 0, 3, 0]);
    check_counts(
        &shape(2, 2, 0, 2),
        &[2, 4, 14, 44, 164, 616, 2450, 9908, 41116, 173_144],
    );
    check_counts(
        &shape(3, 1, 0, 2),
        &[3, 3, 15, 33, 135, 423, 1671, 6009, 23745, 91425],
    );
    check_counts(
        &shape(4, 2, 1, 2),
        &[
            4, 8, 52, 232, 1432, 8240, 52276, 330_472, 2_166_776, 14_336_752,
        ],
    );
    check_counts(
        &shape(2, 1, 1, 2),
        &[2, 2, 12, 28, 134, 454, 2050, 8098, 36158, 154_142],
    );
}

/// The recurrence of `open-start` with slots: F(n, k) = A(n, k) + 2 F(n-1, k-1)
/// plus pairs, goal G(n, k) = F(n-1, k) + 2 F(n-1, k-1) + until, at most three
/// slots; written out here by loops of its own.
#[test]
fn open_start_follows_its_recurrence() {
    let open = Grammar::open("open-start").unwrap();
    for (channels, flags) in [(1, 0), (3, 2), (2, 1)] {
        let largest = 7;
        let mut f = vec![[[0u128; 4]; 8]; largest + 1];
        for n in 1..=largest {
            for k in 0..=3 {
                for e in 0..=3 {
                    let atoms = match (n, k, e) {
                        (1, 1, 0) => 2 * channels,
                        (2, 1, 0) => 4 * channels,
                        (1, 0, 1) => 2 * flags,
                        _ => 0,
                    };
                    let mut sum = atoms as u128;
                    if k > 0 {
                        sum += 2 * f[n - 1][k - 1][e];
                    }
                    let (ordered, equal) = pairs(&f, n - 1, k, e);
                    f[n][k][e] = sum + 2 * (ordered + equal) / 2;
                }
            }
        }
        let counts = count(&open, &Palette::of(channels, flags), Some(largest as u32)).unwrap();
        for n in 1..=largest {
            let mut sum = 0;
            for k in 0..=3 {
                for e in 0..=3 {
                    sum += f[n - 1][k][e] + pairs(&f, n - 1, k, e).0;
                    if k > 0 {
                        sum += 2 * f[n - 1][k - 1][e];
                    }
                }
            }
            assert_eq!(counts.of[n], sum, "size {n} of {channels} and {flags}");
        }
    }
}

/// Ordered pairs of a total size, slots and flags, and pairs of equals.
fn pairs(f: &[[[u128; 4]; 8]], size: usize, slots: usize, flags: usize) -> (u128, u128) {
    let mut ordered = 0;
    for i in 1..size {
        for k in 0..=slots {
            for e in 0..=flags {
                ordered += f[i][k][e] * f[size - i][slots - k][flags - e];
            }
        }
    }
    let halves = [size, slots, flags].iter().all(|n| n.is_multiple_of(2)) && size > 0;
    let equal = if halves {
        f[size / 2][slots / 2][flags / 2]
    } else {
        0
    };
    (ordered, equal)
}

/// Counts of the other shipped grammars by rules worked out by hand from their
/// texts (C channels, E flags, P = C (C-1) / 2 pairs).
#[test]
fn shipped_counts_follow_from_their_rules() {
    for (c, e) in [(1u128, 0u128), (3, 2), (5, 3)] {
        let p = c * (c - 1) / 2;
        let miss = 3 * c + p;
        let settling = miss + 2 * e * miss + 2 * c + miss + c;
        let far = 2 * c + 2 * c + 2 * c + p;
        let excursion = far + 2 * (2 * e * far) + 2 * c + far + 2 * e * far + far;
        let idle = 2 * e + 2 * c;
        let (state, level) = (2 * e, 2 * c);
        let lasting = state + level;
        let effect = state + 2 * e + level;
        let response = idle * effect
            + idle * lasting
            + idle * lasting
            + idle * 2 * e
            + idle * lasting * effect;
        // Of these, templates with more than three slots are left out: idle,
        // lasting and effect each with a threshold, and the time.
        let over = 2 * c * 2 * c * 2 * c;
        for (name, expected) in [
            ("settling", settling),
            ("excursion", excursion),
            ("event-response", response - over),
        ] {
            let grammar = Grammar::open(name).unwrap();
            let palette = Palette::of(c as usize, e as usize);
            let counts = count(&grammar, &palette, None).unwrap();
            assert_eq!(counts.total(), expected, "{name} at {c}, {e}");
            let listed: usize = (0..=12)
                .map(|size| list(&grammar, &palette, size).len())
                .sum();
            assert_eq!(listed as u128, expected, "{name} at {c}, {e}");
        }
    }
}

/// Every shipped grammar reads, its templates read back from their text, keep
/// to the limits, and come in the same order every time.
#[test]
fn shipped_templates_keep_to_the_limits() {
    let palette = Palette::of(2, 2);
    for (name, text) in SHIPPED {
        assert!(
            text.starts_with("# ") && text.contains("Example:"),
            "{name}"
        );
        let grammar = Grammar::open(name).unwrap();
        assert!(
            grammar.warnings.is_empty(),
            "{name}: {:?}",
            grammar.warnings
        );
        for size in 1..=6 {
            let listed = list(&grammar, &palette, size);
            assert_eq!(listed, list(&grammar, &palette, size));
            for formula in &listed {
                assert_eq!(&parse(&formula.to_string()).unwrap(), formula);
                assert!(
                    formula.slots().len() <= 3 && formula.size() == size,
                    "{formula}"
                );
            }
        }
        let report = report(&grammar, &palette).unwrap();
        assert!(
            report.rules.iter().all(|rule| !rule.example.is_empty()),
            "{report:?}"
        );
    }
}

/// Purposeful grammars list nothing twice.
#[test]
fn purposeful_grammars_list_nothing_twice() {
    let palette = Palette::of(3, 2);
    for name in ["settling", "excursion", "event-response"] {
        let grammar = Grammar::open(name).unwrap();
        let all: Vec<Formula> = (0..=12)
            .flat_map(|size| list(&grammar, &palette, size))
            .collect();
        let distinct: BTreeSet<&Formula> = all.iter().collect();
        assert_eq!(distinct.len(), all.len(), "{name}");
    }
}

fn list_in(grammar: &Grammar, palette: &Palette, size: u32, portion: Portion) -> Vec<Formula> {
    let mut found = Vec::new();
    let mut enumerator = Enumerator::new(grammar, palette).unwrap();
    let _ = enumerator.for_each_in(size, portion, &mut Identity, |_, _, formula| {
        found.push(formula);
        ControlFlow::Continue(())
    });
    found
}

/// Slices together are the whole and share nothing; a listing that was cut
/// short goes on exactly behind the place where it stopped.
#[test]
fn portions_make_up_the_whole() {
    let palette = Palette::of(2, 1);
    for name in ["open-start", "event-response"] {
        let grammar = Grammar::open(name).unwrap();
        for size in [4, 5, 6] {
            let whole = list(&grammar, &palette, size);
            for slices in [1, 3, 16] {
                let parts: Vec<Vec<Formula>> = (0..slices)
                    .map(|slice| {
                        let slice = (slice, slices);
                        list_in(&grammar, &palette, size, Portion { from: 0, slice })
                    })
                    .collect();
                for (place, formula) in whole.iter().enumerate() {
                    assert_eq!(&parts[place % slices][place / slices], formula);
                }
                assert_eq!(parts.iter().map(Vec::len).sum::<usize>(), whole.len());
            }
            for from in [0, 1.min(whole.len()), whole.len() / 2, whole.len()] {
                let portion = Portion {
                    from,
                    ..Portion::WHOLE
                };
                assert_eq!(list_in(&grammar, &palette, size, portion), whole[from..]);
            }
        }
    }
}

/// Weights decide the order of alternatives; bindings choose once.
#[test]
fn weights_and_bindings_do_what_they_say() {
    let grammar = read(
        "goal = sometime [0, end] f\n\
         f = \"a\" | (weight 2) with x, y from channels: x - y <= ?\n  | (weight 2) CHANNEL >= ?\n",
    );
    let text: Vec<String> = [2, 4]
        .into_iter()
        .flat_map(|size| list(&grammar, &Palette::of(2, 0), size))
        .map(|formula| formula.to_string())
        .collect();
    assert_eq!(
        text,
        [
            "sometime [0, end] (x1 >= ?1)",
            "sometime [0, end] (x2 >= ?1)",
            "sometime [0, end] a",
            "sometime [0, end] (x1 - x2 <= ?1)",
            "sometime [0, end] (x2 - x1 <= ?1)",
        ]
    );
}

/// Text, the line and column that the drawing shows, and a part of it.
const MISTAKES: &[(&str, &str, &str)] = &[
    ("", "", "no rule `goal`"),
    ("f = FLAG\n", "1:1", "no rule `goal`"),
    ("goal = f\n", "1:8", "is no rule and no binding"),
    (
        "goal = stat\nstate = FLAG\n",
        "1:8",
        "did you mean `state`?",
    ),
    ("goal = FLAG\nf = FLAG\n", "2:1", "cannot be reached"),
    ("goal = not goal\n", "1:1", "recursion without a base"),
    (
        "goal = f\nf = sometime [0, ?] g\ng = throughout [0, ?] f\n",
        "2:1",
        "through f, g",
    ),
    ("goal = FLAG\ngoal = FLAG\n", "2:1", "defined twice"),
    ("goal FLAG\n", "1:6", "`=` is missing"),
    ("goal = FLAG |\n", "1:6", "is empty"),
    ("goal = | FLAG\n", "1:6", "is empty"),
    ("= FLAG\n", "1:1", "starts with its name"),
    ("  goal = FLAG\n", "1:3", "the first line is indented"),
    ("goal = FLAG\nor FLAG\n", "2:4", "must be indented"),
    ("limit slots\ngoal = FLAG\n", "1:1", "cannot be read"),
    (
        "limit slots 0\ngoal = FLAG\n",
        "1:13",
        "whole number from 1",
    ),
    ("limit depth 3\ngoal = FLAG\n", "1:1", "no limit on `depth`"),
    ("limit size 2.5\ngoal = FLAG\n", "1:12", "whole number"),
    ("goal = (weight 0) FLAG\n", "1:16", "above zero"),
    ("goal = (weight) FLAG\n", "1:8", "cannot be read"),
    (
        "goal = with x channels: x <= ?\n",
        "1:15",
        "expected `,` or `from`",
    ),
    (
        "goal = with x from signals: x <= ?\n",
        "1:20",
        "expected `channels` or `flags`",
    ),
    (
        "goal = with x from channels x <= ?\n",
        "1:29",
        "expected `:`",
    ),
    (
        "goal = pair x from channels: x <= ?\n",
        "1:8",
        "binds two names",
    ),
    (
        "goal = with x from channels: CHANNEL <= ?\n",
        "1:8",
        "is not used",
    ),
    (
        "goal = with f from channels: f <= ?\n  | f\nf = FLAG\n",
        "1:8",
        "the name of something else",
    ),
    (
        "goal = with x from flags: x <= ?\n",
        "1:27",
        "a numeric channel is needed",
    ),
    ("goal = CHANNEL\n", "1:8", "a flag is needed"),
    ("goal = FLAG <= ?\n", "1:8", "a numeric channel is needed"),
    (
        "goal = sometime [0, w] FLAG\nw = FLAG\n",
        "2:5",
        "a duration is needed",
    ),
    (
        "goal = throughout [?, 5] FLAG\n",
        "1:20",
        "goes with `end` only",
    ),
    (
        "goal = sometime [0, 5 bar] FLAG\n",
        "1:21",
        "not a unit of time",
    ),
    ("goal = speed(CHANNEL) <= ?\n", "1:8", "no function `speed`"),
    (
        "goal = spread(CHANNEL) <= ?\n",
        "1:8",
        "takes 2 argument(s)",
    ),
    (
        "goal = spread(CHANNEL, 0) >= ?\n",
        "1:24",
        "must be more than zero",
    ),
    ("goal = CHANNEL <= CHANNEL\n", "1:19", "number or a slot"),
    ("goal = sometime FLAG\n", "1:17", "a window such as"),
    (
        "# a comment\ngoal = (FLAG # not closed\n",
        "2:13",
        "expected `)`",
    ),
    (
        "rate = FLAG\ngoal = rate\n",
        "1:1",
        "a word of the language",
    ),
];

#[test]
fn mistakes_are_shown_at_their_place() {
    for (text, place, part) in MISTAKES {
        let error = match Grammar::read("my.grammar", text) {
            Err(error) => error.to_string(),
            Ok(grammar) => panic!("read: {text}\n{grammar:?}"),
        };
        assert!(error.contains(part), "{text}\n{error}");
        let shown = place.is_empty() || error.contains(&format!("my.grammar:{place}"));
        assert!(shown, "{place} of {text}\n{error}");
    }
    let error = Grammar::open("no-such-grammar").unwrap_err().to_string();
    assert!(
        error.contains("no-such-grammar") && error.contains("open-start"),
        "{error}"
    );
}

#[test]
fn constant_shapes_are_warned_of() {
    let grammar = read("goal = throughout [0, end] (sometime [0, end] FLAG)\n");
    assert!(grammar.warnings[0].contains("last sample only"));
}
