//! The template language: text, JSON, negation and mistakes.

use strandline::support::Stream;
use strandline::template::{
    Direction, Formula, SlotKind, TextError, from_json, parse, sentence, to_json,
};

use crate::support::{Shapes, random_formula};

/// Text that is already canonical prints as itself.
#[test]
fn canonical_text_prints_as_itself() {
    for text in [
        "throughout [0, 5 s] (speed <= ?1)",
        "sometime [0, ?1] (throughout [0, 2 s] (abs(level_error) <= ?2))",
        "throughout [0, end] (call_button implies sometime [0, ?1] door_open)",
        "(pressure >= ?1) until [0, 10 s] valve_open",
        "not a or not b",
        "(a or b) and c",
        "a and b or c and d",
        "throughout [?1, end] (abs(x - y) <= 0.5 bar)",
        "throughout [3 step, 1.5 min] (\"flow rate\" > -2.5)",
        "a implies b and (b or not c)",
        "not a or not b or c",
        "(x <= 1 or y >= 2) until [0, end] (a until [0, 1] b)",
        "x - (y - z) <= 3",
        "x - y - z <= 3",
    ] {
        assert_eq!(parse(text).unwrap().to_string(), text);
    }
}

/// Other ways to write a formula give the same formula.
#[test]
fn sugar_and_brackets_vanish() {
    for (written, canonical) in [
        ("not (x <= 3)", "x > 3"),
        (
            "not throughout [0, end] (x <= ?)",
            "sometime [0, end] (x > ?1)",
        ),
        ("a implies b", "not a or b"),
        ("not (a implies b)", "a and not b"),
        ("((a and b)) and c", "a and b and c"),
        ("x<=?name", "x <= ?1"),
        ("not not a", "a"),
        ("throughout [0, 10 steps] a", "throughout [0, 10 step] a"),
        (
            "throughout [0, end] throughout [0, 1] a",
            "throughout [0, end] (throughout [0, 1] a)",
        ),
    ] {
        assert_eq!(
            parse(written).unwrap(),
            parse(canonical).unwrap(),
            "{written}"
        );
    }
}

/// Printing then parsing is the identity, and so is JSON and back; on random
/// formulas with all operators, derived signals and names that need quotes.
#[test]
fn printing_then_parsing_is_the_identity() {
    let shapes = Shapes::all();
    for case in 0..4_000 {
        let mut stream = Stream::new(1, "language", case);
        let formula = random_formula(&mut stream, &shapes, 4);
        let text = formula.to_string();
        let back = parse(&text).unwrap_or_else(|error| panic!("{}", error.draw(&text, "text")));
        assert_eq!(back, formula, "{text}");
        assert_eq!(from_json(&to_json(&formula)).unwrap(), formula, "{text}");
        let words = sentence(&formula, &());
        assert!(words.ends_with('.') && words.len() > 5, "{words}");
    }
}

/// Negation reverses every slot and is its own inverse; `until` has none.
#[test]
fn negation_reverses_every_slot() {
    let shapes = Shapes {
        until: false,
        ..Shapes::all()
    };
    for case in 0..1_000 {
        let formula = random_formula(&mut Stream::new(2, "language", case), &shapes, 4);
        let negation = formula.negated().unwrap();
        assert_eq!(negation.negated().unwrap(), formula);
        assert_eq!(negation.size(), formula.size());
        for (slot, reversed) in formula.slots().iter().zip(negation.slots()) {
            assert_eq!(slot.kind, reversed.kind);
            assert_eq!(slot.direction, reversed.direction.reversed());
        }
    }
    assert!(parse("a until [0, 3] b").unwrap().negated().is_err());
}

/// The facts that constructors compute, on formulas counted by hand.
#[test]
fn facts_are_computed_by_the_constructors() {
    let formula =
        parse("throughout [0, end] (rises(call) implies sometime [0, ?] (abs(speed) <= ?))")
            .unwrap();
    // throughout, rises, call, or, sometime, abs, speed
    assert_eq!(formula.size(), 7);
    let kinds: Vec<bool> = formula
        .slots()
        .iter()
        .map(|slot| slot.kind == SlotKind::Time)
        .collect();
    assert_eq!(kinds, [true, false]);
    assert_eq!(formula.temporal_depth(), 2);
    assert!(formula.has_end() && !formula.has_until());
    let channels: Vec<String> = formula.channels().iter().map(ToString::to_string).collect();
    assert_eq!(channels, ["call", "speed"]);
    let directions = |text: &str| -> Vec<Direction> {
        parse(text)
            .unwrap()
            .slots()
            .iter()
            .map(|s| s.direction)
            .collect()
    };
    use Direction::{LargerIsEasier as Easier, LargerIsHarder as Harder};
    assert_eq!(directions("throughout [?, end] (x <= ?)"), [Easier, Easier]);
    assert_eq!(directions("sometime [?, end] (x >= ?)"), [Harder, Harder]);
    assert_eq!(directions("throughout [0, ?] (x < ?)"), [Harder, Easier]);
    assert_eq!(
        directions("(x > ?) until [0, ?] (y <= ?)"),
        [Harder, Easier, Easier]
    );
    assert_eq!(directions("(x > ?) until [?, end] b"), [Harder, Harder]);
}

