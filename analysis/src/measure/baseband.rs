//! From samples to one slow complex signal per partial.
//!
//! A block's sum is taken about its centre: samples at the same distance on either side are added for the cosine and
//! subtracted for the sine, which halves the products, and an oscillator in single precision turns only half a block from
//! an exact phase.

use core::f64::consts::TAU;

use pulp::{Arch, NullaryFnOnce};
use realfft::num_complex::Complex;

use crate::convert::{nearest, single};
use crate::history::Span;
use crate::stiff::quadrature;

/// Oscillators in one vector.
const LANES: usize = 8;
/// Vectors of oscillators that run together, so that none waits for its own last product.
const ABREAST: usize = 2;
/// Blocks from one exact phase to the next.
const EXACT_EVERY: usize = 32;

/// The slow signals of a note: row by row, a partial each.
#[derive(Debug)]
pub(crate) struct Baseband {
    /// Samples in a block.
    block: usize,
    blocks_max: usize,
    rows_max: usize,
    blocks: usize,
    data: Vec<Complex<f32>>,
    samples: Vec<f32>,
    /// Sums and differences of the samples of one block about its centre.
    pairs: Vec<(f32, f32)>,
    lanes: Vec<Lanes>,
    arch: Arch,
}

impl Baseband {
    /// Room for so many rows of so many blocks of `block` samples.
    pub(crate) fn new(rows_max: usize, blocks_max: usize, block: usize) -> Self {
        Self {
            block,
            blocks_max,
            rows_max,
            blocks: 0,
            data: vec![Complex::default(); rows_max.next_multiple_of(LANES) * blocks_max],
            samples: vec![0.0; block],
            pairs: Vec::with_capacity(block.div_ceil(2)),
            lanes: Vec::with_capacity(rows_max.div_ceil(LANES)),
            arch: Arch::new(),
        }
    }

    /// Blocks of the current note.
    pub(crate) fn blocks(&self) -> usize {
        self.blocks
    }

    /// Samples in a block.
    pub(crate) fn block(&self) -> usize {
        self.block
    }

    /// The signal of a row.
    pub(crate) fn row(&self, row: usize) -> &[Complex<f32>] {
        &self.data[row * self.blocks_max..][..self.blocks]
    }

    /// Brings the samples down by `steps[row]` radians per sample, times `bend[block]` where the pitch moves (empty where it
    /// holds). Phases are 0 at the first sample. The scale is amplitude: a partial of amplitude `A` reads `A`.
    pub(crate) fn run(&mut self, sound: Span<'_>, steps: &[f64], bend: &[f64]) {
        self.blocks = (sound.length / self.block).min(self.blocks_max);
        let rows = steps.len().min(self.rows_max);
        self.lanes.clear();
        for steps in steps[..rows].chunks(LANES) {
            let mut lanes = Lanes::default();
            lanes.steps[..steps.len()].copy_from_slice(steps);
            lanes.turn_by(1.0, self.block);
            self.lanes.push(lanes);
        }
        for m in 0..self.blocks {
            sound.read(m * self.block, &mut self.samples);
            pair(&self.samples, &mut self.pairs);
            if let Some(factor) = bend.get(m) {
                self.lanes.iter_mut().for_each(|lanes| lanes.turn_by(*factor, self.block));
            }
            let (abreast, rest) = self.lanes.as_chunks_mut::<ABREAST>();
            for lanes in abreast {
                self.arch.dispatch(Turn { lanes, pairs: &self.pairs });
            }
            for lanes in rest {
                self.arch
                    .dispatch(Turn { lanes: core::array::from_mut(lanes), pairs: &self.pairs });
            }
            for (lanes, rows) in
                self.lanes.iter_mut().zip(self.data.chunks_mut(LANES * self.blocks_max))
            {
                let sums = lanes.end_block(self.block);
                for (sum, row) in sums.into_iter().zip(rows.chunks_mut(self.blocks_max)) {
                    row[m] = sum;
                }
            }
        }
    }
}

