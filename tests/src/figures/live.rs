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
/// Noise under it all, in dBFS.
const NOISE_DB: f64 = -90.0;
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
    /// Time from the onset to the end of the block that delivered the first right reading, provisional or not, in ms: the
    /// longest over the seeds; infinite when there was none.
    pub reached_ms: f64,
    /// Time from the onset to the last provisional reading that was wrong, in ms: the longest over the seeds; 0 for none.
    pub settled_ms: f64,
}

/// Measures the figures, the worst over seeds 0 to `seeds`.
///
/// # Errors
/// Settings that the engine refuses.
pub fn live(seeds: u64) -> Result<Vec<LiveFigure>, SettingsError> {
    DUE.into_iter()
        .map(|(f0_hz, due_ms)| {
            let mut figure = LiveFigure { f0_hz, due_ms, reached_ms: 0.0, settled_ms: 0.0 };
            for seed in 0..seeds {
                let (reached_ms, settled_ms) = onset(seed, f0_hz)?;
                figure.reached_ms = figure.reached_ms.max(reached_ms);
                figure.settled_ms = figure.settled_ms.max(settled_ms);
            }
            Ok(figure)
        })
        .collect()
}

/// Times of the first right reading and of the last wrong provisional one, in ms after the onset.
fn onset(seed: u64, f0_hz: f64) -> Result<(f64, f64), SettingsError> {
    let mut random = Random::new(seed);
    let power = amplitude(NOISE_DB).powi(2);
    let mut sound = white_noise(&mut random, sample_count(END_S, RATE_HZ), power);
    let timbre = Timbre { partials: 30, ..Timbre::default() };
    let tone = Tone::random(&mut random, RATE_HZ, f0_hz, 1e-4, &timbre);
    let start = sample_count(ONSET_S, RATE_HZ);
    add_at(&mut sound, start, &tone.render(sample_count(END_S - ONSET_S, RATE_HZ)));
    let mut analyzer = Analyzer::new(&Settings::new(RATE_HZ))?;
    let mut ear = Ear { f0_hz, heard_ms: 0.0, first_right_ms: f64::INFINITY, last_wrong_ms: 0.0 };
    for (block, samples) in narrow(&sound).chunks(BLOCK).enumerate() {
        let heard = ((block + 1) * BLOCK) as f64 - start as f64;
        ear.heard_ms = 1000.0 * heard / RATE_HZ;
        analyzer.push(samples, &mut ear);
    }
    Ok((ear.first_right_ms, ear.last_wrong_ms))
}

/// Notes when readings are right and wrong.
struct Ear {
    f0_hz: f64,
    /// Time from the onset to the end of the block being pushed.
    heard_ms: f64,
    first_right_ms: f64,
    last_wrong_ms: f64,
}

impl Ear {
    fn right(&self, reading: &Reading) -> Option<bool> {
        reading.pitch.map(|pitch| cents(pitch.f0_hz, self.f0_hz).abs() <= RIGHT_CENTS)
    }

    fn note(&mut self, reading: &Reading) {
        if self.right(reading) == Some(true) {
            self.first_right_ms = self.first_right_ms.min(self.heard_ms);
        }
    }
}

impl Sink for Ear {
    fn wants_live(&self) -> bool {
        true
    }

    fn live(&mut self, reading: &Reading) {
        self.note(reading);
        if self.right(reading) == Some(false) {
            self.last_wrong_ms = self.last_wrong_ms.max(self.heard_ms);
        }
    }

    fn reading(&mut self, reading: &Reading) {
        self.note(reading);
    }
}
