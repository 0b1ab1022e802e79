//! Cosine-sum windows and the figures that a spectrum under them must be read with.
//!
//! A window of N samples is the periodic ("DFT-even") `w[n] = a0 - a1 cos(2 pi n/N) + a2 cos(4 pi n/N) - ...`. Figures
//! are closed forms in the limit of long frames, with frequencies in bins of sample rate / N. Sources: F. J. Harris,
//! Proc. IEEE 66(1):51-83, 1978 (figures of merit, Table I); G. Heinzel, A. Ruediger and R. Schilling, "Spectrum and
//! spectral density estimation by the DFT", MPI fuer Gravitationsphysik, 2002 (scaling, sec. 8 and 9).

use core::f64::consts::PI;

/// A window made of a constant and cosines.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct CosineSum {
    /// a0, a1, ..., as written above with the signs taken out.
    coefficients: &'static [f64],
}

impl CosineSum {
    /// The Hann window: a narrow main lobe, and side lobes that fall by 18 dB per octave.
    pub const HANN: Self = Self::new(&[0.5, 0.5]);
    /// The four-term Blackman-Harris window: no side lobe above -92 dB.
    pub const BLACKMAN_HARRIS: Self = Self::new(&[0.35875, 0.48829, 0.14128, 0.01168]);

    /// The window of these coefficients: a0 (above 0), a1, ..., with the alternating signs taken out.
    #[must_use]
    pub const fn new(coefficients: &'static [f64]) -> Self {
        Self { coefficients }
    }

    /// The `length` samples of the window.
    pub fn samples(self, length: usize) -> impl ExactSizeIterator<Item = f64> {
        (0..length).map(move |n| self.value(n as f64 / length as f64 - 0.5))
    }

    /// The window at a position of -0.5 to 0.5 frames from its centre.
    #[must_use]
    pub fn value(self, position: f64) -> f64 {
        self.of_cosine((2.0 * PI * position).cos())
    }

    /// The window where the cosine of its first term, counted from the centre, has a value: the others are its Chebyshev
    /// polynomials (C. Clenshaw's recurrence, 1955).
    pub(crate) fn of_cosine(self, cosine: f64) -> f64 {
        // Counted from the centre, the signs no longer alternate.
        let (mut now, mut before) = (0.0, 0.0);
        for &a in self.coefficients[1..].iter().rev() {
            (now, before) = (2.0 * cosine * now - before + a, now);
        }
        self.coefficients[0] + cosine * now - before
    }

    /// Half the width of the main lobe, in bins: here, and at every whole bin beyond, the transform is zero.
    #[must_use]
    pub const fn half_lobe_bins(self) -> usize {
        self.coefficients.len()
    }

    /// The transform this many bins off, over its value at 0; real, for a phase reference at the centre of the frame.
    #[must_use]
    pub fn response(self, offset_bins: f64) -> f64 {
        let sum: f64 = self.lines().map(|(bin, a)| a * sinc(offset_bins - bin)).sum();
        sum / self.coherent_gain()
    }

    /// Mean of the window. The transform of a sine of peak A reads `A * N * coherent_gain / 2` at its bin.
    #[must_use]
    pub fn coherent_gain(self) -> f64 {
        self.coefficients[0]
    }

    /// Equivalent noise bandwidth in bins: `N sum(w^2) / sum(w)^2`. It is also the variance of an amplitude read off
    /// the transform, over the least variance possible.
    #[must_use]
    pub fn enbw_bins(self) -> f64 {
        self.mean_of_square(|bins| if bins.abs() < 0.5 { 1.0 } else { 0.0 })
            / self.coherent_gain().powi(2)
    }

    /// Loss of a sine half-way between two bins, in dB.
    #[must_use]
    pub fn scalloping_loss_db(self) -> f64 {
        -20.0 * self.response(0.5).log10()
    }

    /// Variance of a frequency read off the peak of the transform, over the least variance possible (D. Rife and
    /// R. Boorstyn, IEEE Trans. IT 20(5):591-598, 1974): `N^3/12 sum(w^2 t^2) / sum(w t^2)^2` with t in samples from
    /// the centre, from a first-order expansion about the peak.
    #[must_use]
    pub fn frequency_variance_factor(self) -> f64 {
        let mean: f64 = self.lines().map(|(bin, a)| a * second_moment(bin)).sum();
        self.mean_of_square(second_moment) / (12.0 * mean.powi(2))
    }

    /// The lines of the centred window's spectrum: (bin, amplitude).
    fn lines(self) -> impl Iterator<Item = (f64, f64)> + Clone {
        let halves = self.coefficients.iter().enumerate();
        halves.flat_map(|(k, a)| [(k as f64, a / 2.0), (-(k as f64), a / 2.0)])
    }

    /// Mean of `w^2` times a weight, which is given by its mean against a cosine of so many periods in the frame.
    fn mean_of_square(self, weight: impl Fn(f64) -> f64) -> f64 {
        let pairs = self.lines().flat_map(|a| self.lines().map(move |b| (a, b)));
        pairs.map(|((i, a), (j, b))| a * b * weight(i + j)).sum()
    }
}

/// Mean over the frame of squared time, in frames from the centre, times a cosine of so many periods.
fn second_moment(periods: f64) -> f64 {
    if periods.abs() < 0.5 {
        1.0 / 12.0
    } else {
        (PI * periods).cos() / (2.0 * (PI * periods).powi(2))
    }
}

/// sin(pi x) / (pi x).
fn sinc(x: f64) -> f64 {
    if x.abs() < 1e-9 { 1.0 } else { (PI * x).sin() / (PI * x) }
}
