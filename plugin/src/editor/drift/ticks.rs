//! Labels of the time axis: bars where the transport tells them, session time where it tells that, or time heard.

use super::super::plumb::round_step;
use crate::convert::{floor, nearest, single};
use crate::trail::{Break, Trail};

/// Most labels.
const MOST: usize = 64;

/// A label at an index of the trail.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Tick {
    pub(crate) at: f64,
    pub(crate) text: String,
}

/// Labels from `start` to `end`, at least `apart` readings from each other.
pub(crate) fn ticks(trail: &Trail, start: f64, end: f64, apart: f64) -> Vec<Tick> {
    let bars: Vec<(f64, i64)> = trail
        .bars()
        .map(|bar| (bar.index as f64, bar.number))
        .filter(|(at, _)| *at >= start && *at <= end)
        .collect();
    if bars.len() >= 2 { of_bars(&bars, apart) } else { of_seconds(trail, start, end, apart) }
}

fn of_bars(bars: &[(f64, i64)], apart: f64) -> Vec<Tick> {
    let mean = (bars[bars.len() - 1].0 - bars[0].0) / (bars.len() - 1) as f64;
    let stride =
        [1, 2, 4, 8, 16, 32, 64, 128].into_iter().find(|&stride| mean * stride as f64 >= apart);
    let stride = stride.unwrap_or(256);
    let mut last = f64::NEG_INFINITY;
    bars.iter()
        .filter(|(_, number)| (number - 1).rem_euclid(stride) == 0)
        .filter(|(at, _)| {
            let far = *at - last >= apart;
            if far {
                last = *at;
            }
            far
        })
        .map(|&(at, number)| Tick { at, text: format!("{number}|1") })
        .take(MOST)
        .collect()
}

fn of_seconds(trail: &Trail, start: f64, end: f64, apart: f64) -> Vec<Tick> {
    let step_s = trail.step_s();
    let round = time_step(apart * step_s);
    let begin = Break { index: 0, seconds: Some(0.0) };
    let breaks: Vec<Break> = trail.breaks().collect();
    let mut out: Vec<Tick> = Vec::new();
    for (number, from) in std::iter::once(&begin).chain(&breaks).enumerate() {
        let until = breaks.get(number).map_or(f64::INFINITY, |next| next.index as f64).min(end);
        let first = from.index as f64;
        // Without session time, time heard: seconds since the trail began.
        let base = from.seconds.unwrap_or(first * step_s);
        let mut k = ((base + (start.max(first) - first) * step_s) / round).ceil();
        while out.len() < MOST {
            let at = first + (k * round - base) / step_s;
            if !(at < until) {
                break;
            }
            if out.last().is_none_or(|last| at - last.at >= 0.8 * apart) {
                out.push(Tick { at, text: clock(k * round, round) });
            }
            k += 1.0;
        }
    }
    out
}

/// A round number of seconds that is not below a number.
fn time_step(least_s: f64) -> f64 {
    if least_s < 10.0 {
        return round_step(least_s.max(0.1));
    }
    let steps = [15.0, 30.0, 60.0, 120.0, 300.0, 600.0, 1_800.0];
    steps.into_iter().find(|&step| step >= least_s).unwrap_or(3_600.0)
}

/// Seconds as minutes and seconds.
fn clock(seconds: f64, step_s: f64) -> String {
    let sign = if seconds < 0.0 { "\u{2212}" } else { "" };
    let whole = seconds.abs() + 1e-6;
    let minutes = floor(whole / 60.0);
    let rest = whole - 60.0 * (whole / 60.0).floor();
    if step_s < 0.99 {
        return format!("{sign}{minutes}:{:04.1}", single(rest));
    }
    format!("{sign}{minutes}:{:02}", nearest(rest.floor()))
}

#[cfg(test)]
mod tests {
    use plumbtone_analysis::Reading;

    use super::*;
    use crate::session::{BarBeat, SessionPosition};

    fn trail(session: impl Fn(f64) -> SessionPosition) -> Trail {
        let mut trail = Trail::default();
        trail.grid(480, 48_000.0);
        for number in 0..4_000u64 {
            let reading = Reading { centre: number * 480, ..Reading::default() };
            trail.push(1, &reading, &session(number as f64 * 0.01));
        }
        trail
    }

    #[test]
    fn bars_are_labelled_in_round_numbers() {
        let trail = trail(|t| SessionPosition {
            playing: true,
            seconds: Some(t),
            bar_beat: Some(BarBeat { bar: 1 + floor(t / 2.0), beat: 1.0 }),
            ..SessionPosition::default()
        });
        let ticks = ticks(&trail, 0.0, 4_000.0, 350.0);
        let texts: Vec<&str> = ticks.iter().map(|tick| tick.text.as_str()).collect();
        assert_eq!(
            texts,
            ["1|1", "3|1", "5|1", "7|1", "9|1", "11|1", "13|1", "15|1", "17|1", "19|1"]
        );
        assert!((ticks[1].at - 400.0).abs() < 1.5, "{ticks:?}");
    }

    #[test]
    fn session_time_is_labelled_where_there_are_no_bars() {
        let trail = trail(|t| SessionPosition {
            playing: true,
            seconds: Some(58.0 + t),
            ..SessionPosition::default()
        });
        let found = ticks(&trail, 0.0, 1_000.0, 180.0);
        let texts: Vec<&str> = found.iter().map(|tick| tick.text.as_str()).collect();
        assert_eq!(texts, ["0:58", "1:00", "1:02", "1:04", "1:06"]);
        assert!((found[1].at - 200.0).abs() < 1e-6, "{found:?}");
    }

    #[test]
    fn any_stretch_has_a_bounded_number_of_labels() {
        let trail = trail(|_| SessionPosition::default());
        for (start, end, apart) in [(0.0, 4_000.0, 0.0), (-1e6, 1e9, 1.0), (5.0, 5.0, 100.0)] {
            assert!(ticks(&trail, start, end, apart).len() <= MOST, "{start} {end} {apart}");
        }
    }
}
