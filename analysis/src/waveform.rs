//! Which textbook wave the partials of a sound make: from their amplitudes and phases, or none.
//!
//! The waves are those of the Fourier series (any textbook; amplitudes and phases checked in the tests against the waves
//! themselves). A recording starts anywhere in the period and may be upside down, so phases are compared after the best
//! shift in time, and with either sign. A word is said only when every partial that the wave should have within
//! [`RANGE_DB`] of its strongest is there with nearly its level and phase, and none that it should not have.

use core::f64::consts::{PI, TAU};

use crate::convert::nearest;
use crate::reading::{Partial, Reading};
use crate::stiff::DB_PER_NEPER;

/// Levels below the strongest partial, in dB, that are compared.
const RANGE_DB: f64 = 40.0;
/// Largest root-mean-square differences of a fit, in dB and in radians.
const LEVEL_RMS_DB: f64 = 1.0;
const PHASE_RMS_RAD: f64 = 0.2;
/// Least number of partials that a wave with more than one must show.
const LEAST_PARTIALS: usize = 3;
/// Shifts in time tried, as parts of a period, before the best is refined.
const SHIFTS: usize = 256;
/// Halvings of the step of a search.
const HALVINGS: usize = 30;
/// Pulse widths tried, as parts of half a period.
const WIDTHS: usize = 98;

/// A textbook wave.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Waveform {
    /// One partial.
    Sine,
    /// All partials, falling as `1/n`.
    Saw,
    /// Odd partials, falling as `1/n`.
    Square,
    /// Odd partials, falling as `1/n^2`.
    Triangle,
    /// High for a share `width` of the period, 0 to 0.5, low for the rest.
    Pulse {
        /// The share.
        width: f64,
    },
    /// A sine whose negative halves are cut off.
    HalfRectifiedSine,
}

/// A textbook wave found in a sound, and how well it fits.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WaveformFit {
    /// Which.
    pub waveform: Waveform,
    /// Root mean square of the differences in level, in dB.
    pub level_rms_db: f64,
    /// Root mean square of the differences in phase, in radians, after the best shift in time.
    pub phase_rms_rad: f64,
    /// Partials compared.
    pub partials: usize,
}

impl Waveform {
    /// The word for it.
    #[must_use]
    pub fn name(self) -> &'static str {
        match self {
            Self::Sine => "sine",
            Self::Saw => "saw",
            Self::Square => "square",
            Self::Triangle => "triangle",
            Self::Pulse { .. } => "pulse",
            Self::HalfRectifiedSine => "half-rectified sine",
        }
    }

    /// The share of the period that a pulse is high.
    #[must_use]
    pub fn width(self) -> Option<f64> {
        match self {
            Self::Pulse { width } => Some(width),
            _ => None,
        }
    }

    /// Amplitude and cosine phase of partial `n` (from 1), up to a common factor and a shift in time. The amplitude is
    /// negative where that says the phase more simply.
    fn partial(self, n: f64) -> (f64, f64) {
        let odd = n % 2.0 > 0.5;
        match self {
            Self::Sine => (if n < 1.5 { 1.0 } else { 0.0 }, 0.0),
            Self::Saw => (1.0 / n, -PI / 2.0),
            Self::Square => (if odd { 1.0 / n } else { 0.0 }, -PI / 2.0),
            Self::Triangle => (if odd { 1.0 / (n * n) } else { 0.0 }, 0.0),
            Self::Pulse { width } => ((PI * n * width).sin() / n, 0.0),
            Self::HalfRectifiedSine if n < 1.5 => (PI / 4.0, 0.0),
            // Centred on the half that is kept: 2 (-1)^(n/2 + 1) / (pi (n^2 - 1)), over the fundamental's 2/pi * pi/4.
            Self::HalfRectifiedSine if odd => (0.0, 0.0),
            Self::HalfRectifiedSine => {
                let sign = if (n / 2.0) % 2.0 > 0.5 { 1.0 } else { -1.0 };
                (sign / (n * n - 1.0), 0.0)
            }
        }
    }

    /// The waves without a parameter.
    const PLAIN: [Self; 5] =
        [Self::Sine, Self::Saw, Self::Square, Self::Triangle, Self::HalfRectifiedSine];
}

/// Finds the textbook wave of partials given as (number from 1, amplitude, cosine phase in radians), all at one instant, in
/// rising order. `looked_for` is the highest number that would have been found. `None` when no wave fits.
#[must_use]
pub fn waveform(partials: &[(u32, f64, f64)], looked_for: u32) -> Option<WaveformFit> {
    let strongest = partials.iter().map(|p| p.1).fold(0.0, f64::max);
    if !(strongest > 0.0) {
        return None;
    }
    let plain = Waveform::PLAIN.into_iter().filter_map(|wave| fit(partials, looked_for, wave));
    // Some width makes nearly a square, so pulses come after the others.
    plain
        .min_by(|a, b| badness(a).total_cmp(&badness(b)))
        .or_else(|| fit(partials, looked_for, best_pulse(partials, looked_for)?))
}

