//! Results for tests.

use super::curve::{COLUMNS_MAX, Curve};
use super::result::{CheckResult, Extent, OutsideSpan, VerdictWord};
use plumbtone_analysis::check::{Heard, Trace};

/// A result that is outside over the middle of a stretch of the session, in seconds.
pub(crate) fn result(start_s: f64, end_s: f64) -> CheckResult {
    let extent = |start_s: f64, end_s: f64| Extent {
        start_s,
        end_s,
        start_sample: crate::convert::floor(48_000.0 * start_s),
        end_sample: crate::convert::floor(48_000.0 * end_s),
        start_bar: Some(1),
        start_beat: Some(1.0 + start_s / 3.0),
        end_bar: Some(1),
        end_beat: Some(1.0 + end_s / 3.0),
    };
    let third = (end_s - start_s) / 3.0;
    CheckResult {
        number: 1,
        extent: extent(start_s, end_s),
        in_session: true,
        verdict: VerdictWord::Outside,
        reason: None,
        reference: "nearest note".to_owned(),
        reference_kind: "nearest".to_owned(),
        reference_hz: None,
        tolerance_cents: 5.0,
        worst_cents: Some(7.1),
        mean_cents: Some(2.3),
        drift_cents_per_s: Some(0.1),
        drift_sd: Some(0.05),
        drift_cents_per_min: Some(6.0),
        drift_per_min_sd: Some(3.0),
        vibrato_hz: None,
        vibrato_extent_cents: None,
        vibrato_share: None,
        raw_lowest_cents: Some(-1.0),
        raw_highest_cents: Some(8.0),
        measured_s: end_s - start_s,
        measured_share: Some(1.0),
        outside_s: third,
        spans: vec![OutsideSpan {
            extent: extent(start_s + third, end_s - third),
            worst_cents: 7.1,
            mean_cents: 6.4,
        }],
        spans_left_out: 0,
        lost_samples: 0,
        sample_rate_hz: 48_000.0,
        concert_pitch_hz: 440.0,
        temperament: "equal".to_owned(),
        engine_version: "0.1.0".to_owned(),
        comment: String::new(),
        curve: curve(start_s, end_s),
        in_trail: None,
    }
}

/// The pitch of such a result: outside over the middle, with a pause before the end. Bars last two seconds.
fn curve(start_s: f64, end_s: f64) -> Option<Curve> {
    let mut trace = Trace::new(COLUMNS_MAX);
    let count = crate::convert::nearest(100.0 * (end_s - start_s));
    for index in 0..count {
        let share = index as f64 / count as f64;
        let wave = (25.0 * share).sin();
        let cents = if (0.33..0.67).contains(&share) { 6.4 + 0.7 * wave } else { 1.5 * wave };
        if !(0.8..0.9).contains(&share) {
            trace.push(&Heard {
                position: 480 * index,
                reference_hz: 220.0,
                cents,
                sd_cents: 0.3 + 0.2 * share,
                raw_cents: cents,
            });
        }
    }
    let bars = (2..100).map(|bar| (bar, 2.0 * (bar - 1) as f64));
    let within = bars.filter(|(_, at)| *at > start_s && *at < end_s).take(16);
    Curve::of(&trace, within.collect(), |at| start_s + at as f64 / 48_000.0)
}
