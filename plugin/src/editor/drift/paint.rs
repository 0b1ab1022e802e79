//! Paints the drift trace: tolerance, cents, times, the pitch with its deviation, what lies outside, and gaps.

use egui::epaint::{BandPoint, BandShape};
use egui::{Align2, Color32, Pos2, Rangef, Rect, Shape, Stroke, Ui, pos2, vec2};

use super::super::ink;
use super::super::plumb::round_step;
use super::super::steady::signed;
use super::super::theme::{Palette, SMALL, mono, sans};
use super::columns::Column;
use super::ticks::Tick;
use crate::convert::single;
use crate::trail::Kind;

/// Deviations that the shade spans each way.
const SHADE_SD: f32 = 2.0;

/// From indices and cents to points.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Frame {
    pub(crate) plot: Rect,
    /// Ends of the stretch shown, as indices of the trail.
    pub(crate) start: f64,
    pub(crate) end: f64,
    /// Cents from the middle to the upper edge.
    pub(crate) half: f32,
}

impl Frame {
    /// Where an index lies.
    pub(crate) fn x(&self, at: f64) -> f32 {
        let share = (at - self.start) / (self.end - self.start).max(1e-9);
        self.plot.left() + single(share) * self.plot.width()
    }

    fn y(&self, cents: f32) -> f32 {
        let share = (cents / self.half).clamp(-1.0, 1.0);
        self.plot.center().y - share * self.plot.height() / 2.0
    }
}

/// The lines of cents, and the tolerance.
pub(crate) fn grid(ui: &Ui, frame: &Frame, tolerance: f32, palette: &Palette) {
    let plot = frame.plot;
    let within = Rangef::new(frame.y(tolerance), frame.y(-tolerance));
    let band = Rect::from_x_y_ranges(plot.x_range(), within);
    ui.painter().rect_filled(band, 0.0, palette.within_ground);
    for y in [within.min, within.max] {
        ui.painter().hline(plot.x_range(), y, Stroke::new(1.0, palette.within.gamma_multiply(0.5)));
    }
    let least = f64::from(2.0 * frame.half) * 18.0 / f64::from(plot.height().max(1.0));
    let step = round_step(least.max(f64::from(frame.half) / 2.0));
    let count = crate::convert::floor(f64::from(frame.half) / step + 1e-6).clamp(0, 10);
    for k in -count..=count {
        let cents = k as f64 * step;
        let y = frame.y(single(cents));
        let colour = if k == 0 { palette.edge } else { palette.grid };
        ui.painter().hline(plot.x_range(), y, Stroke::new(1.0, colour));
        let at = pos2(plot.left() - 8.0, y);
        let text = signed(cents, usize::from(step < 0.99));
        ink::mark(ui, at, Align2::RIGHT_CENTER, &text, mono(SMALL), palette.dim);
    }
}

/// The labels of time.
pub(crate) fn times(ui: &Ui, frame: &Frame, ticks: &[Tick], palette: &Palette) {
    for tick in ticks {
        let x = frame.x(tick.at);
        let bottom = frame.plot.bottom();
        ui.painter().vline(
            x,
            Rangef::new(bottom + 1.0, bottom + 5.0),
            Stroke::new(1.0, palette.edge),
        );
        let at = pos2(x, bottom + 15.0);
        let wide = single(tick.text.len() as f64) * 3.5;
        if x - wide > frame.plot.left() - 40.0 && x + wide < frame.plot.right() + 6.0 {
            ink::mark(ui, at, Align2::CENTER_CENTER, &tick.text, mono(SMALL), palette.dim);
        }
    }
}