/// Where a mistake is and what is said about it.
#[test]
fn mistakes_are_shown_at_their_place() {
    for (text, place, message) in MISTAKES {
        let error: TextError = match parse(text) {
            Err(error) => error,
            Ok(formula) => panic!("`{text}` was read as `{formula}`"),
        };
        let said = format!("{} / {} / {:?}", error.message, error.label, error.help);
        assert!(said.contains(message), "`{text}`: {said}");
        assert_eq!(
            &text[error.span.start..error.span.end.min(text.len())],
            *place,
            "{text}"
        );
        let drawn = error.draw(text, "template");
        assert!(
            drawn.contains('^') && drawn.contains(&error.message),
            "{drawn}"
        );
    }
}

/// Text, the piece of it that is marked, and a part of what is said.
const MISTAKES: &[(&str, &str, &str)] = &[
    ("", "", "stops too early"),
    ("throughout (x <= 3)", "(", "a window such as [0, 5 s]"),
    ("throughout [0 5] a", "5", "between the two bounds"),
    ("throughout [0, 5 a", "", "expected `]`"),
    ("throughout [5, 2] a", "5, 2", "lower bound lies above"),
    (
        "throughout [5 min, 2 s] a",
        "5 min, 2 s",
        "lower bound lies above",
    ),
    ("throughout [-1, 2] a", "-", "cannot be negative"),
    ("throughout [?, 5] a", "?, 5", "goes with `end` only"),
    (
        "throughout [end, end] a",
        "end, end",
        "cannot start at `end`",
    ),
    ("throughout [0, 5 bar] a", "5 bar", "not a unit of time"),
    ("x <= y", "y", "write x - y <= ?"),
    ("x = 3", "=", "use two bounds"),
    ("x <= ?a and y >= ?a", "?a", "occurs twice"),
    (
        "not (a until [0, 3] b)",
        "(a until [0, 3] b)",
        "cannot be negated",
    ),
    (
        "a until [0, 3] b implies c",
        "a until [0, 3] b",
        "cannot be negated",
    ),
    (
        "a until [0, 1] b until [0, 1] c",
        "until",
        "use parentheses",
    ),
    ("(a and b", "", "expected `)`"),
    ("a and", "", "stops too early"),
    ("a b", "b", "expected the end of the text"),
    ("speed(x) <= 3", "speed(x)", "there is no function"),
    ("smooth(x) <= 3", "smooth(x)", "takes 2 argument(s), not 1"),
    ("smooth(x, 0) <= 3", "0", "more than zero"),
    ("smooth(x, y) <= 3", "y", "a duration is needed"),
    ("rises(x) <= 3", "rises(x)", "a numeric channel is needed"),
    ("rate(x)", "rate(x)", "a flag or a comparison is needed"),
    ("x - y", "x - y", "can hold or not hold"),
    ("throughout", "", "a window such as"),
    ("end <= 3", "end", "word of the language"),
    ("\"flow rate <= 3", "\"flow rate <= 3", "not closed"),
    ("\"\" <= 3", "\"\"", "empty"),
    ("flow & x", "&", "has no meaning here"),
    ("x <= 1.2.3", "1.2.3", "not a number"),
    ("x <= 1e999", "1e999", "not a number"),
];

/// A text nested far too deep is refused, not overflowed on.
#[test]
fn deep_nesting_is_refused() {
    for open in ["(", "not ", "throughout [0, 1] ", "a implies ", "rate("] {
        let error = parse(&(open.repeat(20_000) + "a")).unwrap_err();
        assert!(
            error.message.contains("deep") || error.label.contains("simpler"),
            "{error}"
        );
    }
}

/// A slot that a person named keeps its place, and values go where they
/// belong.
#[test]
fn filling_slots_follows_the_order_of_the_text() {
    use strandline::support::Finite;
    use strandline::template::{Duration, SlotValue};
    let template = parse("(x >= ?) until [0, ?] (y <= ?)").unwrap();
    let number = |value: f64| Some(SlotValue::Threshold(Finite::new(value).unwrap()));
    let filled = template.fill(&[
        number(1.5),
        Some(SlotValue::Time(Duration::steps(4))),
        number(-2.0),
    ]);
    assert_eq!(
        filled,
        parse("(x >= 1.5) until [0, 4 step] (y <= -2)").unwrap()
    );
    assert!(filled.is_specification());
    let partly: Formula = template.fill(&[None, Some(SlotValue::Time(Duration::steps(4))), None]);
    assert_eq!(
        partly,
        parse("(x >= ?) until [0, 4 step] (y <= ?)").unwrap()
    );
}