/// Sums and differences of samples at the same distance from the centre, from the inside out. A middle sample makes its own
/// sum.
fn pair(block: &[f32], out: &mut Vec<(f32, f32)>) {
    let half = block.len() / 2;
    let (before, after) = (&block[..half], &block[block.len() - half..]);
    out.clear();
    if block.len() % 2 == 1 {
        out.push((block[half], 0.0));
    }
    let around = after.iter().zip(before.iter().rev());
    out.extend(around.map(|(late, early)| (late + early, late - early)));
}

/// Oscillators side by side.
#[derive(Debug, Clone, Copy, Default)]
struct Lanes {
    /// Radians per sample, as asked for and with the current bend.
    steps: [f64; LANES],
    bent: [f64; LANES],
    /// At the first sample of the block to come.
    phases: [f64; LANES],
    /// What brings the block's sum to its true phase, what takes that from block to block, and for how many blocks it has.
    turned: [Complex<f64>; LANES],
    onward: [Complex<f64>; LANES],
    age: usize,
    step_re: [f32; LANES],
    step_im: [f32; LANES],
    /// The oscillator at the first pair.
    start_re: [f32; LANES],
    start_im: [f32; LANES],
    /// Sums of the last block.
    sum_re: [f32; LANES],
    sum_im: [f32; LANES],
    /// The scale, with what the rounding of the steps does to it undone.
    scale: [f64; LANES],
}

impl Lanes {
    /// From here on, turns by the steps times a factor.
    fn turn_by(&mut self, factor: f64, block: usize) {
        // Of the first pair from the centre.
        let distance = if block % 2 == 1 { 0.0 } else { 0.5 };
        for i in 0..LANES {
            let step = self.steps[i] * factor;
            self.bent[i] = step;
            (self.step_re[i], self.step_im[i]) = rounded(step);
            (self.start_re[i], self.start_im[i]) = rounded(step * distance);
            let (re, im) = (f64::from(self.step_re[i]), f64::from(self.step_im[i]));
            let grows = quadrature(re, im) - 1.0;
            let length = block as f64;
            self.scale[i] = 2.0 / length * (1.0 - 0.25 * length * grows);
        }
        self.age = 0;
    }

    /// The block's sums at true phase and scale, and on to the next block.
    fn end_block(&mut self, block: usize) -> [Complex<f32>; LANES] {
        let length = block as f64;
        for i in 0..LANES {
            match self.age {
                0 => {
                    let centre = self.phases[i] + 0.5 * (length - 1.0) * self.bent[i];
                    self.turned[i] = Complex::cis(-centre);
                }
                1 => self.onward[i] = Complex::cis(-length * self.bent[i]),
                _ => {}
            }
            if self.age > 0 {
                self.turned[i] *= self.onward[i];
            }
        }
        self.age = (self.age + 1) % EXACT_EVERY;
        core::array::from_fn(|i| {
            let sum = Complex::new(f64::from(self.sum_re[i]), f64::from(self.sum_im[i]));
            let sum = sum * self.turned[i] * self.scale[i];
            let phase = self.phases[i] + self.bent[i] * length;
            self.phases[i] = phase - TAU * nearest(phase / TAU);
            Complex::new(single(sum.re), single(sum.im))
        })
    }
}

/// Sums of the samples of one block under some vectors of oscillators.
struct Turn<'a, const N: usize> {
    lanes: &'a mut [Lanes; N],
    pairs: &'a [(f32, f32)],
}

