//! A parameter edited where it is shown: drag or turn the wheel to change it, double-click or press Enter to type it,
//! right-click or press Delete for its default, arrows for steps. Choices open as a list.

use egui::{
    Align2, CornerRadius, EventFilter, Key, Popup, PopupCloseBehavior, Pos2, Rect, Response, Role,
    Sense, Stroke, StrokeKind, TextEdit, Ui, WidgetInfo, pos2, vec2,
};

use super::ink;
use super::knob::{Gesture, Handle, Knob};
use super::theme::{CORNER, FIGURE, Palette, SMALL, VALUE, mono, sans};
use crate::parameters::Parameters;

/// Change of the normalised value per point of a drag, and with Shift held.
const DRAG: f32 = 1.0 / 400.0;
const DRAG_FINE: f32 = 1.0 / 4000.0;
/// Points of a drag that one notch of the wheel, or one press of an arrow, is worth.
const NOTCH: f32 = 4.0;
/// Points of scrolling in one notch.
const SCROLL_A_NOTCH: f32 = 40.0;

/// What is being edited.
#[derive(Debug, Clone, Default)]
pub(crate) struct Editing {
    typing: Option<Typing>,
    /// The normalised value under the pointer, not yet rounded.
    dragging: Option<(Knob, f32)>,
}

#[derive(Debug, Clone)]
struct Typing {
    knob: Knob,
    text: String,
    /// Frames drawn since it began.
    frames: u8,
}

/// How a field is shown.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Field {
    pub(crate) knob: Knob,
    pub(crate) caption: &'static str,
    pub(crate) help: &'static str,
    pub(crate) place: Place,
}

/// Where the value stands.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Place {
    /// Under its caption.
    Under,
    /// Right after it.
    After,
    /// At the right edge.
    Edge,
}

/// The parts that every field draws with.
pub(crate) struct Bench<'a> {
    pub(crate) parameters: &'a Parameters,
    pub(crate) palette: &'a Palette,
    pub(crate) editing: &'a mut Editing,
    pub(crate) gestures: &'a mut Vec<Gesture>,
}

/// Draws a field into a rectangle and takes what is done to it.
pub(crate) fn field(ui: &mut Ui, rect: Rect, field: &Field, bench: &mut Bench<'_>) -> Response {
    let handle = field.knob.of(bench.parameters);
    let value = handle.value();
    let shown = handle.shown(value);
    let choices = choices(handle);
    let sense = if choices.is_some() { Sense::click() } else { Sense::click_and_drag() };
    let response = ui.interact(rect, ui.scope_id().with(field.knob), sense);
    let name = format!("{}: {shown}", field.caption);
    let kind = if choices.is_some() { Role::ComboBox } else { Role::SpinButton };
    response.widget_info(|| WidgetInfo::labeled(kind, true, &name));
    keep_arrows(ui, &response);
    frame(ui, &response, bench.palette);
    let at = caption(ui, rect, field, bench.palette);
    if type_in(ui, &response, field, at, bench) {
        return response;
    }
    let (align, font, room) = match field.place {
        Place::Under => (Align2::LEFT_CENTER, sans(VALUE), rect.width() - 4.0),
        Place::After => (Align2::LEFT_CENTER, sans(FIGURE), rect.right() - at.x),
        Place::Edge => (Align2::RIGHT_CENTER, mono(FIGURE), rect.width() * 0.6),
    };
    let mut job = egui::text::LayoutJob::simple_singleline(shown, font, bench.palette.ink);
    job.wrap = egui::text::TextWrapping::truncate_at_width(room);
    let galley = ui.painter().layout_job(job);
    let place = align.anchor_size(at, galley.size());
    ui.painter().galley(place.min, galley, bench.palette.ink);
    match choices {
        Some(count) => choose(&response, field, count, bench),
        None => drag(ui, &response, field.knob, bench),
    }
    step(ui, &response, field, choices, bench);
    if response.secondary_clicked() || focused_key(ui, &response, Key::Delete) {
        bench.gestures.extend(Gesture::jump(field.knob, handle.default()));
    }
    response.on_hover_text(field.help)
}

/// The number of choices of a parameter that is chosen from a list.
fn choices(handle: &dyn Handle) -> Option<usize> {
    handle.steps().map(|steps| steps + 1).filter(|&count| count <= 16)
}

fn frame(ui: &Ui, response: &Response, palette: &Palette) {
    let rect = response.rect.expand2(vec2(6.0, 2.0));
    let corner = CornerRadius::same(4);
    if response.hovered() || response.dragged() {
        ui.painter().rect_filled(rect, corner, palette.lit);
    }
    if response.has_focus() {
        let stroke = Stroke::new(1.0, palette.pitch);
        ui.painter().rect_stroke(rect, corner, stroke, StrokeKind::Inside);
    }
}

