//! Two sounds side by side: per partial how much louder, how far off and how turned the second one is. Rows are partials as in
//! the plumb view; a thorn grows to the side of the louder sound, a bob hangs off the middle by the cents between the two, and
//! a hand shows the phase. What could be noise is faint.

mod rows;

use egui::{Align2, Rangef, Rect, Stroke, Ui, pos2, vec2};
use plumbtone_analysis::compare::{Difference, PartialDifference, compare, pitch_difference};
use plumbtone_analysis::keys::worst_alias_now;
use plumbtone_analysis::{Descriptors, Reading};

use self::rows::Columns;
use super::ink;
use super::mark::Mark;
use super::plumb::{Axis, CENTS, Calm, CalmRows, Scroll};
use super::steady::signed;
use super::theme::{CORNER, PAD, Palette, SMALL, TEXT, mono, sans};

/// Height of the title, of the captions, and of the scale below the rows.
const TITLE: f32 = 34.0;
const HEAD: f32 = 24.0;
const FOOT: f32 = 28.0;
/// Widths: partial numbers, a column's gap, the dials, and a figure with its deviation.
const NUMBERS: f32 = 42.0;
const BETWEEN: f32 = 44.0;
const DIAL: f32 = 36.0;
const FIGURE: f32 = 92.0;
/// Width below which the figures are left out.
const WIDE: f32 = 620.0;
/// Steps of the scale of levels, in dB.
const DECIBELS: [f64; 9] = [1.0, 2.0, 3.0, 6.0, 12.0, 20.0, 30.0, 50.0, 80.0];
/// What a screen reader calls it.
const NAME: &str = "Difference view: partials of two sounds";

/// What is compared.
#[derive(Debug, Clone, Default)]
pub(crate) struct Comparison {
    sides: [Named; 2],
    rows: Vec<PartialDifference>,
    /// The second fundamental against the first.
    pitch: Option<Difference>,
    scroll: Scroll,
    calm: (Calm, Calm, CalmRows),
    /// Half-widths of the scales of levels and cents, and the rows that fit.
    scales: (f64, f64, f32),
}

/// One of the two.
#[derive(Debug, Clone, Default)]
pub(crate) struct Named {
    pub(crate) mark: Mark,
    pub(crate) name: String,
    pub(crate) reading: Reading,
}

/// A figure of both sounds: caption, unit, and the two values.
pub(crate) struct Pair {
    pub(crate) caption: &'static str,
    pub(crate) unit: &'static str,
    pub(crate) values: [Option<f64>; 2],
}

impl Comparison {
    /// Takes both sounds as they are now.
    pub(crate) fn update(&mut self, sides: [(Mark, String, Reading); 2], now_s: f64) {
        self.sides = sides.map(|(mark, name, reading)| Named { mark, name, reading });
        let [first, second] = &self.sides;
        let pitch = |side: &Named| side.reading.pitch.map(|p| (p.f0_hz, p.f0_sd_cents));
        self.pitch =
            pitch(first).zip(pitch(second)).map(|(first, second)| pitch_difference(first, second));
        self.rows = if self.pitch.is_some() {
            compare(&first.reading.partials, &second.reading.partials)
        } else {
            Vec::new()
        };
        let Some(highest) = self.rows.iter().map(|row| row.number).max() else { return };
        let sure = |difference: Option<Difference>| {
            difference.filter(|d| d.is_significant()).map_or(0.0, |d| d.value.abs())
        };
        let most = |of: fn(&PartialDifference) -> Option<Difference>| {
            self.rows.iter().map(of).map(sure).fold(0.0, f64::max)
        };
        let (db, cents) = (most(|row| row.level_db), most(|row| row.cents));
        let (calm_db, calm_cents, calm_rows) = &mut self.calm;
        self.scales = (
            calm_db.update(1.1 * db, now_s, &DECIBELS),
            calm_cents.update(1.1 * cents, now_s, &CENTS),
            calm_rows.update(highest, now_s),
        );
    }

