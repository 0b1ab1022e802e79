//! The stiff string: `f_n = n * f0 * sqrt(1 + B * n^2)` (H. Fletcher, JASA 36(1):203-209, 1964), fitted through partials.
//!
//! `(f_n / n)^2 = f0^2 + f0^2 B * n^2` is a line in `n^2`: weighted least squares, made robust by reweighting, with a
//! scatter common to all partials (in cents) added to their own deviations until the residuals agree with both. Without
//! that, one very sure partial of a real instrument would dictate the fit and the stated deviation would be far too small.

/// Cents in one neper of frequency ratio: `1200 / ln 2`.
pub(crate) const CENTS_PER_NEPER: f64 = 1731.234_049_066_756_1;
/// Decibels in one neper of amplitude: `20 / ln 10`.
pub(crate) const DB_PER_NEPER: f64 = 8.685_889_638_065_037;
/// Rounds of reweighting.
const ROUNDS: usize = 6;
/// Residual, in deviations, beyond which a partial counts less (P. J. Huber's function).
const HUBER: f64 = 2.5;
/// Residual, in deviations, beyond which a partial does not count at all.
const REJECT: f64 = 8.0;

/// One partial as the fit sees it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Point {
    /// Partial number.
    pub(crate) n: f64,
    /// Frequency in Hz.
    pub(crate) hz: f64,
    /// Deviation of the frequency, in Hz.
    pub(crate) sd_hz: f64,
}

/// Result of a fit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct StiffFit {
    /// Fundamental in Hz.
    pub(crate) f0: f64,
    /// Its deviation in cents.
    pub(crate) f0_sd_cents: f64,
    /// Inharmonicity.
    pub(crate) b: f64,
    /// Its deviation.
    pub(crate) b_sd: f64,
    /// Scatter of the partials about the model beyond their own deviations, in cents.
    pub(crate) scatter_cents: f64,
}

/// Sums of the normal equations in the relative unknowns `u = ln f0^2` and `B`, about a linearisation point.
#[derive(Debug, Clone, Copy, Default)]
struct Normal {
    uu: f64,
    ub: f64,
    bb: f64,
    u: f64,
    b: f64,
}

/// Frequency of partial `n` of the model.
pub(crate) fn partial_hz(f0: f64, b: f64, n: f64) -> f64 {
    n * f0 * (1.0 + b * n * n).max(1e-6).sqrt()
}

/// Fits the model, with an optional earlier knowledge of `B` (value, deviation). `None` without a usable partial; with one
/// partial and no earlier knowledge, `B` is 0 with an infinite deviation.
pub(crate) fn fit(points: &[Point], prior_b: Option<(f64, f64)>) -> Option<StiffFit> {
    let first = points
        .iter()
        .filter(|p| p.sd_hz > 0.0)
        .min_by(|a, b| (a.sd_hz / a.hz).total_cmp(&(b.sd_hz / b.hz)))?;
    let lone = points.len() < 2 && prior_b.is_none();
    let mut b = prior_b.map_or(0.0, |p| p.0);
    let mut f0 = first.hz / partial_hz(1.0, b, first.n);
    if let Some((f, slope)) = start(points).filter(|_| prior_b.is_none() && points.len() > 2) {
        (f0, b) = (f, slope);
    }
    let mut scatter = 0.0f64;
    let mut covariance = (0.0, 0.0);
    for round in 0..ROUNDS {
        let mut m = Normal::default();
        let (mut chi, mut weight, mut linear) = (0.0, 0.0, 0.0);
        for p in points {
            let variance = relative_variance(p, scatter);
            let r = (p.hz / partial_hz(f0, b, p.n)).ln();
            let huber = if round < 2 { 1.0 } else { robust_weight(r / variance.sqrt()) };
            let w = huber / variance;
            let slope = 0.5 * p.n * p.n / (1.0 + b * p.n * p.n);
            m.uu += w;
            m.ub += w * slope;
            m.bb += w * slope * slope;
            m.u += w * r;
            m.b += w * slope * r;
            chi += w * r * r;
            weight += huber;
            linear += w;
        }
        if let Some((b0, sd)) = prior_b {
            let w = 1.0 / (sd * sd);
            m.bb += w;
            m.b += w * (b0 - b);
        } else if lone {
            m.bb = f64::INFINITY;
        }
        let (du, db, cov) = solve(&m)?;
        f0 *= du.clamp(-0.5, 0.5).exp();
        b = (b + db).clamp(-0.5 / largest_square(points), 0.5);
        covariance = cov;
        let free = weight - if prior_b.is_some() || lone { 1.0 } else { 2.0 };
        // The residuals of this linearisation after the step.
        let left = (chi - du * m.u - db * m.b).max(0.0);
        if round >= 1 && free > 0.5 {
            // Moment estimate of a common variance (R. DerSimonian & N. Laird, 1986).
            let excess = (left - free) / linear * weight / free.max(1.0);
            scatter = (scatter * scatter + excess).max(0.0).sqrt();
        }
    }
    Some(StiffFit {
        f0,
        f0_sd_cents: CENTS_PER_NEPER * covariance.0.sqrt(),
        b,
        b_sd: covariance.1.sqrt(),
        scatter_cents: CENTS_PER_NEPER * scatter,
    })
}

