//! The bare real transforms that the engine runs for its readings, and nothing else.

use std::error::Error;
use std::sync::Arc;

use plumbtone_tests::cast::index;
use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};

/// Length of the shortest frame at 48 kHz; the others are 2, 4 and 8 times as long.
const SHORTEST_S: f64 = 1024.0 / 48_000.0;
/// Forward transforms in 100 seconds, by frame length. The longest frame is renewed at every other reading.
const FORWARD_PER_100_S: [usize; 4] = [10_000, 10_000, 10_000, 5_000];
/// Inverse transforms to the lag domain, of the two longest frames: how many in 100 seconds, and the least sample rate in Hz
/// of the lower part of the spectrum that is taken back.
const INVERSE: [(usize, usize, f64); 2] = [(2, 10_000, 22_000.0), (3, 5_000, 11_000.0)];

/// Planned transforms with their buffers.
pub(crate) struct Bare {
    forward: Vec<(Arc<dyn RealToComplex<f32>>, usize)>,
    inverse: Vec<(Arc<dyn ComplexToReal<f32>>, usize)>,
    samples: Vec<f32>,
    bins: Vec<Complex<f32>>,
    scratch: Vec<Complex<f32>>,
}

impl Bare {
    /// Plans the transforms for a sample rate.
    pub(crate) fn new(sample_rate_hz: f64) -> Self {
        let mut planner = RealFftPlanner::new();
        let shortest = 1_usize << index((SHORTEST_S * sample_rate_hz).log2());
        let forward: Vec<_> = (0..)
            .zip(FORWARD_PER_100_S)
            .map(|(i, count)| (planner.plan_fft_forward(shortest << i), count))
            .collect();
        let inverse: Vec<_> = INVERSE
            .into_iter()
            .map(|(i, count, least_hz)| {
                let narrower = 1_usize << index((sample_rate_hz / least_hz).log2().floor());
                (planner.plan_fft_inverse((shortest << i) / narrower), count)
            })
            .collect();
        let longest = shortest << 3;
        let scratch = (forward.iter().map(|(plan, _)| plan.get_scratch_len()))
            .chain(inverse.iter().map(|(plan, _)| plan.get_scratch_len()))
            .max();
        Self {
            samples: vec![0.0; longest],
            bins: vec![Complex::default(); longest / 2 + 1],
            scratch: vec![Complex::default(); scratch.unwrap_or(0)],
            forward,
            inverse,
        }
    }

    /// Runs the transforms of a sound of this length.
    pub(crate) fn run(&mut self, seconds: f64) -> Result<(), Box<dyn Error>> {
        let times = |per_100_s: usize| index(seconds * per_100_s as f64 / 100.0);
        for (plan, count) in &self.forward {
            let len = plan.len();
            let (samples, bins) = (&mut self.samples[..len], &mut self.bins[..=len / 2]);
            let scratch = &mut self.scratch[..plan.get_scratch_len()];
            for _ in 0..times(*count) {
                plan.process_with_scratch(samples, bins, scratch)?;
            }
        }
        for (plan, count) in &self.inverse {
            let len = plan.len();
            let (samples, bins) = (&mut self.samples[..len], &mut self.bins[..=len / 2]);
            let scratch = &mut self.scratch[..plan.get_scratch_len()];
            for _ in 0..times(*count) {
                // A power spectrum is real.
                bins.fill(Complex::new(1.0, 0.0));
                plan.process_with_scratch(bins, samples, scratch)?;
            }
        }
        std::hint::black_box(&self.samples);
        Ok(())
    }
}
