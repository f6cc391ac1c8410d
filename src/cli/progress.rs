//! The progress bar: what is being searched, how far, how long still, the best
//! so far. Shown only on a terminal.

use std::time::Duration;

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use super::terminal;

/// A progress bar, or nothing when nobody watches.
#[derive(Debug)]
pub(super) struct Progress {
    bar: ProgressBar,
}

impl Progress {
    /// A bar for so many steps of work; hidden when `quiet`, or when standard
    /// error is no terminal.
    pub(super) fn new(total: usize, quiet: bool) -> Self {
        let bar = ProgressBar::new(total as u64);
        if quiet || !terminal::is_watched() {
            bar.set_draw_target(ProgressDrawTarget::hidden());
        } else {
            bar.enable_steady_tick(Duration::from_millis(200));
        }
        let template = "{bar:24} {pos} of {len} templates, {eta} left  {wide_msg}";
        if let Ok(style) = ProgressStyle::with_template(template) {
            bar.set_style(style.progress_chars("=> "));
        }
        Progress { bar }
    }

    /// Moves the bar and says what goes on.
    pub(super) fn set(&self, done: usize, message: String) {
        self.bar.set_position(done as u64);
        self.bar.set_message(message);
    }

    /// Takes the bar away.
    pub(super) fn finish(&self) {
        self.bar.finish_and_clear();
    }
}
