//! Results as plain text for a terminal: aligned, wrapped to a width.

use std::fmt::Write;

use crate::search::{Explanation, GroupReport, Mode, Ranked, Ranking, Relation};

/// Names shown of a list before "and n more".
const NAMES_SHOWN: usize = 8;

/// The ranking as text: what was searched, the verdict, one entry a family.
pub fn ranking(ranking: &Ranking, width: usize, entries: usize) -> String {
    let mut text = heading(ranking, width);
    for ranked in ranking.templates.iter().take(entries) {
        text.push('\n');
        text.push_str(&entry(ranked, width));
    }
    let hidden = ranking.templates.len().saturating_sub(entries);
    if hidden > 0 {
        let _ = writeln!(
            text,
            "\n{hidden} more: `ranking --entries {}`",
            ranking.templates.len()
        );
    }
    text
}

fn heading(ranking: &Ranking, width: usize) -> String {
    let run = &ranking.run;
    let data = &run.data;
    let held_out = match data.traces_held_out {
        0 => String::new(),
        count => format!(" ({count} more held out)"),
    };
    let kind = match run.mode {
        Mode::Labelled => format!("{} labels", data.labels.len()),
        Mode::Unlabelled => "labels not used".to_owned(),
    };
    let searched = format!(
        "{}: {} traces{held_out}, {kind}. {} templates listed, {} distinct after equivalence, \
         {} constant and {} indistinguishable on this data set aside, {} scored. Stopped: {}.",
        data.path,
        data.traces,
        grouped(run.templates_listed),
        grouped(run.templates_distinct),
        grouped(run.templates_constant),
        grouped(run.templates_folded),
        grouped(run.templates_scored),
        run.stopped,
    );
    let mut text = wrapped(&searched, "", "", width);
    for finding in &run.findings {
        text.push_str(&wrapped(finding, "Finding: ", "  ", width));
    }
    text.push_str(&wrapped(
        &format!("{}. {}", run.verdict, run.verdict_text),
        "Verdict: ",
        "  ",
        width,
    ));
    if let Some(held_out) = &run.held_out {
        let line = format!(
            "on {} traces that the search never saw, the first {} templates voting put {} into \
             the right group.",
            held_out.traces,
            held_out.templates,
            percent(held_out.accuracy),
        );
        text.push_str(&wrapped(&line, "Held out: ", "  ", width));
    }
    text
}

fn entry(ranked: &Ranked, width: usize) -> String {
    let margin = "      ";
    let first = format!("{:>4}  ", ranked.rank);
    let mut text = wrapped(&ranked.text, &first, &format!("{margin}  "), width);
    text.push_str(&wrapped(&ranked.sentence, margin, margin, width));
    let mut figures = vec![
        ranked.id.clone(),
        format!("score {:.3}", ranked.score),
        format!("{} groups", ranked.groups),
    ];
    let mut figure = |name: &str, value: Option<f64>| {
        figures.extend(value.map(|value| format!("{name} {value:.2}")));
    };
    figure("accuracy", ranked.accuracy);
    figure("stability", ranked.stability);
    figure("silhouette", Some(ranked.silhouette));
    figure("agreement with labels", ranked.agreement_with_labels);
    figures.extend(ranked.p_value.map(|p| format!("p {p:.3}")));
    figures.push(format!("size {}", ranked.size));
    text.push_str(&wrapped(&figures.join(", "), margin, margin, width));
    let mut relatives = Vec::new();
    if ranked.same_on_data > 0 {
        relatives.push(format!(
            "indistinguishable on this data: {} more",
            ranked.same_on_data
        ));
    }
    if !ranked.family.is_empty() {
        relatives.push(format!(
            "nearly the same groups: {} more",
            ranked.family.len()
        ));
    }
    relatives.extend(
        ranked
            .special_case_of
            .as_ref()
            .map(|id| format!("a special case of {id}, with a slot fixed")),
    );
    if !relatives.is_empty() {
        text.push_str(&wrapped(&relatives.join("; "), margin, margin, width));
    }
    text
}

/// One template explained as text.
pub fn explanation(explanation: &Explanation, width: usize) -> String {
    let ranked = &explanation.ranked;
    let mut text = wrapped(
        &ranked.text,
        &format!("{}  ", ranked.id),
        "           ",
        width,
    );
    text.push_str(&wrapped(&ranked.sentence, "", "", width));
    let _ = writeln!(text, "Height: {}.", explanation.height);
    for group in &explanation.groups {
        text.push('\n');
        text.push_str(&group_text(group, width));
    }
    if !explanation.none.is_empty() {
        let names = listed(&explanation.none, NAMES_SHOWN);
        text.push('\n');
        text.push_str(&wrapped(&names, "In no group: ", "  ", width));
    }
    text.push_str(&relatives(explanation, width));
    text.push('\n');
    for line in &explanation.evidence {
        text.push_str(&wrapped(line, "- ", "  ", width));
    }
    let check = explanation.check;
    let line = match check.disagreements {
        0 => format!(
            "every description was re-checked on every trace by the evaluator that follows the \
             definition word by word: {} verdicts, all the same.",
            grouped(check.verdicts)
        ),
        count => format!(
            "FAULT: {count} of {} verdicts differ between the search and the evaluator that \
             follows the definition; do not use these descriptions, and report this.",
            grouped(check.verdicts)
        ),
    };
    text.push_str(&wrapped(&line, "- ", "  ", width));
    text
}

