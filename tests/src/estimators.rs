//! Independent pitch estimators from the registry, run the way their documentation shows: the reference in tests and
//! benches.

use pitch_detection::detector::PitchDetector as _;
use pitch_detection::detector::mcleod::McLeodDetector;
use pyin::{Framing, PYINExecutor, PadMode};

/// Frame and hop of both, in samples.
const FRAME: usize = 2048;
const HOP: usize = 512;
/// Range of pYIN, in Hz; the lowest has to fit twice into half a frame.
const PYIN_HZ: (f64, f64) = (65.0, 2_000.0);
/// Least power of a frame and least clarity for the method of `McLeod` to answer.
const MCLEOD: (f64, f64) = (1e-3, 0.7);

/// Fundamentals in Hz by the method of `McLeod` and Wyvill (crate `pitch-detection`), one per frame that has one.
#[must_use]
pub fn mcleod(samples: &[f64], sample_rate_hz: usize) -> Vec<f64> {
    let mut detector = McLeodDetector::new(FRAME, FRAME / 2);
    let last = samples.len().saturating_sub(FRAME);
    (0..=last)
        .step_by(HOP)
        .filter_map(|start| samples.get(start..start + FRAME))
        .filter_map(|frame| detector.get_pitch(frame, sample_rate_hz, MCLEOD.0, MCLEOD.1))
        .map(|pitch| pitch.frequency)
        .collect()
}

/// Fundamentals in Hz by pYIN (crate `pyin`), one per voiced frame.
#[must_use]
pub fn probabilistic_yin(samples: &[f64], sample_rate_hz: u32) -> Vec<f64> {
    let (lowest, highest) = PYIN_HZ;
    let mut executor =
        PYINExecutor::new(lowest, highest, sample_rate_hz, FRAME, None, Some(HOP), None);
    let framing = Framing::Center(PadMode::Constant(0.0));
    let (_, frequencies, voiced, _) = executor.pyin(samples, f64::NAN, framing);
    frequencies.iter().zip(voiced.iter()).filter(|&(_, &voiced)| voiced).map(|(&f, _)| f).collect()
}

/// Median; `None` for none.
#[must_use]
pub fn median(mut values: Vec<f64>) -> Option<f64> {
    values.sort_by(f64::total_cmp);
    values.get(values.len() / 2).copied()
}