/// Finds the textbook wave of a reading. What lies above its last partial cannot be told from what the band or the count left
/// out, so it is not looked for.
#[must_use]
pub fn of_reading(reading: &Reading) -> Option<WaveformFit> {
    let partial = |p: &Partial| (p.number, 10f64.powf(p.level_dbfs / 20.0), p.phase_rad);
    let partials: Vec<_> = reading.partials.iter().map(partial).collect();
    waveform(&partials, partials.last()?.0)
}

/// The pulse whose levels fit best.
fn best_pulse(partials: &[(u32, f64, f64)], looked_for: u32) -> Option<Waveform> {
    let pulses = (1..=WIDTHS).map(|i| {
        let pulse = Waveform::Pulse { width: 0.5 * i as f64 / (WIDTHS + 1) as f64 };
        (pulse, level_error(partials, looked_for, pulse))
    });
    let best = pulses.min_by(|a, b| a.1.total_cmp(&b.1))?;
    Some(refined(partials, looked_for, best.0))
}

/// One figure for how bad a fit is: both differences over what is allowed.
fn badness(fit: &WaveformFit) -> f64 {
    fit.level_rms_db / LEVEL_RMS_DB + fit.phase_rms_rad / PHASE_RMS_RAD
}

/// A pulse whose width is refined around that of `pulse`.
fn refined(partials: &[(u32, f64, f64)], looked_for: u32, pulse: Waveform) -> Waveform {
    let Waveform::Pulse { mut width } = pulse else { return pulse };
    let mut step = 0.25 / (WIDTHS + 1) as f64;
    for _ in 0..HALVINGS {
        let tried = [width - step, width, width + step].map(|width| {
            let width = width.clamp(1e-3, 0.5);
            (width, level_error(partials, looked_for, Waveform::Pulse { width }))
        });
        if let Some(best) = tried.into_iter().min_by(|a, b| a.1.total_cmp(&b.1)) {
            width = best.0;
        }
        step *= 0.5;
    }
    Waveform::Pulse { width }
}

/// Mean square of the differences in level in nepers, with the common factor that makes it least. A partial that is missing on
/// one side counts as lying at the end of the range.
fn level_error(partials: &[(u32, f64, f64)], looked_for: u32, wave: Waveform) -> f64 {
    let mut sums = (0.0, 0.0, 0.0);
    for (measured, expected, _) in compared(partials, looked_for, wave) {
        let off = measured.0.ln() - expected.0.abs().ln();
        sums = (sums.0 + 1.0, sums.1 + off, sums.2 + off * off);
    }
    let (count, sum, squares) = sums;
    if count > 0.0 { (squares - sum * sum / count) / count } else { f64::INFINITY }
}

/// What a partial is measured as and expected as (amplitude, phase), both at least at the end of the range, and its number.
fn compared<'a>(
    partials: &'a [(u32, f64, f64)],
    looked_for: u32,
    wave: Waveform,
) -> impl Iterator<Item = ((f64, f64), (f64, f64), f64)> + 'a {
    let reach = 10f64.powf(-RANGE_DB / 20.0);
    let strongest = partials.iter().map(|p| p.1).fold(0.0, f64::max);
    let loudest = (1..=looked_for).map(|n| wave.partial(f64::from(n)).0.abs()).fold(0.0, f64::max);
    let mut rest = partials;
    (1..=looked_for).filter_map(move |number| {
        let n = f64::from(number);
        while rest.first().is_some_and(|p| p.0 < number) {
            rest = &rest[1..];
        }
        let measured = rest.first().filter(|p| p.0 == number).map_or((0.0, 0.0), |p| (p.1, p.2));
        let expected = wave.partial(n);
        let (there, wanted) = (measured.0 > reach * strongest, expected.0.abs() > reach * loudest);
        (there || wanted).then(|| {
            let sign = if expected.0 < 0.0 { -1.0 } else { 1.0 };
            let measured = (measured.0.max(reach * strongest), measured.1);
            (measured, (sign * expected.0.abs().max(reach * loudest), expected.1), n)
        })
    })
}

