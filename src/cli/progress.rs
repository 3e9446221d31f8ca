//! Progress bars on a terminal, silence in a pipe.

use std::io::IsTerminal;
use std::time::Duration;

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use crate::study::Progress;

/// Shows each stage of a run on standard error.
pub(super) struct Bars {
    bar: ProgressBar,
}

impl Bars {
    pub(super) fn new() -> Self {
        let target = if std::io::stderr().is_terminal() {
            ProgressDrawTarget::stderr_with_hz(12)
        } else {
            ProgressDrawTarget::hidden()
        };
        let bar = ProgressBar::with_draw_target(Some(0), target);
        // The template is a constant, so the fallback never shows.
        let style = ProgressStyle::with_template("{msg:36} {bar:28} {pos}/{len}  {elapsed}");
        bar.set_style(style.unwrap_or_else(|_| ProgressStyle::default_bar()));
        bar.enable_steady_tick(Duration::from_millis(120));
        Self { bar }
    }
}

impl Progress for Bars {
    fn stage(&self, name: &str, steps: u64) {
        self.bar.set_length(steps);
        self.bar.set_position(0);
        self.bar.set_message(name.to_string());
    }

    fn step(&self) {
        self.bar.inc(1);
    }
}

impl Drop for Bars {
    fn drop(&mut self) {
        self.bar.finish_and_clear();
    }
}
