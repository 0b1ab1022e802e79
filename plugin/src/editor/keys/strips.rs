//! The strips of the picture: one figure of all keys each, over the same axis.

use egui::{Align2, Color32, Pos2, Rangef, Rect, Shape, Stroke, Ui, pos2};
use plumbtone_analysis::keys::StretchFound;
use plumbtone_analysis::tuning::Tuning;

use super::super::ink;
use super::super::plumb::Axis;
use super::super::sound::power_of_ten;
use super::super::steady::signed;
use super::super::theme::{Palette, SMALL, bold, mono, sans};
use super::compass::Compass;
use super::words::stretch_found;
use crate::keys::Row;

/// Deviations that a whisker spans each way.
pub(super) const WHISKER_SD: f64 = 2.0;
/// Radius of a dot, and half the width of a stem.
const DOT: f32 = 3.5;
const STEM: f32 = 3.0;
/// Width of the captions and ticks beside the strips.
pub(super) const GUTTER: f32 = 124.0;
/// Least distance of two ticks, and from a tick's figure to the strip's edge.
const TICK_APART: f32 = 19.0;
const TICK_INSET: f32 = 5.0;

/// A figure of the keys.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Strip {
    Cents,
    Level,
    Tilt,
    Alias,
    Settling,
    Stretch,
}

/// All of them, from top to bottom; where there is little room, the last ones go.
pub(super) const STRIPS: [Strip; 6] =
    [Strip::Cents, Strip::Level, Strip::Tilt, Strip::Alias, Strip::Settling, Strip::Stretch];

/// What a strip is painted over.
pub(super) struct Ground<'a> {
    pub(super) compass: &'a Compass,
    pub(super) rows: &'a [Row],
    pub(super) tuning: &'a Tuning,
    pub(super) palette: &'a Palette,
}

impl Strip {
    /// Share of the height.
    pub(super) fn weight(self) -> f32 {
        if self == Self::Cents { 1.7 } else { 1.0 }
    }

    /// What it is, in which unit, and what that means.
    fn caption(self) -> (&'static str, &'static str, &'static str) {
        match self {
            Self::Cents => (
                "pitch",
                "cents off",
                "How far each key's pitch lies off the key in the tuning, with two standard deviations each way.",
            ),
            Self::Level => ("level", "dBFS", "Mean level of the partials together."),
            Self::Tilt => ("tilt", "dB/octave", "Slope of the partials' levels."),
            Self::Alias => (
                "worst alias",
                "dB over mask",
                "The alias that stands out most, over what hides it there (the measured partials, or the ear's own threshold where a full-scale sine is 100 dB SPL): above the line at 0 it may be heard. A ring at the foot: no alias was found.",
            ),
            Self::Settling => (
                "settling",
                "s",
                "Time from the onset until the pitch stays within 3 cents. A triangle at the top: it never does.",
            ),
            Self::Stretch => (
                "stretch B",
                "",
                "Inharmonicity of a stiff string. An arrow down: none can be told from noise, it is below this.",
            ),
        }
    }

    /// Where a row lies on the strip's scale; `None` when it has no such figure.
    pub(super) fn value(self, row: &Row, tuning: &Tuning) -> Option<f64> {
        match self {
            Self::Cents => Some(row.cents(tuning)),
            Self::Level => row.level_dbfs,
            Self::Tilt => row.tilt_db_per_octave,
            Self::Alias => row.worst_alias?.over_mask_db,
            Self::Settling => row.settling_s,
            Self::Stretch => match stretch_found(row)? {
                StretchFound::Measured { b, .. } | StretchFound::Below(b) => Some(b.log10()),
            },
        }
    }

    /// Draws caption, scale and all keys.
    pub(super) fn paint(self, ui: &mut Ui, place: Rect, (low, high): (f64, f64), on: &Ground<'_>) {
        let plot = place.with_min_x(place.left() + GUTTER);
        let scale = Scale { axis: Axis { x: Rangef::new(0.0, plot.height()), low, high }, plot };
        self.caption_beside(ui, place, on.palette);
        self.grid(ui, &scale, on.palette);
        match self {
            Self::Cents => on.rows.iter().for_each(|row| self.pitch(ui, &scale, row, on)),
            Self::Level | Self::Tilt => self.joined(ui, &scale, on),
            Self::Alias => on.rows.iter().for_each(|row| self.alias(ui, &scale, row, on)),
            Self::Settling => on.rows.iter().for_each(|row| self.settling(ui, &scale, row, on)),
            Self::Stretch => on.rows.iter().for_each(|row| self.stretch(ui, &scale, row, on)),
        }
    }

