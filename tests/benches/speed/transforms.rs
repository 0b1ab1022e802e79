//! The bare real transforms that the engine runs over a second of sound, and nothing else.

use std::error::Error;
use std::sync::Arc;

use plumbtone_tests::cast::index;
use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};

/// Length of the shortest transform at 48 kHz; the others are 2, 4 and 8 times as long.
const SHORTEST_S: f64 = 1024.0 / 48_000.0;
/// Transforms in 100 seconds of each length: forward, then inverse (the autocorrelations). The longest ones run at every
/// other reading.
const PER_100_S: [(usize, usize); 4] = [(10_000, 0), (10_000, 0), (10_000, 10_000), (5_000, 5_000)];

/// Planned transforms with their buffers.
pub(crate) struct Bare(Vec<Length>);

struct Length {
    forward: Arc<dyn RealToComplex<f32>>,
    inverse: Arc<dyn ComplexToReal<f32>>,
    samples: Vec<f32>,
    bins: Vec<Complex<f32>>,
    scratch: Vec<Complex<f32>>,
    per_100_s: (usize, usize),
}

impl Bare {
    /// Plans the transforms for a sample rate.
    pub(crate) fn new(sample_rate_hz: f64) -> Self {
        let mut planner = RealFftPlanner::new();
        let shortest = 1_usize << index((SHORTEST_S * sample_rate_hz).log2());
        let lengths = PER_100_S.iter().enumerate().map(|(i, &per_100_s)| {
            let forward = planner.plan_fft_forward(shortest << i);
            let inverse = planner.plan_fft_inverse(shortest << i);
            let scratch = forward.get_scratch_len().max(inverse.get_scratch_len());
            Length {
                samples: forward.make_input_vec(),
                bins: forward.make_output_vec(),
                scratch: vec![Complex::default(); scratch],
                forward,
                inverse,
                per_100_s,
            }
        });
        Self(lengths.collect())
    }

    /// Runs the transforms of a sound of this length.
    pub(crate) fn run(&mut self, seconds: f64) -> Result<(), Box<dyn Error>> {
        for length in &mut self.0 {
            let count = |per_100_s: usize| index(seconds * per_100_s as f64 / 100.0);
            for _ in 0..count(length.per_100_s.0) {
                let (samples, bins) = (&mut length.samples, &mut length.bins);
                length.forward.process_with_scratch(samples, bins, &mut length.scratch)?;
            }
            for _ in 0..count(length.per_100_s.1) {
                // Made of a real sound, the two outermost bins would be real.
                length.bins.fill(Complex::new(1.0, 0.0));
                let (samples, bins) = (&mut length.samples, &mut length.bins);
                length.inverse.process_with_scratch(bins, samples, &mut length.scratch)?;
            }
            std::hint::black_box(&length.samples);
        }
        Ok(())
    }
}
