//! Many files over all processor cores, printed in the order given.

use crate::args::What;
use crate::convert;
use crate::measure::{Measured, Timebase, measure};
use crate::output::Report;
use anyhow::{Context as _, Result, anyhow, bail};
use indicatif::{ProgressBar, ProgressStyle};
use plumbtone_analysis::Settings;
use plumbtone_analysis::tuning::Tuning;
use std::collections::BTreeMap;
use std::io::ErrorKind;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError, mpsc};
use std::thread;

/// Exit status for bad input, bad usage or nothing measurable; the argument parser has the same.
pub(crate) const EXIT_BAD: u8 = 2;
/// Exit status after an interrupt, as shells count it.
pub(crate) const EXIT_INTERRUPTED: u8 = 130;
/// How far measuring runs ahead of printing, in files, since results wait in memory and open temporary files.
const AHEAD_FILES: usize = 64;

/// What is to be done with many files.
pub(crate) trait Job: Sync {
    /// The files, in the order of printing.
    fn files(&self) -> &[PathBuf];

    /// What is measured, and how.
    fn what(&self) -> &What;

    /// The reports that take in what the engine says of the file with an index.
    fn reports(&self, index: usize, timebase: Timebase) -> Result<Vec<Box<dyn Report>>>;
}

/// How a batch ended.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Ended {
    /// All that was asked for is there.
    Whole,
    /// Something of some file could not be had.
    Lacking,
    /// The user stopped it.
    Interrupted,
}

/// What the program ends with, where a command has no status of its own; says what went wrong.
pub(crate) fn exit_code(ended: Result<Ended>) -> ExitCode {
    match ended {
        Ok(Ended::Whole) => ExitCode::SUCCESS,
        Ok(Ended::Lacking) => ExitCode::from(EXIT_BAD),
        Ok(Ended::Interrupted) => ExitCode::from(EXIT_INTERRUPTED),
        Err(error) => {
            eprintln!("plumbtone: {error:#}");
            ExitCode::from(EXIT_BAD)
        }
    }
}

/// Runs every file through the engine and prints what comes of it; `done` hears of each as it is printed.
///
/// # Errors
/// What concerns no single file.
pub(crate) fn run(
    job: &impl Job,
    mut done: impl FnMut(&Path, &Result<Measured>) + Send,
) -> Result<Ended> {
    check(job.what())?;
    let bar = progress_bar(job.files());
    let queue = Arc::new(Queue::default());
    stop_on_interrupt(&queue)?;
    let workers = thread::available_parallelism().map_or(1, usize::from).min(job.files().len());
    thread::scope(|scope| {
        let (sender, results) = mpsc::channel();
        for worker in 0..workers {
            let (sender, queue, bar) = (sender.clone(), &*queue, &bar);
            thread::Builder::new()
                .name(format!("measure {worker}"))
                .spawn_scoped(scope, move || {
                    while let Some(index) = queue.take(job.files().len()) {
                        let result = measure_one(job, index, queue, bar);
                        if sender.send((index, result)).is_err() {
                            break;
                        }
                    }
                })
                .context("cannot start a thread")
                .inspect_err(|_| queue.stop())?;
        }
        drop(sender);
        let all_good = print_in_order(job, &results, &queue, &bar, &mut done);
        let interrupted = queue.stopped();
        queue.stop();
        bar.finish_and_clear();
        Ok(match all_good? {
            _ if interrupted => Ended::Interrupted,
            true => Ended::Whole,
            false => Ended::Lacking,
        })
    })
}

/// Lets an interrupt (Ctrl-C) end the work instead of the process, so that no half-written file stays behind.
fn stop_on_interrupt(queue: &Arc<Queue>) -> Result<()> {
    let queue = Arc::clone(queue);
    ctrlc::set_handler(move || queue.stop()).context("cannot listen for interrupts")
}

/// Checks what does not depend on any file, so that it is said once.
fn check(what: &What) -> Result<()> {
    Tuning::new(what.concert_pitch, what.temperament)?;
    let any_rate = Settings::new(48_000.0);
    let highest_hz = what.highest.unwrap_or(any_rate.highest_hz);
    Settings { lowest_hz: what.lowest, highest_hz, ..any_rate }.validate()?;
    if what.end.is_some_and(|end| end <= what.start) {
        bail!("--end must lie after --start");
    }
    Ok(())
}

