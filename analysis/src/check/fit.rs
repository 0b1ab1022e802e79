//! Least-squares fits over a window of readings: a straight line, alone or with a vibrato on top.

use core::f64::consts::TAU;

use super::heard::Point;

/// Rates searched for a vibrato, in Hz, and the step between them: the published 4 to 8 Hz with some room.
const RATES_HZ: (f64, f64) = (3.8, 9.0);
const RATE_STEP_HZ: f64 = 0.2;
/// Periods of a vibrato that a window must hold.
const PERIODS: f64 = 2.0;
/// Share of what the line leaves that a vibrato must explain.
const EXPLAINED: f64 = 0.6;
/// Least extent of a vibrato, in cents, and in its own deviations.
const EXTENT_CENTS: f64 = 2.0;
const EXTENT_SDS: f64 = 4.0;
/// Deviation added to what a reading states, in cents: what is too small to matter must not decide.
const FLOOR_CENTS: f64 = 0.1;
/// A scatter beside which all that readings state is equal, in squared cents.
const EQUAL: f64 = 1e12;
/// Parameters at most: offset, slope, and the two parts of a vibrato.
const MOST: usize = 4;

/// A fit over a window. Times are relative to the window's middle.
#[derive(Debug, Clone, Copy)]
pub(super) struct Fit {
    middle_s: f64,
    offset: f64,
    /// Cents per second.
    pub(super) slope: f64,
    pub(super) vibrato: Option<Wave>,
    /// Weighted mean square of what is left, in squared cents.
    pub(super) left: f64,
    /// Variance of the offset, and of the slope, in squared cents and squared cents per second.
    variances: (f64, f64),
}

/// A vibrato within a window.
#[derive(Debug, Clone, Copy)]
pub(super) struct Wave {
    pub(super) rate_hz: f64,
    cosine: f64,
    sine: f64,
}

impl Wave {
    /// Half of the whole range, in cents.
    pub(super) fn extent(&self) -> f64 {
        self.cosine.hypot(self.sine)
    }

    fn at(&self, time_s: f64) -> f64 {
        let (sin, cos) = (TAU * self.rate_hz * time_s).sin_cos();
        self.cosine * cos + self.sine * sin
    }
}

impl Fit {
    /// A line through a window of readings; `independent` is how many readings in a row say the same thing once, for
    /// their frames overlap.
    pub(super) fn line(window: &[Point], independent: f64) -> Self {
        let middle_s = middle(window);
        let scatter = solve(window, Model { middle_s, rate_hz: None, scatter: EQUAL }).left;
        let Solved { values, left, variances } =
            solve(window, Model { middle_s, rate_hz: None, scatter });
        let scale = spread(window, left, independent);
        Self {
            middle_s,
            offset: values[0],
            slope: values[1],
            vibrato: None,
            left,
            variances: (scale * variances.0, scale * variances.1),
        }
    }

    /// The same with a vibrato, where there is one.
    pub(super) fn with_vibrato(window: &[Point], independent: f64) -> Self {
        let line = Self::line(window, independent);
        let length_s = window.last().map_or(0.0, |p| p.time_s) - window[0].time_s;
        let noise = 2.0 * mean_variance(window);
        // What the readings' own deviations explain needs no vibrato.
        if line.left < noise.max(0.25 * EXTENT_CENTS * EXTENT_CENTS) {
            return line;
        }
        let model = Model { middle_s: line.middle_s, rate_hz: None, scatter: line.left };
        let Some(rate_hz) = best_rate(window, model, length_s) else { return line };
        let Solved { values, left, variances } =
            solve(window, Model { rate_hz: Some(rate_hz), ..model });
        let wave = Wave { rate_hz, cosine: values[2], sine: values[3] };
        let scale = spread(window, left, independent);
        let extent_sd = (2.0 * scale * variances.0).sqrt();
        let there = left < (1.0 - EXPLAINED) * line.left
            && wave.extent() > EXTENT_CENTS.max(EXTENT_SDS * extent_sd);
        if !there {
            return line;
        }
        Self {
            offset: values[0],
            slope: values[1],
            vibrato: Some(wave),
            left,
            variances: (scale * variances.0, scale * variances.1),
            ..line
        }
    }

    /// The trend at a time, in cents.
    pub(super) fn trend(&self, time_s: f64) -> f64 {
        self.offset + self.slope * (time_s - self.middle_s)
    }

    /// Variance of the trend at a time, in squared cents.
    pub(super) fn variance(&self, time_s: f64) -> f64 {
        let from_middle = time_s - self.middle_s;
        self.variances.0 + self.variances.1 * from_middle * from_middle
    }

    /// The vibrato at a time, in cents.
    pub(super) fn vibrato_at(&self, time_s: f64) -> f64 {
        self.vibrato.map_or(0.0, |wave| wave.at(time_s - self.middle_s))
    }
}

