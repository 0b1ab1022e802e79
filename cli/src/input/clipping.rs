//! Runs of full-scale samples: the sign that a recording was clipped.

/// Equal full-scale samples in a row that count as clipped: a sine of a recorded pitch that just touches full scale does
/// so for one or two samples.
const RUN_SAMPLES: u32 = 3;

/// Counts clipped runs in one channel, block by block.
#[derive(Debug, Clone)]
pub(crate) struct ClipCounter {
    full_scale: f32,
    last: f32,
    run: u32,
    /// Runs found so far.
    pub(crate) runs: u64,
}

impl ClipCounter {
    /// For samples of that many bits; `None` for floating point, whose full scale is 1.0.
    pub(crate) fn new(integer_bits: Option<u32>) -> Self {
        // The largest positive code lies one step below 1.0.
        let step = integer_bits.map_or(0.0, |bits| f32::powi(2.0, 1 - bits.min(32).cast_signed()));
        Self { full_scale: 1.0 - step, last: 0.0, run: 0, runs: 0 }
    }

    /// Takes in the next samples of the channel.
    pub(crate) fn push(&mut self, samples: &[f32]) {
        for &sample in samples {
            let repeats = sample.to_bits() == self.last.to_bits();
            self.last = sample;
            if !(sample.abs() >= self.full_scale) || !sample.is_finite() {
                self.run = 0;
                continue;
            }
            self.run = if repeats { self.run.saturating_add(1) } else { 1 };
            if self.run == RUN_SAMPLES {
                self.runs += 1;
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn only_repeated_full_scale_samples_count() {
        let top = 32767.0 / 32768.0;
        for (bits, samples, runs) in [
            (Some(16), vec![0.5, top, top, top, 0.5, -1.0, -1.0, -1.0, -1.0], 2),
            (Some(16), vec![top, -1.0, top, -1.0, top], 0),
            (Some(16), vec![top, top, 0.0, top, top], 0),
            (Some(24), vec![top, top, top], 0),
            (None, vec![1.0, 1.0, 1.0, 1.2, 1.3, 1.2], 1),
            (None, vec![f32::NAN, f32::INFINITY, f32::INFINITY, f32::INFINITY], 0),
        ] {
            let mut whole = ClipCounter::new(bits);
            whole.push(&samples);
            assert_eq!(whole.runs, runs, "{bits:?} bits, {samples:?}");
            let mut pieces = ClipCounter::new(bits);
            samples.chunks(2).for_each(|piece| pieces.push(piece));
            assert_eq!(pieces.runs, runs, "in pieces: {bits:?} bits, {samples:?}");
        }
    }
}
