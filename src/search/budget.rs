//! Limits of a search. The only place that looks at a clock: time cuts the
//! sequence of batches after a whole batch and decides nothing else, so a run
//! cut at batch n equals the first n batches of any other.

use std::fmt;
use std::time::{Duration, Instant};

use serde::{Deserialize, Serialize};

/// When a search stops.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Limits {
    /// After so many scored templates. Default: 2,000.
    pub templates: usize,
    /// After the templates of this size. Default: what the grammars say.
    pub size: Option<u32>,
    /// After so much time, when the batch then under way is done. Default:
    /// none.
    pub time: Option<Duration>,
    /// Bytes that comparing templates may take. From three quarters on they are
    /// compared by their normal form alone, which takes a third as much; at the
    /// limit the search stops. Default: 4 GiB.
    pub memory: usize,
}

impl Default for Limits {
    fn default() -> Self {
        Limits {
            templates: 2_000,
            size: None,
            time: None,
            memory: 4 << 30,
        }
    }
}

/// Why a search stopped.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize, Deserialize)]
#[serde(rename_all = "kebab-case")]
pub enum StopReason {
    /// Every template of every grammar has been listed.
    Exhausted,
    /// The limit on scored templates was reached.
    Templates,
    /// The limit on time was reached.
    Time,
    /// The memory for comparing templates is used up.
    Memory,
    /// The person at the keyboard, or the system, asked for it.
    Interrupted,
}

impl fmt::Display for StopReason {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(match self {
            StopReason::Exhausted => "every template of the grammars was listed",
            StopReason::Templates => "the limit on templates was reached (--templates)",
            StopReason::Time => "the limit on time was reached (--for)",
            StopReason::Memory => "the memory for comparing templates is used up (--memory)",
            StopReason::Interrupted => "interrupted",
        })
    }
}

/// A clock that started with the search.
#[derive(Debug)]
pub struct Budget {
    limits: Limits,
    start: Instant,
}

impl Budget {
    /// Starts the clock.
    pub fn start(limits: Limits) -> Self {
        Budget {
            limits,
            start: Instant::now(),
        }
    }

    /// The limits.
    pub fn limits(&self) -> &Limits {
        &self.limits
    }

    /// Time since the start.
    pub fn elapsed(&self) -> Duration {
        self.start.elapsed()
    }

    /// Whether to go on after a batch.
    ///
    /// # Errors
    /// The reason to stop.
    pub fn check(&self, scored: usize, bytes: usize) -> Result<(), StopReason> {
        if bytes >= self.limits.memory {
            return Err(StopReason::Memory);
        }
        if scored >= self.limits.templates {
            return Err(StopReason::Templates);
        }
        match self.limits.time {
            Some(time) if self.elapsed() >= time => Err(StopReason::Time),
            _ => Ok(()),
        }
    }
}