/// The rate at which a vibrato leaves least, to a fraction of the step by a parabola.
fn best_rate(window: &[Point], model: Model, length_s: f64) -> Option<f64> {
    let lowest = RATES_HZ.0.max(PERIODS / length_s);
    let left = |rate_hz: f64| solve(window, Model { rate_hz: Some(rate_hz), ..model }).left;
    let mut best: Option<(f64, f64)> = None;
    let mut rate_hz = lowest;
    while rate_hz <= RATES_HZ.1 {
        let here = left(rate_hz);
        if best.is_none_or(|(_, least)| here < least) {
            best = Some((rate_hz, here));
        }
        rate_hz += RATE_STEP_HZ;
    }
    let (rate_hz, least) = best?;
    let (below, above) = (left(rate_hz - RATE_STEP_HZ), left(rate_hz + RATE_STEP_HZ));
    let bend = below - 2.0 * least + above;
    let shift = if bend > 0.0 { (0.5 * (below - above) / bend).clamp(-1.0, 1.0) } else { 0.0 };
    Some(rate_hz + shift * RATE_STEP_HZ)
}

/// What is fitted.
#[derive(Debug, Clone, Copy)]
struct Model {
    middle_s: f64,
    /// Rate of the vibrato, where there is to be one.
    rate_hz: Option<f64>,
    /// Variance of the readings beyond what they state, in squared cents.
    scatter: f64,
}

/// What a fit comes to.
struct Solved {
    values: [f64; MOST],
    /// Weighted mean square of the residuals.
    left: f64,
    /// Variances of offset and slope per unit of reading variance.
    variances: (f64, f64),
}

/// Weighted least squares of 1, t and, at a rate, cos and sin, by normal equations.
fn solve(window: &[Point], model: Model) -> Solved {
    let Model { middle_s, rate_hz, scatter } = model;
    let count = if rate_hz.is_some() { MOST } else { 2 };
    let origin = window[0].cents;
    let turn = TAU * rate_hz.unwrap_or(0.0);
    let (mut normal, mut right, mut square, mut weights) =
        ([[0.0; MOST]; MOST], [0.0; MOST], 0.0, 0.0);
    for point in window {
        let t = point.time_s - middle_s;
        let (sin, cos) = if rate_hz.is_some() { (turn * t).sin_cos() } else { (0.0, 0.0) };
        let row = [1.0, t, cos, sin];
        let weight = 1.0 / (variance(point) + scatter);
        let y = point.cents - origin;
        for i in 0..count {
            for j in 0..=i {
                normal[i][j] += weight * row[i] * row[j];
            }
            right[i] += weight * row[i] * y;
        }
        square += weight * y * y;
        weights += weight;
    }
    let factor = cholesky(normal, count);
    let mut values = substitute(&factor, right, count);
    let explained: f64 = values.iter().zip(&right).map(|(v, r)| v * r).sum();
    let unit = |i: usize| {
        let mut e = [0.0; MOST];
        e[i] = 1.0;
        substitute(&factor, e, count)[i]
    };
    values[0] += origin;
    let mean_weight = weights / window.len() as f64;
    Solved {
        values,
        left: ((square - explained) / weights).max(0.0),
        variances: (mean_weight * unit(0), mean_weight * unit(1)),
    }
}

/// Lower triangle L with L L' = the matrix; a direction that the data do not tell is held at 0.
fn cholesky(mut m: [[f64; MOST]; MOST], count: usize) -> [[f64; MOST]; MOST] {
    for j in 0..count {
        let whole = m[j][j];
        for k in 0..j {
            m[j][j] -= m[j][k] * m[j][k];
        }
        m[j][j] = if m[j][j] > 1e-12 * whole { m[j][j].sqrt() } else { f64::INFINITY };
        for i in j + 1..count {
            for k in 0..j {
                m[i][j] -= m[i][k] * m[j][k];
            }
            m[i][j] /= m[j][j];
        }
    }
    m
}

fn substitute(factor: &[[f64; MOST]; MOST], mut x: [f64; MOST], count: usize) -> [f64; MOST] {
    for i in 0..count {
        for k in 0..i {
            x[i] -= factor[i][k] * x[k];
        }
        x[i] /= factor[i][i];
    }
    for i in (0..count).rev() {
        for k in i + 1..count {
            x[i] -= factor[k][i] * x[k];
        }
        x[i] /= factor[i][i];
    }
    x
}

/// Variance that a reading states, in squared cents.
fn variance(point: &Point) -> f64 {
    point.sd * point.sd + FLOOR_CENTS * FLOOR_CENTS
}

/// Variance of one independent observation: what is left over, or what the readings state where that is more.
fn spread(window: &[Point], left: f64, independent: f64) -> f64 {
    independent * left.max(mean_variance(window))
}

/// Harmonic mean of the variances that the readings state: a few bad ones do not raise it.
pub(super) fn mean_variance(window: &[Point]) -> f64 {
    window.len() as f64 / window.iter().map(|point| 1.0 / variance(point)).sum::<f64>()
}

fn middle(window: &[Point]) -> f64 {
    window.last().map_or(0.0, |last| 0.5 * (window[0].time_s + last.time_s))
}
