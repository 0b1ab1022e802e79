//! The pinned partial: its level and its cents over the last half minute.

use egui::{
    Align2, Pos2, Rangef, Rect, Response, Role, Sense, Shape, Stroke, Ui, WidgetInfo, pos2, vec2,
};

use super::super::ink;
use super::super::steady::signed;
use super::super::theme::{Palette, SMALL, TEXT, bold, mono, sans};
use super::axis::round_step;
use super::memory::{Memory, Moment};
use crate::convert::single;

/// Height of the inset.
pub(crate) const HEIGHT: f32 = 112.0;
/// Least extent of the two scales.
const LEAST_DB: f32 = 6.0;
const LEAST_CENTS: f32 = 2.0;
/// Width of a scale's figures.
const FIGURES: f32 = 44.0;

/// Draws it into a rectangle. The response is that of the button which ends it.
pub(crate) fn show(
    ui: &mut Ui,
    rect: Rect,
    number: u32,
    memory: &Memory,
    palette: &Palette,
) -> Response {
    ui.painter().hline(rect.x_range(), rect.top(), Stroke::new(1.0, palette.edge));
    let title = format!("partial {number}");
    ink::text(
        ui,
        (rect.left_top() + vec2(12.0, 8.0), Align2::LEFT_TOP),
        &title,
        bold(TEXT),
        palette.ink,
    );
    let middle = rect.center().x;
    let graphs = [
        (Rangef::new(rect.left() + 12.0, middle - 10.0), "level, dBFS", LEAST_DB),
        (Rangef::new(middle + 10.0, rect.right() - 12.0), "cents off the series", LEAST_CENTS),
    ];
    let moments: Vec<Option<Moment>> = memory.of(number).collect();
    for (column, (x, caption, least)) in graphs.into_iter().enumerate() {
        let area = Rect::from_x_y_ranges(x, rect.top() + 28.0..=rect.bottom() - 10.0);
        let caption_at = if column == 0 {
            pos2(area.left() + 84.0, rect.top() + 9.0)
        } else {
            pos2(area.left(), rect.top() + 9.0)
        };
        ink::text(ui, (caption_at, Align2::LEFT_TOP), caption, sans(SMALL), palette.dim);
        let value = |moment: &Moment| if column == 0 { moment.level_dbfs } else { moment.cents };
        graph(ui, area, (&moments, memory.span_s()), (value, least), palette);
    }
    close(ui, rect, palette)
}

fn graph(
    ui: &Ui,
    area: Rect,
    (moments, span_s): (&[Option<Moment>], Option<(f64, f64)>),
    (value, least): (impl Fn(&Moment) -> f32, f32),
    palette: &Palette,
) {
    let plot = area.with_min_x(area.left() + FIGURES);
    let Some((first, last)) = span_s else { return };
    let values = || moments.iter().flatten().map(&value);
    let (low, high) = values().fold((f32::MAX, f32::MIN), |(a, b), v| (a.min(v), b.max(v)));
    if low > high {
        let text = "not there in the last half minute";
        ink::mark(ui, plot.left_center(), Align2::LEFT_CENTER, text, sans(SMALL), palette.dim);
        return;
    }
    let widen = (least - (high - low)).max(0.0) / 2.0;
    let (low, high) = (low - widen, high + widen);
    let step = round_step(f64::from(high - low) / 2.5);
    let place = |v: f32| plot.bottom() - (v - low) / (high - low) * plot.height();
    let ticks = (f64::from(low) / step).ceil();
    for k in 0..4 {
        let tick = (ticks + f64::from(k)) * step;
        if tick > f64::from(high) {
            break;
        }
        let y = place(single(tick));
        ui.painter().hline(plot.x_range(), y, Stroke::new(1.0, palette.grid));
        let decimals = usize::from(step < 0.99) + usize::from(step < 0.099);
        let at = pos2(plot.left() - 6.0, y);
        ink::mark(ui, at, Align2::RIGHT_CENTER, &signed(tick, decimals), mono(10.0), palette.dim);
    }
    let span = single(last - first);
    let mut run: Vec<Pos2> = Vec::new();
    for moment in moments.iter().map(Option::as_ref).chain([None]) {
        match moment {
            Some(moment) => {
                let share = single(moment.time_s - first) / span;
                run.push(pos2(plot.left() + share * plot.width(), place(value(moment))));
            }
            None => {
                let line = core::mem::take(&mut run);
                if line.len() > 1 {
                    ui.painter().add(Shape::line(line, Stroke::new(1.5, palette.pitch)));
                }
            }
        }
    }
}

fn close(ui: &Ui, rect: Rect, palette: &Palette) -> Response {
    let place = Rect::from_center_size(rect.right_top() + vec2(-16.0, 16.0), vec2(18.0, 18.0));
    let response = ui.interact(place, ui.scope_id().with("unpin"), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, "Unpin"));
    let ink = if response.hovered() || response.has_focus() { palette.ink } else { palette.dim };
    ink::mark(ui, place.center(), Align2::CENTER_CENTER, "\u{d7}", sans(15.0), ink);
    response.on_hover_text("Back to all partials")
}
