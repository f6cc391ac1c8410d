//! Two templates compared, as plain text.

use std::fmt::Write;

use super::terminal::wrapped;
use crate::comparison::{Answer, OnData, Reason, Witness};

/// Whether two templates are the same, and how one can see it.
pub fn comparison(answer: &Answer, on: Option<&OnData>, width: usize) -> String {
    let mut text = match (answer.same, &answer.witness) {
        (Some(true), _) => same(&answer.because, width),
        (_, Some(witness)) => different(witness, width),
        _ => wrapped(
            "Not decided: no rule makes them the same, and no short record that was tried tells \
             them apart. With --on TRACES they are compared on your data.",
            "",
            "",
            width,
        ),
    };
    if let Some(on) = on {
        text.push_str(&on_data(on, width));
    }
    text
}

fn same(because: &[Reason], width: usize) -> String {
    let mut text = "The same, whatever the data.\n".to_owned();
    if because.is_empty() {
        text.push_str("They are one formula but for the order of operands.\n");
    }
    let unwritten = "(no formula of the language)";
    for reason in because {
        let from = reason.from.as_deref().unwrap_or(unwritten);
        let to = reason.to.as_deref().unwrap_or(unwritten);
        let line = format!("{from}  =  {to}");
        text.push_str(&wrapped(
            &line,
            &format!("  {:<14} ", reason.rule),
            "                 ",
            width,
        ));
    }
    text
}

fn different(witness: &Witness, width: usize) -> String {
    let mut text = "Different.\n".to_owned();
    let (own, other) = match witness.template {
        1 => ("first", "second"),
        _ => ("second", "first"),
    };
    let count = witness.records.len();
    let line = if witness.slots.is_empty() {
        format!(
            "The {own} one has the verdict below; the {other} one has it not, whatever its slots \
             if it has any."
        )
    } else {
        format!(
            "With its slots filled as in {} the {own} one gives the verdicts below; the {other} \
             one gives them with no choice of its slots.",
            witness.specification
        )
    };
    text.push_str(&wrapped(&line, "", "", width));
    for (number, record) in witness.records.iter().enumerate() {
        let verdict = if record.satisfied {
            "satisfied"
        } else {
            "violated"
        };
        let _ = writeln!(
            text,
            "  record {} of {count}, a sample every {}: {verdict}",
            number + 1,
            witness.step
        );
        for (name, samples) in &record.samples {
            let samples: Vec<String> = samples.iter().map(f64::to_string).collect();
            text.push_str(&wrapped(
                &samples.join(" "),
                &format!("    {name}: "),
                "      ",
                width,
            ));
        }
    }
    text
}

fn on_data(on: &OnData, width: usize) -> String {
    let line = match (&on.differs, on.same_on_data) {
        (_, true) => format!(
            "On this data: indistinguishable; they sort the {} traces alike.",
            on.traces
        ),
        (Some(differs), false) => format!("On this data: different. {differs}."),
        (None, false) => "On this data: different.".to_owned(),
    };
    wrapped(&line, "", "", width)
}