impl<const N: usize> NullaryFnOnce for Turn<'_, N> {
    type Output = ();

    #[inline(always)]
    fn call(self) {
        let Self { lanes, pairs } = self;
        let (s_re, s_im) =
            (lanes.each_ref().map(|l| l.step_re), lanes.each_ref().map(|l| l.step_im));
        let mut c_re = lanes.each_ref().map(|l| l.start_re);
        let mut c_im = lanes.each_ref().map(|l| l.start_im);
        let (mut a_re, mut a_im) = ([[0.0f32; LANES]; N], [[0.0f32; LANES]; N]);
        for &(sum, difference) in pairs {
            for v in 0..N {
                for i in 0..LANES {
                    a_re[v][i] += sum * c_re[v][i];
                    a_im[v][i] -= difference * c_im[v][i];
                    let re = c_re[v][i] * s_re[v][i] - c_im[v][i] * s_im[v][i];
                    c_im[v][i] = c_re[v][i] * s_im[v][i] + c_im[v][i] * s_re[v][i];
                    c_re[v][i] = re;
                }
            }
        }
        for (v, lanes) in lanes.iter_mut().enumerate() {
            (lanes.sum_re, lanes.sum_im) = (a_re[v], a_im[v]);
        }
    }
}

/// Cosine and sine in single precision.
fn rounded(phase: f64) -> (f32, f32) {
    let (sin, cos) = phase.sin_cos();
    (single(cos), single(sin))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::history::History;

    fn held(samples: &[f32]) -> History {
        let mut history = History::new(samples.len());
        history.push(samples);
        history
    }

    fn whole(history: &History, length: usize) -> Span<'_> {
        Span { history, start: 0, length }
    }

    /// A sum of cosines: (amplitude, radians per sample, phase).
    fn sound(parts: &[(f64, f64, f64)], samples: usize) -> Vec<f32> {
        let at = |n: f64| parts.iter().map(|(a, step, phase)| a * (step * n + phase).cos()).sum();
        (0..samples).map(|n| single(at(n as f64))).collect()
    }

    #[test]
    fn blocks_equal_the_defining_sum_in_double_precision() {
        for block in [220, 221, 480] {
            let parts = [(0.3, 0.0036, 0.4), (0.2, 0.7, 1.0), (1e-3, 3.1, 2.0)];
            let samples = sound(&parts, 40 * block);
            let steps: Vec<f64> = (0..11).map(|k| [0.0036, 0.7, 3.1, 1.3][k % 4]).collect();
            let mut baseband = Baseband::new(steps.len(), 40, block);
            baseband.run(whole(&held(&samples), samples.len()), &steps, &[]);
            for (row, step) in steps.iter().enumerate() {
                for m in [0, 1, 17, 39] {
                    let exact: Complex<f64> = (m * block..(m + 1) * block)
                        .map(|n| Complex::cis(-step * n as f64) * f64::from(samples[n]))
                        .sum();
                    let exact = exact * (2.0 / block as f64);
                    let found = baseband.row(row)[m];
                    let found = Complex::new(f64::from(found.re), f64::from(found.im));
                    // Of the loudest part, 0.3: -116 dB.
                    let off = (found - exact).norm();
                    assert!(off < 5e-7, "block {block}, step {step}, block {m}: off by {off:e}");
                }
            }
        }
    }

    #[test]
    fn a_bend_is_followed() {
        let block = 240;
        let bend: Vec<f64> = (0..50).map(|m| 1.0 + 0.01 * (f64::from(m) * 0.3).sin()).collect();
        let mut phase = 0.9;
        let mut samples = Vec::new();
        for factor in &bend {
            for _ in 0..block {
                samples.push(single(0.5 * f64::cos(phase)));
                phase += 0.2 * factor;
            }
        }
        let mut baseband = Baseband::new(1, 50, block);
        baseband.run(whole(&held(&samples), samples.len()), &[0.2], &bend);
        for (m, z) in baseband.row(0).iter().enumerate() {
            // The image at negative frequencies leaves its share.
            assert!((z.norm() - 0.5).abs() < 0.012, "block {m}: {z}");
            assert!((z.arg() - 0.9).abs() < 0.025, "block {m}: {z}");
        }
    }
}
