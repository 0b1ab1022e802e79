//! The list of captures, newest first, and what is heard now on top; the one that is clicked opens.

use egui::{
    Align2, Rect, Response, Role, Sense, Stroke, StrokeKind, TextEdit, Ui, WidgetInfo, pos2, vec2,
};

use plumbtone_analysis::waveform;

use super::super::copy;
use super::super::mark::Mark;
use super::super::parts::{act, say, write};
use super::super::steady::signed;
use super::super::theme::{FIGURE, Palette, SMALL, bold, sans};
use super::super::words::{self, hertz};
use super::{Captures, Side};
use crate::captures::{COLOURS, Capture, Captures as Kept};

/// Heights of the row of a capture, and of what is heard now.
const ROW: f32 = 42.0;
const LIVE: f32 = 28.0;
/// Side of a button that chooses what is compared, and from where on the right of a row they stand.
const CHOICE: f32 = 22.0;

/// What is done with a capture.
enum Deed {
    Open,
    First,
    Second,
    Rename(String),
    Paint(u8),
    Forget,
}

/// Draws the list and does what is asked for.
pub(super) fn show(ui: &mut Ui, captures: &mut Captures, kept: &Kept, palette: &Palette) {
    if live(ui, captures, palette) {
        captures.second = Side::Live;
    }
    let mut done = None;
    for capture in captures.snapshot.captures.iter().rev() {
        let number = capture.number;
        let chosen = [captures.first == Some(number), captures.second == Side::Kept(number)];
        let opened = captures.opened == Some(number);
        if let Some(deed) = row(ui, capture, opened, chosen, palette) {
            done = Some((number, deed));
        }
        if opened && let Some(deed) = details(ui, capture, kept, palette) {
            done = Some((number, deed));
        }
    }
    let Some((number, deed)) = done else { return };
    match deed {
        Deed::Open => {
            captures.opened = Some(number).filter(|_| captures.opened != Some(number));
        }
        Deed::First => {
            captures.first = Some(number).filter(|_| captures.first != Some(number));
        }
        Deed::Second => {
            let other = captures.snapshot.captures.iter().rev().find(|c| c.number != number);
            captures.first = captures.first.or(other.map(|c| c.number));
            let again = captures.second == Side::Kept(number);
            captures.second = if again { Side::Live } else { Side::Kept(number) };
        }
        Deed::Rename(name) => {
            kept.rename(number, &name);
            // What is typed is there at once, even if somebody else is at the captures just now.
            let mut all = captures.snapshot.captures.iter_mut();
            if let Some(capture) = all.find(|c| c.number == number) {
                capture.name = name;
            }
        }
        Deed::Paint(colour) => kept.paint(number, colour),
        Deed::Forget => kept.remove(number),
    }
}

/// What is heard now; true when it is to be compared.
fn live(ui: &mut Ui, captures: &Captures, palette: &Palette) -> bool {
    let (rect, _) = ui.allocate_exact_size(vec2(ui.available_width(), LIVE), Sense::hover());
    ui.painter().rect_filled(rect, 4.0, palette.ground);
    let y = rect.center().y;
    ui.painter().add(Mark::Live.shape(pos2(rect.left() + 14.0, y), 5.0, palette));
    write(ui, (rect.left() + 28.0, y), "live: what is heard now", FIGURE, palette.ink);
    let on = captures.first.is_some() && captures.second == Side::Live;
    choice(ui, (rect, 0.0), ("B", "live", 0), on, palette).clicked()
}

/// One capture in two lines.
fn row(
    ui: &mut Ui,
    capture: &Capture,
    opened: bool,
    chosen: [bool; 2],
    palette: &Palette,
) -> Option<Deed> {
    let (rect, _) = ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::hover());
    let id = ui.scope_id().with(("capture", capture.number));
    let response = ui.interact(rect, id, Sense::click());
    let name = format!("capture {}: {}", capture.number, capture.name);
    response.widget_info(|| WidgetInfo::selected(Role::Button, true, opened, &name));
    let fill = if response.hovered() || opened { palette.lit } else { palette.ground };
    let edge = if response.has_focus() { palette.pitch } else { palette.edge };
    ui.painter().rect(rect, 4.0, fill, Stroke::new(1.0, edge), StrokeKind::Inside);
    let (left, upper, lower) = (rect.left() + 28.0, rect.top() + 13.0, rect.bottom() - 12.0);
    let at = pos2(rect.left() + 14.0, upper);
    ui.painter().add(Mark::of(capture).shape(at, 5.0, palette));
    let room = rect.right() - left - 2.0 * CHOICE - 16.0;
    let mut job =
        egui::text::LayoutJob::simple_singleline(capture.name.clone(), sans(FIGURE), palette.ink);
    job.wrap = egui::text::TextWrapping::truncate_at_width(room);
    let galley = ui.painter().layout_job(job);
    let place = Align2::LEFT_CENTER.anchor_size(pos2(left, upper), galley.size());
    ui.painter().galley(place.min, galley, palette.ink);
    let cents = capture.cents.map_or_else(String::new, |c| format!(" {} ct", signed(c, 1)));
    let second = format!("{}{cents}, {}", capture.note_name(), when(capture));
    write(ui, (left, lower), &second, SMALL, palette.dim);
    let first =
        choice(ui, (rect, CHOICE + 4.0), ("A", &capture.name, capture.number), chosen[0], palette);
    let second = choice(ui, (rect, 0.0), ("B", &capture.name, capture.number), chosen[1], palette);
    if first.clicked() {
        return Some(Deed::First);
    }
    if second.clicked() {
        return Some(Deed::Second);
    }
    response.clicked().then_some(Deed::Open)
}