/// Fits one wave; `None` when it does not.
fn fit(partials: &[(u32, f64, f64)], looked_for: u32, wave: Waveform) -> Option<WaveformFit> {
    let count = compared(partials, looked_for, wave).count();
    let enough = matches!(wave, Waveform::Sine) || count >= LEAST_PARTIALS;
    let level_rms_db = DB_PER_NEPER * level_error(partials, looked_for, wave).sqrt();
    if !enough || !(level_rms_db < LEVEL_RMS_DB) {
        return None;
    }
    let error = |shift: f64| {
        let squares = compared(partials, looked_for, wave).map(|(measured, expected, n)| {
            let flipped = if expected.0 < 0.0 { PI } else { 0.0 };
            let off = measured.1 - expected.1 - flipped - n * shift;
            // Either way up: half a turn on all partials alike is the other sign.
            (off, off + PI)
        });
        let turn = |x: f64| (x - TAU * nearest(x / TAU)).powi(2);
        let sums = squares.fold((0.0, 0.0), |s, (a, b)| (s.0 + turn(a), s.1 + turn(b)));
        f64::min(sums.0, sums.1)
    };
    let spacing = TAU / SHIFTS as f64;
    let coarse = (0..SHIFTS).map(|i| spacing * i as f64);
    let mut shift = coarse.min_by(|a, b| error(*a).total_cmp(&error(*b)))?;
    let mut step = 0.5 * spacing;
    for _ in 0..HALVINGS {
        shift = [shift - step, shift, shift + step]
            .into_iter()
            .min_by(|a, b| error(*a).total_cmp(&error(*b)))?;
        step *= 0.5;
    }
    let phase_rms_rad = (error(shift) / count as f64).sqrt();
    (phase_rms_rad < PHASE_RMS_RAD).then_some(WaveformFit {
        waveform: wave,
        level_rms_db,
        phase_rms_rad,
        partials: count,
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Partials 1 to 20 of a wave given by its samples over one period, by the defining sum; the period starts `shift` in.
    fn series(wave: impl Fn(f64) -> f64, shift: f64) -> Vec<(u32, f64, f64)> {
        let samples = 1_u32 << 16;
        let at = |i: u32| (f64::from(i) + 0.5) / f64::from(samples);
        (1..=20u32)
            .map(|n| {
                let turn = |t: f64| TAU * f64::from(n) * t;
                let (mut re, mut im) = (0.0, 0.0);
                for i in 0..samples {
                    let x = wave((at(i) + shift).rem_euclid(1.0)) * 2.0 / f64::from(samples);
                    re += x * turn(at(i)).cos();
                    im -= x * turn(at(i)).sin();
                }
                (n, re.hypot(im), im.atan2(re))
            })
            .filter(|p| p.1 > 1e-4)
            .collect()
    }

    /// One period, by place in it.
    type Period = Box<dyn Fn(f64) -> f64>;

    fn waves() -> Vec<(Waveform, Period)> {
        let pulse = |width: f64| move |t: f64| if t < width { 1.0 } else { 0.0 };
        vec![
            (Waveform::Sine, Box::new(|t: f64| (TAU * t).sin())),
            (Waveform::Saw, Box::new(|t| 2.0 * t - 1.0)),
            (Waveform::Square, Box::new(|t| if t < 0.5 { 1.0 } else { -1.0 })),
            (Waveform::Triangle, Box::new(|t| 4.0 * (t - 0.5).abs() - 1.0)),
            (Waveform::HalfRectifiedSine, Box::new(|t| (TAU * t).sin().max(0.0))),
            (Waveform::Pulse { width: 0.25 }, Box::new(pulse(0.25))),
            (Waveform::Pulse { width: 0.1 }, Box::new(pulse(0.1))),
            (Waveform::Pulse { width: 0.4 }, Box::new(pulse(0.4))),
        ]
    }

    #[test]
    fn every_wave_is_named_from_anywhere_in_its_period_and_upside_down() {
        for (name, wave) in waves() {
            for (shift, sign) in [(0.0, 1.0), (0.13, -1.0), (0.71, 1.0)] {
                let found = waveform(&series(|t| sign * wave(t), shift), 20);
                let found = found.unwrap_or_else(|| panic!("{name:?} shifted by {shift}: nothing"));
                match (name, found.waveform) {
                    (Waveform::Pulse { width: a }, Waveform::Pulse { width: b }) => {
                        assert!((a - b).abs() < 1e-3, "width {a} read as {b}");
                    }
                    (a, b) => assert_eq!(a, b, "shifted by {shift}: {found:?}"),
                }
                assert!(found.level_rms_db < 0.1 && found.phase_rms_rad < 0.01, "{found:?}");
            }
        }
    }

    #[test]
    fn what_is_no_wave_is_not_named() {
        let saw = series(|t| 2.0 * t - 1.0, 0.2);
        let scrambled: Vec<_> = saw.iter().map(|&(n, a, p)| (n, a, p + f64::from(n * n))).collect();
        assert_eq!(waveform(&scrambled, 20), None, "a saw's levels with other phases");
        let dull: Vec<_> =
            saw.iter().map(|&(n, a, p)| (n, a * 0.8f64.powf(f64::from(n)), p)).collect();
        assert_eq!(waveform(&dull, 20), None, "a saw through a filter");
        let missing: Vec<_> = saw.iter().copied().filter(|p| p.0 != 3).collect();
        assert_eq!(waveform(&missing, 20), None, "a saw without partial 3");
        assert_eq!(waveform(&[], 20), None, "nothing");
    }
}
