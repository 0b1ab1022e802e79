//! Joint refinement of the partials of one frame: each partial is measured with the others' share of its bins taken away,
//! round after round (the relaxation of J. Li & P. Stoica, IEEE TSP 44(2):281-295, 1996, on the windowed spectrum), so
//! that partials a few bins apart do not pull at each other.
//!
//! With the phase referred to the frame's centre the Hann kernel is real and every cross term is one division.

use pulp::{Arch, NullaryFnOnce};
use realfft::num_complex::Complex;

use crate::convert::{nearest_index, number};
use crate::peaks::NoiseFloor;
use crate::reading::Partial;
use crate::spectrum::{Frame, kernel, sin_pi};
use crate::stiff::{CENTS_PER_NEPER, DB_PER_NEPER, Point, partial_hz, quadrature};

/// Rounds of relaxation.
const ROUNDS: usize = 3;
/// Bins beyond which a partial's sidelobes are left out.
const NEAR_BINS: f64 = 16.0;
/// Power of a bin's noise, against the strongest partial, under which it is never taken to be: what a frame's far
/// sidelobes, rounding and unresolved lines leave of it.
const FAINTEST: f64 = 1e-8;
/// Nearest to the image at negative frequencies, in bins, at which it is left out.
const IMAGE_BINS: f64 = 12.0;
/// Power over the noise in a bin below which a partial is not there (see the peaks' own limit).
const PRESENT: f64 = 13.8;
/// Standard deviation of the frequency in bins is this over the root of the power ratio: the Cramer-Rao bound with the
/// Hann window's variance factor 2.3445 (F. J. Harris 1978; D. Rife & R. Boorstyn 1974).
const FREQUENCY_SD: f64 = 0.4874;
/// Search around the expectation, as a share of the fundamental and of the expectation.
const REACH_OF_F0: f64 = 0.3;
const REACH: f64 = 0.02;

/// A partial of one frame.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Tone {
    /// Partial number.
    pub(crate) n: usize,
    /// Frequency in Hz.
    pub(crate) hz: f64,
    /// Its deviation in Hz.
    pub(crate) sd_hz: f64,
    /// Amplitude and phase at the frame's centre.
    pub(crate) amplitude: Complex<f64>,
    /// Power over the noise in one bin.
    pub(crate) snr: f64,
}

impl Tone {
    /// The tone as a partial of a reading, not averaged.
    pub(crate) fn partial(&self, f0: f64, f0_sd_cents: f64) -> Partial {
        let cents_sd = CENTS_PER_NEPER * self.sd_hz / self.hz;
        Partial {
            number: number(self.n),
            frequency_hz: self.hz,
            frequency_sd_hz: self.sd_hz,
            cents_from_harmonic: CENTS_PER_NEPER * (self.hz / (self.n as f64 * f0)).ln(),
            cents_sd: quadrature(cents_sd, f0_sd_cents),
            level_dbfs: 10.0 * self.amplitude.norm_sqr().log10(),
            level_sd_db: DB_PER_NEPER * (0.5 / self.snr).sqrt(),
            phase_rad: self.amplitude.arg(),
            snr_db: 10.0 * self.snr.log10(),
        }
    }
}

impl From<&Tone> for Point {
    fn from(tone: &Tone) -> Self {
        Self { n: tone.n as f64, hz: tone.hz, sd_hz: tone.sd_hz }
    }
}

#[derive(Debug, Clone, Copy)]
struct Line {
    n: usize,
    bin: usize,
    nu: f64,
    /// `sin(pi nu) / pi`: what the kernel at whole bins needs.
    sine: f64,
    a: Complex<f64>,
}

/// Refines partials; owns its scratch.
#[derive(Debug)]
pub(crate) struct Refiner {
    lines: Vec<Line>,
    /// Partials found, by rising number.
    pub(crate) tones: Vec<Tone>,
    arch: Arch,
}

impl Refiner {
    /// Room for so many partials.
    pub(crate) fn new(partials: usize) -> Self {
        Self {
            lines: Vec::with_capacity(partials),
            tones: Vec::with_capacity(partials),
            arch: Arch::new(),
        }
    }

    /// Measures up to `partials` partials of a fundamental in a frame.
    pub(crate) fn run(
        &mut self,
        frame: &Frame,
        bin_hz: f64,
        model: (f64, f64),
        partials: usize,
        noise: &NoiseFloor,
    ) {
        self.seed(frame, bin_hz, model, partials);
        self.arch.dispatch(Relax { lines: &mut self.lines, frame });
        self.deliver(frame, bin_hz, model.0, noise);
    }

