//! A progress line on stderr: on a terminal only, and only for work over a second.

use std::io::{self, IsTerminal};
use std::sync::Arc;
use std::sync::mpsc::{RecvTimeoutError, Sender, channel};
use std::thread;
use std::time::Duration;

use gradeline::watch::Watch;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

/// Work shorter than this shows no line.
const PATIENCE: Duration = Duration::from_secs(1);
/// How often the line is drawn.
const TICK: Duration = Duration::from_millis(100);

/// Shows how far a run is.
pub struct Progress {
    line: Arc<ProgressBar>,
    /// Dropped at the end, so that the thread that waits to show the line lets it be.
    still_running: Option<Sender<()>>,
}

impl Progress {
    /// A line that appears after a second, unless it is not wanted or nobody looks.
    pub fn start(wanted: bool) -> Progress {
        let line = ProgressBar::with_draw_target(Some(0), ProgressDrawTarget::hidden());
        if let Ok(style) = ProgressStyle::with_template("{spinner} {msg}  {elapsed}") {
            line.set_style(style);
        }
        let line = Arc::new(line);
        if !wanted || !io::stderr().is_terminal() {
            return Progress {
                line,
                still_running: None,
            };
        }
        let (still_running, ended) = channel::<()>();
        let shown = Arc::clone(&line);
        thread::spawn(move || {
            if ended.recv_timeout(PATIENCE) == Err(RecvTimeoutError::Timeout) {
                shown.set_draw_target(ProgressDrawTarget::stderr());
                shown.enable_steady_tick(TICK);
            }
        });
        Progress {
            line,
            still_running: Some(still_running),
        }
    }
}

impl Watch for Progress {
    fn progress(&self, stage: &'static str, done: u64, total: u64) {
        self.line.set_message(match total {
            0 => stage.to_string(),
            total => format!("{stage}, {done} of {total}"),
        });
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        self.still_running = None;
        self.line.finish_and_clear();
    }
}