/// Draws the caption; says where the value goes.
fn caption(ui: &Ui, rect: Rect, field: &Field, palette: &Palette) -> Pos2 {
    let (at, align, size) = match field.place {
        Place::Under => (rect.left_top(), Align2::LEFT_TOP, SMALL),
        Place::After | Place::Edge => (rect.left_center(), Align2::LEFT_CENTER, FIGURE),
    };
    let drawn = ink::mark(ui, at, align, field.caption, sans(size), palette.dim);
    match field.place {
        Place::Under => pos2(rect.left(), rect.bottom() - 10.0),
        Place::After => pos2(drawn.right() + 7.0, rect.center().y),
        Place::Edge => rect.right_center(),
    }
}

/// Typing: begun by a double click or Enter, ended by Enter or by going elsewhere. True while it lasts.
fn type_in(
    ui: &mut Ui,
    response: &Response,
    field: &Field,
    at: Pos2,
    bench: &mut Bench<'_>,
) -> bool {
    let knob = field.knob;
    let handle = knob.of(bench.parameters);
    let typed = choices(handle).is_none();
    let begins = response.double_clicked() || focused_key(ui, response, Key::Enter);
    let id = ui.scope_id().with((knob, "typing"));
    if typed && begins && bench.editing.typing.is_none() {
        let text = handle.shown(handle.value());
        bench.editing.typing = Some(Typing { knob, text, frames: 0 });
    }
    let Some(typing) = &mut bench.editing.typing else { return false };
    if typing.knob != knob {
        return false;
    }
    let (left, width) = match field.place {
        Place::Under => (at.x - 4.0, response.rect.width()),
        Place::After => (at.x - 4.0, response.rect.right() - at.x + 4.0),
        Place::Edge => (at.x - 96.0, 96.0),
    };
    let place = Rect::from_min_size(pos2(left, at.y - 10.0), vec2(width, 20.0));
    let length = typing.text.chars().count();
    let edit = TextEdit::singleline(&mut typing.text).id(id).font(sans(TEXT_IN));
    let entry = ui.put(place, edit.margin(vec2(3.0, 1.0)));
    entry.widget_info(|| WidgetInfo::labeled(Role::TextInput, true, field.caption));
    typing.frames = typing.frames.saturating_add(1);
    if typing.frames <= SETTLING_FRAMES {
        entry.request_focus();
        if !entry.changed() {
            select_all(ui, id, length);
        }
    } else if entry.lost_focus() {
        let done = ui.input(|input| !input.key_pressed(Key::Escape));
        if let Some(Typing { text, .. }) = bench.editing.typing.take()
            && done
            && let Some(entered) = handle.entered(&text)
        {
            bench.gestures.extend(Gesture::jump(knob, handle.snapped(entered)));
        }
    }
    true
}

/// The double click itself takes the focus away again, and a text field takes a selection only once it has had the focus.
const SETTLING_FRAMES: u8 = 3;
/// Size of what is typed.
const TEXT_IN: f32 = 13.0;

fn select_all(ui: &Ui, id: egui::Id, length: usize) {
    use egui::text::{CCursor, CCursorRange};
    let mut state = egui::text_edit::TextEditState::load(ui.ctx(), id).unwrap_or_default();
    let all = CCursorRange::two(CCursor::new(0), CCursor::new(length));
    state.cursor.set_char_range(Some(all));
    state.store(ui.ctx(), id);
    ui.ctx().request_repaint();
}

fn drag(ui: &Ui, response: &Response, knob: Knob, bench: &mut Bench<'_>) {
    let handle = knob.of(bench.parameters);
    if response.drag_started() {
        bench.editing.dragging = Some((knob, handle.value()));
        bench.gestures.push(Gesture::Begin(knob));
    }
    if let Some((dragging, value)) = &mut bench.editing.dragging
        && *dragging == knob
    {
        let delta = response.drag_delta();
        let rate = if ui.input(|input| input.modifiers.shift) { DRAG_FINE } else { DRAG };
        if delta != egui::Vec2::ZERO {
            *value = (*value + (delta.x - delta.y) * rate).clamp(0.0, 1.0);
            bench.gestures.push(Gesture::Set(knob, tidy(handle, *value)));
        }
        if !response.dragged() {
            bench.editing.dragging = None;
            bench.gestures.push(Gesture::End(knob));
        }
    }
}

