//! Spectral peaks of a Hann frame, interpolated, and the noise floor they stand on.
//!
//! Interpolation: three-bin ratio for the Hann window (T. Grandke, IEEE Trans. Instrum. Meas. 32(2):350-355, 1983), exact
//! for a lone stationary tone.

use core::ops::Range;

use pulp::{Arch, NullaryFnOnce};

use crate::convert::nearest_index;
use crate::masking::bark;
use crate::spectrum::{Frame, near_kernel};
use crate::stiff::DB_PER_NEPER;

/// Power of a peak over the noise below which it is taken for noise: 11.4 dB is passed by one noise bin in a million.
const PEAK_OVER_NOISE: f32 = 13.8;
/// Power below the strongest peak at which the window's own sidelobes and rounding end a search.
const PEAK_RANGE: f32 = 1e-9;
/// Bins in one block of the noise floor.
const NOISE_BLOCK: usize = 48;
/// Of those, one in so many is looked at: neighbours under a window say much the same.
const NOISE_STEP: usize = 2;
/// Share of bins below the chosen one in a block: low, since partials fill most of a block of a low note.
const NOISE_QUANTILE: f32 = 0.25;
/// How many of those of a whole block are below it.
const NOISE_RANK: usize = NOISE_BLOCK / NOISE_STEP / 4;
/// Blocks whose floors are found side by side.
const ABREAST: usize = 8;

/// Level below a masker at its own place, and the slopes of its excitation to either side (M. Schroeder, B. Atal & J. Hall,
/// JASA 66(6):1647-1652, 1979: 25 dB per Bark below, 10 dB per Bark above).
const MASK_DB: f64 = 12.0;
const UPWARD_DB_PER_BARK: f64 = 10.0;
const DOWNWARD_DB_PER_BARK: f64 = 25.0;
/// Exponent that compresses amplitudes.
const COMPRESSION: f64 = 0.85;
/// Amplitude, against the strongest peak's, that no longer counts (35 dB down), and the same compressed.
const FAINT: f64 = 0.0178;
const NOTHING: f64 = 0.0326;

/// Most peaks kept of one frame.
pub(crate) const PEAKS_MAX: usize = 400;

/// A peak.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Peak {
    /// Frequency in Hz.
    pub(crate) hz: f64,
    /// Amplitude.
    pub(crate) amplitude: f64,
    /// What it counts for pitch: its compressed amplitude, 0 when a stronger peak near it masks it.
    pub(crate) weight: f64,
}

/// Noise power in one bin of the longest frame, by block.
#[derive(Debug, Clone)]
pub(crate) struct NoiseFloor {
    blocks: Vec<f32>,
    len: usize,
    arch: Arch,
}

/// The lowest powers of some blocks of bins side by side: each new one sinks to its place among those so far.
struct Lowest<'a> {
    power: &'a [f32],
}

impl NullaryFnOnce for Lowest<'_> {
    type Output = [[f32; ABREAST]; NOISE_RANK + 1];

    #[inline(always)]
    fn call(self) -> Self::Output {
        let mut bins = [[f32::INFINITY; ABREAST]; NOISE_BLOCK / NOISE_STEP];
        for (i, block) in self.power.chunks(NOISE_BLOCK).enumerate().take(ABREAST) {
            for (bins, power) in bins.iter_mut().zip(block.iter().step_by(NOISE_STEP)) {
                bins[i] = *power;
            }
        }
        let mut lowest = [[f32::INFINITY; ABREAST]; NOISE_RANK + 1];
        for mut new in bins {
            for kept in &mut lowest {
                for i in 0..ABREAST {
                    let (low, high) =
                        if new[i] < kept[i] { (new[i], kept[i]) } else { (kept[i], new[i]) };
                    (kept[i], new[i]) = (low, high);
                }
            }
        }
        lowest
    }
}

