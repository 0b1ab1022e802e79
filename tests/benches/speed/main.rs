//! The speed of the engine, as ratios measured in one run on one core: `cargo xtask bench`.
//!
//! Every time is the shortest of several rounds, in which the things compared take turns, so that whatever else the
//! machine does slows all of them or none.
#![expect(clippy::print_stdout, reason = "printing is the program's purpose")]

mod sound;
mod timing;
mod transforms;

use std::error::Error;

use plumbtone_analysis::{Analyzer, Settings, Sink};
use plumbtone_tests::estimators::{mcleod, probabilistic_yin};
use timing::{Task, shortest_times};

/// Rounds of each comparison.
const ROUNDS: usize = 4;
/// Block in which samples are pushed.
const BLOCK: usize = 1024;

/// A sink that only receives.
struct Ignore;

impl Sink for Ignore {}

fn main() -> Result<(), Box<dyn Error>> {
    against_transforms_and_others()?;
    against_partials()?;
    against_sample_rate()
}

fn engine(samples: &[f32], settings: &Settings) -> Result<Analyzer, Box<dyn Error>> {
    let mut analyzer = Analyzer::new(settings)?;
    for block in samples.chunks(BLOCK) {
        analyzer.push(block, &mut Ignore);
    }
    analyzer.finish(&mut Ignore);
    Ok(analyzer)
}

fn against_transforms_and_others() -> Result<(), Box<dyn Error>> {
    let rate = 48_000.0;
    let settings = Settings::new(rate);
    let wide = sound::notes(rate, 10.0);
    let samples = plumbtone_analysis::signals::narrow(&wide);
    let seconds = samples.len() as f64 / rate;
    let mut bare = transforms::Bare::new(engine(&samples, &settings)?.transforms());
    let names = [
        "the whole engine, 40 partials",
        "its bare transforms",
        "crate pitch-detection, McLeod",
        "crate pyin",
    ];
    let tasks: [Task<'_>; 4] = [
        Box::new(|| engine(&samples, &settings).map(drop)),
        Box::new(|| bare.run()),
        Box::new(|| {
            std::hint::black_box(mcleod(&wide, 48_000));
            Ok(())
        }),
        Box::new(|| {
            std::hint::black_box(probabilistic_yin(&wide, 48_000));
            Ok(())
        }),
    ];
    let times = shortest_times(tasks, ROUNDS)?;
    println!("seconds of audio per second of one core, 48 kHz");
    for (name, time) in names.iter().zip(&times) {
        println!("  {name:<34}{:>10.1}", seconds / time);
    }
    println!("  to reach with the whole engine: 150");
    println!(
        "the whole engine takes {:.2} times its bare transforms (to reach: 4)",
        times[0] / times[1]
    );
    Ok(())
}

fn against_partials() -> Result<(), Box<dyn Error>> {
    let rate = 48_000.0;
    let samples = plumbtone_analysis::signals::narrow(&sound::notes(rate, 10.0));
    let counts = [8, 16, 32, 40, 64, 128];
    let settings = counts.map(|partials| Settings { partials, ..Settings::new(rate) });
    let tasks = settings.each_ref().map(|settings| {
        let task: Task<'_> = Box::new(|| engine(&samples, settings).map(drop));
        task
    });
    let times = shortest_times(tasks, ROUNDS)?;
    println!("cost against the number of partials, over that of 8 (to reach: 3 at most)");
    for (count, time) in counts.iter().zip(&times) {
        println!("  {count:>4} partials{:>8.2}", time / times[0]);
    }
    Ok(())
}

fn against_sample_rate() -> Result<(), Box<dyn Error>> {
    let rates = [44_100.0, 48_000.0, 88_200.0, 96_000.0, 176_400.0, 192_000.0];
    let sounds = rates.map(|rate| plumbtone_analysis::signals::narrow(&sound::notes(rate, 10.0)));
    let settings = rates.map(Settings::new);
    let mut tasks: Vec<Task<'_>> = Vec::new();
    for (samples, settings) in sounds.iter().zip(&settings) {
        tasks.push(Box::new(|| engine(samples, settings).map(drop)));
    }
    let times = shortest_times(tasks, ROUNDS)?;
    println!(
        "cost of a second of audio against the sample rate, over that at 44.1 kHz (to reach: linear)"
    );
    for (rate, time) in rates.iter().zip(&times) {
        println!("  {rate:>8} Hz{:>8.2}   (linear: {:.2})", time / times[0], rate / rates[0]);
    }
    Ok(())
}
