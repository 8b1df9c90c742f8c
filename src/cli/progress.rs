//! A progress bar on stderr, where that is a terminal.

use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

/// A bar that counts frames.
pub(super) struct Progress {
    bar: ProgressBar,
}

impl Progress {
    /// A bar, or none at all where `quiet`; the library draws nothing where stderr is no terminal.
    pub(super) fn new(quiet: bool) -> Self {
        let target = if quiet {
            ProgressDrawTarget::hidden()
        } else {
            ProgressDrawTarget::stderr()
        };
        let bar = ProgressBar::with_draw_target(None, target);
        if let Ok(style) = ProgressStyle::with_template("{bar:30} frame {pos} of {len}  {eta} left")
        {
            bar.set_style(style);
        }
        Self { bar }
    }

    /// Tells how many frames are done, of how many if known.
    pub(super) fn tell(&self, done: usize, of: Option<usize>) {
        if let Some(of) = of {
            self.bar.set_length(u64::try_from(of).unwrap_or(u64::MAX));
        }
        self.bar
            .set_position(u64::try_from(done).unwrap_or(u64::MAX));
    }
}

impl Drop for Progress {
    fn drop(&mut self) {
        self.bar.finish_and_clear();
    }
}
