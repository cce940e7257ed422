//! How far a run is, on stderr while that is a terminal.

use super::exit::Exit;
use super::interrupt::Interrupt;
use super::screen::complain;
use super::table::printable;
use super::units;
use bandproof::job::Progress;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressState, ProgressStyle};
use std::fmt::{self, Write};
use std::io::{IsTerminal, stderr};
use std::path::Path;
use std::sync::Arc;
use std::time::Duration;

/// A line that counts finished bytes; failed recordings are named above it.
pub struct Meter {
    bar: ProgressBar,
    /// Knows whether the run is to end early.
    interrupt: Arc<Interrupt>,
}

impl Meter {
    /// A meter that shows itself only on a terminal, and never if `quiet`, and ends the run
    /// early once the user interrupts it; `left` says what comes of the run then. Complains
    /// where interrupts can't be listened for.
    pub fn new(quiet: bool, left: &'static str) -> Result<Self, Exit> {
        let bar = ProgressBar::with_draw_target(Some(0), target(quiet));
        count_bytes(&bar);
        let interrupt = Arc::new(Interrupt::default());
        let line = bar.clone();
        interrupt.answer_with(move || {
            line.suspend(|| complain(&format!("interrupted: {left}; interrupt again to leave at once")));
        });
        interrupt.watch().map_err(|error| {
            complain(&format!("interrupts can't be listened for: {error}"));
            Exit::Refused
        })?;
        Ok(Meter { bar, interrupt })
    }

    /// From whatever the line said before to bytes.
    fn count(&self) {
        self.bar.disable_steady_tick();
        count_bytes(&self.bar);
    }

    /// Takes the line away.
    pub fn clear(&self) {
        self.bar.finish_and_clear();
    }
}

/// Runs `work`, which finds stages from bands, under a line that says so.
pub fn finding<T>(quiet: bool, work: impl FnOnce() -> T) -> T {
    let bar = ProgressBar::with_draw_target(None, target(quiet));
    say_finding(&bar);
    let result = work();
    bar.finish_and_clear();
    result
}

fn target(quiet: bool) -> ProgressDrawTarget {
    let shown = !quiet && stderr().is_terminal();
    if shown { ProgressDrawTarget::stderr_with_hz(5) } else { ProgressDrawTarget::hidden() }
}

/// A template that is wrong would only cost the line its looks.
fn count_bytes(bar: &ProgressBar) {
    if let Ok(style) = ProgressStyle::with_template("{wide_bar} {done}{pace}") {
        bar.set_style(
            style
                .with_key("done", |state: &ProgressState, out: &mut dyn Write| done(state, out).unwrap_or(()))
                .with_key("pace", |state: &ProgressState, out: &mut dyn Write| pace(state, out).unwrap_or(()))
                .progress_chars("=> "),
        );
    }
}

/// Nobody knows how long that will be; the time so far shows that it goes on.
fn say_finding(bar: &ProgressBar) {
    if let Ok(style) = ProgressStyle::with_template("Finding filters from the bands, {elapsed}") {
        bar.set_style(style);
    }
    bar.enable_steady_tick(Duration::from_secs(1));
}

fn done(state: &ProgressState, out: &mut dyn Write) -> fmt::Result {
    write!(out, "{} of {}", units::bytes(state.pos()), units::bytes(state.len().unwrap_or(0)))
}

fn pace(state: &ProgressState, out: &mut dyn Write) -> fmt::Result {
    match reckon(state.pos(), state.len().unwrap_or(0), state.elapsed().as_secs_f64()) {
        Some((per_second, left_s)) => {
            write!(out, ", {} a second, about {} left", units::bytes(per_second as u64), units::about(left_s))
        }
        None => Ok(()),
    }
}

/// Bytes a second and seconds left. `None` at the very beginning, when a few blocks
/// would say nothing.
fn reckon(done: u64, all: u64, elapsed_s: f64) -> Option<(f64, f64)> {
    // The mean since the start: recordings of one run are much alike, and a mean of the
    // last moments would leap with every one that begins or ends.
    let per_second = done as f64 / elapsed_s;
    (done > 0 && elapsed_s >= 1.0).then(|| (per_second, all.saturating_sub(done) as f64 / per_second))
}

impl Progress for Meter {
    fn finding(&self) {
        say_finding(&self.bar);
    }

    fn checking(&self, bytes: u64) {
        self.count();
        self.bar.set_length(bytes);
        self.bar.reset_elapsed();
    }

    fn planned(&self, _recordings: u64, bytes: u64) {
        self.count();
        self.bar.set_position(0);
        self.bar.set_length(bytes);
        // Designs and the witness came before; they say nothing of the pace.
        self.bar.reset_elapsed();
    }

    fn advanced(&self, bytes: u64) {
        self.bar.inc(bytes);
    }

    fn finished(&self, path: &str, failed: Option<&str>) {
        if let Some(error) = failed {
            self.bar.suspend(|| complain(&printable(&format!("{path}: {error}"))));
        }
    }

    fn interrupted(&self) -> bool {
        self.interrupt.asked()
    }

    fn temporary(&self, path: &Path) {
        self.interrupt.temporary(path);
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_pace_is_the_mean_since_the_start() {
        assert_eq!(reckon(200, 1000, 2.0), Some((100.0, 8.0)));
        assert_eq!(reckon(1000, 1000, 5.0), Some((200.0, 0.0)));
        // A recording that grew while it was read.
        assert_eq!(reckon(1100, 1000, 5.0), Some((220.0, 0.0)));
    }

    #[test]
    fn nothing_is_reckoned_from_nothing() {
        assert_eq!(reckon(0, 1000, 2.0), None);
        assert_eq!(reckon(10, 1000, 0.9), None);
    }
}
