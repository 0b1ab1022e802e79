//! Strays in the plumb view: at their true height between the rows, explained in words that never cover each other.

use egui::{Rangef, Rect, Stroke, Ui, pos2, vec2};
use plumbtone_analysis::{Stray, StrayKind, Stretch};

use super::super::ink;
use super::super::theme::{Palette, SMALL, sans};
use super::super::words;
use super::axis::{Axis, RowAxis};
use crate::convert::single;

/// Height of a label, and space between two.
const LABEL: f32 = 13.0;
/// Most strays drawn, strongest first.
const MOST: usize = 64;
/// Most that are labelled.
const EXPLAINED_MOST: usize = 10;
const UNEXPLAINED_MOST: usize = 3;
pub(crate) const LABELLED_MOST: usize = EXPLAINED_MOST + UNEXPLAINED_MOST;
/// Thickness of a stray's bar.
const BAR: f32 = 3.0;

/// Where strays are drawn.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Lane {
    pub(crate) rows: RowAxis,
    /// Centre of the diamonds.
    pub(crate) diamonds: f32,
    pub(crate) levels: Axis,
    /// Where labels end at the latest.
    pub(crate) right: f32,
}

/// Draws them; `level` gives the level on the axis.
pub(crate) fn show(
    ui: &mut Ui,
    lane: &Lane,
    (strays, f0_hz, stretch): (&[Stray], f64, Option<Stretch>),
    level: impl Fn(f64) -> f64,
    palette: &Palette,
) {
    let b = stretch.map_or(0.0, |stretch| stretch.b);
    let seen: Vec<(f32, &Stray)> = strays
        .iter()
        .take(MOST)
        .map(|stray| (single(number_of(stray.frequency_hz, f0_hz, b)), stray))
        .filter(|(number, _)| lane.rows.shows(*number))
        .map(|(number, stray)| (lane.rows.at(number), stray))
        .collect();
    let labelled = labelled(&seen);
    let heights: Vec<f32> = seen.iter().map(|(y, _)| *y).collect();
    let wanted = heights.iter().zip(&labelled).map(|(y, on)| if *on { *y } else { f32::NAN });
    let places = spread(&wanted.collect::<Vec<_>>(), lane.rows.y, LABEL);
    for ((y, stray), place) in seen.into_iter().zip(places) {
        ink::diamond(ui, pos2(lane.diamonds, y), 4.5, palette.stray);
        let end = lane.levels.at(level(stray.level_dbfs)).max(lane.levels.x.min + 2.0);
        let bar =
            Rect::from_min_max(pos2(lane.levels.x.min, y - BAR / 2.0), pos2(end, y + BAR / 2.0));
        ui.painter().rect_filled(bar, 1.0, palette.stray);
        if let Some(place) = place {
            label(ui, lane, (stray, end), (y, place), palette);
        }
    }
}

/// Which are labelled: explained ones before unexplained ones, few of each; the side panel lists the rest.
fn labelled(seen: &[(f32, &Stray)]) -> Vec<bool> {
    let (mut explained, mut unexplained) = (0, 0);
    let on = |(_, stray): &(f32, &Stray)| {
        let (count, most) = match stray.kind {
            StrayKind::Unexplained => (&mut unexplained, UNEXPLAINED_MOST),
            StrayKind::Alias { .. } | StrayKind::Mains { .. } => (&mut explained, EXPLAINED_MOST),
        };
        *count += 1;
        *count <= most
    };
    seen.iter().map(on).collect()
}

fn label(
    ui: &mut Ui,
    lane: &Lane,
    (stray, bar_end): (&Stray, f32),
    (y, place): (f32, f32),
    palette: &Palette,
) {
    let text = words::stray(stray);
    let galley = ui.painter().layout_no_wrap(text.clone(), sans(SMALL), palette.stray);
    let left = (bar_end + 8.0).min(lane.right - galley.size().x - 4.0);
    let rect = Rect::from_min_size(pos2(left, place - galley.size().y / 2.0), galley.size());
    // The label stands before the bars of the rows.
    ui.painter().rect_filled(rect.expand2(vec2(3.0, -1.0)), 2.0, palette.card.gamma_multiply(0.9));
    if (place - y).abs() > 1.0 {
        let leader = [pos2(bar_end + 1.0, y), pos2(left - 2.0, place)];
        ui.painter().line_segment(leader, Stroke::new(1.0, palette.stray.gamma_multiply(0.6)));
    }
    ui.painter().galley(rect.min, galley, palette.stray);
    let hz = words::hertz(stray.frequency_hz, 1);
    ink::label(ui, rect, &text).on_hover_text(format!(
        "{hz} Hz, {:.1} dBFS: a peak that belongs to no partial of this pitch.",
        stray.level_dbfs
    ));
}