    /// The two sounds.
    pub(crate) fn sides(&self) -> &[Named; 2] {
        &self.sides
    }

    /// What the partials of each say together.
    pub(crate) fn figures(&self) -> Vec<Pair> {
        let both = [0, 1].map(|side| {
            let reading = &self.sides[side].reading;
            let held = reading.pitch.map(|_| Descriptors::of_reading(reading));
            (reading, held.unwrap_or_default())
        });
        let pair = |caption, unit, of: &dyn Fn(&Reading, &Descriptors) -> Option<f64>| Pair {
            caption,
            unit,
            values: [0, 1].map(|side| of(both[side].0, &both[side].1).filter(|v| v.is_finite())),
        };
        vec![
            pair("level", "dBFS", &|r, _| r.pitch.map(|_| r.level_dbfs)),
            pair("stretch B", "10\u{207b}\u{2076}", &|r, _| Some(1e6 * r.stretch?.b)),
            pair("tilt", "dB/oct", &|_, d| d.tilt_db_per_octave),
            pair("odd \u{2212} even", "dB", &|_, d| d.odd_even_db),
            pair("THD", "%", &|_, d| d.thd_f_percent),
            pair("to noise", "dB", &|_, d| d.hnr_db),
            pair("centroid", "partial", &|_, d| d.centroid_partial),
            pair("worst alias", "dB", &|r, _| Some(worst_alias_now(r)?.relative_db)),
        ]
    }

    /// Draws the view.
    pub(crate) fn show(&mut self, ui: &mut Ui, rect: Rect, palette: &Palette) {
        ui.painter().rect_filled(rect, CORNER, palette.card);
        let mut ui = ui.new_child(egui::UiBuilder::new().max_rect(rect).id_salt("difference"));
        let ui = &mut ui;
        ui.shrink_clip_rect(rect);
        self.title(ui, rect, palette);
        if self.rows.is_empty() {
            let name = self.sides.iter().find(|side| side.reading.pitch.is_none());
            let name = name.map_or("one of the two", |side| side.name.as_str());
            let text = format!("{name} has no single pitch: nothing to compare");
            let place = (rect.center(), Align2::CENTER_CENTER);
            ink::text_within(ui, place, (&text, rect.width() - 40.0), sans(TEXT), palette.dim);
            return;
        }
        let columns = self.columns(rect);
        self.scroll.navigate(ui, rect.with_min_y(rect.top() + TITLE), columns.rows, NAME);
        captions(ui, &columns, palette);
        grid(ui, &columns, palette);
        let marks = [0, 1].map(|side| (self.sides[side].mark, self.sides[side].name.as_str()));
        rows::show(ui, &columns, &self.rows, marks, palette);
    }

    fn title(&self, ui: &mut Ui, rect: Rect, palette: &Palette) {
        let y = rect.top() + 19.0;
        let mut x = rect.left() + PAD + 4.0;
        // The second less the first, as every figure is.
        for (side, joint) in [(&self.sides[1], Some("less")), (&self.sides[0], None)] {
            ui.painter().add(side.mark.shape(pos2(x, y), 5.5, palette));
            let place = (pos2(x + 13.0, y), Align2::LEFT_CENTER);
            let room = (rect.right() - x - 40.0).clamp(1.0, 220.0);
            let said = ink::text_within(ui, place, (&side.name, room), sans(15.0), palette.ink);
            x = said.rect.right() + 12.0;
            if let Some(joint) = joint {
                let place = (pos2(x, y), Align2::LEFT_CENTER);
                x = ink::text(ui, place, joint, sans(TEXT), palette.dim).rect.right() + 18.0;
            }
        }
        if let Some(pitch) = self.pitch {
            let text = format!("pitch {} \u{b1} {:.2} ct", signed(pitch.value, 2), pitch.sd);
            let place = (pos2(rect.right() - PAD, y), Align2::RIGHT_CENTER);
            let colour = if pitch.is_significant() { palette.ink } else { palette.dim };
            if rect.right() - PAD - x > 190.0 {
                ink::text(ui, place, &text, sans(TEXT), colour)
                    .on_hover_text("Distance of the two fundamentals. Everything below is compared partial by partial, whatever the notes are.");
            }
        }
    }

