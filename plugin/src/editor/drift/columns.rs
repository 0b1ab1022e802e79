//! The trail as columns of pixels: lowest, mean and highest pitch of each, at a cost that does not depend on the zoom.

use super::reference::Target;
use crate::convert::{nearest, single};
use crate::trail::{Kind, Trail};

/// From this many readings a column on, cells are drawn instead of points.
const POINTS_A_COLUMN: u64 = 16;
/// Half the time over which the drift line averages, in seconds: over two periods of a slow vibrato.
const SMOOTH_S: f64 = 0.4;

/// One column.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Column {
    /// Middle of the column, as an index of the trail.
    pub(crate) at: f64,
    pub(crate) kind: Kind,
    /// The note it is held against.
    pub(crate) note: i64,
    /// Cents off the reference; of no use without a single pitch.
    pub(crate) low: f32,
    pub(crate) mean: f32,
    pub(crate) high: f32,
    /// Deviation in cents.
    pub(crate) sd: f32,
    /// The drift line there: the mean over the time of some vibrato periods.
    pub(crate) drift: f32,
}

/// The columns of a stretch of the trail, `step` readings each.
pub(crate) fn columns(
    trail: &Trail,
    (start, end): (u64, u64),
    step: u64,
    target: &Target,
) -> Vec<Column> {
    let step = step.max(1);
    let reach = SMOOTH_S / (trail.step_s() * step as f64);
    // The drift line at the edge knows of what lies beyond it.
    let start = start.saturating_sub(nearest(reach) * step);
    let mut out = Vec::new();
    // Columns lie on a fixed grid, so that they do not change while the picture scrolls.
    let mut from = start / step * step;
    while from < end {
        out.push(column(trail, from, step, target));
        from += step;
    }
    smooth(&mut out, reach);
    out
}

/// What a column is made of.
struct Sum {
    kind: Kind,
    note: i64,
    low: f64,
    high: f64,
    mean: f64,
    sd: f64,
    count: f64,
}

fn column(trail: &Trail, from: u64, step: u64, target: &Target) -> Column {
    let mut sum =
        Sum { kind: Kind::Nothing, note: 0, low: 0.0, high: 0.0, mean: 0.0, sd: 0.0, count: 0.0 };
    let fine = step < POINTS_A_COLUMN && trail.point(from).is_some();
    if fine {
        for at in from..from + step {
            if let Some(point) = trail.point(at) {
                sum.add(
                    point.kind(),
                    (point.cents(), point.cents(), point.cents()),
                    point.sd_cents(),
                    target,
                );
            }
        }
    } else {
        let length = trail.cell_length();
        let mut at = from;
        while at < from + step {
            if let Some(cell) = trail.cell(at) {
                let (low, high) = cell.range_cents();
                let mean = cell.mean;
                sum.add(mean.kind(), (low, mean.cents(), high), mean.sd_cents(), target);
            }
            at += length - at % length;
        }
    }
    let count = sum.count.max(1.0);
    let mean = single(sum.mean / count);
    Column {
        at: from as f64 + 0.5 * (step as f64 - 1.0),
        kind: sum.kind,
        note: sum.note,
        low: single(sum.low),
        mean,
        high: single(sum.high),
        sd: single(sum.sd / count),
        drift: mean,
    }
}

impl Sum {
    fn add(&mut self, kind: Kind, (low, mean, high): (f64, f64, f64), sd: f64, target: &Target) {
        if !kind.pitched() {
            if !self.kind.pitched() && kind != Kind::Nothing {
                self.kind = kind;
            }
            return;
        }
        let (note, off) = target.off(mean);
        let (low, high) = (off - (mean - low), off + (high - mean));
        if !self.kind.pitched() || note != self.note {
            // A column shows the newest note of several.
            *self = Self { kind, note, low, high, mean: off, sd, count: 1.0 };
            return;
        }
        self.kind = kind;
        self.low = self.low.min(low);
        self.high = self.high.max(high);
        self.mean += off;
        self.sd += sd;
        self.count += 1.0;
    }
}

