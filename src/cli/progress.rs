//! Progress of long work, on a terminal only.

use crate::cli::show::Show;
use crate::report::digits;
use crate::study::Event;
use indicatif::ProgressBar;
use indicatif::ProgressDrawTarget;
use indicatif::ProgressStyle;
use std::io;
use std::io::IsTerminal;
use std::time::Duration;

/// A line that tells the phase, the round, the panels, the bar reached and the time left.
pub(super) struct Progress(ProgressBar);

impl Progress {
    /// A line on standard error if that is a terminal and nobody asked for quiet.
    pub(super) fn start(show: &Show) -> Progress {
        if show.quiet || !io::stderr().is_terminal() {
            return Progress(ProgressBar::with_draw_target(None, ProgressDrawTarget::hidden()));
        }
        let bar = ProgressBar::new_spinner();
        if let Ok(style) = ProgressStyle::with_template("{spinner} {elapsed} {prefix} {msg}") {
            bar.set_style(style);
        }
        bar.enable_steady_tick(Duration::from_millis(120));
        Progress(bar)
    }

    /// Shows an event.
    pub(super) fn tell(&self, event: &Event) {
        match event {
            Event::Phase(phase) => self.0.set_prefix(phase_text(phase)),
            Event::Round { .. } => self.0.set_message(round_text(event)),
        }
    }

    /// Takes the line away.
    pub(super) fn end(self) {
        self.0.finish_and_clear();
    }
}

fn phase_text(phase: &'static str) -> &'static str {
    match phase {
        "read" => "reading",
        "inspect" => "inspecting",
        "panel" => "panelling",
        "assemble" => "assembling",
        "factor" => "factorising",
        "correct" => "correcting",
        "refine" => "refining",
        "results" => "working out results",
        other => other,
    }
}

fn round_text(event: &Event) -> String {
    let Event::Round { number, panels, reached, asked, left } = event else { return String::new() };
    let left = left.map(|seconds| format!(", about {} left", duration(seconds))).unwrap_or_default();
    let (reached, asked) = (digits::percent(*reached, false), digits::percent(*asked, false));
    format!("(round {number}: {panels} panels, bar {reached} of {asked} asked{left})")
}

fn duration(seconds: f64) -> String {
    if seconds < 90.0 { format!("{seconds:.0} s") } else { format!("{:.0} min", seconds / 60.0) }
}