    fn columns(&mut self, rect: Rect) -> Columns {
        let (db, cents, fitting) = self.scales;
        let y = Rangef::new(rect.top() + TITLE + HEAD, rect.bottom() - FOOT);
        let figures = if rect.width() > WIDE { 3.0 * FIGURE - 14.0 } else { 0.0 };
        let left = rect.left() + NUMBERS + 14.0;
        let right = rect.right() - PAD - figures;
        let room = (right - left - 2.0 * BETWEEN - DIAL).max(10.0);
        let middle = left + 0.58 * room;
        let bobs = Rangef::new(middle + BETWEEN, middle + BETWEEN + 0.42 * room);
        Columns {
            rows: self.scroll.axis(y, fitting),
            numbers: rect.left() + NUMBERS,
            levels: Axis { x: Rangef::new(left, middle), low: -db, high: db },
            cents: Axis { x: bobs, low: -cents, high: cents },
            dials: bobs.max + BETWEEN + DIAL / 2.0 - 8.0,
            figures: (figures > 0.0)
                .then_some([2.0, 1.0, 0.0].map(|k| rect.right() - PAD - k * (FIGURE - 4.0))),
            whole: rect.with_min_y(rect.top() + TITLE).shrink2(vec2(4.0, 0.0)),
        }
    }
}

fn captions(ui: &mut Ui, columns: &Columns, palette: &Palette) {
    let y = columns.rows.y.min - 11.0;
    let mut caption = |x: f32, align: Align2, text: &str, help: &str| {
        ink::text(ui, (pos2(x, y), align), text, sans(SMALL), palette.dim).on_hover_text(help);
    };
    let left = columns.whole.left() + 8.0;
    caption(left, Align2::LEFT_CENTER, "partial", "Number of the partial: 1 is the fundamental.");
    caption(
        columns.levels.x.min + 20.0,
        Align2::LEFT_CENTER,
        "level, dB",
        "How much louder each partial is, against the strongest partial of its sound. A thorn grows to the right where the second sound has more. The line at its tip spans two standard deviations each way; what could be noise is faint.",
    );
    caption(
        columns.cents.x.min,
        Align2::LEFT_CENTER,
        "off the series, cents",
        "How much farther each partial lies off its own harmonic series.",
    );
    caption(
        columns.dials,
        Align2::CENTER_CENTER,
        "phase",
        "How each partial is turned against its fundamental: upright is no difference, clockwise is ahead. None where the partial does not stay with the fundamental.",
    );
    if let Some(figures) = columns.figures {
        for (x, text) in figures.into_iter().zip(["dB", "ct", "rad"]) {
            caption(x, Align2::RIGHT_CENTER, text, "The difference with its standard deviation.");
        }
    }
}

fn grid(ui: &Ui, columns: &Columns, palette: &Palette) {
    let painter = ui.painter();
    for (axis, apart) in [(&columns.levels, 62.0), (&columns.cents, 54.0)] {
        for value in axis.ticks(apart) {
            let at = pos2(axis.at(value), columns.rows.y.max + 13.0);
            let zero = value.abs() < 1e-9;
            let stroke =
                if zero { Stroke::new(1.5, palette.dim) } else { Stroke::new(1.0, palette.grid) };
            painter.vline(at.x, columns.rows.y, stroke);
            let decimals = if axis.high < 5.0 { 1 } else { 0 };
            let text = signed(value, decimals);
            ink::mark(ui, at, Align2::CENTER_CENTER, &text, mono(SMALL), palette.dim);
        }
    }
}
