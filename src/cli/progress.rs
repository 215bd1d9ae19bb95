//! A progress bar on standard error when the simulation takes longer than a second and a person is watching.

use std::io::IsTerminal;
use std::sync::Mutex;
use std::sync::atomic::{AtomicU64, Ordering};
use std::time::{Duration, Instant};

use indicatif::{ProgressBar, ProgressStyle};

use crate::solver::Progress;

/// How long a simulation may run unseen.
const PATIENCE: Duration = Duration::from_secs(1);

pub(super) struct Bar {
    watched: bool,
    state: Mutex<Option<(Instant, u64)>>,
    finished: AtomicU64,
    bar: Mutex<Option<ProgressBar>>,
}

impl Bar {
    pub(super) fn new() -> Self {
        Self {
            watched: std::io::stderr().is_terminal(),
            state: Mutex::new(None),
            finished: AtomicU64::new(0),
            bar: Mutex::new(None),
        }
    }
}

fn held<T>(mutex: &Mutex<T>) -> std::sync::MutexGuard<'_, T> {
    mutex.lock().unwrap_or_else(std::sync::PoisonError::into_inner)
}

impl Progress for Bar {
    fn begin(&self, total: u64) {
        self.finished.store(0, Ordering::Relaxed);
        *held(&self.state) = Some((Instant::now(), total));
    }

    fn advance(&self, finished: u64) {
        let done = self.finished.fetch_add(finished, Ordering::Relaxed) + finished;
        if !self.watched {
            return;
        }
        let Some((start, total)) = *held(&self.state) else { return };
        if start.elapsed() < PATIENCE {
            return;
        }
        let mut bar = held(&self.bar);
        let bar = bar.get_or_insert_with(|| {
            let bar = ProgressBar::new(total);
            let style =
                ProgressStyle::with_template("checking by simulation {wide_bar} {percent} %");
            match style {
                Ok(style) => bar.with_style(style),
                Err(_) => bar,
            }
        });
        bar.set_position(done);
    }

    fn end(&self) {
        if let Some(bar) = held(&self.bar).take() {
            bar.finish_and_clear();
        }
        *held(&self.state) = None;
    }
}
