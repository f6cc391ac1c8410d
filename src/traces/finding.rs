//! What was noticed about the data and mended by a stated rule.

use std::fmt;

/// Something worth knowing about the data; nothing that stops a search.
#[derive(Debug, Clone, PartialEq)]
pub enum Finding {
    /// Channels that have one value everywhere were set aside.
    ConstantChannels(Vec<String>),
    /// Traces differ in length.
    UnequalLengths {
        /// Samples of the shortest.
        shortest: usize,
        /// Samples of the longest.
        longest: usize,
    },
    /// Unevenly sampled traces were put on a uniform grid.
    Resampled {
        /// How many traces.
        traces: usize,
        /// The step of the grid, in the data's unit of time.
        step: f64,
        /// The unit.
        unit: String,
    },
    /// Gaps were mended.
    GapsMended {
        /// How many gaps.
        gaps: usize,
        /// The longest, in steps.
        longest: u64,
    },
    /// Empty cells between known ones were filled in.
    CellsMended {
        /// The channel.
        channel: String,
        /// How many.
        cells: usize,
    },
    /// Samples before the first or after the last known one stay unknown.
    Unknown {
        /// The channel.
        channel: String,
        /// How many samples.
        samples: usize,
    },
}

impl fmt::Display for Finding {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Finding::ConstantChannels(names) => write!(
                f,
                "{} {} one value everywhere and {} set aside",
                names.join(", "),
                if names.len() == 1 { "has" } else { "have" },
                if names.len() == 1 { "was" } else { "were" }
            ),
            Finding::UnequalLengths { shortest, longest } => write!(
                f,
                "traces differ in length, from {shortest} to {longest} samples: beware of \
                 templates that measure the length of the record"
            ),
            Finding::Resampled { traces, step, unit } => write!(
                f,
                "{traces} unevenly sampled trace(s) were put on a grid of {step} {unit}: channels \
                 by straight lines between samples, flags held"
            ),
            Finding::GapsMended { gaps, longest } => write!(
                f,
                "{gaps} gap(s) of up to {longest} steps were mended: channels by straight lines, \
                 flags held"
            ),
            Finding::CellsMended { channel, cells } => write!(
                f,
                "{cells} empty cell(s) of `{channel}` were filled in: channels by straight lines, \
                 flags held"
            ),
            Finding::Unknown { channel, samples } => write!(
                f,
                "{samples} sample(s) of `{channel}` at the start or end of a trace are empty and \
                 count as not known"
            ),
        }
    }
}