impl NoiseFloor {
    /// A floor for frames of `len` samples.
    pub(crate) fn new(len: usize) -> Self {
        let blocks = (len / 2).div_ceil(NOISE_BLOCK);
        Self { blocks: vec![0.0; blocks], len, arch: Arch::new() }
    }

    /// Estimates the floor: in each block a low quantile, scaled to the mean of the exponential distribution that the
    /// power of a noise bin follows.
    pub(crate) fn estimate(&mut self, frame: &Frame) {
        let scale = -1.0 / (1.0 - NOISE_QUANTILE).ln();
        let power = frame.power[1..].chunks(ABREAST * NOISE_BLOCK);
        for (blocks, power) in self.blocks.chunks_mut(ABREAST).zip(power) {
            let lowest = self.arch.dispatch(Lowest { power });
            for (i, block) in blocks.iter_mut().enumerate() {
                let bins = (power.len() - i * NOISE_BLOCK).min(NOISE_BLOCK);
                *block = lowest[bins.div_ceil(NOISE_STEP) / 4][i] * scale;
            }
        }
    }

    /// Noise power of all bins together. Of few numbers the quantile lies higher than of many: of n exponential ones the r-th
    /// smallest is `1/n + ... + 1/(n - r + 1)` in the mean (A. Renyi, Acta Math. Hung. 4:191-231, 1953).
    pub(crate) fn total(&self) -> f32 {
        let count = NOISE_BLOCK / NOISE_STEP;
        let mean: f32 = (0..=NOISE_RANK).map(|i| 1.0 / (count - i) as f32).sum();
        let many = -(1.0 - NOISE_QUANTILE).ln();
        self.blocks.iter().sum::<f32>() * NOISE_BLOCK as f32 * many / mean
    }

    /// Noise power in a bin of the longest frame at `bin` (fractional) of a frame of `len` samples, scaled to that frame.
    pub(crate) fn at(&self, bin: usize, len: usize) -> f32 {
        let ratio = self.len / len;
        let block = (bin * ratio).saturating_sub(1) / NOISE_BLOCK;
        let last = self.blocks.len() - 1;
        self.blocks[block.min(last)] * ratio as f32
    }
}

/// Collects the peaks of a frame from `low_hz` to `high_hz`, by rising frequency, at most the capacity of `out`.
pub(crate) fn pick(
    frame: &Frame,
    bin_hz: f64,
    noise: &NoiseFloor,
    range_hz: (f64, f64),
    out: &mut Vec<Peak>,
) {
    out.clear();
    noise.arch.dispatch(Pick { frame, bin_hz, noise, range_hz, out });
}

/// See [`pick`].
struct Pick<'a> {
    frame: &'a Frame,
    bin_hz: f64,
    noise: &'a NoiseFloor,
    range_hz: (f64, f64),
    out: &'a mut Vec<Peak>,
}

impl NullaryFnOnce for Pick<'_> {
    type Output = ();

    #[inline(always)]
    fn call(self) {
        let Self { frame, bin_hz, noise, range_hz, out } = self;
        let p = &frame.power;
        let len = (p.len() - 1) * 2;
        let first = nearest_index(range_hz.0 / bin_hz).max(2);
        let last = nearest_index(range_hz.1 / bin_hz).min(p.len() - 3);
        if first >= last {
            return;
        }
        let floor = largest(&p[first..=last]) * PEAK_RANGE;
        let ratio = noise.len / len;
        let mut from = first;
        while from <= last {
            // One block of the noise floor at a time has the same threshold.
            let block = (from * ratio).saturating_sub(1) / NOISE_BLOCK;
            let until = (((block + 1) * NOISE_BLOCK) / ratio + 1).clamp(from + 1, last + 1);
            let least = floor.max(noise.at(from, len) * PEAK_OVER_NOISE);
            maxima(p, from..until, least, |k| {
                if out.len() < out.capacity() {
                    out.push(interpolate(p, k, bin_hz));
                }
            });
            from = until;
        }
    }
}

