//! What can be wrong with trace files: place, cause and remedy.

use std::path::PathBuf;

/// A place in a file, as a person counts: lines and columns from 1.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Place {
    /// The file.
    pub path: PathBuf,
    /// The line.
    pub line: u64,
    /// The name of the column.
    pub column: String,
}

impl std::fmt::Display for Place {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        write!(
            f,
            "{}, line {}, column `{}`",
            self.path.display(),
            self.line,
            self.column
        )
    }
}

/// Traces that cannot be read.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum TraceError {
    /// Nothing is at the path, or it cannot be read.
    #[error("{path}: {reason}; give a CSV file, or a folder of CSV files", path = path.display())]
    Unreadable {
        /// The path.
        path: PathBuf,
        /// What the system said.
        reason: String,
    },
    /// A folder without CSV files.
    #[error("{}: the folder has no CSV file (their names end in .csv)", .0.display())]
    EmptyFolder(PathBuf),
    /// A file without rows.
    #[error("{}: the file is empty; a header line and at least one row are needed", .0.display())]
    EmptyFile(PathBuf),
    /// Bytes that are not UTF-8.
    #[error(
        "{path}, line {line}: the file is not in UTF-8; save it as UTF-8 (plain ASCII is)",
        path = path.display()
    )]
    NotUtf8 {
        /// The file.
        path: PathBuf,
        /// The first line that is not.
        line: u64,
    },
    /// A row with more or fewer cells than the header.
    #[error(
        "{path}, line {line}: {found} cells where the header has {expected}; every row must have a \
         cell for every column (an empty one where nothing was measured)",
        path = path.display()
    )]
    Ragged {
        /// The file.
        path: PathBuf,
        /// The line.
        line: u64,
        /// Cells in the line.
        found: usize,
        /// Cells in the header.
        expected: usize,
    },
    /// Broken quotes or the like.
    #[error("{path}: {reason}", path = path.display())]
    Csv {
        /// The file.
        path: PathBuf,
        /// What the CSV reader said.
        reason: String,
    },
    /// Two columns of one name.
    #[error("{path}, line 1: the column `{name}` occurs twice; rename one", path = path.display())]
    DuplicateColumn {
        /// The file.
        path: PathBuf,
        /// The name.
        name: String,
    },
    /// A column without a name.
    #[error("{path}, line 1: column {position} has no name", path = path.display())]
    UnnamedColumn {
        /// The file.
        path: PathBuf,
        /// Its position, from 1.
        position: usize,
    },
    /// A column that the layout needs is not there.
    #[error(
        "{path}: there is no `{name}` column; the header has: {header}. {remedy}",
        path = path.display()
    )]
    MissingColumn {
        /// The file.
        path: PathBuf,
        /// The column.
        name: &'static str,
        /// The header.
        header: String,
        /// What to do.
        remedy: &'static str,
    },
    /// A file without any channel.
    #[error("{}: there is no channel beside the trace, label and time columns", .0.display())]
    NoChannel(PathBuf),
    /// A file of the folder has other columns than the first.
    #[error(
        "{path}: the columns differ from those of {first}: {difference}; all files of a folder \
         need the same columns",
        path = path.display(), first = first.display()
    )]
    OtherColumns {
        /// The file.
        path: PathBuf,
        /// The first file.
        first: PathBuf,
        /// What differs.
        difference: String,
    },
    /// A cell that should be a number.
    #[error(
        "{place}: `{text}` is not a number (or on/off, true/false for a flag); correct it, or leave \
         the cell empty where nothing was measured"
    )]
    NotANumber {
        /// The place.
        place: Box<Place>,
        /// The cell.
        text: String,
    },
    /// NaN or infinity.
    #[error(
        "{place}: `{text}` is not a finite number; leave the cell empty where nothing was measured"
    )]
    NotFinite {
        /// The place.
        place: Box<Place>,
        /// The cell.
        text: String,
    },
    /// An empty cell where there must be something.
    #[error("{place}: the cell is empty; every row needs it")]
    EmptyCell {
        /// The place.
        place: Box<Place>,
    },
    /// Time that does not go forward.
    #[error(
        "{place}: the time {time} of trace `{trace}` does not come after {before}; time must go \
         forward, so remove repeated rows and sort the rest"
    )]
    TimeNotForward {
        /// The place.
        place: Box<Place>,
        /// The trace.
        trace: String,
        /// The time.
        time: f64,
        /// The time before it.
        before: f64,
    },
    /// A gap that is too long to mend.
    #[error(
        "{place}: trace `{trace}` has a gap of {steps} steps before this row; gaps of up to \
         {allowed} steps are mended, so cut the record there or allow more with --max-gap {steps}"
    )]
    Gap {
        /// The place.
        place: Box<Place>,
        /// The trace.
        trace: String,
        /// The length of the gap, in steps.
        steps: u64,
        /// The longest gap that is mended.
        allowed: u32,
    },
    /// A record of one sample.
    #[error("trace `{0}` has one sample only; a record needs at least two")]
    OneSample(String),
    /// A set of one trace.
    #[error("there is one trace only (`{0}`); to compare traces at least two are needed")]
    OneTrace(String),
    /// All traces are the same.
    #[error("all traces have the same samples, so there is nothing to tell apart")]
    AllAlike,
    /// Every channel is constant.
    #[error("every channel is constant, so there is nothing to search")]
    AllConstant,
    /// Two traces of one name.
    #[error(
        "{path}, line {line}: a second trace is called `{name}`; names must differ",
        path = path.display()
    )]
    DuplicateTrace {
        /// The file.
        path: PathBuf,
        /// The line.
        line: u64,
        /// The name.
        name: String,
    },
    /// A trace with two labels.
    #[error("{place}: trace `{trace}` has the labels `{first}` and `{second}`; it needs one")]
    TwoLabels {
        /// The place.
        place: Box<Place>,
        /// The trace.
        trace: String,
        /// The label before.
        first: String,
        /// The label here.
        second: String,
    },
    /// A label for a trace that is not there.
    #[error(
        "{path}, line {line}: there is no trace `{name}`; remove the line or correct the name",
        path = path.display()
    )]
    LabelWithoutTrace {
        /// The file.
        path: PathBuf,
        /// The line.
        line: u64,
        /// The name.
        name: String,
    },
    /// A trace without a label where others have one.
    #[error("trace `{0}` has no label; give every trace one, or none (--unlabelled ignores them)")]
    TraceWithoutLabel(String),
    /// One label for all.
    #[error(
        "all traces have the label `{0}`, so there is nothing to tell apart by label; use \
         --unlabelled to find groups without labels"
    )]
    OneLabel(String),
    /// A channel asked for is not in the data.
    #[error("the data has no channel or flag `{name}`; it has {known}")]
    UnknownChannel {
        /// The name.
        name: String,
        /// What there is.
        known: String,
    },
}