    fn caption_beside(self, ui: &mut Ui, place: Rect, palette: &Palette) {
        let (name, unit, help) = self.caption();
        let left = (place.left_top() + egui::vec2(0.0, 7.0), Align2::LEFT_CENTER);
        ink::text(ui, left, name, bold(SMALL), palette.ink).on_hover_text(help);
        if place.height() > 26.0 && !unit.is_empty() {
            let below = (place.left_top() + egui::vec2(0.0, 21.0), Align2::LEFT_CENTER);
            ink::text(ui, below, unit, sans(SMALL), palette.dim).on_hover_text(help);
        }
    }

    fn grid(self, ui: &Ui, scale: &Scale, palette: &Palette) {
        let plot = scale.plot;
        if self == Self::Alias {
            let heard = plot.with_max_y(scale.y(0.0));
            ui.painter().rect_filled(heard, 0.0, palette.stray.gamma_multiply(0.07));
        }
        let ticks = if self == Self::Stretch { scale.decades() } else { scale.ticks() };
        let step = ticks.get(1).map_or(1.0, |second| second - ticks[0]);
        for &tick in &ticks {
            let y = scale.y(tick);
            let zero = tick.abs() < 1e-9 && matches!(self, Self::Cents | Self::Alias);
            let stroke = match self {
                Self::Cents if zero => Stroke::new(1.5, palette.dim),
                Self::Alias if zero => Stroke::new(1.0, palette.stray),
                _ => Stroke::new(1.0, palette.grid),
            };
            ui.painter().hline(plot.x_range(), y, stroke);
            let text = match self {
                Self::Stretch => power_of_ten(crate::convert::floor(tick.round())),
                Self::Settling => format!("{tick:.*}", tick_decimals(step)),
                _ => signed(tick, tick_decimals(step)),
            };
            let inside = Rangef::new(plot.top() + TICK_INSET, plot.bottom() - TICK_INSET);
            let at = pos2(plot.left() - 8.0, y.clamp(inside.min, inside.max.max(inside.min)));
            ink::mark(ui, at, Align2::RIGHT_CENTER, &text, mono(10.0), palette.dim);
        }
    }

    fn pitch(self, ui: &Ui, scale: &Scale, row: &Row, on: &Ground<'_>) {
        let Some(cents) = self.value(row, on.tuning) else { return };
        let (x, colour) = (on.compass.at(row.key), on.palette.pitch);
        if !scale.axis.holds(cents) {
            scale.beyond(ui, x, cents, on.palette.stray);
            return;
        }
        let reach = WHISKER_SD * row.f0_sd_cents;
        let whisker = Rangef::new(scale.y(cents + reach), scale.y(cents - reach));
        let stroke = Stroke::new(1.5, colour.gamma_multiply(0.6));
        ui.painter().vline(x, whisker, stroke);
        let radius = on.compass.mark(DOT);
        for end in [whisker.min, whisker.max] {
            if (end - scale.y(cents)).abs() > radius {
                ui.painter().hline(Rangef::new(x - radius, x + radius), end, stroke);
            }
        }
        ui.painter().circle_filled(pos2(x, scale.y(cents)), radius, colour);
    }

    /// Dots, joined where keys follow each other.
    fn joined(self, ui: &Ui, scale: &Scale, on: &Ground<'_>) {
        let colour = on.palette.pitch;
        let radius = on.compass.mark(DOT - 0.5);
        let mut last: Option<(u8, Pos2)> = None;
        for row in on.rows {
            let value = self.value(row, on.tuning).filter(|value| value.is_finite());
            let at = value.map(|value| pos2(on.compass.at(row.key), scale.y(value)));
            if let (Some(at), Some((key, from))) = (at, last)
                && key + 1 == row.key
            {
                let stroke = Stroke::new(1.0, colour.gamma_multiply(0.45));
                ui.painter().line_segment([from, at], stroke);
            }
            if let (Some(at), Some(value)) = (at, value) {
                if scale.axis.holds(value) {
                    ui.painter().circle_filled(at, radius, colour);
                } else {
                    scale.beyond(ui, at.x, value, on.palette.stray);
                }
            }
            last = at.map(|at| (row.key, at));
        }
    }

