//! The scales of the strips: they grow at once and shrink after a while, and no single key out of order crushes the rest.

use plumbtone_analysis::keys::in_order_cents;
use plumbtone_analysis::tuning::Tuning;

use super::super::plumb::{Calm, CalmCents, CalmRange};
use super::strips::{STRIPS, Strip, WHISKER_SD};
use crate::keys::Row;

/// Ends of the scale of settling times, in seconds.
const SETTLING_S: [f64; 9] = [0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0, 30.0];
/// Steps of the other scales, and the least distance of their ends: dB, dB per octave, dB, decades.
const LEVEL: (f64, f64) = (6.0, 12.0);
const TILT: (f64, f64) = (3.0, 6.0);
const ALIAS: (f64, f64) = (10.0, 20.0);
const STRETCH: (f64, f64) = (1.0, 2.0);
/// Values beyond these do not stretch their scale.
const LEVEL_DBFS: (f64, f64) = (-140.0, 24.0);
const TILT_DB: (f64, f64) = (-60.0, 60.0);
const ALIAS_DB: (f64, f64) = (-40.0, 80.0);
const STRETCH_LOG: (f64, f64) = (-9.0, 0.0);

/// What the strips' scales are, and have been.
#[derive(Debug, Clone, Default)]
pub(super) struct Scales {
    cents: CalmCents,
    level: CalmRange,
    tilt: CalmRange,
    alias: CalmRange,
    settling: Calm,
    stretch: CalmRange,
    shown: [(f64, f64); STRIPS.len()],
}

impl Scales {
    /// The ends of a strip's scale.
    pub(super) fn of(&self, strip: Strip) -> (f64, f64) {
        self.shown[strip as usize]
    }

    /// Takes the rows as they are now.
    pub(super) fn update(&mut self, rows: &[Row], tuning: &Tuning, now_s: f64) {
        let range = |strip: Strip, within: (f64, f64), with: f64| {
            let values = rows.iter().filter_map(|row| strip.value(row, tuning));
            let held = values.filter(|value| value.is_finite());
            held.map(|value| value.clamp(within.0, within.1))
                .map(|value| (value.min(with), value.max(with)))
                .reduce(|a, b| (a.0.min(b.0), a.1.max(b.1)))
        };
        // A value on the edge of a scale is hard to see.
        let room = |(low, high): (f64, f64), by: f64| (low - by, high + by);
        let mut set = |strip: Strip, ends: (f64, f64)| self.shown[strip as usize] = ends;
        set(Strip::Cents, self.cents.update(cents(rows, tuning), now_s));
        let level = range(Strip::Level, LEVEL_DBFS, f64::NAN).unwrap_or((-30.0, -12.0));
        set(Strip::Level, self.level.update(room(level, 0.5), LEVEL, now_s));
        let tilt = range(Strip::Tilt, TILT_DB, f64::NAN).unwrap_or((-9.0, 0.0));
        set(Strip::Tilt, self.tilt.update(room(tilt, 0.2), TILT, now_s));
        // The threshold is always to be seen.
        let alias = range(Strip::Alias, ALIAS_DB, 0.0).unwrap_or((-20.0, 10.0));
        set(Strip::Alias, self.alias.update(room(alias, 1.0), ALIAS, now_s));
        let settling = range(Strip::Settling, (0.0, 30.0), 0.0).map_or(0.0, |ends| 1.05 * ends.1);
        set(Strip::Settling, (0.0, self.settling.update(settling, now_s, &SETTLING_S)));
        let stretch = range(Strip::Stretch, STRETCH_LOG, f64::NAN).unwrap_or((-5.0, -3.0));
        set(Strip::Stretch, self.stretch.update(stretch, STRETCH, now_s));
    }
}

/// How far the keys reach below and above zero.
fn cents(rows: &[Row], tuning: &Tuning) -> (f64, f64) {
    let most = in_order_cents(rows.iter().map(|row| row.cents(tuning)));
    let held = rows.iter().map(|row| (row.cents(tuning), WHISKER_SD * row.f0_sd_cents));
    held.filter(|(cents, _)| cents.abs() <= most).fold((0.0, 0.0), |(low, high), (cents, reach)| {
        let reach = reach.min(most);
        (f64::max(low, 1.05 * (reach - cents)), f64::max(high, 1.05 * (reach + cents)))
    })
}
