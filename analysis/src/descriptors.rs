//! What the partials of a sound say together: balance, slope, distortion, brightness, harmonicity.
//!
//! From partial numbers and peak amplitudes to the figures of [`Descriptors`]; one pass, nothing allocated. A partial
//! that was not found counts as absent, so each figure speaks of the partials given and of no others.

use crate::reading::Reading;

/// What a note's partials say together. `None` where the partials needed were not found.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct Descriptors {
    /// Power of the odd partials (1 included) over that of the even ones, in dB; needs one of each. G. Peeters et al.,
    /// JASA 130(5):2902-2916, 2011.
    pub odd_even_db: Option<f64>,
    /// Slope of level over log2 of the partial number, in dB per octave, by least squares with equal weights; needs two
    /// partials. The spectral slope of Peeters et al. 2011, on logarithmic axes.
    pub tilt_db_per_octave: Option<f64>,
    /// Total harmonic distortion against the fundamental, in percent: root of the summed squares of partials 2 and above
    /// over partial 1; needs partial 1. `THD_F` of D. Shmilovitz, IEEE Trans. Power Delivery 20(1):526-528, 2005.
    pub thd_f_percent: Option<f64>,
    /// Total harmonic distortion against the root of the total power, in percent; needs partial 1. `THD_R` of Shmilovitz
    /// 2005.
    pub thd_r_percent: Option<f64>,
    /// Power of the partials over all other power, in dB; needs other power. The ratio of P. Boersma, Proc. Inst.
    /// Phonetic Sciences Amsterdam 17:97-110, 1993, with both powers measured instead of inferred from periodicity.
    pub hnr_db: Option<f64>,
    /// Tristimulus over amplitudes: partial 1, 2 to 4, 5 and above, summing to 1. H. Pollard and E. Jansson, Acustica
    /// 51:162-171, 1982, with amplitudes in place of their loudnesses.
    pub tristimulus: Option<[f64; 3]>,
    /// Amplitude-weighted mean partial number: the harmonic spectral centroid of Peeters et al. 2011, over f0.
    pub centroid_partial: Option<f64>,
}

impl Descriptors {
    /// The descriptors of partials given as (number from 1, peak amplitude), in any order. `rest_power` is the mean
    /// square of all that is not in them, in the same unit squared (full scale 1.0). Partials without a positive, finite
    /// amplitude count as not found.
    #[must_use]
    pub fn of(partials: impl IntoIterator<Item = (u32, f64)>, rest_power: Option<f64>) -> Self {
        let mut sums = Sums::default();
        for (number, amplitude) in partials {
            if number > 0 && amplitude > 0.0 && amplitude.is_finite() {
                sums.add(number, amplitude);
            }
        }
        sums.descriptors(rest_power)
    }

    /// The descriptors of a reading; all that is not in its partials is its noise and its strays.
    #[must_use]
    pub fn of_reading(reading: &Reading) -> Self {
        let power = |dbfs: f64| 0.5 * 10f64.powf(dbfs / 10.0);
        let strays: f64 = reading.strays.iter().map(|stray| power(stray.level_dbfs)).sum();
        let partials = reading.partials.iter();
        let amplitudes = partials.map(|p| (p.number, 10f64.powf(p.level_dbfs / 20.0)));
        Self::of(amplitudes, Some(power(reading.noise_dbfs) + strays))
    }
}

/// Running sums over the partials, enough for every descriptor.
#[derive(Default)]
struct Sums {
    count: f64,
    /// Power (half the squared amplitude) of partial 1, of the odd partials above it, of the even ones.
    fundamental: f64,
    odd: f64,
    even: f64,
    /// Amplitudes of partial 1, 2 to 4, 5 and above.
    amplitudes: [f64; 3],
    /// Amplitude times partial number.
    moment: f64,
    /// For the line of y = dB on x = log2 n.
    x: f64,
    y: f64,
    xx: f64,
    xy: f64,
}

impl Sums {
    fn add(&mut self, number: u32, amplitude: f64) {
        let power = amplitude * amplitude / 2.0;
        match number {
            1 => self.fundamental += power,
            n if n % 2 == 1 => self.odd += power,
            _ => self.even += power,
        }
        self.amplitudes[match number {
            1 => 0,
            2..=4 => 1,
            _ => 2,
        }] += amplitude;
        let n = f64::from(number);
        self.moment += n * amplitude;
        let (x, y) = (n.log2(), 20.0 * amplitude.log10());
        self.count += 1.0;
        self.x += x;
        self.y += y;
        self.xx += x * x;
        self.xy += x * y;
    }

