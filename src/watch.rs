//! Watching a run: progress out, a wish to stop in. The library never prints; whoever runs it decides what to show.

use crate::finding::Error;

/// What a run tells and asks while it goes.
pub trait Watch: Sync {
    /// A stage has done `done` of `total` steps. `total` is 0 while it is not known.
    fn progress(&self, _stage: &'static str, _done: u64, _total: u64) {}

    /// Whether the run should stop before its end.
    fn cancelled(&self) -> bool {
        false
    }
}

/// Watches nothing.
pub struct Unwatched;

impl Watch for Unwatched {}

/// Tells a stage's progress, and stops the run if that is wished.
///
/// # Errors
/// [`Error::Cancelled`] when the watcher wants the run to stop.
pub fn step(watch: &dyn Watch, stage: &'static str, done: u64, total: u64) -> Result<(), Error> {
    watch.progress(stage, done, total);
    if watch.cancelled() {
        Err(Error::Cancelled)
    } else {
        Ok(())
    }
}
