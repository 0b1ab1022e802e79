//! The lines of a note in one long transform: every peak above the local noise, partial or not.
//!
//! Blackman-Harris window (side lobes under -92 dB), so that what stands out is there. Interpolation by a parabola through
//! the logarithms (M. Gasior & J. Gonzalez, CERN-AB-2004-021, 2004), whose bias under this window, 0.003 bin, is far below
//! the width of a line.

use core::f64::consts::{PI, TAU};
use std::sync::Arc;

use realfft::num_complex::Complex;
use realfft::{RealFftPlanner, RealToComplex};

use crate::convert::{nearest_index, single};
use crate::history::Span;
use crate::peaks::largest;
use crate::spectrum::TransformRuns;
use crate::window::CosineSum;

/// Lengths of the transforms, in seconds before rounding to a power of two.
const LENGTHS_S: [f64; 2] = [32_768.0 / 48_000.0, 131_072.0 / 48_000.0];
/// Most lines kept; when there are more, the weaker half is dropped.
pub(crate) const LINES_MAX: usize = 4_096;
/// Bins of one block of the noise floor.
const NOISE_BLOCK: usize = 128;
/// Power over the mean noise at which a bin is a line: one noise bin in three million passes (12 dB by -ln p, with a
/// margin for the windowed bins' correlation).
const LINE_OVER_NOISE: f32 = 17.0;
/// Bins on either side within which a line must stand out by [`PROMINENCE`] in power.
const PROMINENCE_BINS: usize = 6;
const PROMINENCE: f32 = 4.0;
/// Samples of the window between two exact cosines.
const EXACT_EVERY: usize = 512;

/// A line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Line {
    /// Frequency in Hz.
    pub(crate) hz: f64,
    /// Amplitude.
    pub(crate) amplitude: f64,
    /// Power over the local noise.
    pub(crate) snr: f64,
}

/// Long transforms and their scratch.
pub(crate) struct LongSpectrum {
    plans: [Arc<dyn RealToComplex<f32>>; 2],
    /// Runs of each so far.
    pub(crate) runs: [TransformRuns; 2],
    /// Samples under the window, then the power of the bins.
    input: Vec<f32>,
    bins: Vec<Complex<f32>>,
    scratch: Vec<Complex<f32>>,
    order: Vec<f32>,
    /// Mean noise power of the blocks of bins.
    floors: Vec<f32>,
    bin_hz: f64,
    /// Lines found, by rising frequency.
    pub(crate) lines: Vec<Line>,
    /// Width of a bin of the last transform, in Hz, stretched by how much of it the note filled.
    pub(crate) resolution_hz: f64,
    sample_rate_hz: f64,
}

impl core::fmt::Debug for LongSpectrum {
    fn fmt(&self, f: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        f.debug_struct("LongSpectrum").field("lines", &self.lines.len()).finish_non_exhaustive()
    }
}

impl LongSpectrum {
    /// Plans for a sample rate.
    pub(crate) fn new(sample_rate_hz: f64) -> Self {
        let mut planner = RealFftPlanner::new();
        let plans = LENGTHS_S
            .map(|s| planner.plan_fft_forward(1 << nearest_index((s * sample_rate_hz).log2())));
        let longest = &plans[1];
        Self {
            runs: plans.each_ref().map(|plan| TransformRuns::none(plan.len(), false)),
            input: longest.make_input_vec(),
            bins: longest.make_output_vec(),
            scratch: longest.make_scratch_vec(),
            order: Vec::with_capacity(NOISE_BLOCK),
            floors: Vec::with_capacity(longest.len() / 2 / NOISE_BLOCK + 1),
            bin_hz: 1.0,
            lines: Vec::with_capacity(LINES_MAX),
            resolution_hz: 0.0,
            sample_rate_hz,
            plans,
        }
    }

    /// Finds the lines of a note from its samples, as many of them as the longest transform takes.
    pub(crate) fn run(&mut self, sound: Span<'_>) {
        let which = usize::from(sound.length > self.plans[0].len());
        let plan = &self.plans[which];
        self.runs[which].runs += 1;
        let len = plan.len();
        let used = sound.length.min(len);
        let scale = 2.0 / (used as f64 * CosineSum::BLACKMAN_HARRIS.coherent_gain());
        sound.read(0, &mut self.input[..used]);
        taper(&mut self.input[..used], scale);
        self.input[used..len].fill(0.0);
        let bins = &mut self.bins[..len / 2 + 1];
        let done = plan.process_with_scratch(
            &mut self.input[..len],
            bins,
            &mut self.scratch[..plan.get_scratch_len()],
        );
        debug_assert!(done.is_ok(), "lengths are planned");
        // The transform has used its input up.
        for (power, x) in self.input.iter_mut().zip(bins.iter()) {
            *power = x.re * x.re + x.im * x.im;
        }
        self.resolution_hz = self.sample_rate_hz / used as f64;
        self.find(len / 2 + 1, self.sample_rate_hz / len as f64);
    }

