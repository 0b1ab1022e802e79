//! The stiff string: `f_n = n * f0 * sqrt(1 + B * n^2)` (H. Fletcher, JASA 36(1):203-209, 1964), fitted through partials.
//!
//! `(f_n / n)^2 = f0^2 + f0^2 B * n^2` is a line in `n^2`: weighted least squares, made robust by reweighting, with a
//! scatter common to all partials (in cents) added to their own deviations until the residuals agree with both. Without
//! that, one very sure partial of a real instrument would dictate the fit and the stated deviation would be far too small.

/// Cents in one neper of frequency ratio: `1200 / ln 2`.
pub(crate) const CENTS_PER_NEPER: f64 = 1_731.234_049_066_756_1;
/// Decibels in one neper of amplitude: `20 / ln 10`.
pub(crate) const DB_PER_NEPER: f64 = 8.685_889_638_065_037;
/// Rounds of reweighting.
const ROUNDS: usize = 6;
/// Squared step in deviations, and change of the scatter, below which nothing more is gained.
const SETTLED: f64 = 1e-4;
/// Residual, in deviations, beyond which a partial counts less (P. J. Huber's function).
const HUBER: f64 = 2.5;
/// Residual, in deviations, beyond which a partial does not count at all.
const REJECT: f64 = 8.0;

/// Partials from which on the middle one's residual says how large residuals are to begin with, so that a few partials on
/// something else's line are outvoted.
const OUTVOTED: usize = 6;
/// Most points that a median is taken of.
const MEDIAN_OF: usize = 136;

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

/// The (fractional) partial number at a frequency: the inverse of [`partial_hz`].
pub(crate) fn partial_number(f0: f64, b: f64, hz: f64) -> f64 {
    let harmonic = (hz / f0) * (hz / f0);
    (2.0 * harmonic / (1.0 + (1.0 + 4.0 * b * harmonic).max(0.0).sqrt())).sqrt()
}

