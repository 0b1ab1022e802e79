//! Plays the demo sound through a CLAP bundle as a host would, and prints what came out of the running plugin.
//!
//! `play BUNDLE FOLDER`: the bundle to load, and the folder that the environment made plugins log their readings to.
#![expect(clippy::print_stdout, reason = "printing is what this program is for")]

use std::path::{Path, PathBuf};
use std::time::{Duration, Instant};

use clack_host::prelude::InputEvents;
use plumbtone_analysis::Settings;
use plumbtone_analysis::signals::demo;
use plumbtone_analysis::tuning::Tuning;
use plumbtone_tests::clap_host::{Failure, Format, Instance, Library, same_bits};
use plumbtone_tests::readings::{Logged, VARIABLE, read_logs};
use plumbtone_tests::take::Take;

/// Length of a block, in samples.
const BLOCK: usize = 512;
/// Time between two readings in the table, in seconds.
const TABLE_STEP_S: f64 = 0.2;

fn main() -> Result<(), Failure> {
    let mut arguments = std::env::args_os().skip(1).map(PathBuf::from);
    let (bundle, folder) = arguments.next().zip(arguments.next()).ok_or("play BUNDLE FOLDER")?;
    if std::env::var_os(VARIABLE).is_none_or(|set| Path::new(&set) != folder) {
        return Err(format!("{VARIABLE} must name the folder {}", folder.display()).into());
    }
    let sound = demo();
    let channel = sound.samples.as_slice();
    let started = Instant::now();
    let library = Library::load(&bundle)?;
    let loaded = started.elapsed();
    let mut instance = Instance::new(&library)?;
    let made = started.elapsed() - loaded;
    println!("Loaded in {}, instance made in {}.", milliseconds(loaded), milliseconds(made));

    let format = Format {
        sample_rate_hz: sound.sample_rate_hz,
        block_max: BLOCK,
        channels: 2,
        offline: true,
    };
    let mut running = instance.start(format)?;
    let latency = instance.latency()?;
    let (mut costs, mut equal) = (Vec::new(), true);
    for block in channel.chunks(BLOCK) {
        let before = Instant::now();
        let out = running.process(&[block, block], &InputEvents::empty(), None)?;
        costs.push(before.elapsed());
        equal &= out.iter().all(|out| same_bits(out, block));
    }
    instance.stop(running);
    drop(instance);
    println!(
        "Output {} input bit for bit over {} samples of 2 channels; latency {latency} samples.",
        if equal { "equals" } else { "DIFFERS FROM" },
        channel.len(),
    );
    costs.sort_unstable();
    println!(
        "A block of {BLOCK} samples, with the host's and the framework's share: {} (median), {} (longest; offline the \
         plugin waits for its analysis).",
        milliseconds(costs[costs.len() / 2]),
        milliseconds(costs[costs.len() - 1]),
    );
    let logged = read_logs(&folder)?.pop().ok_or("the plugin logged no readings")?;
    print_table(&logged, sound.sample_rate_hz);
    let engine = Take::of(&Settings::new(sound.sample_rate_hz), channel)?.readings;
    let same = logged.len() == engine.len() && logged.iter().zip(&engine).all(|(l, r)| l.is(r));
    println!(
        "{} readings came out of the plugin; the engine alone gives {} on the same samples: {}.",
        logged.len(),
        engine.len(),
        if same { "equal bit for bit" } else { "THEY DIFFER" },
    );
    if !equal || !same || latency != 0 {
        return Err("the plugin did not do what it must".into());
    }
    Ok(())
}

fn print_table(logged: &[Logged], sample_rate_hz: f64) {
    let tuning = Tuning::default();
    println!(
        "\n   time s  state      pitch             f0 Hz    sd ct  conf   dBFS  partials strays"
    );
    let mut next_s = 0.0;
    for reading in logged {
        let time_s = reading.centre as f64 / sample_rate_hz;
        if time_s < next_s {
            continue;
        }
        next_s += TABLE_STEP_S;
        let level = reading.level_dbfs.map_or_else(String::new, |dbfs| format!("{dbfs:.1}"));
        let nearest = reading.f0_hz.and_then(|f0| tuning.nearest(f0));
        let pitch =
            nearest.map_or_else(String::new, |at| format!("{} {:+.2} ct", at.note, at.cents));
        let figure =
            |x: Option<f64>, digits: usize| x.map_or_else(String::new, |x| format!("{x:.digits$}"));
        println!(
            "{time_s:9.3}  {:<9}  {pitch:<14} {:>10} {:>7} {:>5} {level:>7}  {:>7} {:>6}",
            reading.state,
            figure(reading.f0_hz, 3),
            figure(reading.f0_sd_cents, 3),
            figure(reading.confidence, 2),
            reading.partials.len(),
            reading.strays,
        );
    }
    println!();
}

fn milliseconds(time: Duration) -> String {
    format!("{:.3} ms", 1000.0 * time.as_secs_f64())
}