    /// Noise at a frequency, as the variance (squared amplitude) of a sum over `samples` samples brought down from there.
    pub(crate) fn noise_of_sum(&self, hz: f64, samples: usize) -> f64 {
        let block = nearest_index(hz / self.bin_hz) / NOISE_BLOCK;
        let floor = f64::from(self.floors[block.min(self.floors.len() - 1)]);
        let used = self.sample_rate_hz / self.resolution_hz;
        floor * used / (CosineSum::BLACKMAN_HARRIS.enbw_bins() * samples as f64)
    }

    fn find(&mut self, count: usize, bin_hz: f64) {
        self.lines.clear();
        self.floors.clear();
        self.bin_hz = bin_hz;
        let wide = nearest_index(PROMINENCE_BINS as f64 * self.resolution_hz / bin_hz);
        let p = &self.input[..count];
        let strongest = largest(p);
        // The window's side lobes, at -92 dB, are lines of nothing.
        let least = strongest * 1e-9;
        let mut faintest = 0.0;
        for (block, start) in (0..p.len()).step_by(NOISE_BLOCK).enumerate() {
            let end = (start + NOISE_BLOCK).min(p.len());
            self.order.clear();
            // Neighbours say the same under the window.
            self.order.extend(p[start..end].iter().step_by(2));
            let middle = self.order.len() / 2;
            let (_, median, _) = self.order.select_nth_unstable_by(middle, f32::total_cmp);
            let floor = (*median / core::f32::consts::LN_2).max(f32::MIN_POSITIVE);
            self.floors.push(floor);
            let least = (floor * LINE_OVER_NOISE).max(least);
            let first = if block == 0 { wide + 2 } else { start };
            for k in first..end.min(p.len().saturating_sub(wide + 1)) {
                let here = p[k];
                if here < least || here <= p[k - 1] || here < p[k + 1] {
                    continue;
                }
                let below = p[k - wide..k].iter().fold(f32::MAX, |a, &b| a.min(b));
                let above = p[k + 1..=k + wide].iter().fold(f32::MAX, |a, &b| a.min(b));
                if here < PROMINENCE * below.max(above) || here < faintest {
                    continue;
                }
                if self.lines.len() == LINES_MAX {
                    faintest = drop_weaker_half(&mut self.lines);
                }
                let [a, b, c] = [p[k - 1], here, p[k + 1]].map(|x| f64::from(x).ln());
                let curve = a - 2.0 * b + c;
                let d = if curve < 0.0 { 0.5 * (a - c) / curve } else { 0.0 };
                self.lines.push(Line {
                    hz: (k as f64 + d) * bin_hz,
                    amplitude: (0.5 * (b - 0.25 * (a - c) * d)).exp(),
                    snr: f64::from(here / floor),
                });
            }
        }
    }
}

/// Samples under the window, times `scale`. The window's cosine is turned on from one exact value to the next, and serves
/// both ends.
fn taper(samples: &mut [f32], scale: f64) {
    let count = samples.len();
    let turn = Complex::cis(TAU / count as f64);
    let mut e = Complex::default();
    for n in 0..=count / 2 {
        if n % EXACT_EVERY == 0 {
            // From the start of the frame, half a turn from its centre.
            e = Complex::cis(TAU * n as f64 / count as f64 - PI);
        }
        let w = single(scale * CosineSum::BLACKMAN_HARRIS.of_cosine(e.re));
        samples[n] *= w;
        if n > 0 && 2 * n < count {
            samples[count - n] *= w;
        }
        e *= turn;
    }
}

/// Drops the weaker half of the lines; returns the squared amplitude of the weakest kept.
fn drop_weaker_half(lines: &mut Vec<Line>) -> f32 {
    let middle = lines.len() / 2;
    let by_amplitude = |a: &Line, b: &Line| a.amplitude.total_cmp(&b.amplitude);
    let (_, median, _) = lines.select_nth_unstable_by(middle, by_amplitude);
    let least = median.amplitude;
    lines.retain(|l| l.amplitude >= least);
    lines.sort_unstable_by(|a, b| a.hz.total_cmp(&b.hz));
    single(least * least)
}