/// A button at the right of a row, which chooses what is compared.
fn choice(
    ui: &Ui,
    (row, from_right): (Rect, f32),
    (letter, name, number): (&str, &str, u64),
    on: bool,
    palette: &Palette,
) -> Response {
    let centre = pos2(row.right() - 8.0 - CHOICE / 2.0 - from_right, row.center().y);
    let rect = Rect::from_center_size(centre, vec2(CHOICE, CHOICE));
    let id = ui.scope_id().with(("choice", letter, number));
    let response = ui.interact(rect, id, Sense::click());
    let said = format!("{letter}: {name}");
    response.widget_info(|| WidgetInfo::selected(Role::RadioButton, true, on, &said));
    let (fill, ink) = match (on, response.hovered()) {
        (true, _) => (palette.within_ground, palette.within),
        (false, true) => (palette.lit, palette.ink),
        (false, false) => (palette.card, palette.dim),
    };
    let edge = if on { palette.within } else { palette.edge };
    let edge = if response.has_focus() { palette.pitch } else { edge };
    ui.painter().rect(rect, 4.0, fill, Stroke::new(1.0, edge), StrokeKind::Inside);
    ui.painter().text(centre, Align2::CENTER_CENTER, letter, bold(SMALL), ink);
    response.on_hover_text(match letter {
        "A" => "Compare this one with B: differences are B less A. Again: stop comparing.",
        _ => "Compare A with this one.",
    })
}

fn details(ui: &mut Ui, capture: &Capture, kept: &Kept, palette: &Palette) -> Option<Deed> {
    let mut deed = None;
    let mut name = capture.name.clone();
    let edit = TextEdit::singleline(&mut name).hint_text("name").desired_width(f32::INFINITY);
    let response = ui.add(edit.font(sans(FIGURE)));
    response.widget_info(|| WidgetInfo::labeled(Role::TextInput, true, "name"));
    if response.changed() {
        deed = Some(Deed::Rename(name));
    }
    for line in lines(capture) {
        say(ui, &line, palette);
    }
    if let Some(colour) = colours(ui, capture, palette) {
        deed = Some(Deed::Paint(colour));
    }
    ui.horizontal_wrapped(|ui| {
        if act(ui, "copy as JSON", palette) {
            ui.ctx().copy_text(kept.json(Some(capture.number)));
        }
        if act(ui, "copy recipe as CSV", palette) {
            ui.ctx().copy_text(copy::recipe_csv(capture));
        }
        if act(ui, "forget this one", palette) {
            deed = Some(Deed::Forget);
        }
    });
    ui.add_space(4.0);
    deed
}

fn colours(ui: &mut Ui, capture: &Capture, palette: &Palette) -> Option<u8> {
    let mut chosen = None;
    let (rect, _) = ui.allocate_exact_size(vec2(ui.available_width(), 22.0), Sense::hover());
    for colour in 0..COLOURS {
        let at = pos2(rect.left() + 12.0 + 26.0 * f32::from(colour), rect.center().y);
        let place = Rect::from_center_size(at, vec2(22.0, 20.0));
        let id = ui.scope_id().with(("colour", capture.number, colour));
        let response = ui.interact(place, id, Sense::click());
        let on = capture.colour == colour;
        let name = format!("colour {}", colour + 1);
        response.widget_info(|| WidgetInfo::selected(Role::RadioButton, true, on, &name));
        if on || response.hovered() || response.has_focus() {
            let edge = if response.has_focus() { palette.pitch } else { palette.dim };
            let stroke = Stroke::new(1.0, edge);
            ui.painter().rect_stroke(place, 4.0, stroke, StrokeKind::Inside);
        }
        ui.painter().add(Mark::Kept(colour).shape(at, 5.0, palette));
        if response.clicked() {
            chosen = Some(colour);
        }
    }
    chosen
}

/// What there is to say of a capture, a line each.
fn lines(capture: &Capture) -> Vec<String> {
    let taken = format!("taken {}", capture.time.replace('T', " ").replace('Z', " UTC"));
    let mut lines = vec![format!(
        "{} Hz \u{b1} {:.2} ct, {} partials over {:.0} ms",
        hertz(capture.f0_hz, 2),
        capture.f0_sd_cents,
        capture.partials.len(),
        1000.0 * capture.integration_s
    )];
    if let Some(fit) = waveform::of_reading(&capture.reading()) {
        lines.push(format!("waveform: {}", words::waveform(&fit)));
    }
    if let Some(place) = &capture.place {
        let bar =
            place.bar_beat.map_or_else(String::new, |(bar, beat)| format!(", {bar}|{beat:.2}"));
        lines.push(format!("at {:.2} s{bar} of the session", place.seconds));
    }
    lines.push(taken);
    lines
}

/// When it was taken: month, day, and the time in UTC.
fn when(capture: &Capture) -> String {
    let (day, time) = capture.time.split_once('T').unwrap_or((&capture.time, ""));
    format!("{} {}", day.get(5..).unwrap_or(day), time.get(..5).unwrap_or(time))
}