    fn descriptors(&self, rest_power: Option<f64>) -> Descriptors {
        let distortion = self.odd + self.even;
        let total = self.fundamental + distortion;
        let amplitude: f64 = self.amplitudes.iter().sum();
        let thd = |reference: f64| {
            (self.fundamental > 0.0).then(|| 100.0 * (distortion / reference).sqrt())
        };
        Descriptors {
            odd_even_db: decibels(self.fundamental + self.odd, self.even),
            tilt_db_per_octave: self.tilt(),
            thd_f_percent: thd(self.fundamental),
            thd_r_percent: thd(total),
            hnr_db: rest_power.and_then(|rest| decibels(total, rest)),
            tristimulus: (amplitude > 0.0).then(|| self.amplitudes.map(|part| part / amplitude)),
            centroid_partial: (amplitude > 0.0).then(|| self.moment / amplitude),
        }
    }

    fn tilt(&self) -> Option<f64> {
        let spread = self.count * self.xx - self.x * self.x;
        (spread > 0.0).then(|| (self.count * self.xy - self.x * self.y) / spread)
    }
}

/// A ratio of powers in dB. `None` when one of them is missing.
fn decibels(over: f64, under: f64) -> Option<f64> {
    (over > 0.0 && under > 0.0).then(|| 10.0 * (over / under).log10())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn nothing_is_said_of_nothing() {
        assert_eq!(Descriptors::of([], Some(1.0)), Descriptors::default(), "no partials");
        let unusable = [(0, 1.0), (1, 0.0), (2, -1.0), (3, f64::NAN), (4, f64::INFINITY)];
        assert_eq!(Descriptors::of(unusable, Some(1.0)), Descriptors::default(), "unusable");
    }

    #[test]
    fn a_lone_fundamental_has_neither_tilt_nor_balance() {
        let lone = Descriptors::of([(1, 0.5)], None);
        assert_eq!((lone.odd_even_db, lone.tilt_db_per_octave, lone.hnr_db), (None, None, None));
        assert_eq!((lone.thd_f_percent, lone.tristimulus), (Some(0.0), Some([1.0, 0.0, 0.0])));
    }

    #[test]
    fn distortion_needs_the_fundamental() {
        let missing = Descriptors::of([(2, 0.5), (3, 0.5)], None);
        assert_eq!((missing.thd_f_percent, missing.thd_r_percent), (None, None));
        assert_eq!((missing.odd_even_db, missing.centroid_partial), (Some(0.0), Some(2.5)));
    }

    #[test]
    fn harmonicity_compares_powers() {
        // A sine of peak 0.1 holds 0.005; ten times less beside it makes 10 dB, nothing beside it no ratio.
        let hnr = |rest| Descriptors::of([(1, 0.1)], rest).hnr_db;
        assert!((hnr(Some(0.0005)).unwrap() - 10.0).abs() < 1e-9, "{:?}", hnr(Some(0.0005)));
        assert_eq!((hnr(Some(0.0)), hnr(None)), (None, None));
    }

    #[test]
    fn gain_moves_no_ratio() {
        let partials = [(1, 0.3), (2, 0.2), (4, 0.05), (7, 0.01)];
        let quiet = Descriptors::of(partials.map(|(n, a)| (n, a / 1024.0)), None);
        let loud = Descriptors::of(partials, None);
        let near = |a: Option<f64>, b: Option<f64>| (a.unwrap() - b.unwrap()).abs() < 1e-9;
        assert!(near(quiet.odd_even_db, loud.odd_even_db), "{quiet:?} {loud:?}");
        assert!(near(quiet.tilt_db_per_octave, loud.tilt_db_per_octave), "{quiet:?} {loud:?}");
        assert!(near(quiet.thd_f_percent, loud.thd_f_percent), "{quiet:?} {loud:?}");
        assert!(near(quiet.centroid_partial, loud.centroid_partial), "{quiet:?} {loud:?}");
    }
}
