use std::io::{IsTerminal, Write};
use std::sync::Mutex;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::time::{Duration, Instant};

use gaussworthy::survey::Watch;
use indicatif::{ProgressBar, ProgressDrawTarget, ProgressStyle};

/// Where nothing can be redrawn, a line is written this often.
const LINE_EVERY: Duration = Duration::from_secs(10);

/// Notes that are shown: a store on a full disk has one for every case.
const MOST_NOTES: u64 = 20;

/// Set by Ctrl-C.
static STOP: AtomicBool = AtomicBool::new(false);

/// From now on the first Ctrl-C asks the survey to stop and keep what is finished; a second one ends the
/// program at once.
pub fn heed_interrupts() -> Result<(), ctrlc::Error> {
    ctrlc::set_handler(|| {
        if STOP.swap(true, Ordering::SeqCst) {
            std::process::exit(3);
        }
        let _ = writeln!(std::io::stderr(), "\nstopping: what is finished is kept (again to stop at once)");
    })
}

/// Progress of one suite on standard error: a bar with rate and time left on a terminal, plain lines elsewhere.
#[derive(Debug)]
pub struct Progress {
    suite: String,
    total: u64,
    done: AtomicU64,
    points: AtomicU64,
    notes: AtomicU64,
    began: Instant,
    bar: Option<ProgressBar>,
    last_line: Mutex<Instant>,
}

impl Progress {
    pub fn new(suite: &str, cases: usize) -> Self {
        let total = cases as u64;
        let bar = std::io::stderr().is_terminal().then(|| {
            let bar = ProgressBar::with_draw_target(Some(total), ProgressDrawTarget::stderr());
            // The template is a constant; should it ever be wrong, the default bar serves.
            if let Ok(style) =
                ProgressStyle::with_template("{prefix} [{bar:30}] {pos}/{len} cases, {msg}, about {eta} left")
            {
                bar.set_style(style.progress_chars("=> "));
            }
            bar.set_prefix(suite.to_string());
            bar
        });
        let now = Instant::now();
        Self {
            suite: suite.into(),
            total,
            done: AtomicU64::new(0),
            points: AtomicU64::new(0),
            notes: AtomicU64::new(0),
            began: now,
            bar,
            last_line: Mutex::new(now),
        }
    }

    pub fn finish(&self) {
        if let Some(bar) = &self.bar {
            bar.finish_and_clear();
        }
    }

    pub fn interrupted() -> bool {
        STOP.load(Ordering::SeqCst)
    }

    fn rate(&self) -> String {
        let rate = self.points.load(Ordering::Relaxed) as f64 / self.began.elapsed().as_secs_f64().max(1e-3);
        format!("{:.1} million samples/s", rate / 1e6)
    }

    fn line(&self, done: u64) {
        let Ok(mut last) = self.last_line.lock() else { return };
        if last.elapsed() < LINE_EVERY {
            return;
        }
        *last = Instant::now();
        let left = self.began.elapsed().as_secs_f64() * (self.total - done) as f64 / done as f64;
        let _ = writeln!(
            std::io::stderr(),
            "{}: {done}/{} cases, {}, about {left:.0} s left",
            self.suite,
            self.total,
            self.rate()
        );
    }
}

impl Watch for Progress {
    fn case_done(&self, points: u64) {
        self.points.fetch_add(points, Ordering::Relaxed);
        let done = self.done.fetch_add(1, Ordering::Relaxed) + 1;
        match &self.bar {
            Some(bar) => {
                bar.set_message(self.rate());
                bar.inc(1);
            }
            None => self.line(done),
        }
    }

    fn stop(&self) -> bool {
        Self::interrupted()
    }

    fn note(&self, text: &str) {
        let before = self.notes.fetch_add(1, Ordering::Relaxed);
        let text = match before.cmp(&MOST_NOTES) {
            std::cmp::Ordering::Less => text,
            std::cmp::Ordering::Equal => "more of the same is not shown",
            std::cmp::Ordering::Greater => return,
        };
        let say = || {
            let _ = writeln!(std::io::stderr(), "{}: {text}", self.suite);
        };
        match &self.bar {
            Some(bar) => bar.suspend(say),
            None => say(),
        }
    }
}
