//! How far the reading of captures is, for who waits.

use std::sync::Mutex;
use std::sync::atomic::{AtomicUsize, Ordering};
use std::time::{Duration, Instant};

use arcstead::Watch;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

use crate::console::Talk;
use crate::interrupt;
use crate::table::figures::count;

/// How often a line is written where there is no terminal to draw on.
const LINE_EVERY: Duration = Duration::from_secs(5);

/// Counts captures: a bar on a terminal, else a line on stderr now and then; nothing with `--quiet`. Tells the work to stop
/// on Ctrl-C.
pub(crate) struct Progress<'t, 'w> {
    talk: &'t Talk<'w>,
    total: Option<usize>,
    done: AtomicUsize,
    bar: Option<ProgressBar>,
    last_line: Mutex<Instant>,
}

impl<'t, 'w> Progress<'t, 'w> {
    /// Begins to count; `total` where it is known.
    pub(crate) fn begin(talk: &'t Talk<'w>, total: Option<usize>) -> Self {
        let bar = (talk.terminal && !talk.quiet).then(|| {
            let length = total.map(|total| total as u64);
            let bar = ProgressBar::with_draw_target(length, ProgressDrawTarget::stderr());
            let template = if total.is_some() {
                "{bar:40} {pos} of {len} captures, {eta} left"
            } else {
                "{pos} captures"
            };
            // The template is fixed; were it wrong, the bar would look plain.
            if let Ok(style) = ProgressStyle::with_template(template) {
                bar.set_style(style.progress_chars("=> "));
            }
            bar
        });
        Self { talk, total, done: AtomicUsize::new(0), bar, last_line: Mutex::new(Instant::now()) }
    }

    /// Takes the bar away.
    pub(crate) fn end(self) {
        if let Some(bar) = self.bar {
            bar.finish_and_clear();
        }
    }
}

impl Watch for Progress<'_, '_> {
    fn capture_done(&self) {
        let done = self.done.fetch_add(1, Ordering::Relaxed) + 1;
        if let Some(bar) = &self.bar {
            bar.inc(1);
            return;
        }
        // A thread that finds the clock taken leaves the line to the other.
        if let Ok(mut last_line) = self.last_line.try_lock()
            && last_line.elapsed() >= LINE_EVERY
        {
            *last_line = Instant::now();
            match self.total {
                Some(total) => self.talk.say(&format!("{done} of {total} captures done")),
                None => self.talk.say(&format!("{} done", count(done, "capture"))),
            }
        }
    }

    fn stop(&self) -> bool {
        interrupt::asked()
    }
}