/// The partial number, with its fraction, at which a frequency lies in the stretched series: `f = n f0 sqrt(1 + B n^2)`
/// solved for n.
fn number_of(hz: f64, f0_hz: f64, b: f64) -> f64 {
    let ratio = hz / f0_hz;
    if b > 1e-12 {
        ((((1.0 + 4.0 * b * ratio * ratio).sqrt() - 1.0) / (2.0 * b)).max(0.0)).sqrt()
    } else {
        ratio
    }
}

/// Centres for labels of one height, none covering another, each near where it wants to be and within the range. The
/// first are the most important: what finds no room gets no label.
pub(crate) fn spread(wanted: &[f32], within: Rangef, height: f32) -> Vec<Option<f32>> {
    let room = crate::convert::index(crate::convert::nearest(f64::from(
        ((within.span() / height).floor() - 1.0).max(0.0),
    )));
    let mut order: Vec<usize> =
        (0..wanted.len()).filter(|&k| wanted[k].is_finite()).take(room / 2).collect();
    order.sort_by(|&a, &b| wanted[a].total_cmp(&wanted[b]));
    // Clusters of touching labels, each centred on the mean of what its members want.
    let mut clusters: Vec<(f32, usize)> = Vec::new();
    for &k in &order {
        clusters.push((wanted[k], 1));
        while let [.., (above, m), (below, n)] = clusters[..] {
            let touch = 0.5 * height * (m + n) as f32;
            if below - above >= touch {
                break;
            }
            let centre = (above * m as f32 + below * n as f32) / (m + n) as f32;
            clusters.truncate(clusters.len() - 2);
            clusters.push((centre, m + n));
        }
    }
    let mut places = vec![None; wanted.len()];
    let mut sorted = order.into_iter();
    let mut free = within.min;
    let mut left: usize = clusters.iter().map(|(_, count)| count).sum();
    for (centre, count) in clusters {
        let tall = height * count as f32;
        // Room must be left for all below.
        let latest = within.max - height * left as f32;
        let top = (centre - tall / 2.0).min(latest).max(free);
        for (row, k) in sorted.by_ref().take(count).enumerate() {
            places[k] = Some(top + height * (row as f32 + 0.5));
        }
        free = top + tall;
        left -= count;
    }
    places
}

#[cfg(test)]
mod tests {
    use super::*;

    const WITHIN: Rangef = Rangef { min: 100.0, max: 500.0 };

    fn check(wanted: &[f32]) -> Vec<Option<f32>> {
        let places = spread(wanted, WITHIN, LABEL);
        let mut given: Vec<f32> = places.iter().flatten().copied().collect();
        given.sort_by(f32::total_cmp);
        for pair in given.windows(2) {
            assert!(pair[1] - pair[0] >= LABEL - 1e-3, "{wanted:?}: {given:?}");
        }
        for place in &given {
            let inside = *place >= WITHIN.min && *place <= WITHIN.max;
            assert!(inside, "{wanted:?}: {place}");
        }
        places
    }

    #[test]
    fn labels_never_cover_each_other() {
        check(&[]);
        check(&[300.0; 5]);
        check(&[100.0, 100.0, 500.0, 500.0, 499.0]);
        check(&[f32::NAN, 200.0, f32::INFINITY]);
        check(&[-1e9, 1e9, 300.0]);
        let mut seed = 7u32;
        for count in 1..200 {
            let wanted: Vec<f32> = (0..count)
                .map(|_| {
                    seed = seed.wrapping_mul(1_664_525).wrapping_add(1_013_904_223);
                    100.0 + 400.0 * (seed >> 8) as f32 / (1 << 24) as f32
                })
                .collect();
            check(&wanted);
        }
    }

    #[test]
    fn labels_with_room_stay_where_they_belong() {
        assert_eq!(check(&[300.0, 150.0, 400.0]), [Some(300.0), Some(150.0), Some(400.0)]);
    }

    #[test]
    fn the_first_are_labelled_when_there_is_no_room_for_all() {
        let wanted: Vec<f32> = (0..200).map(|k| 120.0 + k as f32).collect();
        let places = check(&wanted);
        let labelled = places.iter().flatten().count();
        assert!(labelled > 5 && places[..labelled].iter().all(Option::is_some), "{labelled}");
    }

    #[test]
    fn a_stray_lies_between_its_neighbours_in_a_stretched_series() {
        let (f0, b) = (220.0, 4e-4);
        for n in [1.0, 7.0, 13.5, 40.0] {
            let hz = n * f0 * f64::sqrt(1.0 + b * n * n);
            assert!((number_of(hz, f0, b) - n).abs() < 1e-6, "{n}");
        }
        assert!((number_of(99.0, 220.0, 0.0) - 0.45).abs() < 1e-9);
    }
}
