//! The side panel: tabs, each a view of its own. A new one is one more entry in [`Tab::ALL`] and one more arm.

use egui::{Align2, Rect, Response, Role, Sense, Stroke, Ui, WidgetInfo, pos2, vec2};

use super::captures::{self, Captures};
use super::checks::{self, Checks};
use super::field::Bench;
use super::ink;
use super::keys::{self, Keys};
use super::screen::Shown;
use super::settings::{self, Look};
use super::sound::{self, Figures};
use super::theme::{CORNER, PAD, Palette, bold, sans};

/// Height of the tabs, and of the line of actions at the bottom.
const TABS: f32 = 38.0;
const ACTIONS: f32 = 34.0;
/// Space between two tabs, where there is room for it.
const TABS_APART: f32 = 22.0;

/// What the panel shows.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(crate) enum Tab {
    #[default]
    Sound,
    Captures,
    Keys,
    Checks,
    Settings,
}

impl Tab {
    const ALL: [(Self, &'static str); 5] = [
        (Self::Sound, "Sound"),
        (Self::Captures, "Captures"),
        (Self::Keys, "Keys"),
        (Self::Checks, "Checks"),
        (Self::Settings, "Settings"),
    ];
}

/// What is asked to be copied.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Copy {
    Text,
    Csv,
    KeysText,
    KeysCsv,
    Picture,
}

const PICTURE: (Copy, &str, &str) = (
    Copy::Picture,
    "picture",
    "Copy what you see as an SVG picture: paste it into a drawing program or save it as a file",
);
const COPIES: [(Copy, &str, &str); 3] = [
    (Copy::Text, "text", "Copy all figures as text"),
    (Copy::Csv, "CSV", "Copy all figures as CSV, for a spreadsheet or a program"),
    PICTURE,
];
const COPIES_OF_KEYS: [(Copy, &str, &str); 3] = [
    (Copy::KeysText, "text", "Copy the key sheet as text"),
    (Copy::KeysCsv, "CSV", "Copy the key sheet as CSV, for a spreadsheet or a program"),
    PICTURE,
];

/// What the tabs show and change.
pub(crate) struct Views<'a, 'b> {
    pub(crate) tab: &'a mut Tab,
    pub(crate) look: &'a mut Look<'b>,
    pub(crate) captures: &'a mut Captures,
    pub(crate) checks: &'a mut Checks,
    pub(crate) keys: &'a mut Keys,
}

/// Draws it. Says what is asked for.
pub(crate) fn show(
    ui: &mut Ui,
    rect: Rect,
    Views { tab, look, captures, checks, keys }: Views<'_, '_>,
    (shown, figures): (&Shown<'_>, &Figures),
    bench: &mut Bench<'_>,
) -> Option<Copy> {
    let palette = bench.palette;
    ui.painter().rect_filled(rect, CORNER, palette.card);
    let mut ui = ui.new_child(egui::UiBuilder::new().max_rect(rect).id_salt("panel"));
    let ui = &mut ui;
    ui.shrink_clip_rect(rect);
    tabs(ui, rect, tab, palette);
    let body = rect.with_min_y(rect.top() + TABS).with_max_y(rect.bottom() - ACTIONS);
    match tab {
        Tab::Sound => sound::show(ui, body, shown, figures, palette),
        Tab::Captures => captures::show(ui, body, captures, shown, palette),
        Tab::Keys => keys::show(ui, body, keys, shown, palette),
        Tab::Checks => checks::show(ui, body, checks, bench),
        Tab::Settings => settings::show(ui, body, look, bench),
    }
    let all = if *tab == Tab::Keys { &COPIES_OF_KEYS } else { &COPIES };
    copies(ui, rect.with_min_y(rect.bottom() - ACTIONS), all, palette)
}

fn tabs(ui: &mut Ui, rect: Rect, tab: &mut Tab, palette: &Palette) {
    let names = Tab::ALL.map(|(this, name)| {
        let on = *tab == this;
        let font = if on { bold(12.5) } else { sans(12.5) };
        let colour = if on { palette.ink } else { palette.dim };
        ui.painter().layout_no_wrap(name.to_owned(), font, colour)
    });
    let wide: f32 = names.iter().map(|galley| galley.size().x).sum();
    let apart = (rect.width() - 2.0 * PAD - wide) / (names.len() as f32 - 1.0);
    let mut x = rect.left() + PAD;
    for ((this, name), galley) in Tab::ALL.into_iter().zip(names) {
        let on = *tab == this;
        let colour = if on { palette.ink } else { palette.dim };
        let place = Rect::from_min_size(pos2(x, rect.top() + 6.0), vec2(galley.size().x, 24.0));
        let response =
            ui.interact(place.expand2(vec2(6.0, 0.0)), ui.scope_id().with(name), Sense::click());
        response.widget_info(|| WidgetInfo::selected(Role::RadioButton, true, on, name));
        let at = Align2::LEFT_CENTER.anchor_size(place.left_center(), galley.size());
        ui.painter().galley(at.min, galley, colour);
        if on || response.hovered() || response.has_focus() {
            let colour = if on || response.has_focus() { palette.pitch } else { palette.edge };
            ui.painter().hline(place.x_range(), place.bottom() + 2.0, Stroke::new(2.0, colour));
        }
        if response.clicked() {
            *tab = this;
        }
        x = place.right() + apart.min(TABS_APART);
    }
}

fn copies(ui: &mut Ui, rect: Rect, all: &[(Copy, &str, &str)], palette: &Palette) -> Option<Copy> {
    ui.painter().hline(
        rect.shrink2(vec2(PAD, 0.0)).x_range(),
        rect.top(),
        Stroke::new(1.0, palette.edge),
    );
    let y = rect.center().y;
    let at = (pos2(rect.left() + PAD, y), Align2::LEFT_CENTER);
    let mut x = ink::text(ui, at, "copy", sans(12.0), palette.dim).rect.right() + 14.0;
    let mut asked = None;
    for &(copy, name, help) in all {
        let response = link(ui, pos2(x, y), (name, help), palette);
        if response.clicked() {
            asked = Some(copy);
        }
        x = response.rect.right() + 10.0;
    }
    asked
}

fn link(ui: &mut Ui, at: egui::Pos2, (name, help): (&str, &str), palette: &Palette) -> Response {
    let galley = ui.painter().layout_no_wrap(name.to_owned(), sans(12.0), palette.pitch);
    let place = Align2::LEFT_CENTER.anchor_size(at, galley.size());
    let response =
        ui.interact(place.expand2(vec2(4.0, 4.0)), ui.scope_id().with(help), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, help));
    ui.painter().galley(place.min, galley, palette.pitch);
    if response.hovered() || response.has_focus() {
        ui.painter().hline(place.x_range(), place.bottom(), Stroke::new(1.0, palette.pitch));
    }
    response.on_hover_text(help)
}
