//! How soon after an onset the first right reading is delivered, in time of the stream.

use plumbtone_analysis::signals::{
    Random, Timbre, Tone, add_at, amplitude, narrow, sample_count, white_noise,
};
use plumbtone_analysis::{Analyzer, Reading, Settings, SettingsError, Sink};

use crate::take::cents;

/// Sample rate in Hz, block in samples, onset and end in seconds.
const RATE_HZ: f64 = 48_000.0;
const BLOCK: usize = 64;
const ONSET_S: f64 = 0.5;
const END_S: f64 = 1.5;
/// Farthest from the truth that is right, in cents.
const RIGHT_CENTS: f64 = 50.0;

/// Fundamentals in Hz, each with the time in ms within which its first right reading is due.
const DUE: [(f64, f64); 3] = [(27.5, 200.0), (110.0, 60.0), (440.0, 30.0)];

/// The figure for one fundamental.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LiveFigure {
    /// Fundamental in Hz.
    pub f0_hz: f64,
    /// Time due, in ms.
    pub due_ms: f64,
    /// Time from the onset to the end of the block that delivered the first right reading, in ms, the longest over the
    /// seeds; infinite when there was none.
    pub reached_ms: f64,
}

/// Measures the figures, the worst over seeds 0 to `seeds`.
///
/// # Errors
/// Settings that the engine refuses.
pub fn live(seeds: u64) -> Result<Vec<LiveFigure>, SettingsError> {
    DUE.into_iter()
        .map(|(f0_hz, due_ms)| {
            let mut reached_ms = 0.0_f64;
            for seed in 0..seeds {
                reached_ms = reached_ms.max(first_right_ms(seed, f0_hz)?);
            }
            Ok(LiveFigure { f0_hz, due_ms, reached_ms })
        })
        .collect()
}

fn first_right_ms(seed: u64, f0_hz: f64) -> Result<f64, SettingsError> {
    let mut random = Random::new(seed);
    let mut sound =
        white_noise(&mut random, sample_count(END_S, RATE_HZ), amplitude(-90.0).powi(2));
    let timbre = Timbre { partials: 30, ..Timbre::default() };
    let tone = Tone::random(&mut random, RATE_HZ, f0_hz, 1e-4, &timbre);
    let onset = sample_count(ONSET_S, RATE_HZ);
    add_at(&mut sound, onset, &tone.render(sample_count(END_S - ONSET_S, RATE_HZ)));
    let mut analyzer = Analyzer::new(&Settings::new(RATE_HZ))?;
    let mut wait = Wait { f0_hz, right: false };
    for (block, samples) in narrow(&sound).chunks(BLOCK).enumerate() {
        analyzer.push(samples, &mut wait);
        let heard = (block + 1) * BLOCK;
        if wait.right {
            return Ok((heard as f64 - onset as f64) / RATE_HZ * 1000.0);
        }
    }
    Ok(f64::INFINITY)
}

/// Waits for a right reading.
struct Wait {
    f0_hz: f64,
    right: bool,
}

impl Sink for Wait {
    fn reading(&mut self, reading: &Reading) {
        self.right |=
            reading.pitch.is_some_and(|pitch| cents(pitch.f0_hz, self.f0_hz).abs() <= RIGHT_CENTS);
    }
}
