//! Captures in and out: through the clipboard, and through files.

use egui::{Event, Role, TextEdit, Ui, WidgetInfo};

use super::super::parts::{act, say, warn};
use super::super::theme::{FIGURE, Palette, sans};
use super::Captures;
use crate::captures::Captures as Kept;

/// Draws it.
pub(super) fn show(ui: &mut Ui, captures: &mut Captures, kept: &Kept, palette: &Palette) {
    ui.add_space(6.0);
    ui.separator();
    say(ui, "a file's whole path, or paste captures here", palette);
    let edit = TextEdit::singleline(&mut captures.path);
    let id = ui.scope_id().with("captures' file");
    let focused = ui.memory(|memory| memory.has_focus(id));
    if focused && let Some(text) = pasted(ui) {
        kept.import(&text);
    }
    let edit = edit.id(id).hint_text("patch.json").desired_width(f32::INFINITY);
    let response = ui.add(edit.font(sans(FIGURE)));
    response.widget_info(|| WidgetInfo::labeled(Role::TextInput, true, "captures' file"));
    ui.horizontal_wrapped(|ui| {
        if act(ui, "take in", palette) {
            kept.load(&captures.path);
        }
        if captures.count() == 0 {
            return;
        }
        if act(ui, "save all", palette) {
            kept.save(&captures.path);
        }
        if act(ui, "copy all as JSON", palette) {
            ui.ctx().copy_text(kept.json(None));
        }
    });
    match &captures.snapshot.told {
        Some(told) if told.done => say(ui, &told.text, palette),
        Some(told) => warn(ui, &told.text, palette),
        None => {}
    }
}

/// Captures that are being pasted: they are no path, and too long for a line.
fn pasted(ui: &Ui) -> Option<String> {
    ui.input_mut(|input| {
        let is_json = |event: &Event| {
            matches!(event, Event::Paste(text) if text.trim_start().starts_with('{'))
        };
        let at = input.events.iter().position(is_json)?;
        match input.events.remove(at) {
            Event::Paste(text) => Some(text),
            _ => None,
        }
    })
}
