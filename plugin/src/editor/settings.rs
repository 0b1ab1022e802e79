//! The side panel's settings: what is measured, and how the editor looks.

use egui::{Align2, Rect, Role, Sense, Stroke, Ui, WidgetInfo, pos2, vec2};

use super::field::{self, Bench, Field, Place};
use super::ink;
use super::knob::Knob;
use super::plumb::{Levels, Plumb};
use super::theme::{PAD, Palette, SMALL, Theme, sans};

/// Height of a line, and space before a heading.
const LINE: f32 = 26.0;
const HEADING: f32 = 34.0;
/// Zooms on offer, in percent.
const ZOOMS: [(f32, &str); 6] =
    [(75.0, "75"), (100.0, "100"), (125.0, "125"), (150.0, "150"), (175.0, "175"), (200.0, "200")];
const THEMES: [(Theme, &str); 2] = [(Theme::Dark, "dark"), (Theme::Light, "light")];
/// Half-widths of the scale of cents on offer; `None` adapts.
const SCALES: [(Option<f64>, &str); 6] = [
    (None, "auto"),
    (Some(5.0), "5"),
    (Some(20.0), "20"),
    (Some(50.0), "50"),
    (Some(100.0), "100"),
    (Some(500.0), "500"),
];

const FIELDS: [Field; 4] = [
    Field {
        knob: Knob::Partials,
        caption: "partials",
        help: "How many partials are measured, 1 to 128.",
        place: Place::Edge,
    },
    Field {
        knob: Knob::Lowest,
        caption: "lowest pitch",
        help: "Lowest fundamental looked for, as a note or in Hz.",
        place: Place::Edge,
    },
    Field {
        knob: Knob::Highest,
        caption: "highest pitch",
        help: "Highest fundamental looked for, as a note or in Hz.",
        place: Place::Edge,
    },
    Field {
        knob: Knob::ReferencePitch,
        caption: "reference pitch",
        help: "The pitch that drift is measured against when the reference is one pitch.",
        place: Place::Edge,
    },
];

/// What of the look is set here.
pub(crate) struct Look<'a> {
    pub(crate) theme: &'a mut Theme,
    pub(crate) zoom: &'a mut f32,
    pub(crate) plumb: &'a mut Plumb,
}

/// Draws it.
pub(crate) fn show(ui: &mut Ui, rect: Rect, look: &mut Look<'_>, bench: &mut Bench<'_>) {
    let area = rect.shrink2(vec2(PAD, 0.0));
    let palette = bench.palette;
    egui::ScrollArea::vertical().id_salt("settings").show(
        &mut ui.new_child(egui::UiBuilder::new().max_rect(area)),
        |ui| {
            let area = Rect::from_min_size(ui.cursor().min, vec2(area.width(), 0.0));
            let mut y = heading(ui, area, area.top(), "measuring", palette);
            for field in &FIELDS {
                let place =
                    Rect::from_min_size(pos2(area.left(), y), vec2(area.width() - 8.0, 20.0));
                field::field(ui, place, field, bench);
                y += LINE;
            }
            y = look_fields(ui, (area, y), look, palette);
            ui.allocate_rect(area.with_max_y(y + 8.0), Sense::hover());
        },
    );
}

/// How the editor looks; gives where that ends.
fn look_fields(ui: &mut Ui, (area, y): (Rect, f32), look: &mut Look<'_>, palette: &Palette) -> f32 {
    let Look { theme, zoom, plumb } = look;
    let levels = (&Levels::ALL[..], |levels: &Levels| plumb.levels == *levels);
    let (chosen, y) = choices(ui, (area, y), "levels", levels, palette);
    plumb.levels = chosen.unwrap_or(plumb.levels);
    let scales = (&SCALES[..], |scale: &Option<f64>| plumb.fixed_cents == *scale);
    let (chosen, y) = choices(ui, (area, y), "scale of cents", scales, palette);
    plumb.fixed_cents = chosen.unwrap_or(plumb.fixed_cents);
    let themes = (&THEMES[..], |this: &Theme| **theme == *this);
    let (chosen, y) = choices(ui, (area, y), "theme", themes, palette);
    **theme = chosen.unwrap_or(**theme);
    let now = **zoom * 100.0;
    let zooms = (&ZOOMS[..], |percent: &f32| (now - percent).abs() < 0.5);
    let (chosen, y) = choices(ui, (area, y), "zoom, %", zooms, palette);
    **zoom = chosen.map_or(**zoom, |percent| percent / 100.0);
    y
}

fn heading(ui: &mut Ui, area: Rect, y: f32, text: &str, palette: &Palette) -> f32 {
    let at = (pos2(area.left(), y + HEADING - 12.0), Align2::LEFT_CENTER);
    ink::text(ui, at, text, sans(SMALL), palette.dim);
    y + HEADING
}

/// Several side by side; gives the one that was clicked, and where they end.
fn choices<T: Copy>(
    ui: &mut Ui,
    (area, y): (Rect, f32),
    group: &str,
    (all, on): (&[(T, &str)], impl Fn(&T) -> bool),
    palette: &Palette,
) -> (Option<T>, f32) {
    let top = heading(ui, area, y, group, palette);
    let width = (area.width() - 8.0) / all.len() as f32;
    let mut chosen = None;
    for (k, (value, text)) in all.iter().enumerate() {
        let left = area.left() + width * k as f32;
        let size = vec2(width - 4.0, LINE - 4.0);
        let place = Rect::from_min_size(pos2(left, top), size);
        if option(ui, place, (group, text), on(value), palette) {
            chosen = Some(*value);
        }
    }
    (chosen, top + LINE)
}

fn option(ui: &Ui, place: Rect, (group, text): (&str, &str), on: bool, palette: &Palette) -> bool {
    let name = format!("{group}: {text}");
    let response = ui.interact(place, ui.scope_id().with(&name), Sense::click());
    response.widget_info(|| WidgetInfo::selected(Role::RadioButton, true, on, &name));
    let fill = if response.hovered() || on { palette.lit } else { palette.ground };
    let edge = if on || response.has_focus() { palette.pitch } else { palette.edge };
    ui.painter().rect(place, 4.0, fill, Stroke::new(1.0, edge), egui::StrokeKind::Inside);
    let ink = if on { palette.ink } else { palette.dim };
    ink::mark(ui, place.center(), Align2::CENTER_CENTER, text, sans(12.0), ink);
    response.clicked()
}
