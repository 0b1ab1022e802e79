//! Drawing with names: whatever is painted as text is also told to screen readers.

use egui::{
    Align2, Color32, FontId, Pos2, Rect, Response, Role, Sense, Stroke, Ui, WidgetInfo, pos2, vec2,
};

/// Paints text at a place and labels it. Text that is wider than `width` is cut with an ellipsis.
pub(crate) fn text(
    ui: &mut Ui,
    (at, align): (Pos2, Align2),
    text: &str,
    font: FontId,
    colour: Color32,
) -> Response {
    let galley = ui.painter().layout_no_wrap(text.to_owned(), font, colour);
    let rect = align.anchor_size(at, galley.size());
    ui.painter().galley(rect.min, galley, colour);
    label(ui, rect, text)
}

/// Paints text within a width: what does not fit ends in an ellipsis.
pub(crate) fn text_within(
    ui: &mut Ui,
    (at, align): (Pos2, Align2),
    (text, width): (&str, f32),
    font: FontId,
    colour: Color32,
) -> Response {
    let mut job = egui::text::LayoutJob::simple_singleline(text.to_owned(), font, colour);
    job.wrap = egui::text::TextWrapping::truncate_at_width(width.max(1.0));
    let galley = ui.painter().layout_job(job);
    let rect = align.anchor_size(at, galley.size());
    ui.painter().galley(rect.min, galley, colour);
    label(ui, rect, text)
}

/// Names a place that is painted.
pub(crate) fn label(ui: &mut Ui, rect: Rect, text: &str) -> Response {
    let id = ui.next_auto_id();
    ui.skip_ahead_auto_ids(1);
    let response = ui.interact(rect, id, Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, text));
    response
}

/// Paints text that nobody needs to be told of, such as the figures of an axis.
pub(crate) fn mark(
    ui: &Ui,
    at: Pos2,
    align: Align2,
    text: &str,
    font: FontId,
    colour: Color32,
) -> Rect {
    ui.painter().text(at, align, text, font, colour)
}

/// Slanted lines over a place where something is missing.
pub(crate) fn hatch(ui: &Ui, area: Rect, colour: Color32) {
    let painter = ui.painter().with_clip_rect(area);
    let stroke = Stroke::new(1.0, colour);
    let mut at = area.left() - area.height();
    while at < area.right() {
        painter
            .line_segment([pos2(at, area.bottom()), pos2(at + area.height(), area.top())], stroke);
        at += 7.0;
    }
}

/// A diamond: the shape of what belongs to no partial.
pub(crate) fn diamond(ui: &Ui, centre: Pos2, radius: f32, colour: Color32) {
    let points = [vec2(0.0, -radius), vec2(radius, 0.0), vec2(0.0, radius), vec2(-radius, 0.0)]
        .map(|offset| centre + offset);
    ui.painter().add(egui::Shape::closed_line(points.to_vec(), Stroke::new(1.5, colour)));
}
