//! The overlapping Allan deviation: how stable the pitch is over an averaging time.
//!
//! `AVAR(m tau0) = mean of (x[i+2m] - 2 x[i+m] + x[i])^2 / (2 (m tau0)^2)`, with the phase x as the running sum of the
//! frequency deviation (IEEE Std 1139; W. J. Riley, NIST Special Publication 1065, 2008, section 5.2.4).

use std::collections::VecDeque;

/// Phases kept per averaging time, twice this and one: longer times take every so-manieth phase, which loses next to
/// nothing, for terms that overlap that far are the same.
const OVERLAP: usize = 64;

/// The deviation over one averaging time, of a stream of evenly spaced values, in bounded memory.
#[derive(Debug, Clone)]
pub struct OverlappingAllan {
    /// Averaging time in values.
    m: usize,
    stride: usize,
    phase: f64,
    count: usize,
    phases: VecDeque<f64>,
    squares: f64,
    terms: u64,
}

impl OverlappingAllan {
    /// For averages over `m` values, at least 1; above 64, `m` should be a multiple of `m / 64`.
    #[must_use]
    pub fn new(m: usize) -> Self {
        let m = m.max(1);
        let stride = (m / OVERLAP).max(1);
        Self {
            m,
            stride,
            phase: 0.0,
            count: 0,
            phases: VecDeque::with_capacity(2 * m / stride + 2),
            squares: 0.0,
            terms: 0,
        }
    }

    /// Averaging time in values.
    #[must_use]
    pub fn m(&self) -> usize {
        self.m
    }

    /// Takes in the next value.
    pub fn push(&mut self, value: f64) {
        if self.count == 0 {
            self.phases.push_back(0.0);
        }
        self.phase += value;
        self.count += 1;
        if !self.count.is_multiple_of(self.stride) {
            return;
        }
        self.phases.push_back(self.phase);
        let half = self.m / self.stride;
        if self.phases.len() > 2 * half {
            let last = self.phases.len() - 1;
            let term =
                self.phases[last] - 2.0 * self.phases[last - half] + self.phases[last - 2 * half];
            self.squares += term * term;
            self.terms += 1;
            self.phases.pop_front();
        }
    }

    /// Says that values are missing here: no average reaches over it.
    pub fn interrupt(&mut self) {
        self.phase = 0.0;
        self.count = 0;
        self.phases.clear();
    }

    /// Differences of neighbouring averages that went into it.
    #[must_use]
    pub fn terms(&self) -> u64 {
        self.terms
    }

    /// The deviation, in the unit of the values; `None` while there are too few.
    #[must_use]
    pub fn deviation(&self) -> Option<f64> {
        let m = self.m as f64;
        (self.terms > 0).then(|| (self.squares / (2.0 * m * m * self.terms as f64)).sqrt())
    }
}
