//! The lowest strong line of a sound's spectrum: a reference for bars and bells, whose partials make no period.

use std::f64::consts::TAU;

use realfft::RealFftPlanner;

/// A line is strong within this many dB of the strongest.
const STRONG_DB: f64 = -25.0;
/// Lowest line looked at, in Hz.
const LOWEST_HZ: f64 = 20.0;

/// Frequency in Hz of the lowest spectral peak within 25 dB of the highest, over the whole sound under a Hann window.
///
/// # Errors
/// Never in practice: the buffers are made by the transform itself.
pub fn lowest_peak_hz(
    sound: &[f32],
    sample_rate_hz: f64,
) -> Result<Option<f64>, realfft::FftError> {
    let count = sound.len() as f64;
    let transform = RealFftPlanner::<f64>::new().plan_fft_forward(sound.len().next_power_of_two());
    let mut input = transform.make_input_vec();
    for (n, (x, &sample)) in input.iter_mut().zip(sound).enumerate() {
        *x = f64::from(sample) * (0.5 - 0.5 * (TAU * n as f64 / count).cos());
    }
    let bin_hz = sample_rate_hz / input.len() as f64;
    let mut lines = transform.make_output_vec();
    transform.process(&mut input, &mut lines)?;
    let levels: Vec<f64> = lines.iter().map(|line| 10.0 * line.norm_sqr().log10()).collect();
    let lowest = crate::cast::index((LOWEST_HZ / bin_hz).ceil()).max(1);
    let highest = levels.iter().skip(lowest).fold(f64::NEG_INFINITY, |a, &b| a.max(b));
    let peak = (lowest..levels.len() - 1).find(|&bin| {
        let [before, here, after] = [levels[bin - 1], levels[bin], levels[bin + 1]];
        here > highest + STRONG_DB && here >= before && here > after
    });
    Ok(peak.map(|bin| {
        let (a, b, c) = (levels[bin - 1], levels[bin], levels[bin + 1]);
        (bin as f64 + 0.5 * (a - c) / (a - 2.0 * b + c)) * bin_hz
    }))
}

#[cfg(test)]
mod tests {
    use super::*;
    use plumbtone_analysis::signals::{Tone, narrow};

    #[test]
    fn the_lowest_strong_line_is_found_under_stronger_ones() {
        let tone = Tone::new(48_000.0, 500.0, 0.0, 3, |n| [0.01, 0.1, 0.5][n as usize - 1]);
        let found = lowest_peak_hz(&narrow(&tone.render(48_000)), 48_000.0).unwrap();
        assert!((found.unwrap() - 1000.0).abs() < 0.1, "500 Hz is 34 dB down: {found:?}");
    }
}