    /// A stem from the threshold: up where it may be heard, down where it is masked; a ring at the foot where there is none.
    fn alias(self, ui: &Ui, scale: &Scale, row: &Row, on: &Ground<'_>) {
        let x = on.compass.at(row.key);
        let Some(over) = self.value(row, on.tuning).filter(|over| over.is_finite()) else {
            let radius = on.compass.mark(2.0);
            let at = pos2(x, scale.plot.bottom() - radius - 1.0);
            ui.painter().circle_stroke(at, radius, Stroke::new(1.0, on.palette.dim));
            return;
        };
        let colour = if over > 0.0 { on.palette.stray } else { on.palette.dim };
        scale.stem(ui, (x, on.compass.mark(STEM) * 0.5), (0.0, over), colour.gamma_multiply(0.7));
        let radius = on.compass.mark(4.0);
        ink::diamond(ui, pos2(x, scale.y(over)), radius, colour);
    }

    fn settling(self, ui: &Ui, scale: &Scale, row: &Row, on: &Ground<'_>) {
        let x = on.compass.at(row.key);
        let Some(settling_s) = self.value(row, on.tuning) else {
            scale.beyond(ui, x, f64::INFINITY, on.palette.stray);
            return;
        };
        let colour = on.palette.pitch.lerp_to_gamma(on.palette.card, 0.25);
        scale.stem(ui, (x, on.compass.mark(STEM)), (0.0, settling_s), colour);
        if !scale.axis.holds(settling_s) {
            scale.beyond(ui, x, settling_s, on.palette.stray);
        }
    }

    fn stretch(self, ui: &Ui, scale: &Scale, row: &Row, on: &Ground<'_>) {
        let x = on.compass.at(row.key);
        let radius = on.compass.mark(DOT - 0.5);
        match stretch_found(row) {
            None => {}
            Some(StretchFound::Below(most)) => {
                let y = scale.y(most.log10()).min(scale.plot.bottom() - 2.0 * radius);
                let stroke = Stroke::new(1.0, on.palette.dim);
                ui.painter().hline(Rangef::new(x - radius, x + radius), y, stroke);
                let tip = y + 2.0 * radius;
                ui.painter().vline(x, Rangef::new(y, tip), stroke);
                let head =
                    [pos2(x - radius, tip - radius), pos2(x, tip), pos2(x + radius, tip - radius)];
                ui.painter().add(Shape::line(head.to_vec(), stroke));
            }
            Some(StretchFound::Measured { b, b_sd: sd }) => {
                let ends = [b + WHISKER_SD * sd, (b - WHISKER_SD * sd).max(f64::MIN_POSITIVE)];
                let [high, low] = ends.map(|end| scale.y(end.log10()));
                let stroke = Stroke::new(1.5, on.palette.pitch.gamma_multiply(0.6));
                ui.painter().vline(x, Rangef::new(high, low), stroke);
                let at = pos2(x, scale.y(b.log10()));
                ui.painter().circle_filled(at, radius, on.palette.pitch);
            }
        }
    }
}

/// Values against the height of a strip.
struct Scale {
    axis: Axis,
    plot: Rect,
}

impl Scale {
    fn y(&self, value: f64) -> f32 {
        self.plot.bottom() - self.axis.at(value)
    }

    fn ticks(&self) -> Vec<f64> {
        self.axis.ticks(TICK_APART)
    }

    /// Whole powers of ten, as many as there is room for.
    fn decades(&self) -> Vec<f64> {
        let all = self.axis.ticks(TICK_APART);
        all.into_iter().filter(|tick| (tick - tick.round()).abs() < 1e-6).collect()
    }

    fn stem(&self, ui: &Ui, (x, half): (f32, f32), (from, to): (f64, f64), colour: Color32) {
        let (a, b) = (self.y(from), self.y(to));
        let y = Rangef::new(a.min(b), a.max(b).max(a.min(b) + 1.0));
        ui.painter().rect_filled(
            Rect::from_x_y_ranges(Rangef::new(x - half, x + half), y),
            0.0,
            colour,
        );
    }

    /// A triangle at the edge: the value lies beyond the scale.
    fn beyond(&self, ui: &Ui, x: f32, value: f64, colour: Color32) {
        if value.is_nan() {
            return;
        }
        let up = value > self.axis.high;
        let (tip, by) = if up { (self.plot.top(), 6.0) } else { (self.plot.bottom(), -6.0) };
        let points = vec![pos2(x, tip), pos2(x - 4.0, tip + by), pos2(x + 4.0, tip + by)];
        ui.painter().add(Shape::convex_polygon(points, colour, Stroke::NONE));
    }
}

/// Decimals that tell ticks of a step apart.
fn tick_decimals(step: f64) -> usize {
    match step {
        step if step < 0.0999 => 2,
        step if step < 0.999 => 1,
        _ => 0,
    }
}