/// Averages the means over `reach` columns each way, within one note.
fn smooth(columns: &mut [Column], reach: f64) {
    let reach = crate::convert::index(nearest(reach));
    if reach == 0 {
        return;
    }
    let mut start = 0;
    while start < columns.len() {
        let first = columns[start];
        let same = |c: &Column| c.kind.pitched() && first.kind.pitched() && c.note == first.note;
        let length = columns[start..].iter().take_while(|c| same(c)).count().max(1);
        let run = &mut columns[start..start + length];
        let mut sums = vec![0.0f64];
        let mut total = 0.0;
        for column in run.iter() {
            total += f64::from(column.mean);
            sums.push(total);
        }
        for (k, column) in run.iter_mut().enumerate() {
            let (a, b) = (k.saturating_sub(reach), (k + reach + 1).min(length));
            column.drift = single((sums[b] - sums[a]) / (b - a) as f64);
        }
        start += length;
    }
}

#[cfg(test)]
mod tests {
    use plumbtone_analysis::tuning::{Tuning, ratio};
    use plumbtone_analysis::{Pitch, Reading, State};

    use super::*;
    use crate::session::SessionPosition;

    fn trail(readings: u64, cents: impl Fn(f64) -> Option<f64>) -> Trail {
        let mut trail = Trail::default();
        trail.grid(480, 48_000.0);
        for number in 0..readings {
            let pitch = cents(number as f64 * 0.01).map(|cents| Pitch {
                f0_hz: 220.0 * ratio(cents),
                f0_sd_cents: 0.2,
                confidence: 1.0,
            });
            let state = if pitch.is_some() { State::Steady } else { State::Silent };
            let reading = Reading { centre: number * 480, state, pitch, ..Reading::default() };
            trail.push(1, &reading, &SessionPosition::default());
        }
        trail
    }

    fn target() -> Target {
        Target::nearest(&Tuning::default())
    }

    #[test]
    fn a_vibrato_keeps_its_extent_at_every_zoom_and_drift_goes_through_it() {
        let trail = trail(20_000, |t| Some(3.0 + 8.0 * (core::f64::consts::TAU * 5.5 * t).sin()));
        for step in [1, 4, 16, 50, 200] {
            let columns = columns(&trail, (0, trail.next()), step, &target());
            let (low, high) =
                columns.iter().fold((0.0f32, 0.0f32), |(l, h), c| (l.min(c.low), h.max(c.high)));
            assert!((low + 5.0).abs() < 0.3 && (high - 11.0).abs() < 0.3, "{step}: {low} {high}");
            let inner = &columns[columns.len() / 4..columns.len() * 3 / 4];
            let worst = inner.iter().map(|c| (c.drift - 3.0).abs()).fold(0.0, f32::max);
            assert!(worst < 1.0, "{step}: the drift line is off by {worst}");
        }
    }

    #[test]
    fn gaps_and_silence_stay_themselves() {
        let mut trail = trail(100, |t| (t < 0.5).then_some(0.0));
        let far = Reading { centre: 200 * 480, ..Reading::default() };
        trail.push(1, &far, &SessionPosition::default());
        let columns = columns(&trail, (0, trail.next()), 1, &target());
        let kind = |at: usize| columns[at].kind;
        assert_eq!(
            (kind(10), kind(70), kind(150), kind(200)),
            (Kind::Steady, Kind::Silent, Kind::Nothing, Kind::Silent)
        );
    }

    #[test]
    fn columns_do_not_change_while_the_picture_scrolls() {
        let trail = trail(5_000, |t| Some(t.sin()));
        let a = columns(&trail, (1_000, 3_000), 7, &target());
        let b = columns(&trail, (1_005, 3_000), 7, &target());
        let other = b[150];
        let same = a.iter().find(|column| (column.at - other.at).abs() < 1e-9).unwrap();
        assert_eq!((same.low, same.mean, same.high), (other.low, other.mean, other.high));
    }

    #[test]
    fn an_empty_trail_has_no_columns() {
        assert_eq!(columns(&Trail::default(), (0, 0), 0, &target()), []);
        assert_eq!(columns(&Trail::default(), (0, 10), 3, &target())[0].kind, Kind::Nothing);
    }
}
