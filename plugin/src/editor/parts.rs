//! What the side panel's lists are made of: sentences, small buttons, ticks.

use egui::{Align2, Color32, Rect, RichText, ScrollArea, Stroke, Ui, pos2, vec2};

use super::theme::{FIGURE, PAD, Palette, SMALL, sans};

/// Room for the bar that a list scrolls by.
pub(crate) const BAR: f32 = 14.0;

/// A list that scrolls, under a name of its own.
pub(crate) fn list(
    ui: &mut Ui,
    rect: Rect,
    name: &str,
    palette: &Palette,
    show: impl FnOnce(&mut Ui),
) {
    let area = rect.shrink2(vec2(PAD, 0.0));
    let mut whole = ui.new_child(egui::UiBuilder::new().max_rect(area));
    // A fade in the toolkit's colour would not be the card's.
    whole.spacing_mut().scroll.fade.strength = 0.0;
    whole.visuals_mut().widgets.inactive.bg_stroke = Stroke::new(1.0, palette.edge);
    ScrollArea::vertical().id_salt(name).auto_shrink(false).show(&mut whole, |ui| {
        ui.set_width(area.width() - BAR);
        ui.spacing_mut().item_spacing = vec2(6.0, 5.0);
        ui.add_space(8.0);
        show(ui);
        ui.add_space(8.0);
    });
}

/// A sentence in passing.
pub(crate) fn say(ui: &mut Ui, text: &str, palette: &Palette) {
    ui.label(RichText::new(text).size(SMALL).color(palette.dim));
}

/// A sentence that must not be overlooked.
pub(crate) fn warn(ui: &mut Ui, text: &str, palette: &Palette) {
    ui.label(RichText::new(format!("! {text}")).size(SMALL).color(palette.stray));
}

/// A small button.
pub(crate) fn act(ui: &mut Ui, text: &str, palette: &Palette) -> bool {
    let button = egui::Button::new(RichText::new(text).size(SMALL).color(palette.ink));
    ui.add(button.fill(palette.ground).stroke(Stroke::new(1.0, palette.edge))).clicked()
}

/// A setting that is on or off; true when it changed.
pub(crate) fn tick(ui: &mut Ui, on: &mut bool, text: &str, help: &str) -> bool {
    ui.checkbox(on, RichText::new(text).size(FIGURE)).on_hover_text(help).changed()
}

/// Text at a place of a row.
pub(crate) fn write(ui: &Ui, (x, y): (f32, f32), text: &str, size: f32, colour: Color32) {
    ui.painter().text(pos2(x, y), Align2::LEFT_CENTER, text, sans(size), colour);
}
