//! Arguments that several commands share.

use std::io;
use std::path::{Path, PathBuf};

use clap::{Args, ValueEnum};

use super::error::CliError;
use super::terminal;
use crate::traces::{self, Layout, LoadOptions, Loaded};

/// How the traces are laid out in files.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub(super) enum LayoutName {
    /// One table: trace, optional label, time, channels
    Long,
    /// A folder with one CSV file a trace
    Files,
    /// One row a trace: its name, optional label, then samples of one channel
    Rows,
}

/// Where traces come from.
#[derive(Debug, Clone, Args)]
pub(super) struct TracesFrom {
    /// A CSV file, or a folder of CSV files
    #[arg(value_name = "TRACES")]
    pub(super) path: PathBuf,
    #[command(flatten)]
    pub(super) how: ReadOptions,
}

impl TracesFrom {
    /// Reads the traces and says on standard error what was noticed.
    pub(super) fn load(&self) -> Result<Loaded, CliError> {
        self.how.load(&self.path)
    }
}

/// How traces are read.
#[derive(Debug, Clone, Args)]
pub(super) struct ReadOptions {
    /// How the traces are laid out; told from the files when not given
    #[arg(long, value_name = "LAYOUT")]
    pub(super) layout: Option<LayoutName>,
    /// A CSV file with the columns trace,label
    #[arg(long, value_name = "FILE")]
    pub(super) labels: Option<PathBuf>,
    /// Read only these channels and flags, separated by commas
    #[arg(long, value_name = "NAMES", value_delimiter = ',')]
    pub(super) channels: Option<Vec<String>>,
    /// Longest gap that is mended, in steps of the time grid
    #[arg(long, value_name = "STEPS")]
    pub(super) max_gap: Option<u32>,
}

impl ReadOptions {
    /// Reads traces and says on standard error what was noticed.
    pub(super) fn load(&self, path: &Path) -> Result<Loaded, CliError> {
        let mut options = LoadOptions {
            layout: self.layout.map(|layout| match layout {
                LayoutName::Long => Layout::Long,
                LayoutName::Files => Layout::Files,
                LayoutName::Rows => Layout::Rows,
            }),
            labels: self.labels.clone(),
            channels: self.channels.clone(),
            ..LoadOptions::default()
        };
        if self.max_gap.is_some() {
            options.max_gap = self.max_gap;
        }
        let loaded =
            traces::load(path, &options).map_err(|error| CliError::input(error.to_string()))?;
        for finding in &loaded.findings {
            terminal::remark(&format!("strandline: {finding}"));
        }
        Ok(loaded)
    }
}

/// A shell to print completions for.
#[derive(Debug, Clone, Args)]
pub(super) struct Shell {
    /// The shell
    #[arg(value_enum)]
    shell: clap_complete::Shell,
}

impl Shell {
    /// Prints the completion script.
    pub(super) fn print(&self, command: &mut clap::Command) -> Result<u8, CliError> {
        let mut script = Vec::new();
        clap_complete::generate(self.shell, command, "strandline", &mut script);
        let mut output = io::stdout().lock();
        io::Write::write_all(&mut output, &script)?;
        Ok(0)
    }
}
