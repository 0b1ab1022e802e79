//! Many files over all processor cores, printed in the order given.

use crate::args::{Measure, Outputs};
use crate::convert;
use crate::measure::{Measured, Timebase, measure};
use crate::names::distinct_names;
use crate::output::Report;
use crate::output::csv::CsvReport;
use crate::output::json::JsonReport;
use crate::output::table::TableReport;
use crate::picture::PictureReport;
use anyhow::{Context as _, Result, anyhow, bail};
use indicatif::{ProgressBar, ProgressStyle};
use plumbtone_analysis::Settings;
use plumbtone_analysis::tuning::Tuning;
use std::collections::BTreeMap;
use std::io::ErrorKind;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::path::{Path, PathBuf};
use std::process::ExitCode;
use std::sync::{Condvar, Mutex, MutexGuard, PoisonError, mpsc};
use std::thread;

/// Exit status for bad input, bad usage or nothing measurable; the argument parser has the same.
const EXIT_BAD: u8 = 2;
/// How far measuring runs ahead of printing, in files, since results wait in memory and open temporary files.
const AHEAD_FILES: usize = 64;

/// Measures every file and prints what comes of it.
pub(crate) fn measure_files(job: &Measure) -> ExitCode {
    match try_measure_files(job) {
        Ok(true) => ExitCode::SUCCESS,
        Ok(false) => ExitCode::from(EXIT_BAD),
        Err(error) => {
            eprintln!("plumbtone: {error:#}");
            ExitCode::from(EXIT_BAD)
        }
    }
}

/// True when every file was measured and had a pitch somewhere.
fn try_measure_files(job: &Measure) -> Result<bool> {
    check(job)?;
    let outputs = FileOutputs::new(job)?;
    let bar = progress_bar(&job.files);
    let queue = Queue::default();
    let workers = thread::available_parallelism().map_or(1, usize::from).min(job.files.len());
    thread::scope(|scope| {
        let (sender, results) = mpsc::channel();
        for worker in 0..workers {
            let (sender, queue, outputs, bar) = (sender.clone(), &queue, &outputs, &bar);
            thread::Builder::new()
                .name(format!("measure {worker}"))
                .spawn_scoped(scope, move || {
                    while let Some(index) = queue.take(job.files.len()) {
                        let result = measure_one(job, index, outputs, queue, bar);
                        if sender.send((index, result)).is_err() {
                            break;
                        }
                    }
                })
                .context("cannot start a thread")
                .inspect_err(|_| queue.stop())?;
        }
        drop(sender);
        let all_good = print_in_order(job, &results, &queue, &bar);
        queue.stop();
        bar.finish_and_clear();
        all_good
    })
}

/// Checks what does not depend on any file, so that it is said once.
fn check(job: &Measure) -> Result<()> {
    Tuning::new(job.what.concert_pitch, job.what.temperament)?;
    let any_rate = Settings::new(48_000.0);
    let highest_hz = job.what.highest.unwrap_or(any_rate.highest_hz);
    Settings { lowest_hz: job.what.lowest, highest_hz, ..any_rate }.validate()?;
    if job.what.end.is_some_and(|end| end <= job.what.start) {
        bail!("--end must lie after --start");
    }
    Ok(())
}

fn measure_one(
    job: &Measure,
    index: usize,
    outputs: &FileOutputs<'_>,
    queue: &Queue,
    bar: &ProgressBar,
) -> Result<Measured> {
    let path = &job.files[index];
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
        measure(path, &job.what, |timebase| outputs.reports(index, timebase), progress)
    }));
    bar.inc(bytes - shown);
    result.unwrap_or_else(|_| {
        Err(anyhow!("was not measured, because of a defect in this program: please report it"))
    })
}

/// Prints results as soon as their turn has come. False when a file failed or had nothing measurable.
fn print_in_order(
    job: &Measure,
    results: &mpsc::Receiver<(usize, Result<Measured>)>,
    queue: &Queue,
    bar: &ProgressBar,
) -> Result<bool> {
    let mut waiting = BTreeMap::new();
    let mut all_good = true;
    let mut printed = 0;
    for (index, result) in results {
        waiting.insert(index, result);
        while let Some(result) = waiting.remove(&printed) {
            match bar.suspend(|| print(&job.files[printed], result)) {
                Ok(good) => all_good &= good,
                // Whoever reads the output has had enough.
                Err(error) if error.kind() == ErrorKind::BrokenPipe => return Ok(all_good),
                Err(error) => return Err(error).context("cannot print"),
            }
            printed += 1;
            queue.advance(printed);
            bar.set_message(format!("{printed} of {} files", job.files.len()));
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
    if !measured.pitched {
        say(&"nothing measurable: no single pitch was found");
    }
    Ok(measured.pitched && measured.unmet.is_empty())
}

/// Where the figures of each file go.
struct FileOutputs<'a> {
    to: &'a Outputs,
    names: Vec<String>,
}

impl<'a> FileOutputs<'a> {
    fn new(job: &'a Measure) -> Result<Self> {
        if let Some(folder) = &job.to.csv {
            std::fs::create_dir_all(folder)
                .with_context(|| format!("cannot make the folder {}", folder.display()))?;
        }
        Ok(Self { to: &job.to, names: distinct_names(&job.files) })
    }

    fn reports(&self, index: usize, timebase: Timebase) -> Result<Vec<Box<dyn Report>>> {
        let mut reports: Vec<Box<dyn Report>> = Vec::new();
        if self.to.json {
            reports.push(Box::new(JsonReport::new(timebase)));
        } else {
            reports.push(Box::new(TableReport::new()));
        }
        if let Some(folder) = &self.to.csv {
            reports.push(Box::new(CsvReport::new(folder, &self.names[index], timebase)?));
        }
        if let Some(picture) = &self.to.picture {
            let place = self.picture_place(picture, index);
            reports.push(Box::new(PictureReport::new(place, self.to.note, timebase)));
        }
        Ok(reports)
    }

    /// The picture's own name for one input; with the input's name in it for several.
    fn picture_place(&self, picture: &Path, index: usize) -> PathBuf {
        if self.names.len() == 1 {
            return picture.to_owned();
        }
        let mut name = picture.file_stem().unwrap_or_default().to_owned();
        name.push("-");
        name.push(&self.names[index]);
        name.push(".");
        name.push(picture.extension().unwrap_or_default());
        picture.with_file_name(name)
    }
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