/// The wheel over a field, and the arrow keys in it.
fn step(
    ui: &Ui,
    response: &Response,
    field: &Field,
    choices: Option<usize>,
    bench: &mut Bench<'_>,
) {
    let knob = field.knob;
    // A list scrolls: over it, the wheel turns what was chosen before and nothing that it happens to come over.
    let listens = field.place != Place::Edge || response.has_focus();
    let scrolled = if listens && response.hovered() { wheel_notches(ui) } else { 0.0 };
    let arrows = [(Key::ArrowUp, 1.0), (Key::ArrowDown, -1.0)];
    let pressed: f32 =
        arrows.iter().filter(|(key, _)| focused_key(ui, response, *key)).map(|(_, by)| by).sum();
    let notches = scrolled + pressed;
    if notches.abs() < 1e-3 {
        return;
    }
    let handle = knob.of(bench.parameters);
    let fine = ui.input(|input| input.modifiers.shift);
    let target = match choices {
        // Up the list is towards its first entry; a wheel turns by whole entries.
        Some(count) => handle.value() - notches.signum() / (count - 1) as f32,
        None => {
            let rate = if fine { DRAG_FINE } else { DRAG };
            tidy(handle, (handle.value() + notches * NOTCH * rate).clamp(0.0, 1.0))
        }
    };
    if (handle.snapped(target) - handle.value()).abs() > f32::EPSILON {
        bench.gestures.extend(Gesture::jump(knob, handle.snapped(target)));
    }
}

/// Notches that the wheel turned, each a change of its own; nobody else gets to see them.
fn wheel_notches(ui: &Ui) -> f32 {
    ui.input_mut(|input| {
        input.smooth_scroll_delta = egui::Vec2::ZERO;
        let turned = input.events.iter().filter_map(|event| match event {
            egui::Event::MouseWheel { unit: egui::MouseWheelUnit::Point, delta, .. } => {
                Some(delta.y / SCROLL_A_NOTCH)
            }
            egui::Event::MouseWheel { delta, .. } => Some(delta.y),
            _ => None,
        });
        turned.sum()
    })
}

fn choose(response: &Response, field: &Field, count: usize, bench: &mut Bench<'_>) {
    let handle = field.knob.of(bench.parameters);
    let mut chosen = None;
    Popup::menu(response).close_behavior(PopupCloseBehavior::CloseOnClick).show(|ui| {
        ui.set_min_width(120.0);
        for step in 0..count {
            let normalized = step as f32 / (count - 1).max(1) as f32;
            let current = (normalized - handle.value()).abs() < 1e-4;
            if ui.selectable_label(current, handle.shown(normalized)).clicked() {
                chosen = Some(normalized);
            }
        }
    });
    if let Some(normalized) = chosen {
        bench.gestures.extend(Gesture::jump(field.knob, normalized));
    }
}

/// Rounds a value to what is shown of it, so that a dragged value is the one read.
fn tidy(handle: &dyn Handle, normalized: f32) -> f32 {
    handle.entered(&handle.shown(normalized)).map_or(normalized, |rounded| handle.snapped(rounded))
}

/// Arrows pressed in what has the focus belong to it and move no focus.
pub(crate) fn keep_arrows(ui: &Ui, response: &Response) {
    if response.has_focus() {
        let filter = EventFilter {
            horizontal_arrows: true,
            vertical_arrows: true,
            ..EventFilter::default()
        };
        ui.memory_mut(|memory| memory.set_focus_lock_filter(response.id, filter));
    }
}

fn focused_key(ui: &Ui, response: &Response, key: Key) -> bool {
    response.has_focus() && ui.input(|input| input.key_pressed(key))
}

/// A button that stays down while its parameter is on.
pub(crate) fn switch(
    ui: &mut Ui,
    rect: Rect,
    (knob, caption, help): (Knob, &str, &str),
    bench: &mut Bench<'_>,
) -> Response {
    let handle = knob.of(bench.parameters);
    let on = handle.value() > 0.5;
    let response = ui.interact(rect, ui.scope_id().with(knob), Sense::click());
    response.widget_info(|| WidgetInfo::selected(Role::Button, true, on, caption));
    button_face(ui, &response, (caption, on), bench.palette);
    if response.clicked() {
        bench.gestures.extend(Gesture::jump(knob, if on { 0.0 } else { 1.0 }));
    }
    response.on_hover_text(help)
}

/// A plain button.
pub(crate) fn button(ui: &mut Ui, rect: Rect, caption: &str, palette: &Palette) -> Response {
    let response = ui.interact(rect, ui.scope_id().with(caption), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, caption));
    button_face(ui, &response, (caption, false), palette);
    response
}

fn button_face(ui: &Ui, response: &Response, (caption, on): (&str, bool), palette: &Palette) {
    let rect = response.rect;
    let fill = match (on, response.hovered()) {
        (true, _) => palette.within_ground,
        (false, true) => palette.lit,
        (false, false) => palette.ground,
    };
    let edge = if on {
        palette.within
    } else if response.has_focus() {
        palette.pitch
    } else {
        palette.edge
    };
    let ink = if on { palette.within } else { palette.ink };
    ui.painter().rect(rect, CORNER, fill, Stroke::new(1.0, edge), StrokeKind::Inside);
    ink::mark(ui, rect.center(), Align2::CENTER_CENTER, caption, sans(13.0), ink);
}
