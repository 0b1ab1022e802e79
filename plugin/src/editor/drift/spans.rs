//! Checks in the drift trace: a line over each with the shape of its verdict, and a shade over what is outside.

use egui::{Rangef, Rect, Stroke, Ui, pos2};

use super::super::checks::{colour, shape};
use super::super::ink;
use super::super::theme::Palette;
use super::paint::Frame;
use crate::check::{CheckResult, InTrail, Snapshot};
use crate::convert::single;

/// Depth of the lines below the upper edge, and height of their ends.
const DEPTH: f32 = 3.0;
const ENDS: f32 = 7.0;

/// Draws them.
pub(crate) fn spans(ui: &mut Ui, frame: &Frame, checks: &Snapshot, palette: &Palette) {
    for result in &checks.stored.results {
        if let Some(in_trail) = &result.in_trail
            && in_trail.end > frame.start
            && in_trail.start < frame.end
        {
            finished(ui, frame, (result, in_trail), palette);
        }
    }
    if let Some(running) = &checks.running {
        let ends = Rangef::new(frame.x(running.from), frame.plot.right());
        line(ui, frame, ends, Stroke::new(2.0, palette.pitch));
    }
}

fn finished(
    ui: &mut Ui,
    frame: &Frame,
    (result, in_trail): (&CheckResult, &InTrail),
    palette: &Palette,
) {
    let ends = Rangef::new(frame.x(in_trail.start), frame.x(in_trail.end));
    line(ui, frame, ends, Stroke::new(2.0, colour(result.verdict, palette)));
    for span in &result.spans {
        let (from, to) = in_trail.of(&result.extent, &span.extent);
        let x = Rangef::new(frame.x(from), frame.x(to).max(frame.x(from) + 1.0));
        let area = Rect::from_x_y_ranges(x, frame.plot.y_range()).intersect(frame.plot);
        if area.width() > 0.0 {
            ui.painter().rect_filled(area, 0.0, palette.stray.gamma_multiply(0.14));
        }
    }
    let left = ends.min.max(frame.plot.left()) + 9.0;
    if left < ends.max.min(frame.plot.right()) {
        let at = pos2(left, frame.plot.top() + DEPTH + 9.0);
        ui.painter().add(shape(at, result.verdict, palette));
        let worst = result
            .worst_cents
            .map(single)
            .map_or_else(String::new, |worst| format!(", worst {worst:+.1} ct"));
        let text = format!("check {}: {}{worst}", result.number, result.verdict.name());
        let place = Rect::from_center_size(at, egui::vec2(14.0, 14.0));
        ink::label(ui, place, &text).on_hover_text(text);
    }
}

/// A line with ends that point down, as far as it lies in the picture.
fn line(ui: &Ui, frame: &Frame, ends: Rangef, stroke: Stroke) {
    let painter = ui.painter().with_clip_rect(frame.plot);
    let top = frame.plot.top() + DEPTH;
    painter.hline(ends, top, stroke);
    for x in [ends.min + 1.0, ends.max - 1.0] {
        painter.vline(x, Rangef::new(top, top + ENDS), stroke);
    }
}
