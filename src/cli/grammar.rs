//! `strandline grammar`: check and count a grammar.

use clap::Args;

use super::error::CliError;
use super::terminal;
use crate::grammar::{Grammar, GrammarReport, Palette, report};

/// Check and count a grammar.
#[derive(Debug, Args)]
#[command(before_help = "Example:\n  strandline grammar settling --channels 3 --flags 2")]
pub(super) struct Arguments {
    /// The name of a shipped grammar, or a file
    #[arg(value_name = "FILE")]
    grammar: String,
    /// Number of channels to count with
    #[arg(long, value_name = "N", default_value_t = 3)]
    channels: usize,
    /// Number of flags to count with
    #[arg(long, value_name = "N", default_value_t = 2)]
    flags: usize,
    /// Print JSON
    #[arg(long)]
    json: bool,
}

/// Runs the command.
pub(super) fn run(arguments: &Arguments) -> Result<u8, CliError> {
    let grammar =
        Grammar::open(&arguments.grammar).map_err(|error| CliError::input(format!("\n{error}")))?;
    let palette = Palette::of(arguments.channels, arguments.flags);
    let report = report(&grammar, &palette).map_err(|error| {
        CliError::input(format!("\n{}", error.draw(&grammar.text, &grammar.name)))
    })?;
    if arguments.json {
        terminal::print_json(&report)?;
    } else {
        terminal::print(&text(&report))?;
    }
    Ok(0)
}

fn text(report: &GrammarReport) -> String {
    let mut text = format!(
        "{}: {} templates with {} channels and {} flags, before equivalents are dropped\n",
        report.name, report.total, report.channels, report.flags
    );
    for (size, count) in &report.counts {
        text.push_str(&format!("  size {size:>2}  {count:>12}\n"));
    }
    for rule in &report.rules {
        text.push_str(&format!("\n{} ({} templates)\n", rule.name, rule.templates));
        text.push_str(&format!("  {}\n  {}\n", rule.example, rule.sentence));
    }
    for warning in &report.warnings {
        text.push_str(&format!("\nWarning: {warning}.\n"));
    }
    text
}
