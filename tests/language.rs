//! The template language: text, JSON and mistakes.

use strandline::template::{from_json, parse, to_json};

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
        "throughout [3 step, 1.5 min] (\"flow rate\" > -2.5e-7)",
        "a implies b and (b or not c)",
        "not a or not b or c",
        "(x <= 1 or y >= 2) until [0, end] (a until [0, 1] b)",
        "x - (y - z) <= 3",
        "x - y - z <= 3",
    ] {
        let formula = parse(text).unwrap_or_else(|e| panic!("{}", e.draw(text, "t")));
        let printed = formula.to_string();
        assert_eq!(parse(&printed).unwrap(), formula, "{text} -> {printed}");
        assert_eq!(from_json(&to_json(&formula)).unwrap(), formula);
        if !text.contains("e-7") {
            assert_eq!(printed, text);
        }
    }
}