    /// Places each line on the strongest bin near its expectation.
    fn seed(&mut self, frame: &Frame, bin_hz: f64, (f0, b): (f64, f64), partials: usize) {
        self.lines.clear();
        let last = frame.power.len() - 3;
        for n in 1..=partials.min(self.lines.capacity()) {
            let nu = partial_hz(f0, b, n as f64) / bin_hz;
            let reach = (REACH_OF_F0 * f0 / bin_hz).min((REACH * nu).max(1.0));
            let low = nearest_index(nu - reach).max(1);
            let high = nearest_index(nu + reach).min(last);
            if low > high || nu > last as f64 {
                break;
            }
            let Some(bin) = (low..=high).max_by(|&i, &j| frame.power[i].total_cmp(&frame.power[j]))
            else {
                break;
            };
            let nu = if (bin as f64 - nu).abs() < 0.5 { nu } else { bin as f64 };
            let mut line = Line { n, bin, nu, sine: 0.0, a: Complex::default() };
            line.settle(neighbourhood(frame, bin));
            self.lines.push(line);
        }
    }

    /// Turns lines into tones, leaving out what is not there.
    fn deliver(&mut self, frame: &Frame, bin_hz: f64, f0: f64, noise: &NoiseFloor) {
        self.tones.clear();
        let len = (frame.power.len() - 1) * 2;
        let mut before = 0.0;
        let loudest = self.lines.iter().map(|l| l.a.norm_sqr()).fold(0.0, f64::max);
        for line in &self.lines {
            let power = line.a.norm_sqr();
            let floor = f64::from(noise.at(line.bin, len)).max(FAINTEST * loudest);
            let off = (line.nu - line.bin as f64).abs();
            let snr = power / floor;
            // Two lines on the same peak are one.
            if snr < PRESENT || off > 0.95 || (line.nu - before) * bin_hz < 0.4 * f0 {
                continue;
            }
            before = line.nu;
            self.tones.push(Tone {
                n: line.n,
                hz: line.nu * bin_hz,
                sd_hz: FREQUENCY_SD * bin_hz / snr.sqrt(),
                amplitude: line.a,
                snr,
            });
        }
    }
}

/// All rounds of the relaxation.
struct Relax<'a> {
    lines: &'a mut [Line],
    frame: &'a Frame,
}

impl NullaryFnOnce for Relax<'_> {
    type Output = ();

    #[inline(always)]
    fn call(self) {
        for _ in 0..ROUNDS {
            for i in 0..self.lines.len() {
                relax(self.lines, self.frame, i);
            }
        }
    }
}

/// Measures line `i` in what the others leave.
#[inline(always)]
fn relax(lines: &mut [Line], frame: &Frame, i: usize) {
    let line = lines[i];
    let mut y = neighbourhood(frame, line.bin);
    let first = line.bin as f64 - 1.0;
    let centre = line.nu;
    for other in lines[..i].iter().rev().take_while(|o| centre - o.nu < NEAR_BINS) {
        other.take_from(&mut y, line.bin);
    }
    for other in lines[i + 1..].iter().take_while(|o| o.nu - centre < NEAR_BINS) {
        other.take_from(&mut y, line.bin);
    }
    for other in lines.iter().take_while(|o| o.nu + centre < IMAGE_BINS) {
        for (j, y) in y.iter_mut().enumerate() {
            *y -= other.a.conj() * kernel(first + j as f64 + other.nu);
        }
    }
    let line = &mut lines[i];
    let middle = y[1].conj();
    let [a, b, c] = y.map(|y| (y * middle).re);
    let sum = a + 2.0 * b + c;
    let delta = if sum > 0.0 { (2.0 * (c - a) / sum).clamp(-1.0, 1.0) } else { 0.0 };
    line.nu = line.bin as f64 + delta;
    line.settle(y);
    if delta.abs() > 0.6 {
        line.bin = nearest_index(line.nu).clamp(1, frame.power.len() - 2);
    }
}

impl Line {
    /// Takes the line's share away from the three bins around a bin.
    #[inline(always)]
    fn take_from(&self, y: &mut [Complex<f64>; 3], bin: usize) {
        let first = bin as f64 - 1.0 - self.nu;
        for (j, y) in y.iter_mut().enumerate() {
            *y -= self.a * self.at(bin + j + 1, first + j as f64);
        }
    }

    /// The kernel at a whole bin, `d` bins from the line.
    #[inline(always)]
    fn at(&self, bin_plus_two: usize, d: f64) -> f64 {
        let q = d * (1.0 - d * d);
        if q.abs() < 1e-3 {
            return kernel(d);
        }
        let s = if bin_plus_two.is_multiple_of(2) { -self.sine } else { self.sine };
        s / q
    }

    /// Least-squares amplitude of the line in its three bins.
    #[inline(always)]
    fn settle(&mut self, y: [Complex<f64>; 3]) {
        self.sine = sin_pi(self.nu) / core::f64::consts::PI;
        let first = self.bin as f64 - 1.0;
        let (mut sum, mut norm) = (Complex::default(), 0.0);
        for (j, y) in y.into_iter().enumerate() {
            let k = self.at(self.bin + j + 1, first + j as f64 - self.nu);
            sum += y * k;
            norm += k * k;
        }
        self.a = sum / norm;
    }
}

/// The three bins around a bin.
#[inline(always)]
fn neighbourhood(frame: &Frame, bin: usize) -> [Complex<f64>; 3] {
    [bin - 1, bin, bin + 1].map(|k| {
        let x = frame.bins[k];
        Complex::new(f64::from(x.re), f64::from(x.im))
    })
}