/// What stands for nearly the same.
fn relatives(explanation: &Explanation, width: usize) -> String {
    let mut text = String::new();
    if explanation.same_on_data > 0 {
        let line = format!(
            "Indistinguishable on this data: {} more.",
            grouped(explanation.same_on_data)
        );
        text.push('\n');
        text.push_str(&wrapped(&line, "", "  ", width));
    }
    if explanation.family.is_empty() {
        return text;
    }
    let line = format!(
        "Nearly the same groups: {} more.",
        grouped(explanation.family.len())
    );
    text.push('\n');
    text.push_str(&wrapped(&line, "", "  ", width));
    for member in explanation.family.iter().take(NAMES_SHOWN) {
        let relation = match member.relation {
            Some(Relation::SpecialCase) => "; a special case, with a slot fixed",
            Some(Relation::MoreGeneral) => "; more general, with one more slot",
            None => "",
        };
        let line = format!("{}  (score {:.3}{relation})", member.text, member.score);
        text.push_str(&wrapped(
            &line,
            &format!("    {}  ", member.id),
            "             ",
            width,
        ));
    }
    text
}

fn group_text(group: &GroupReport, width: usize) -> String {
    let description = &group.description;
    let title = format!("{} ({} traces)", group.name, group.traces.len());
    let mut text = format!("{title}\n");
    text.push_str(&wrapped(&description.sentence, "    ", "    ", width));
    text.push_str(&wrapped(&description.text, "    ", "      ", width));
    let figures = format!(
        "holds on {} traces; precision {} (95 % interval {}), recall {} (95 % interval {})",
        description.support,
        percent(description.precision),
        interval(description.intervals.precision),
        percent(description.recall),
        interval(description.intervals.recall),
    );
    text.push_str(&wrapped(&figures, "    ", "    ", width));
    if let Some(held_out) = &description.held_out {
        let line = format!(
            "held out: {} traces of the group; precision {}, recall {}",
            held_out.members,
            percent(held_out.precision),
            percent(held_out.recall),
        );
        text.push_str(&wrapped(&line, "    ", "    ", width));
    }
    let mut traces = vec![format!("traces: {}", listed(&group.traces, NAMES_SHOWN))];
    let representatives = &group.representatives;
    traces.extend(
        representatives
            .typical
            .as_ref()
            .map(|name| format!("typical: {name}")),
    );
    traces.extend(
        representatives
            .borderline
            .as_ref()
            .map(|name| format!("borderline: {name}")),
    );
    text.push_str(&wrapped(&traces.join("; "), "    ", "    ", width));
    text
}

fn listed(names: &[String], shown: usize) -> String {
    let first = names
        .iter()
        .take(shown)
        .cloned()
        .collect::<Vec<_>>()
        .join(", ");
    match names.len().saturating_sub(shown) {
        0 => first,
        more => format!("{first} and {more} more"),
    }
}

fn percent(share: f64) -> String {
    let value = 100.0 * share;
    if (value - value.round()).abs() < 0.05 {
        format!("{value:.0} %")
    } else {
        format!("{value:.1} %")
    }
}

fn interval((low, high): (f64, f64)) -> String {
    format!("{:.0} to {:.0} %", 100.0 * low, 100.0 * high)
}

/// A count with its thousands apart.
fn grouped(count: usize) -> String {
    let digits = count.to_string();
    let mut text = String::new();
    for (position, digit) in digits.chars().enumerate() {
        if position > 0 && (digits.len() - position).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text
}

/// A paragraph wrapped to a width, with what its lines start with.
pub(super) fn wrapped(text: &str, first: &str, rest: &str, width: usize) -> String {
    let options = textwrap::Options::new(width)
        .initial_indent(first)
        .subsequent_indent(rest);
    let mut lines = textwrap::wrap(text, options).join("\n");
    lines.push('\n');
    lines
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn numbers_are_written_for_people() {
        assert_eq!(grouped(0), "0");
        assert_eq!(grouped(1_234_567), "1,234,567");
        assert_eq!(percent(1.0), "100 %");
        assert_eq!(percent(0.9667), "96.7 %");
        assert_eq!(interval((0.9, 0.998)), "90 to 100 %");
    }

    #[test]
    fn lists_and_lines_are_kept_short() {
        let names: Vec<String> = (1..=10).map(|n| format!("L{n}")).collect();
        assert_eq!(
            listed(&names, 8),
            "L1, L2, L3, L4, L5, L6, L7, L8 and 2 more"
        );
        let text = wrapped(&"word ".repeat(60), "  ", "    ", 80);
        assert!(text.lines().all(|line| line.len() <= 80), "{text}");
    }
}
