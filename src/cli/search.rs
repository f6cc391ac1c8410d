//! `strandline search`: the main job.

use std::path::PathBuf;

use clap::Args;

use super::arguments::TracesFrom;
use super::error::CliError;
use super::run_file::{self, Opened};
use super::{explain, ranking, terminal};
use crate::report;
use crate::search::{Limits, Settings};
use crate::store::RunReader;
use crate::template::{TimeUnit, TokenKind, tokenize};

/// Templates shown after a search.
const SHOWN: usize = 5;

/// The main job: find, score and describe templates.
#[derive(Debug, Args)]
#[command(
    before_help = "Example:\n  strandline search demo-data/lift-landings -o lifts.run\n\
    The same command goes on where it was cut short."
)]
pub(super) struct Arguments {
    #[command(flatten)]
    pub(super) traces: TracesFrom,
    /// The run file to write
    #[arg(short = 'o', long = "output", value_name = "RUN")]
    pub(super) output: PathBuf,
    /// A grammar: the name of a shipped one, or a file; may be given several times
    #[arg(long = "grammar", value_name = "FILE")]
    pub(super) grammars: Vec<String>,
    /// Find groups without looking at labels
    #[arg(long)]
    pub(super) unlabelled: bool,
    /// Keep this share of the traces from the search and try the result on them
    #[arg(long, value_name = "SHARE", default_value_t = 0.0, value_parser = share)]
    pub(super) hold_out: f64,
    /// The seed of everything random
    #[arg(long, value_name = "N", default_value_t = 1)]
    pub(super) seed: u64,
    /// Stop after so many scored templates
    #[arg(long, value_name = "N", default_value_t = 2_000)]
    pub(super) templates: usize,
    /// Largest templates to list
    #[arg(long, value_name = "N")]
    pub(super) size: Option<u32>,
    /// Stop after so much time, such as 30min or 8h
    #[arg(long = "for", value_name = "TIME", value_parser = time)]
    pub(super) time: Option<std::time::Duration>,
    /// Stop when comparing templates takes so much memory, such as 8GiB
    #[arg(long, value_name = "SIZE", default_value = "4GiB", value_parser = bytes)]
    pub(super) memory: usize,
    /// Number of threads; all cores when not given (the result is the same)
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub(super) threads: Option<u16>,
    /// No progress, no remarks
    #[arg(long)]
    pub(super) quiet: bool,
    /// Print the ranking as JSON
    #[arg(long)]
    pub(super) json: bool,
}

fn share(text: &str) -> Result<f64, String> {
    match text.parse() {
        Ok(share) if (0.0..=0.9).contains(&share) => Ok(share),
        _ => Err("expected a share from 0 to 0.9, such as 0.3".to_owned()),
    }
}

/// A time such as `8h`.
fn time(text: &str) -> Result<std::time::Duration, String> {
    let wrong = || "expected a time such as 90s, 30min or 8h".to_owned();
    let tokens = tokenize(text).map_err(|_| wrong())?;
    match tokens.first().map(|token| &token.kind) {
        Some(TokenKind::Number(value, Some(unit))) if tokens.len() == 2 => {
            let seconds = TimeUnit::from_name(unit).and_then(TimeUnit::seconds);
            let seconds = value * seconds.ok_or_else(wrong)?;
            std::time::Duration::try_from_secs_f64(seconds).map_err(|_| wrong())
        }
        _ => Err(wrong()),
    }
}

/// A size such as `8GiB`.
fn bytes(text: &str) -> Result<usize, String> {
    let wrong = || "expected a size such as 500MiB or 8GiB".to_owned();
    let split = text.find(|c: char| !c.is_ascii_digit() && c != '.');
    let (number, unit) = text.split_at(split.ok_or_else(wrong)?);
    let scale = match unit {
        "KiB" => 10,
        "MiB" => 20,
        "GiB" => 30,
        "TiB" => 40,
        _ => return Err(wrong()),
    };
    let number: f64 = number.parse().map_err(|_| wrong())?;
    let bytes = number * f64::from(1_u32 << 10).powi(scale / 10);
    if bytes < 1e6 {
        return Err("less than 1 MiB is not enough for any search".to_owned());
    }
    Ok(bytes as usize)
}

/// Runs the command.
pub(super) fn run(arguments: &Arguments) -> Result<u8, CliError> {
    if let Some(threads) = arguments.threads {
        // Fails only when the pool exists already, which happens in no command.
        let _ = rayon::ThreadPoolBuilder::new()
            .num_threads(usize::from(threads))
            .build_global();
    }
    let loaded = arguments.traces.load()?;
    let limits = Limits {
        templates: arguments.templates,
        size: arguments.size,
        time: arguments.time,
        memory: arguments.memory,
    };
    let settings = Settings {
        grammars: arguments.grammars.clone(),
        use_labels: !arguments.unlabelled,
        hold_out: arguments.hold_out,
        seed: arguments.seed,
    };
    match run_file::open(arguments, &loaded, &settings, &limits)? {
        Opened::Complete => terminal::remark(&format!(
            "strandline: {}: this search is done already; a larger --templates, --size or --for \
             would go on",
            arguments.output.display()
        )),
        Opened::Ready(run) => {
            if !run.search(arguments, limits)? {
                terminal::remark(&format!(
                    "strandline: interrupted; {} is safe, and the same command goes on",
                    arguments.output.display()
                ));
                return Ok(3);
            }
        }
    }
    show(arguments)
}

/// Prints the ranking and the description of the first template.
fn show(arguments: &Arguments) -> Result<u8, CliError> {
    let reader = RunReader::open(&arguments.output)?;
    let found = ranking::read(&reader)?;
    if arguments.json {
        terminal::print_json(&found)?;
        return Ok(0);
    }
    let width = terminal::width();
    let mut text = report::ranking(&found, width, SHOWN);
    if let Some(first) = explain::read_all(&reader)?.first() {
        text.push_str("\nThe first one explained\n\n");
        text.push_str(&report::explanation(first, width));
    }
    text.push_str(&format!(
        "\nMore: strandline ranking {0}, strandline explain {0} ID\n",
        arguments.output.display()
    ));
    text.push_str(CAUTION);
    terminal::print(&text)?;
    Ok(0)
}

const CAUTION: &str = "These descriptions are statements about the traces given, not requirements \
    and no proof of safety;\nlimits for equipment that can hurt come from the applicable codes and \
    from qualified people.\n";

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn times_and_shares_are_read_as_people_write_them() {
        let seconds = |text: &str| time(text).map(|time| time.as_secs_f64());
        assert_eq!(seconds("90s"), Ok(90.0));
        assert_eq!(seconds("1.5 h"), Ok(5400.0));
        assert!(time("8").is_err() && time("h").is_err() && time("5 step").is_err());
        assert_eq!(share("0.3"), Ok(0.3));
        assert!(share("30").is_err() && share("-0.1").is_err() && share("x").is_err());
    }
}
