//! From samples to one slow complex signal per partial.

use realfft::num_complex::Complex;

use crate::convert::single;

/// Partials brought down together: the width of the inner loop.
pub(crate) const LANES: usize = 8;

/// The slow signals of a note: row by row, a partial each.
#[derive(Debug)]
pub(crate) struct Baseband {
    /// Samples in a block.
    block: usize,
    blocks_max: usize,
    rows_max: usize,
    blocks: usize,
    data: Vec<Complex<f32>>,
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
    pub(crate) fn run(&mut self, samples: &[f32], steps: &[f64], bend: &[f64]) {
        self.blocks = (samples.len() / self.block).min(self.blocks_max);
        let rows = steps.len().min(self.rows_max);
        for first in (0..rows).step_by(LANES) {
            let mut lanes = Lanes::default();
            for (lane, step) in steps[first..rows].iter().take(LANES).enumerate() {
                lanes.steps[lane] = *step;
            }
            for (m, block) in samples.chunks_exact(self.block).take(self.blocks).enumerate() {
                let sums = lanes.block(block, bend.get(m).copied(), m == 0);
                for (lane, sum) in sums.into_iter().enumerate() {
                    self.data[(first + lane) * self.blocks_max + m] = sum;
                }
            }
        }
    }
}

/// Oscillators side by side.
#[derive(Default)]
struct Lanes {
    steps: [f64; LANES],
    phases: [f64; LANES],
    step_re: [f32; LANES],
    step_im: [f32; LANES],
    /// What the rounding of the steps does to a block's sum, undone.
    undo: [Complex<f64>; LANES],
}

impl Lanes {
    /// Sums of one block, and on to the next.
    fn block(&mut self, samples: &[f32], bend: Option<f64>, first: bool) -> [Complex<f32>; LANES] {
        let factor = bend.unwrap_or(1.0);
        let (mut c_re, mut c_im) = ([0.0f32; LANES], [0.0f32; LANES]);
        for i in 0..LANES {
            let step = self.steps[i] * factor;
            if first || bend.is_some() {
                let (sin, cos) = step.sin_cos();
                self.step_re[i] = single(cos);
                self.step_im[i] = single(-sin);
                let taken = Complex::new(f64::from(self.step_re[i]), f64::from(self.step_im[i]));
                let error = Complex::new(cos, -sin) / taken - 1.0;
                self.undo[i] = 1.0 + error * (0.5 * (samples.len() - 1) as f64);
            }
            let (sin, cos) = self.phases[i].sin_cos();
            c_re[i] = single(cos);
            c_im[i] = single(-sin);
            self.phases[i] =
                (self.phases[i] + step * samples.len() as f64) % core::f64::consts::TAU;
        }
        let (s_re, s_im) = (self.step_re, self.step_im);
        let (mut a_re, mut a_im) = ([0.0f32; LANES], [0.0f32; LANES]);
        for &x in samples {
            for i in 0..LANES {
                a_re[i] += x * c_re[i];
                a_im[i] += x * c_im[i];
                let re = c_re[i] * s_re[i] - c_im[i] * s_im[i];
                c_im[i] = c_re[i] * s_im[i] + c_im[i] * s_re[i];
                c_re[i] = re;
            }
        }
        let scale = 2.0 / samples.len() as f64;
        core::array::from_fn(|i| {
            let sum = Complex::new(f64::from(a_re[i]), f64::from(a_im[i])) * self.undo[i] * scale;
            Complex::new(single(sum.re), single(sum.im))
        })
    }
}