/// The pitch: shade of the deviation, spread within a column, and the line; then the drift line through it.
pub(crate) fn trace(ui: &Ui, frame: &Frame, columns: &[Column], palette: &Palette) {
    let painter = ui.painter().with_clip_rect(frame.plot.expand(1.0));
    let mut start = 0;
    while start < columns.len() {
        let first = columns[start];
        let length = columns[start..]
            .iter()
            .take_while(|c| c.kind.pitched() == first.kind.pitched() && c.note == first.note)
            .count()
            .max(1);
        let run = &columns[start..start + length];
        if first.kind.pitched() {
            let shade = palette.pitch.gamma_multiply(0.22);
            let sd = |c: &Column| (c.low - SHADE_SD * c.sd, c.high + SHADE_SD * c.sd);
            painter.add(ribbon(frame, run, sd, shade));
            if run.iter().any(|c| c.high > c.low) {
                let spread = palette.pitch.gamma_multiply(0.55);
                painter.add(ribbon(frame, run, |c| (c.low, c.high), spread));
            }
            let line = |value: fn(&Column) -> f32| -> Vec<Pos2> {
                run.iter().map(|c| pos2(frame.x(c.at), frame.y(value(c)))).collect()
            };
            if length == 1 {
                painter.circle_filled(line(|c| c.mean)[0], 1.0, palette.pitch);
            }
            painter.add(Shape::line(line(|c| c.mean), Stroke::new(1.5, palette.pitch)));
            painter.add(Shape::line(
                line(|c| c.drift),
                Stroke::new(1.0, palette.ink.gamma_multiply(0.75)),
            ));
        }
        start += length;
    }
}

/// The area between two values of each column.
fn ribbon(
    frame: &Frame,
    run: &[Column],
    ends: impl Fn(&Column) -> (f32, f32),
    colour: Color32,
) -> Shape {
    let points = run.iter().map(|column| {
        let (low, high) = ends(column);
        BandPoint::new(frame.x(column.at), Rangef::new(frame.y(high), frame.y(low)))
    });
    BandShape::new(points.collect(), colour, Stroke::NONE).into()
}

/// Bars under what lies outside, and marks under what is missing.
pub(crate) fn outside(
    ui: &Ui,
    frame: &Frame,
    columns: &[Column],
    tolerance: f32,
    palette: &Palette,
) {
    let y = frame.plot.bottom() - 2.0;
    let bar = |from: &Column, to: &Column, colour: Color32, width: f32| {
        let x = Rangef::new(frame.x(from.at) - 1.0, frame.x(to.at) + 1.0);
        ui.painter().with_clip_rect(frame.plot.expand(2.0)).hline(x, y, Stroke::new(width, colour));
    };
    let what = |c: &Column| match c.kind {
        Kind::Nothing => Some(false),
        Kind::Steady | Kind::Gliding if c.drift.abs() > tolerance => Some(true),
        _ => None,
    };
    let mut start = 0;
    while start < columns.len() {
        let kind = what(&columns[start]);
        let length = columns[start..].iter().take_while(|c| what(c) == kind).count().max(1);
        let (first, last) = (&columns[start], &columns[start + length - 1]);
        match kind {
            Some(true) => bar(first, last, palette.stray, 4.0),
            Some(false) => gap(ui, frame, (first, last), palette),
            None => {}
        }
        start += length;
    }
}

/// What is missing: hatched, with the word where there is room for it.
fn gap(ui: &Ui, frame: &Frame, (first, last): (&Column, &Column), palette: &Palette) {
    let x = Rangef::new(frame.x(first.at) - 0.5, frame.x(last.at) + 0.5);
    let area = Rect::from_x_y_ranges(x, frame.plot.y_range()).intersect(frame.plot);
    if !(area.width() > 0.0) {
        return;
    }
    ink::hatch(ui, area, palette.edge);
    if area.width() > 40.0 {
        let label = Rect::from_center_size(area.center(), vec2(30.0, 16.0));
        let painter = ui.painter().with_clip_rect(area);
        painter.rect_filled(label, 3.0, palette.card);
        ink::mark(ui, area.center(), Align2::CENTER_CENTER, "gap", sans(SMALL), palette.dim);
    }
}
