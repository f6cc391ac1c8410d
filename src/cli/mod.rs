//! The command line: arguments, messages, exit codes. One file a command.
//!
//! Results go to standard output, all else to standard error; progress is
//! shown only on a terminal. Exit codes: 0 done (also when a limit was
//! reached), 1 failed, 2 bad input or usage, 3 interrupted with the run saved.
//! This is the only module that prints.

mod arguments;
mod assign;
mod equal;
mod error;
mod explain;
mod grammar;
mod handover;
mod measure;
mod progress;
mod ranking;
mod run_file;
mod search;
mod terminal;

use std::ffi::OsString;
use std::process::ExitCode;

use clap::{CommandFactory, Parser, Subcommand};

pub use error::CliError;

/// Finds temporal-logic templates that sort time-series traces.
#[derive(Debug, Parser)]
#[command(
    name = "strandline",
    version,
    about = "Finds temporal-logic templates that sort time-series traces",
    before_help = "Example, with the demo data:\n  \
        strandline search demo-data/lift-landings -o lifts.run\n  \
        strandline explain lifts.run",
    after_help = CAUTION,
    disable_help_subcommand = true
)]
struct Cli {
    #[command(subcommand)]
    command: Command,
}

/// Stands at the end of the help.
const CAUTION: &str = "A description that was found is a statement about the traces given: not a \
    requirement, and no proof of safety. Limits for lifting, pressure, heat, medical or vehicle \
    equipment come from the applicable codes and from qualified people.";

#[derive(Debug, Subcommand)]
enum Command {
    /// The main job: find, score and describe templates; goes on where it was cut short
    Search(search::Arguments),
    /// The ranked templates of a run
    Ranking(ranking::Arguments),
    /// One template: its groups, their descriptions, evidence, traces to look at
    Explain(explain::Arguments),
    /// Write the rules of one template, or of several that vote, to a file
    Handover(handover::Arguments),
    /// Which group is each new trace in, or none
    Assign(assign::Arguments),
    /// The boundary of a template on each trace, as CSV
    Measure(measure::Arguments),
    /// Whether two templates are the same: the reason, or records that tell them apart
    Equal(equal::Arguments),
    /// Check and count a grammar
    Grammar(grammar::Arguments),
    /// Print a shell's completion script
    #[command(hide = true)]
    Completions(arguments::Shell),
}

/// Runs the program on its arguments and gives the exit code.
pub fn run(arguments: impl IntoIterator<Item = OsString>) -> ExitCode {
    let cli = match Cli::try_parse_from(arguments) {
        Ok(cli) => cli,
        Err(error) => {
            let code = if error.use_stderr() { 2 } else { 0 };
            // Nothing can be done when the message itself cannot be printed.
            let _ = error.print();
            return ExitCode::from(code);
        }
    };
    match dispatch(cli.command) {
        Ok(code) => ExitCode::from(code),
        Err(error) if error.is_closed_pipe() => ExitCode::SUCCESS,
        Err(error) => {
            terminal::complain(&error);
            ExitCode::from(error.exit_code())
        }
    }
}

fn dispatch(command: Command) -> Result<u8, CliError> {
    match command {
        Command::Search(arguments) => search::run(&arguments),
        Command::Ranking(arguments) => ranking::run(&arguments),
        Command::Explain(arguments) => explain::run(&arguments),
        Command::Handover(arguments) => handover::run(&arguments),
        Command::Assign(arguments) => assign::run(&arguments),
        Command::Measure(arguments) => measure::run(&arguments),
        Command::Equal(arguments) => equal::run(&arguments),
        Command::Grammar(arguments) => grammar::run(&arguments),
        Command::Completions(shell) => shell.print(&mut Cli::command()),
    }
}
