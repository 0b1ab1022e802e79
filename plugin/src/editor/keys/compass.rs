//! The keys that the picture spans, and where each lies: one column per key, named below, those still to play above.

use egui::{Align2, Pos2, Rangef, Rect, Shape, Stroke, Ui, pos2};

use super::super::ink;
use super::super::theme::{Palette, SMALL, mono};
use super::words;
use crate::keys::Row;

/// Fewest keys shown: an octave and its end.
const KEYS_LEAST: u8 = 13;
const HIGHEST: u8 = 127;
/// Semitones from one name to the next, from the first of which there is room, and that room in points.
const STEPS: [u8; 6] = [1, 2, 3, 4, 6, 12];
const ROOM: f32 = 32.0;
/// Space between two names of missing keys.
const APART: f32 = 8.0;

/// Keys against width.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Compass {
    x: Rangef,
    first: u8,
    last: u8,
}

impl Compass {
    /// Spans the keys of all rows with a margin; `None` without a row.
    pub(super) fn of(rows: &[Row], x: Rangef) -> Option<Self> {
        let (lowest, highest) = (rows.first()?.key, rows.last()?.key);
        let (mut first, mut last) = (lowest.saturating_sub(1), (highest.min(126)) + 1);
        while last - first + 1 < KEYS_LEAST {
            if (first > 0 && lowest - first <= last - highest) || last == HIGHEST {
                first -= 1;
            } else {
                last += 1;
            }
        }
        Some(Self { x, first, last })
    }

    /// Width of a column.
    pub(super) fn width(&self) -> f32 {
        self.x.span() / (f32::from(self.last - self.first) + 1.0)
    }

    /// The middle of a key's column.
    pub(super) fn at(&self, key: u8) -> f32 {
        self.x.min + (f32::from(key) - f32::from(self.first) + 0.5) * self.width()
    }

    /// The columns of a run of keys.
    pub(super) fn columns(&self, (from, to): (u8, u8)) -> Rangef {
        let half = self.width() / 2.0;
        Rangef::new(self.at(from) - half, self.at(to) + half)
    }

    /// All keys.
    pub(super) fn keys(&self) -> impl Iterator<Item = u8> + use<> {
        self.first..=self.last
    }

    /// Lines where octaves begin.
    pub(super) fn octaves(&self, ui: &Ui, y: Rangef, palette: &Palette) {
        let half = self.width() / 2.0;
        for key in self.keys().skip(1).filter(|key| key.is_multiple_of(12)) {
            ui.painter().vline(self.at(key) - half, y, Stroke::new(1.0, palette.edge));
        }
    }

    /// Names of the keys, as many as there is room for, centred on a height.
    pub(super) fn names(&self, ui: &Ui, y: f32, lit: Option<u8>, palette: &Palette) {
        let room = |step: &u8| f32::from(*step) * self.width() >= ROOM;
        let step = STEPS.into_iter().find(room).unwrap_or(24);
        let lit = lit.filter(|key| self.keys().any(|k| k == *key));
        for key in self.keys().filter(|key| key.is_multiple_of(step)) {
            let clear = lit.is_none_or(|lit| (self.at(lit) - self.at(key)).abs() >= ROOM);
            if clear {
                self.name(ui, (key, y), palette.dim, palette);
            }
        }
        if let Some(key) = lit {
            self.name(ui, (key, y), palette.ink, palette);
        }
    }

    fn name(&self, ui: &Ui, (key, y): (u8, f32), colour: egui::Color32, palette: &Palette) {
        let x = self.at(key);
        ui.painter().vline(x, Rangef::new(y - 13.0, y - 9.0), Stroke::new(1.0, palette.edge));
        let text = words::name(key);
        ink::mark(ui, pos2(x, y), Align2::CENTER_CENTER, &text, mono(SMALL), colour);
    }

    /// The newest key's mark below its column.
    pub(super) fn newest(&self, ui: &Ui, key: u8, top: f32, palette: &Palette) {
        let x = self.at(key);
        let points =
            [(-4.0, 6.0), (0.0, 0.0), (4.0, 6.0)].map(|(by, down)| pos2(x + by, top + down));
        ui.painter().add(Shape::convex_polygon(points.to_vec(), palette.pitch, Stroke::NONE));
    }

    /// Keys still to play: hatched over all strips, their names above where there is room.
    pub(super) fn missing(&self, ui: &Ui, runs: &[(u8, u8)], area: Rect, palette: &Palette) {
        let mut free_from = f32::NEG_INFINITY;
        for &run in runs {
            let columns = self.columns(run);
            let place = Rect::from_x_y_ranges(columns, area.y_range());
            ui.painter().rect_filled(place, 0.0, palette.ground);
            ink::hatch(ui, place, palette.edge);
            let galley = ui.painter().layout_no_wrap(words::run(run), mono(SMALL), palette.stray);
            let half = galley.size().x / 2.0;
            let middle = columns.center().clamp(self.x.min + half, self.x.max - half);
            if middle - half >= free_from && 2.0 * half < self.x.span() {
                let at = Pos2::new(middle - half, area.top() - galley.size().y - 3.0);
                ui.painter().galley(at, galley, palette.stray);
                free_from = middle + half + APART;
            } else {
                let tick = Rangef::new(area.top() - 6.0, area.top() - 2.0);
                ui.painter().vline(columns.center(), tick, Stroke::new(1.5, palette.stray));
            }
        }
    }

    /// How wide marks may be.
    pub(super) fn mark(&self, most: f32) -> f32 {
        (self.width() * 0.42).clamp(1.0, most)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn compass(keys: &[u8]) -> Option<Compass> {
        let row = |key: &u8| Row {
            key: *key,
            take: 1,
            told: true,
            length_s: 1.0,
            f0_hz: 440.0,
            f0_sd_cents: 0.1,
            inharmonicity_b: None,
            inharmonicity_sd: None,
            tilt_db_per_octave: None,
            level_dbfs: None,
            settling_s: None,
            worst_alias: None,
        };
        let rows: Vec<Row> = keys.iter().map(row).collect();
        Compass::of(&rows, Rangef::new(100.0, 600.0))
    }

    #[test]
    fn every_key_lies_in_its_column() {
        for keys in [&[60][..], &[0], &[127], &[60, 64], &[0, 127], &[36, 84], &[1, 126]] {
            let compass = compass(keys).unwrap();
            assert!(compass.keys().count() >= 13, "{keys:?}: {compass:?}");
            for key in compass.keys() {
                let column = compass.columns((key, key));
                assert!(column.min >= 99.9 && column.max <= 600.1, "{keys:?}: {column:?}");
                assert!(column.contains(compass.at(key)), "{keys:?}: {column:?}");
            }
            assert!(keys.iter().all(|&k| compass.keys().any(|key| key == k)), "{keys:?}");
        }
        assert_eq!(compass(&[]), None, "without a key there is no compass");
    }
}
