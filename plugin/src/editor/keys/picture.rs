//! The picture of the key sheet: strips stacked over one axis of note names.

use egui::{Align2, Rangef, Rect, Role, Sense, Ui, WidgetInfo, vec2};
use plumbtone_analysis::tuning::Tuning;

use super::super::ink;
use super::super::theme::{CORNER, PAD, Palette, SMALL, sans};
use super::compass::Compass;
use super::scales::Scales;
use super::strips::{GUTTER, Ground, STRIPS, Strip};
use super::words;
use crate::keys::Row;

/// Height of the heading, of the names of missing keys, and of the axis.
const HEAD: f32 = 28.0;
const MISSING: f32 = 18.0;
const AXIS: f32 = 30.0;
/// Space between strips, and the least height of one.
const BETWEEN: f32 = 10.0;
const LEAST: f32 = 30.0;
/// Size below which there is no picture.
const SMALLEST: egui::Vec2 = vec2(GUTTER + 120.0, HEAD + MISSING + AXIS + LEAST);

/// What is done to the picture.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Done {
    pub(super) under_pointer: Option<u8>,
    pub(super) clicked: Option<u8>,
}

/// Draws it; one key may be lit from elsewhere.
pub(super) fn show(
    ui: &mut Ui,
    rect: Rect,
    (rows, scales, lit): (&[Row], &Scales, Option<u8>),
    tuning: &Tuning,
    palette: &Palette,
) -> Done {
    ui.painter().rect_filled(rect, CORNER, palette.card);
    let mut ui = ui.new_child(egui::UiBuilder::new().max_rect(rect).id_salt("key picture"));
    let ui = &mut ui;
    ui.shrink_clip_rect(rect);
    let inner = rect.shrink2(vec2(PAD, 0.0));
    let x = Rangef::new(inner.left() + GUTTER, inner.right());
    let fits = rect.width() >= SMALLEST.x && rect.height() >= SMALLEST.y;
    let Some(compass) = Compass::of(rows, x).filter(|_| fits) else {
        let text = if rows.is_empty() {
            "play notes from the host, and each key stands here".to_owned()
        } else {
            words::compass(rows)
        };
        let at = (rect.center(), Align2::CENTER_CENTER);
        ink::text_within(ui, at, (&text, rect.width() - 24.0), sans(13.0), palette.dim);
        return Done::default();
    };
    let body = inner.with_min_y(rect.top() + HEAD + MISSING).with_max_y(rect.bottom() - AXIS);
    let plot = body.with_min_x(x.min);
    let columns = plot.with_min_y(plot.top() - MISSING).with_max_y(rect.bottom());
    let done = columns_under_pointer(ui, columns, (&compass, rows), tuning);
    let lit = done.under_pointer.or(lit);
    heading(ui, inner, (rows, lit), tuning, palette);
    let places = layout(body);
    for (_, place) in &places {
        ui.painter().rect_filled(place.with_min_x(x.min), 3.0, palette.ground.gamma_multiply(0.5));
    }
    if let Some(key) = lit {
        let column = Rect::from_x_y_ranges(compass.columns((key, key)), plot.y_range());
        ui.painter().rect_filled(column.expand2(vec2(0.0, 3.0)), 2.0, palette.lit);
    }
    compass.missing(ui, &words::missing(rows), plot, palette);
    compass.octaves(ui, plot.y_range(), palette);
    let ground = Ground { compass: &compass, rows, tuning, palette };
    for (strip, place) in places {
        strip.paint(ui, place, scales.of(strip), &ground);
    }
    compass.names(ui, rect.bottom() - AXIS / 2.0 + 3.0, lit, palette);
    if let Some(newest) = rows.iter().max_by_key(|row| row.take) {
        compass.newest(ui, newest.key, plot.bottom() + 1.0, palette);
    }
    done
}

/// What the picture is of, or the figures of the key that is lit.
fn heading(
    ui: &mut Ui,
    inner: Rect,
    (rows, lit): (&[Row], Option<u8>),
    tuning: &Tuning,
    palette: &Palette,
) {
    let place = (inner.left_top() + vec2(0.0, 15.0), Align2::LEFT_CENTER);
    let row = lit.and_then(|key| rows.iter().find(|row| row.key == key));
    let (text, colour) = match (row, lit) {
        (Some(row), _) => {
            (format!("{}  {}", words::name(row.key), words::line(row, tuning)), palette.ink)
        }
        (None, Some(key)) => (format!("{}  still to play", words::name(key)), palette.stray),
        (None, None) => ("the sound over the keyboard".to_owned(), palette.dim),
    };
    ink::text_within(ui, place, (&text, inner.width()), sans(SMALL), colour);
}

/// Where each strip lies, as many as there is room for.
fn layout(body: Rect) -> Vec<(Strip, Rect)> {
    let needs = |count: usize| {
        let weight: f32 = STRIPS.iter().take(count).map(|strip| strip.weight()).sum();
        weight * LEAST + BETWEEN * (count as f32 - 1.0)
    };
    let count = (1..=STRIPS.len()).rev().find(|&count| needs(count) <= body.height()).unwrap_or(1);
    let shown = &STRIPS[..count];
    let weight: f32 = shown.iter().map(|strip| strip.weight()).sum();
    let unit = (body.height() - BETWEEN * (count as f32 - 1.0)) / weight;
    let mut top = body.top();
    let place = |strip: &Strip| {
        let height = unit * strip.weight();
        let place = Rect::from_min_size(egui::pos2(body.left(), top), vec2(body.width(), height));
        top += height + BETWEEN;
        (*strip, place)
    };
    shown.iter().map(place).collect()
}

/// The columns for pointer and screen readers: every key with a row, and every missing one.
fn columns_under_pointer(
    ui: &Ui,
    area: Rect,
    (compass, rows): (&Compass, &[Row]),
    tuning: &Tuning,
) -> Done {
    let mut done = Done::default();
    let (lowest, highest) =
        (rows.first().map_or(0, |row| row.key), rows.last().map_or(0, |row| row.key));
    for key in lowest..=highest {
        let place = Rect::from_x_y_ranges(compass.columns((key, key)), area.y_range());
        let response = ui.interact(place, ui.scope_id().with(key), Sense::CLICK);
        let name = words::name(key);
        let row = rows.binary_search_by_key(&key, |row| row.key).ok().map(|at| &rows[at]);
        let lines =
            || row.map_or_else(|| vec!["still to play".to_owned()], |r| words::lines(r, tuning));
        response.widget_info(|| {
            let said = format!("{name} in the picture: {}", lines().join(", "));
            WidgetInfo::labeled(Role::Button, true, said)
        });
        if response.hovered() || response.has_focus() {
            done.under_pointer = Some(key);
        }
        if response.clicked() {
            done.clicked = Some(key);
        }
        response.on_hover_ui_at_pointer(|ui| {
            ui.label(egui::RichText::new(&name).strong());
            lines().iter().for_each(|line| {
                ui.label(line);
            });
        });
    }
    done
}
