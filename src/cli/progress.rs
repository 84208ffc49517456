//! A progress bar on the terminal, and the time that each stage took.

use facula::trials::Progress;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};
use std::sync::{Mutex, PoisonError};
use std::time::Instant;

/// Shows how far a study has got; silent when standard error is no terminal.
pub struct Bar {
    bar: ProgressBar,
    stages: Mutex<Vec<(String, Instant)>>,
}

impl Bar {
    /// A bar, hidden if `quiet`.
    pub fn new(quiet: bool) -> Bar {
        let target = if quiet {
            ProgressDrawTarget::hidden()
        } else {
            ProgressDrawTarget::stderr_with_hz(10)
        };
        let style = ProgressStyle::with_template("{msg:<22} {bar:40} {pos} of {len}, {eta} left")
            .unwrap_or_else(|_| ProgressStyle::default_bar())
            .progress_chars("━╸─");
        Bar {
            bar: ProgressBar::with_draw_target(Some(0), target).with_style(style),
            stages: Mutex::new(Vec::new()),
        }
    }

    /// Take the bar off the terminal; return the seconds of every stage.
    pub fn finish(&self) -> Vec<(String, f64)> {
        self.bar.finish_and_clear();
        let stages = self.stages.lock().unwrap_or_else(PoisonError::into_inner);
        let ends = stages
            .iter()
            .skip(1)
            .map(|stage| stage.1)
            .chain([Instant::now()]);
        stages
            .iter()
            .zip(ends)
            .map(|((name, start), end)| {
                let key = format!("{}_s", name.replace(' ', "_"));
                (key, (end - *start).as_secs_f64())
            })
            .collect()
    }
}

impl Progress for Bar {
    fn stage(&self, name: &str, steps: u64) {
        self.stages
            .lock()
            .unwrap_or_else(PoisonError::into_inner)
            .push((name.to_string(), Instant::now()));
        self.bar.reset();
        self.bar.set_length(steps);
        self.bar.set_message(name.to_string());
    }

    fn advance(&self, steps: u64) {
        self.bar.inc(steps);
    }
}
