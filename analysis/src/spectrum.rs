//! One windowed transform: Hann frame in, spectrum referred to the frame's centre out.
//!
//! Scale: a stationary sine of amplitude `A` and centre phase `p` on bin `k` reads `A * exp(i p)` there; off the bin by
//! `x` it reads `A * exp(i p) * kernel(x)`. With the phase referred to the centre the kernel is real, which is what makes
//! the joint refinement cheap. Hann: F. J. Harris, Proc. IEEE 66(1):51-83, 1978.

use std::sync::Arc;

use pulp::{Arch, NullaryFnOnce};
use realfft::num_complex::Complex;
use realfft::{RealFftPlanner, RealToComplex};

use crate::convert::{nearest, single};
use crate::history::History;
use crate::window::CosineSum;

/// How often one kind of transform has run.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct TransformRuns {
    /// Real samples on the one side; half as many bins and one more on the other.
    pub length: usize,
    /// Whether it goes from bins to samples.
    pub inverse: bool,
    /// How often.
    pub runs: u64,
}

impl TransformRuns {
    /// None so far.
    pub(crate) fn none(length: usize, inverse: bool) -> Self {
        Self { length, inverse, runs: 0 }
    }
}

/// A spectrum of one frame.
#[derive(Debug, Clone)]
pub(crate) struct Frame {
    /// Bins 0 to `len / 2`, centre-referred, in amplitude.
    pub(crate) bins: Vec<Complex<f32>>,
    /// Squared magnitude of `bins`.
    pub(crate) power: Vec<f32>,
}

impl Frame {
    /// Sum of the power of all bins but those that a constant reaches.
    pub(crate) fn total(&self) -> f32 {
        let mut lanes = [0.0f32; 8];
        for chunk in self.power[2..].chunks(8) {
            for (lane, p) in lanes.iter_mut().zip(chunk) {
                *lane += p;
            }
        }
        lanes.iter().sum()
    }
}

/// Squared magnitudes.
struct Square<'a> {
    bins: &'a [Complex<f32>],
    power: &'a mut [f32],
}

impl NullaryFnOnce for Square<'_> {
    type Output = ();

    #[inline(always)]
    fn call(self) {
        for (p, x) in self.power.iter_mut().zip(self.bins) {
            *p = x.re * x.re + x.im * x.im;
        }
    }
}

/// A planned transform of one length.
pub(crate) struct Transform {
    /// Runs so far.
    pub(crate) runs: TransformRuns,
    window: Vec<f32>,
    plan: Arc<dyn RealToComplex<f32>>,
    input: Vec<f32>,
    scratch: Vec<Complex<f32>>,
    arch: Arch,
}

impl core::fmt::Debug for Transform {
    fn fmt(&self, f: &mut core::fmt::Formatter<'_>) -> core::fmt::Result {
        f.debug_struct("Transform").field("runs", &self.runs).finish_non_exhaustive()
    }
}

impl Transform {
    /// Plans a transform of `len` samples, a power of two.
    pub(crate) fn new(len: usize, planner: &mut RealFftPlanner<f32>) -> Self {
        let plan = planner.plan_fft_forward(len);
        // The window carries the scale 2 / S1, with S1 = len / 2, and is rotated like the samples.
        let mut window: Vec<f32> =
            CosineSum::HANN.samples(len).map(|w| single(w * 4.0 / len as f64)).collect();
        window.rotate_left(len / 2);
        let (input, scratch) = (plan.make_input_vec(), plan.make_scratch_vec());
        let runs = TransformRuns::none(len, false);
        Self { runs, window, input, scratch, plan, arch: Arch::new() }
    }

    /// Frame length in samples.
    pub(crate) fn len(&self) -> usize {
        self.runs.length
    }

    /// A frame to transform into.
    pub(crate) fn make_frame(&self) -> Frame {
        let bins = self.len() / 2 + 1;
        Frame { bins: vec![Complex::default(); bins], power: vec![0.0; bins] }
    }

    /// Transforms the frame centred on a position.
    pub(crate) fn run(&mut self, history: &History, centre: u64, out: &mut Frame) {
        let centre = i64::try_from(centre).unwrap_or(i64::MAX);
        let half = self.len() / 2;
        self.runs.runs += 1;
        // The second half first: phases then refer to the centre.
        let (late, early) = self.input.split_at_mut(half);
        let before = i64::try_from(half).unwrap_or(0);
        history.read_weighted(centre, &self.window[..half], late);
        history.read_weighted(centre - before, &self.window[half..], early);
        let done =
            self.plan.process_with_scratch(&mut self.input, &mut out.bins, &mut self.scratch);
        debug_assert!(done.is_ok(), "lengths are planned");
        self.arch.dispatch(Square { bins: &out.bins, power: &mut out.power });
    }
}

/// The Hann kernel at `x` bins off the frequency: `sin(pi x) / (pi x (1 - x^2))`.
pub(crate) fn kernel(x: f64) -> f64 {
    let d = x.abs();
    if d < 1e-6 {
        return 1.0;
    }
    if (d - 1.0).abs() < 1e-6 {
        return 0.5;
    }
    sin_pi(d) / (core::f64::consts::PI * d * (1.0 - d * d))
}

/// The Hann kernel at most half a bin off the frequency.
#[inline(always)]
pub(crate) fn near_kernel(x: f64) -> f64 {
    let y = core::f64::consts::PI * x;
    sinc_of_square(y * y) / (1.0 - x * x)
}

/// `sin(pi x)`.
#[inline(always)]
pub(crate) fn sin_pi(x: f64) -> f64 {
    let whole = nearest(x);
    let y = core::f64::consts::PI * (x - whole);
    let sine = y * sinc_of_square(y * y);
    let half = 0.5 * whole;
    if (half - nearest(half)).abs() > 0.25 { -sine } else { sine }
}

/// `sin(y) / y` from `y` squared, to 1e-13 up to `pi / 2`: Taylor's series, since nearly all calls of the library's sine would
/// be for this.
#[inline(always)]
fn sinc_of_square(z: f64) -> f64 {
    // 1 / n! with alternating signs, n = 3 to 17.
    const SERIES: [f64; 8] = [
        -1.0 / 6.0,
        1.0 / 120.0,
        -1.0 / 5_040.0,
        1.0 / 362_880.0,
        -1.0 / 39_916_800.0,
        1.0 / 6_227_020_800.0,
        -1.0 / 1_307_674_368_000.0,
        1.0 / 355_687_428_096_000.0,
    ];
    let [a, b, c, d, e, f, g, h] = SERIES;
    let w = z * z;
    1.0 + z * ((a + b * z) + w * ((c + d * z) + w * ((e + f * z) + w * (g + h * z))))
}
