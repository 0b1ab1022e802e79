//! The side panel's settings: what is measured, and how the editor looks.

use egui::{Align2, Rect, Sense, Stroke, Ui, WidgetInfo, Role, pos2, vec2};

use super::field::{self, Bench, Field, Place};
use super::ink;
use super::knob::Knob;
use super::plumb::{Levels, Plumb};
use super::theme::{PAD, Palette, SMALL, Theme, sans};

/// Height of a line, and space before a heading.
const LINE: f32 = 26.0;
const HEADING: f32 = 34.0;
/// Zooms on offer, in percent.
const ZOOMS: [u16; 6] = [75, 100, 125, 150, 175, 200];
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
    Field { knob: Knob::Partials, caption: "partials", help: "How many partials are measured, 1 to 128.", place: Place::Edge },
    Field { knob: Knob::Lowest, caption: "lowest pitch", help: "Lowest fundamental looked for, as a note or in Hz.", place: Place::Edge },
    Field { knob: Knob::Highest, caption: "highest pitch", help: "Highest fundamental looked for, as a note or in Hz.", place: Place::Edge },
    Field { knob: Knob::ReferencePitch, caption: "reference pitch", help: "The pitch that drift is measured against when the reference is one pitch.", place: Place::Edge },
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
                let place = Rect::from_min_size(pos2(area.left(), y), vec2(area.width() - 8.0, 20.0));
                field::field(ui, place, field, bench);
                y += LINE;
            }
            y = heading(ui, area, y, "levels", palette);
            for (levels, words) in Levels::ALL {
                y = choice(ui, area, y, (words, look.plumb.levels == levels), palette, || look.plumb.levels = levels);
            }
            y = heading(ui, area, y, "scale of cents", palette);
            y = choices(ui, area, y, &SCALES, |scale| look.plumb.fixed_cents == *scale, palette)
                .map_or(y + LINE, |scale| { look.plumb.fixed_cents = scale; y + LINE });
            y = heading(ui, area, y, "theme", palette);
            let themes = [(Theme::Dark, "dark"), (Theme::Light, "light")];
            if let Some(theme) = choices(ui, area, y, &themes, |theme| look.theme == theme, palette) {
                *look.theme = theme;
            }
            y = heading(ui, area, y + LINE, "zoom, %", palette);
            let zooms = ZOOMS.map(|percent| (percent, percent.to_string()));
            let zooms = zooms.each_ref().map(|(percent, text)| (*percent, text.as_str()));
            let now = *look.zoom;
            let chosen = |percent: &u16| (now * 100.0 - f32::from(*percent)).abs() < 0.5;
            if let Some(percent) = choices(ui, area, y, &zooms, chosen, palette) {
                *look.zoom = f32::from(percent) / 100.0;
            }
            ui.allocate_rect(area.with_max_y(y + LINE), Sense::hover());
        },
    );
}

fn heading(ui: &mut Ui, area: Rect, y: f32, text: &str, palette: &Palette) -> f32 {
    let at = (pos2(area.left(), y + HEADING - 12.0), Align2::LEFT_CENTER);
    ink::text(ui, at, text, sans(SMALL), palette.dim);
    y + HEADING
}

/// One of several, on a line of its own.
fn choice(
    ui: &Ui,
    area: Rect,
    y: f32,
    (text, on): (&str, bool),
    palette: &Palette,
    chosen: impl FnOnce(),
) -> f32 {
    let place = Rect::from_min_size(pos2(area.left(), y), vec2(area.width() - 8.0, LINE - 4.0));
    if option(ui, place, (text, on), palette) {
        chosen();
    }
    y + LINE
}

/// Several side by side; gives the one that was clicked.
fn choices<T: Copy>(
    ui: &Ui,
    area: Rect,
    y: f32,
    all: &[(T, &str)],
    on: impl Fn(&T) -> bool,
    palette: &Palette,
) -> Option<T> {
    let width = (area.width() - 8.0) / all.len() as f32;
    all.iter().enumerate().find_map(|(k, (value, text))| {
        let left = area.left() + k as f32 * width;
        let place = Rect::from_min_size(pos2(left, y), vec2(width - 4.0, LINE - 4.0));
        option(ui, place, (text, on(value)), palette).then_some(*value)
    })
}

fn option(ui: &Ui, place: Rect, (text, on): (&str, bool), palette: &Palette) -> bool {
    let response = ui.interact(place, ui.scope_id().with((text, nth(place))), Sense::click());
    response.widget_info(|| WidgetInfo::selected(Role::RadioButton, true, on, text));
    let fill = if response.hovered() || on { palette.lit } else { palette.ground };
    let edge = if on || response.has_focus() { palette.pitch } else { palette.edge };
    ui.painter().rect(place, 4.0, fill, Stroke::new(1.0, edge), egui::StrokeKind::Inside);
    let ink = if on { palette.ink } else { palette.dim };
    ink::mark(ui, place.center(), Align2::CENTER_CENTER, text, sans(12.0), ink);
    response.clicked()
}

/// Tells options of the same words apart by their line.
fn nth(place: Rect) -> i64 {
    crate::convert::floor(f64::from(place.width()))
}