/// Calls `found` for the local maxima of at least some power. Eight bins are judged at a time and without a branch each,
/// for which of them are maxima cannot be foreseen.
#[inline(always)]
fn maxima(p: &[f32], range: Range<usize>, least: f32, mut found: impl FnMut(usize)) {
    for from in range.clone().step_by(8) {
        // The last eight of the frame overlap those before.
        let first = from.min(p.len() - 9);
        let Some(bins) = p[first - 1..].first_chunk::<10>() else { return };
        let mut marks = [0u8; 8];
        for i in 0..8 {
            let (before, here, after) = (bins[i], bins[i + 1], bins[i + 2]);
            marks[i] = u8::from((here >= least) & (here > before) & (here >= after));
        }
        let mut left = u64::from_le_bytes(marks);
        while left > 0 {
            let k = first + left.trailing_zeros() as usize / 8;
            left &= left - 1;
            if k >= from && k < range.end {
                found(k);
            }
        }
    }
}

/// The largest of some powers, side by side; 0 for none.
#[inline(always)]
pub(crate) fn largest(power: &[f32]) -> f32 {
    let larger = |a: f32, b: f32| if b > a { b } else { a };
    let (whole, rest) = power.as_chunks::<16>();
    let mut lanes = [0.0; 16];
    for chunk in whole {
        for (lane, p) in lanes.iter_mut().zip(chunk) {
            *lane = larger(*lane, *p);
        }
    }
    lanes.iter().chain(rest).fold(0.0, |a, b| larger(a, *b))
}

/// The peak around the local maximum `k`.
#[inline(always)]
fn interpolate(power: &[f32], k: usize, bin_hz: f64) -> Peak {
    let [a, b, c] = [power[k - 1], power[k], power[k + 1]].map(|x| f64::from(x.sqrt()));
    let delta = (2.0 * (c - a) / (a + 2.0 * b + c)).clamp(-0.5, 0.5);
    Peak { hz: (k as f64 + delta) * bin_hz, amplitude: b / near_kernel(delta), weight: 0.0 }
}

/// Weighs peaks sorted by frequency for pitch. A peak that lies under the spread excitation of a stronger one is not heard
/// (E. Terhardt, G. Stoll & M. Seewann, JASA 71(3):679-688, 1982, drop masked components from the pitch in the same way):
/// lines of a loop, of rattle or of modulation around a strong partial make no pitch of their own.
pub(crate) fn weigh(peaks: &mut [Peak]) {
    let strongest = peaks.iter().map(|p| p.amplitude).fold(f64::MIN_POSITIVE, f64::max);
    let mut mask = (f64::NEG_INFINITY, 0.0);
    for peak in peaks.iter_mut() {
        peak.weight = 0.0;
        if peak.amplitude < strongest * FAINT {
            continue;
        }
        let log = (peak.amplitude / strongest).ln();
        let level = DB_PER_NEPER * log;
        mask = (mask.0 - UPWARD_DB_PER_BARK * (bark(peak.hz) - mask.1), bark(peak.hz));
        let loud = (COMPRESSION * log).exp() - NOTHING;
        peak.weight = if level > mask.0 { loud.max(0.0) } else { 0.0 };
        mask.0 = mask.0.max(level - MASK_DB);
    }
    let mut mask = (f64::NEG_INFINITY, 0.0);
    for peak in peaks.iter_mut().rev().filter(|p| p.amplitude >= strongest * FAINT) {
        let level = DB_PER_NEPER * (peak.amplitude / strongest).ln();
        mask = (mask.0 - DOWNWARD_DB_PER_BARK * (mask.1 - bark(peak.hz)), bark(peak.hz));
        if level < mask.0 {
            peak.weight = 0.0;
        }
        mask.0 = mask.0.max(level - MASK_DB);
    }
}
