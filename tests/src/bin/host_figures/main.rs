//! Prints what the plugin costs in a host: loading, memory, and the workers' time with many instances (Linux only).
//!
//! `host_figures BUNDLE [SECONDS]`
#![expect(clippy::print_stdout, reason = "printing is what this program is for")]

mod process;

use std::path::PathBuf;
use std::thread;
use std::time::{Duration, Instant};

use clack_host::events::event_types::ParamValueEvent;
use clack_host::prelude::*;
use plumbtone_analysis::signals::{Random, Timbre, Tone, narrow, sample_count};
use plumbtone_tests::clap_host::{Failure, Format, Instance, Library, Running};
use plumbtone_tests::readings::{VARIABLE, read_logs};

const RATE: f64 = 48_000.0;
const BLOCK: usize = 512;
/// Instances of the large session.
const INSTANCES: usize = 64;
/// Length of each measurement unless told otherwise, in seconds.
const SECONDS: f64 = 10.0;
/// Instances made to time one.
const MADE: usize = 30;
/// Instances made and dropped to see whether memory grows.
const CYCLES: usize = 100;

fn main() -> Result<(), Failure> {
    let mut arguments = std::env::args_os().skip(1);
    let bundle = PathBuf::from(arguments.next().ok_or("host_figures BUNDLE [SECONDS]")?);
    let seconds = match arguments.next() {
        Some(text) => text.to_string_lossy().parse()?,
        None => SECONDS,
    };
    let started = Instant::now();
    let library = Library::load(&bundle)?;
    println!("library loaded                       {:8.3} ms", milliseconds(started.elapsed()));
    // One stays throughout, as in a session: making further ones does not start the pool anew.
    let _first = Instance::new(&library)?;
    let mut times = (0..MADE).map(|_| made_in(&library)).collect::<Result<Vec<_>, _>>()?;
    times.sort_unstable();
    println!("instance created (median of {MADE})      {:8.3} ms", milliseconds(times[MADE / 2]));
    let sound = tone(seconds);
    let silence = vec![0.0; sound.len()];
    memory(&library, &sound)?;
    growth(&library, &sound[..sample_count(0.3, RATE)])?;
    for (what, samples, watched) in
        [("on sound", &sound, true), ("on silence", &silence, true), ("unwatched", &sound, false)]
    {
        session(&library, what, samples, watched)?;
    }
    if let Some(folder) = std::env::var_os(VARIABLE) {
        count_gaps(&PathBuf::from(folder))?;
    }
    Ok(())
}

fn made_in(library: &Library) -> Result<Duration, Failure> {
    let before = Instant::now();
    let instance = Instance::new(library)?;
    let made = before.elapsed();
    drop(instance);
    Ok(made)
}

fn tone(seconds: f64) -> Vec<f32> {
    let timbre = Timbre { partials: 40, tilt_db_per_octave: -6.0, ..Timbre::default() };
    let tone = Tone::random(&mut Random::new(1), RATE, 110.0, 1e-4, &timbre);
    narrow(&tone.render(sample_count(seconds, RATE)))
}

/// Resident memory of an instance that measures, its editor closed.
fn memory(library: &Library, sound: &[f32]) -> Result<(), Failure> {
    let before = process::resident_mib()?;
    let mut crowd = Crowd::new(library, INSTANCES)?;
    crowd.play(&sound[..sample_count(2.0, RATE).min(sound.len())], true)?;
    let each = (process::resident_mib()? - before) / INSTANCES as f64;
    println!("memory per measuring instance        {each:8.3} MiB");
    crowd.leave();
    Ok(())
}

/// Memory that instances leave behind when they go.
fn growth(library: &Library, sound: &[f32]) -> Result<(), Failure> {
    let mut before = 0.0;
    for cycle in 0..2 * CYCLES {
        if cycle == CYCLES {
            before = process::resident_mib()?;
        }
        let mut crowd = Crowd::new(library, 1)?;
        crowd.rush(sound)?;
        crowd.leave();
    }
    let grown = process::resident_mib()? - before;
    println!("memory left by {CYCLES} instances         {grown:8.3} MiB");
    Ok(())
}

/// A session of many instances, paced by the clock.
fn session(library: &Library, what: &str, sound: &[f32], watched: bool) -> Result<(), Failure> {
    let mut crowd = Crowd::new(library, INSTANCES)?;
    let before = process::worker_seconds()?;
    let started = Instant::now();
    crowd.play(sound, watched)?;
    let share = (process::worker_seconds()? - before) / started.elapsed().as_secs_f64();
    crowd.leave();
    println!("{INSTANCES} instances {what:<11}: workers use {:8.2} % of one core", 100.0 * share);
    Ok(())
}

struct Crowd {
    instances: Vec<Instance>,
    running: Vec<Running>,
    armed: ParamValueEvent,
}

impl Crowd {
    fn new(library: &Library, count: usize) -> Result<Self, Failure> {
        let mut instances =
            (0..count).map(|_| Instance::new(library)).collect::<Result<Vec<_>, _>>()?;
        let format = Format { sample_rate_hz: RATE, block_max: BLOCK, channels: 2, offline: false };
        let running = instances
            .iter_mut()
            .map(|instance| instance.start(format))
            .collect::<Result<Vec<_>, _>>()?;
        let (id, value) = instances[0].value("Check", "On")?;
        let armed = ParamValueEvent::new(0, id, Pckn::match_all(), value);
        Ok(Self { instances, running, armed })
    }

    /// Plays in real time.
    fn play(&mut self, sound: &[f32], watched: bool) -> Result<(), Failure> {
        let start = Instant::now();
        for (number, block) in sound.chunks(BLOCK).enumerate() {
            let due = start + Duration::from_secs_f64((number * BLOCK) as f64 / RATE);
            thread::sleep(due.saturating_duration_since(Instant::now()));
            self.block(block, watched)?;
        }
        Ok(())
    }

    /// Plays as fast as it goes.
    fn rush(&mut self, sound: &[f32]) -> Result<(), Failure> {
        sound.chunks(BLOCK).try_for_each(|block| self.block(block, true))
    }

    fn block(&mut self, block: &[f32], watched: bool) -> Result<(), Failure> {
        let mut events = EventBuffer::new();
        if watched {
            events.push(&self.armed);
        }
        for running in &mut self.running {
            running.process(&[block, block], &InputEvents::from_buffer(&events), None)?;
        }
        Ok(())
    }

    fn leave(&mut self) {
        for (instance, running) in self.instances.iter_mut().zip(self.running.drain(..)) {
            instance.stop(running);
        }
    }
}

/// Gaps in what the instances logged, if they were made to log.
fn count_gaps(folder: &std::path::Path) -> Result<(), Failure> {
    let logs = read_logs(folder)?;
    let (mut readings, mut gaps) = (0, 0);
    for log in &logs {
        readings += log.len();
        let steps = log.windows(2).filter(|pair| pair[0].stream == pair[1].stream);
        gaps += steps.filter(|pair| pair[1].centre - pair[0].centre > 480).count();
    }
    println!("{readings} readings logged by {} instances, {gaps} gaps between them", logs.len());
    Ok(())
}

fn milliseconds(time: Duration) -> f64 {
    1000.0 * time.as_secs_f64()
}