/// Square of the largest partial number.
fn largest_square(points: &[Point]) -> f64 {
    points.iter().fold(1.0, |m: f64, p| m.max(p.n * p.n))
}

/// Relative variance of a partial with the common scatter.
fn relative_variance(p: &Point, scatter: f64) -> f64 {
    let own = p.sd_hz / p.hz;
    own * own + scatter * scatter
}

/// Weight of a residual given in deviations.
fn robust_weight(z: f64) -> f64 {
    let z = z.abs();
    if z <= HUBER {
        1.0
    } else if z < REJECT {
        HUBER / z
    } else {
        0.0
    }
}

/// Solves the normal equations: steps of `ln f0` and `B`, and their variances.
fn solve(m: &Normal) -> Option<(f64, f64, (f64, f64))> {
    if m.bb.is_infinite() {
        return (m.uu > 0.0).then(|| (m.u / m.uu, 0.0, (1.0 / m.uu, f64::INFINITY)));
    }
    let det = m.uu * m.bb - m.ub * m.ub;
    if !(det > 1e-14 * m.uu * m.bb) {
        return None;
    }
    let du = (m.bb * m.u - m.ub * m.b) / det;
    let db = (m.uu * m.b - m.ub * m.u) / det;
    Some((du, db, (m.bb / det, m.uu / det)))
}

/// A starting line: the median inharmonicity over neighbouring pairs (M. Hodgkinson et al., DAFx-09, uses all pairs),
/// then the weighted mean fundamental.
fn start(points: &[Point]) -> Option<(f64, f64)> {
    let mut slopes = [0.0f64; 128];
    let mut count = 0;
    for pair in points.windows(2) {
        let [p, q] = pair else { continue };
        let r = (q.n * p.hz / (p.n * q.hz)).powi(2);
        let b = (1.0 - r) / (r * q.n * q.n - p.n * p.n);
        if b.is_finite() && count < slopes.len() {
            slopes[count] = b;
            count += 1;
        }
    }
    if count == 0 {
        return None;
    }
    let slopes = &mut slopes[..count];
    slopes.sort_unstable_by(f64::total_cmp);
    let b = slopes[count / 2].clamp(-0.25 / largest_square(points), 0.1);
    let (mut sum, mut weight) = (0.0, 0.0);
    for p in points {
        let w = (p.hz / p.sd_hz).powi(2);
        sum += w * (p.hz / partial_hz(1.0, b, p.n)).ln();
        weight += w;
    }
    Some(((sum / weight).exp(), b))
}
