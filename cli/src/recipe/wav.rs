//! Mono WAV files of 32-bit float samples.

use crate::output::{new_file_for, publish};
use anyhow::{Context as _, Result};
use hound::{SampleFormat, WavSpec, WavWriter};
use std::fs::File;
use std::io::BufWriter;
use std::path::Path;

/// Peak to which cycles are scaled: 0.1 dB under full scale, so that no later rounding clips.
const PEAK: f32 = 0.988;

/// Writes samples; the file appears whole or not at all.
///
/// # Errors
/// The place cannot be written to.
pub(super) fn write(place: &Path, samples: &[f32], sample_rate_hz: u32) -> Result<()> {
    let mut file = new_file_for(place)?;
    write_to(file.as_file_mut(), samples, sample_rate_hz)
        .with_context(|| format!("cannot write {}", place.display()))?;
    publish(file, place)
}

fn write_to(file: &mut File, samples: &[f32], sample_rate_hz: u32) -> hound::Result<()> {
    let spec = WavSpec {
        channels: 1,
        sample_rate: sample_rate_hz,
        bits_per_sample: 32,
        sample_format: SampleFormat::Float,
    };
    let mut writer = WavWriter::new(BufWriter::new(file), spec)?;
    samples.iter().try_for_each(|sample| writer.write_sample(*sample))?;
    writer.finalize()
}

/// Scales samples to just under full scale; says by how many dB. Silence stays silence.
pub(super) fn scale_up(samples: &mut [f32]) -> f64 {
    let peak = samples.iter().fold(0.0, |peak, x| x.abs().max(peak));
    if peak <= 0.0 {
        return 0.0;
    }
    let gain = PEAK / peak;
    samples.iter_mut().for_each(|x| *x *= gain);
    20.0 * f64::from(gain).log10()
}