fn measure_one(job: &impl Job, index: usize, queue: &Queue, bar: &ProgressBar) -> Result<Measured> {
    let path = &job.files()[index];
    let bytes = size_of(path);
    let mut shown = 0;
    let progress = |share: f64| {
        let done = convert::samples_in(share, bytes as f64).min(bytes);
        bar.inc(done.saturating_sub(shown));
        shown = shown.max(done);
        if queue.stopped() { Err(anyhow!("was not finished")) } else { Ok(()) }
    };
    // A decoder or the engine that panics on one file must not take the others along.
    let result = catch_unwind(AssertUnwindSafe(|| {
        measure(path, job.what(), |timebase| job.reports(index, timebase), progress)
    }));
    bar.inc(bytes - shown);
    result.unwrap_or_else(|_| {
        Err(anyhow!("was not measured, because of a defect in this program: please report it"))
    })
}

/// Prints results as soon as their turn has come. False when a file failed or had nothing measurable.
fn print_in_order(
    job: &impl Job,
    results: &mpsc::Receiver<(usize, Result<Measured>)>,
    queue: &Queue,
    bar: &ProgressBar,
    done: &mut impl FnMut(&Path, &Result<Measured>),
) -> Result<bool> {
    let mut waiting = BTreeMap::new();
    let mut all_good = true;
    let mut printed = 0;
    for (index, result) in results {
        waiting.insert(index, result);
        while let Some(result) = waiting.remove(&printed) {
            let path = &job.files()[printed];
            done(path, &result);
            match bar.suspend(|| print(path, result)) {
                Ok(good) => all_good &= good,
                // Whoever reads the output has had enough.
                Err(error) if error.kind() == ErrorKind::BrokenPipe => return Ok(all_good),
                Err(error) => return Err(error).context("cannot print"),
            }
            printed += 1;
            queue.advance(printed);
            bar.set_message(format!("{printed} of {} files", job.files().len()));
        }
    }
    Ok(all_good)
}

/// Prints one result. True when all that was asked for is there.
fn print(path: &Path, result: Result<Measured>) -> std::io::Result<bool> {
    let say = |what: &dyn std::fmt::Display| eprintln!("plumbtone: {}: {what}", path.display());
    let measured = match result {
        Ok(measured) => measured,
        Err(error) => {
            say(&format_args!("{error:#}"));
            return Ok(false);
        }
    };
    if let Some(text) = measured.text {
        text.print(&mut std::io::stdout().lock())?;
    }
    measured.remarks.iter().chain(&measured.unmet).for_each(|remark| say(remark));
    Ok(measured.unmet.is_empty())
}

/// Which file is next, and how far printing has come.
#[derive(Default)]
struct Queue {
    state: Mutex<QueueState>,
    moved: Condvar,
}

#[derive(Default)]
struct QueueState {
    next: usize,
    printed: usize,
    stopped: bool,
}

impl Queue {
    /// The next of `count` files, once printing is near enough; `None` when there is no more to do.
    fn take(&self, count: usize) -> Option<usize> {
        let too_far =
            |state: &mut QueueState| !state.stopped && state.next >= state.printed + AHEAD_FILES;
        let mut state =
            self.moved.wait_while(self.lock(), too_far).unwrap_or_else(PoisonError::into_inner);
        if state.stopped || state.next >= count {
            return None;
        }
        state.next += 1;
        Some(state.next - 1)
    }

    fn advance(&self, printed: usize) {
        self.lock().printed = printed;
        self.moved.notify_all();
    }

    fn stop(&self) {
        self.lock().stopped = true;
        self.moved.notify_all();
    }

    fn stopped(&self) -> bool {
        self.lock().stopped
    }

    fn lock(&self) -> MutexGuard<'_, QueueState> {
        self.state.lock().unwrap_or_else(PoisonError::into_inner)
    }
}

/// A bar over the bytes of all files, on a terminal only.
fn progress_bar(files: &[PathBuf]) -> ProgressBar {
    let bar = ProgressBar::new(files.iter().map(|path| size_of(path)).sum());
    if let Ok(style) = ProgressStyle::with_template("{bar:40} {percent:>3} %  {msg}  {eta} left") {
        bar.set_style(style);
    }
    bar.set_message(format!("0 of {} files", files.len()));
    bar
}

fn size_of(path: &Path) -> u64 {
    std::fs::metadata(path).map_or(0, |facts| facts.len())
}
