//! The bare real transforms that the engine runs, and nothing else.

use std::error::Error;
use std::sync::Arc;

use plumbtone_analysis::TransformRuns;
use realfft::num_complex::Complex;
use realfft::{ComplexToReal, RealFftPlanner, RealToComplex};

/// Planned transforms with how often they run, and their buffers.
pub(crate) struct Bare {
    forward: Vec<(Arc<dyn RealToComplex<f32>>, u64)>,
    inverse: Vec<(Arc<dyn ComplexToReal<f32>>, u64)>,
    samples: Vec<f32>,
    bins: Vec<Complex<f32>>,
    scratch: Vec<Complex<f32>>,
}

impl Bare {
    /// Plans what the engine said it had run.
    pub(crate) fn new(told: impl Iterator<Item = TransformRuns>) -> Self {
        let mut planner = RealFftPlanner::new();
        let (mut forward, mut inverse) = (Vec::new(), Vec::new());
        let (mut longest, mut scratch) = (0, 0);
        for TransformRuns { length, inverse: back, runs } in told {
            longest = longest.max(length);
            if back {
                let plan = planner.plan_fft_inverse(length);
                scratch = scratch.max(plan.get_scratch_len());
                inverse.push((plan, runs));
            } else {
                let plan = planner.plan_fft_forward(length);
                scratch = scratch.max(plan.get_scratch_len());
                forward.push((plan, runs));
            }
        }
        Self {
            forward,
            inverse,
            samples: vec![0.0; longest],
            bins: vec![Complex::default(); longest / 2 + 1],
            scratch: vec![Complex::default(); scratch],
        }
    }

    /// Runs all of them.
    pub(crate) fn run(&mut self) -> Result<(), Box<dyn Error>> {
        for (plan, runs) in &self.forward {
            let len = plan.len();
            let (samples, bins) = (&mut self.samples[..len], &mut self.bins[..=len / 2]);
            let scratch = &mut self.scratch[..plan.get_scratch_len()];
            for _ in 0..*runs {
                plan.process_with_scratch(samples, bins, scratch)?;
            }
        }
        for (plan, runs) in &self.inverse {
            let len = plan.len();
            let (samples, bins) = (&mut self.samples[..len], &mut self.bins[..=len / 2]);
            let scratch = &mut self.scratch[..plan.get_scratch_len()];
            for _ in 0..*runs {
                // A power spectrum is real.
                bins.fill(Complex::new(1.0, 0.0));
                plan.process_with_scratch(bins, samples, scratch)?;
            }
        }
        std::hint::black_box(&self.samples);
        Ok(())
    }
}