/// Fits the model. `None` without a usable partial; with a single one, `B` is 0 with an infinite deviation.
pub(crate) fn fit(points: &[Point]) -> Option<StiffFit> {
    let first = points
        .iter()
        .filter(|p| p.sd_hz > 0.0)
        .min_by(|a, b| (a.sd_hz / a.hz).total_cmp(&(b.sd_hz / b.hz)))?;
    let lone = points.len() < 2;
    let (mut f0, mut b) = (first.hz / first.n, 0.0);
    if let Some((f, slope)) = start(points).filter(|_| points.len() > 2) {
        (f0, b) = (f, slope);
    }
    let outvoted = points.len() >= OUTVOTED;
    let mut scatter = if outvoted { middle_residual(points, f0, b) } else { 0.0 };
    let mut covariance = (0.0, 0.0);
    for round in 0..ROUNDS {
        let mut m = Normal::default();
        let (mut chi, mut weight, mut linear) = (0.0, 0.0, 0.0);
        for p in points {
            let variance = relative_variance(p, scatter);
            let r = log_ratio(p.hz / partial_hz(f0, b, p.n));
            let judged = outvoted || round >= 2;
            let huber = if judged { robust_weight(r * r / variance) } else { 1.0 };
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
        if lone {
            m.bb = f64::INFINITY;
        }
        let (du, db, cov) = solve(&m)?;
        f0 *= du.clamp(-0.5, 0.5).exp();
        b = (b + db).clamp(-0.5 / largest_square(points), 0.5);
        covariance = cov;
        let free = weight - if lone { 1.0 } else { 2.0 };
        // The residuals of this linearisation after the step.
        let left = (chi - du * m.u - db * m.b).max(0.0);
        let before = scatter;
        if round >= 1 && free > 0.5 {
            // Moment estimate of a common variance (R. DerSimonian & N. Laird, 1986).
            let excess = (left - free) / linear * weight / free.max(1.0);
            scatter = (scatter * scatter + excess).max(0.0).sqrt();
        }
        let still = du * du < SETTLED * cov.0 && db * db < SETTLED * cov.1;
        if round >= 3 && still && (scatter - before).abs() <= SETTLED * scatter {
            break;
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

/// Root of the sum of squares, as independent deviations add up.
#[expect(
    clippy::imprecise_flops,
    reason = "nothing here overflows, and the library's `hypot` costs twenty times as much"
)]
#[inline(always)]
pub(crate) fn quadrature(a: f64, b: f64) -> f64 {
    (a * a + b * b).sqrt()
}

/// Logarithm; for ratios close to 1, where nearly all calls are, by the series to the last digit.
pub(crate) fn log_ratio(ratio: f64) -> f64 {
    let x = ratio - 1.0;
    if x.abs() > 5e-4 {
        return ratio.ln();
    }
    x * (1.0 - x * (0.5 - x * (1.0 / 3.0 - x * (0.25 - 0.2 * x))))
}

/// Relative variance of a partial with the common scatter.
fn relative_variance(p: &Point, scatter: f64) -> f64 {
    let own = p.sd_hz / p.hz;
    own * own + scatter * scatter
}

/// Weight of a residual given as its square over its variance.
fn robust_weight(z_squared: f64) -> f64 {
    if z_squared <= HUBER * HUBER {
        1.0
    } else if z_squared < REJECT * REJECT {
        HUBER / z_squared.sqrt()
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

/// Size of the middle relative residual, as the deviation of a normal distribution.
fn middle_residual(points: &[Point], f0: f64, b: f64) -> f64 {
    let sizes =
        points.iter().map(|p| (log_ratio(p.hz / partial_hz(f0, b, p.n)).abs(), deviation(p)));
    1.4826 * middle(sizes).unwrap_or(0.0)
}

/// A starting line: the middle inharmonicity over neighbouring pairs (M. Hodgkinson et al., DAFx-09, uses all pairs), then
/// the fundamental: the middle one where there are enough, or the weighted mean.
fn start(points: &[Point]) -> Option<(f64, f64)> {
    let slopes = points.windows(2).filter_map(|pair| {
        let [p, q] = pair else { return None };
        let r = (q.n * p.hz / (p.n * q.hz)).powi(2);
        let b = (1.0 - r) / (r * q.n * q.n - p.n * p.n);
        b.is_finite().then_some((b, deviation(p).max(deviation(q))))
    });
    let b = middle(slopes)?.clamp(-0.25 / largest_square(points), 0.1);
    let log_f0 = |p: &Point| (p.hz / partial_hz(1.0, b, p.n)).ln();
    if points.len() >= OUTVOTED {
        let logs = points.iter().map(|p| (log_f0(p), deviation(p)));
        return middle(logs).map(|log| (log.exp(), b));
    }
    let (mut sum, mut weight) = (0.0, 0.0);
    for p in points {
        let w = (p.hz / p.sd_hz).powi(2);
        sum += w * log_f0(p);
        weight += w;
    }
    Some(((sum / weight).exp(), b))
}

/// The middle of the first so many values, given with the deviations of their partials: half the weight lies on either side.
/// Surer partials weigh more, though far less than by their variances, or one of them would be the middle by itself.
fn middle(values: impl Iterator<Item = (f64, f64)>) -> Option<f64> {
    let mut sorted = [(0.0f64, 0.0f64); MEDIAN_OF];
    let mut count = 0;
    for (slot, (value, deviation)) in sorted.iter_mut().zip(values) {
        *slot = (value, deviation.max(1e-12).sqrt().recip());
        count += 1;
    }
    let sorted = sorted.get_mut(..count).filter(|s| !s.is_empty())?;
    sorted.sort_unstable_by(|a, b| a.0.total_cmp(&b.0));
    let half = 0.5 * sorted.iter().map(|s| s.1).sum::<f64>();
    let mut sum = 0.0;
    let at = sorted.iter().position(|s| {
        sum += s.1;
        sum >= half
    });
    at.map(|at| sorted[at].0)
}

/// Deviation of a partial, relative.
fn deviation(p: &Point) -> f64 {
    p.sd_hz / p.hz
}

#[cfg(test)]
mod tests {
    use super::*;

    fn series(f0: f64, b: f64, count: u8, sd_hz: f64) -> Vec<Point> {
        let point = |n: f64| Point { n, hz: partial_hz(f0, b, n), sd_hz };
        (1..=count).map(|n| point(f64::from(n))).collect()
    }

    #[test]
    fn partials_of_a_stiff_string_are_where_the_model_says() {
        // A. Galembo and A. Askenfelt's form of H. Fletcher's model: f_n = n f0 sqrt(1 + B n^2).
        let cents = CENTS_PER_NEPER * (partial_hz(100.0, 1e-3, 10.0) / 1000.0).ln();
        assert!((cents - 82.503).abs() < 1e-2, "partial 10 at B = 1e-3: {cents} cents");
    }

    #[test]
    fn exact_partials_give_the_exact_model() {
        for (f0, b) in [(27.5, 4e-4), (110.0, 0.0), (1046.5, 2e-3), (440.0, -2e-5)] {
            let found = fit(&series(f0, b, 20, 1e-3)).expect("twenty partials");
            assert!((found.f0 / f0 - 1.0).abs() < 1e-9, "{f0} Hz, B {b}: {found:?}");
            assert!((found.b - b).abs() < 1e-10, "{f0} Hz, B {b}: {found:?}");
        }
    }

    #[test]
    fn partials_on_another_line_are_outvoted() {
        let mut points = series(220.0, 1e-4, 15, 1e-3);
        points[11].hz += 9.0;
        points[4].hz -= 3.0;
        let found = fit(&points).expect("fifteen partials");
        assert!((found.f0 / 220.0 - 1.0).abs() < 1e-6, "{found:?}");
        assert!(found.f0_sd_cents < 0.1, "{found:?}");
    }

    #[test]
    fn scatter_widens_the_deviations() {
        let mut points = series(220.0, 0.0, 20, 1e-4);
        for (p, off) in points.iter_mut().zip([3e-4, -2e-4, 1e-4, -3e-4, 2e-4].iter().cycle()) {
            p.hz *= 1.0 + off;
        }
        let found = fit(&points).expect("twenty partials");
        assert!(found.scatter_cents > 0.2 && found.scatter_cents < 0.8, "{found:?}");
        let off = CENTS_PER_NEPER * (found.f0 / 220.0).ln().abs();
        assert!(off < 3.0 * found.f0_sd_cents && found.f0_sd_cents > 0.05, "{off}: {found:?}");
    }

    #[test]
    fn a_lone_partial_says_nothing_of_inharmonicity() {
        let found = fit(&series(220.0, 0.0, 1, 0.1)).expect("one partial");
        assert!(found.b_sd.is_infinite() && (found.f0 - 220.0).abs() < 1e-9, "{found:?}");
        assert!(fit(&[]).is_none(), "no partial, no model");
    }
}
