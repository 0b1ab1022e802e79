//! A small seeded random generator, so that a seed names the same sound on every machine and in every version.

/// `SplitMix64` (G. Steele, D. Lea & C. Flood, "Fast splittable pseudorandom number generators", OOPSLA 2014).
#[derive(Debug, Clone)]
pub struct Random {
    state: u64,
    spare: Option<f64>,
}

impl Random {
    /// A generator that starts from `seed`.
    #[must_use]
    pub fn new(seed: u64) -> Self {
        Self { state: seed, spare: None }
    }

    /// Uniform from 0 (included) to 1 (excluded).
    pub fn uniform(&mut self) -> f64 {
        // The upper 53 bits: every double of this spacing is as likely as any other.
        (self.next_bits() >> 11) as f64 * 2.0_f64.powi(-53)
    }

    /// Uniform from `low` to `high`.
    pub fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.uniform()
    }

    /// Uniform in the logarithm, from `low` to `high`, both positive.
    pub fn log_between(&mut self, low: f64, high: f64) -> f64 {
        low * (high / low).powf(self.uniform())
    }

    /// One of `choices`, each as likely.
    ///
    /// # Panics
    /// When there is no choice.
    #[expect(clippy::expect_used, reason = "an index below a length fits")]
    pub fn pick<T: Copy>(&mut self, choices: &[T]) -> T {
        let count = choices.len() as u64;
        assert!(count > 0, "a pick needs at least one choice");
        let index = self.next_bits() % count;
        choices[usize::try_from(index).expect("an index below a length fits")]
    }

    /// A phase, uniform from -pi to pi.
    pub fn phase(&mut self) -> f64 {
        self.between(-core::f64::consts::PI, core::f64::consts::PI)
    }

    /// Normal with mean 0 and variance 1, by Marsaglia's polar method (SIAM Review 6(3):260-264, 1964).
    pub fn normal(&mut self) -> f64 {
        if let Some(spare) = self.spare.take() {
            return spare;
        }
        loop {
            let (u, v) = (self.between(-1.0, 1.0), self.between(-1.0, 1.0));
            let s = u * u + v * v;
            if s < 1.0 && s > 0.0 {
                let scale = (-2.0 * s.ln() / s).sqrt();
                self.spare = Some(v * scale);
                return u * scale;
            }
        }
    }

    fn next_bits(&mut self) -> u64 {
        self.state = self.state.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let z = (self.state ^ (self.state >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        let z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_generator_gives_the_published_sequence() {
        // First outputs for seed 1234567 of the authors' reference program.
        let mut random = Random::new(1_234_567);
        let expected = [6_457_827_717_110_365_317, 3_203_168_211_198_807_973];
        assert_eq!([random.next_bits(), random.next_bits()], expected, "seed 1234567");
    }

    #[test]
    fn normal_numbers_have_unit_variance() {
        let mut random = Random::new(3);
        let numbers: Vec<f64> = (0..100_000).map(|_| random.normal()).collect();
        let mean = numbers.iter().sum::<f64>() / 1e5;
        let variance = numbers.iter().map(|x| x * x).sum::<f64>() / 1e5;
        assert!(
            mean.abs() < 0.015 && (variance - 1.0).abs() < 0.02,
            "mean {mean}, variance {variance}"
        );
    }
}
