//! One row per partial: thorn, bob, hand, and figures.

use egui::{
    Align2, Color32, CornerRadius, Pos2, Rangef, Rect, Response, Role, Sense, Shape, Stroke, Ui,
    WidgetInfo, pos2,
};
use plumbtone_analysis::compare::{Difference, PartialDifference};

use super::super::ink;
use super::super::mark::Mark;
use super::super::plumb::{Axis, RowAxis, WHISKER_SD, figures_every};
use super::super::steady::{NONE, signed};
use super::super::theme::{FIGURE, Palette, SMALL, mono, sans};
use crate::convert::single;

/// Half the height of a thorn's root: share of the row, and at most.
const ROOT: (f32, f32) = (0.34, 8.0);
/// Radius of a bob and of a dial: share of the row, and at most.
const BOB: (f32, f32) = (0.3, 4.5);
const DIAL: (f32, f32) = (0.42, 9.0);
/// Radius from which on a dial has a rim.
const RIM: f32 = 4.0;
/// How much is left of what could be noise.
const FAINT: f32 = 0.32;
/// Length of the thorn of a partial that only one sound has.
const LONE: f32 = 22.0;
/// Points of a sector's arc, and the least width that is drawn of it.
const ARC: usize = 12;
const ARC_LEAST: f32 = 1.5;

/// Where the columns stand.
#[derive(Debug, Clone, Copy)]
pub(super) struct Columns {
    pub(super) rows: RowAxis,
    /// Right edge of the numbers.
    pub(super) numbers: f32,
    pub(super) levels: Axis,
    pub(super) cents: Axis,
    /// Middle of the dials.
    pub(super) dials: f32,
    /// Right edges of the figures, where there is room for them.
    pub(super) figures: Option<[f32; 3]>,
    pub(super) whole: Rect,
}

/// Draws all rows; `marks` are those of the two sounds, with their names.
pub(super) fn show(
    ui: &mut Ui,
    columns: &Columns,
    rows: &[PartialDifference],
    marks: [(Mark, &str); 2],
    palette: &Palette,
) {
    let every = figures_every(columns.rows.row());
    let mut first = None;
    for row in rows {
        let number = single(f64::from(row.number));
        if !columns.rows.shows(number) {
            continue;
        }
        let y = columns.rows.at(number);
        let response = ground(ui, columns, y, row, marks, palette);
        match row.level_db {
            Some(level) => thorn(ui, columns, y, level, marks, palette),
            None => lone(ui, columns, y, row, marks, palette),
        }
        if let Some(cents) = row.cents {
            bob(ui, columns, y, cents, palette);
        }
        if let Some(phase) = row.phase_rad.filter(|_| row.number != 1) {
            hand(ui, pos2(columns.dials, y), columns.rows.row(), phase, palette);
        }
        let nth = row.number - *first.get_or_insert(row.number);
        if response.hovered() || nth.is_multiple_of(every) {
            figures(ui, columns, y, row, palette);
        }
        response.on_hover_ui_at_pointer(|ui| {
            for line in said(row, marks) {
                ui.monospace(line);
            }
        });
    }
}

fn ground(
    ui: &Ui,
    columns: &Columns,
    y: f32,
    row: &PartialDifference,
    marks: [(Mark, &str); 2],
    palette: &Palette,
) -> Response {
    let half = columns.rows.row() / 2.0;
    let band = Rect::from_x_y_ranges(columns.whole.x_range(), Rangef::new(y - half, y + half));
    let response = ui.interact(band, ui.scope_id().with(("row", row.number)), Sense::hover());
    response.widget_info(|| WidgetInfo::labeled(Role::Label, true, said(row, marks).join(", ")));
    if response.hovered() {
        ui.painter().rect_filled(band, CornerRadius::same(3), palette.lit);
    }
    response
}

/// All there is to say of a row.
fn said(row: &PartialDifference, marks: [(Mark, &str); 2]) -> Vec<String> {
    let mut lines = vec![format!("partial {}", row.number)];
    match row.present {
        (true, false) => lines.push(format!("only in {}", marks[0].1)),
        (false, true) => lines.push(format!("only in {}", marks[1].1)),
        (true, true) | (false, false) => {}
    }
    let differences = [(row.level_db, "dB"), (row.cents, "ct"), (row.phase_rad, "rad of phase")];
    for (difference, unit) in differences {
        if let Some(d) = difference {
            let noise = if d.is_significant() { "" } else { " (could be noise)" };
            lines.push(format!("{} \u{b1} {:.2} {unit}{noise}", signed(d.value, 2), d.sd));
        }
    }
    lines
}

fn shade(colour: Color32, difference: Difference) -> Color32 {
    if difference.is_significant() { colour } else { colour.gamma_multiply(FAINT) }
}

/// Grows from the middle to the side of the louder sound, in its colour.
fn thorn(
    ui: &Ui,
    columns: &Columns,
    y: f32,
    level: Difference,
    marks: [(Mark, &str); 2],
    palette: &Palette,
) {
    let axis = &columns.levels;
    if !level.value.is_finite() {
        return;
    }
    let louder = usize::from(level.value > 0.0);
    let colour = shade(marks[louder].0.colour(palette), level);
    let half = (columns.rows.row() * ROOT.0).min(ROOT.1);
    let (root, tip) = (axis.at(0.0), axis.at(level.value));
    let points = vec![pos2(root, y - half), pos2(tip, y), pos2(root, y + half)];
    ui.painter().add(Shape::convex_polygon(points, colour, Stroke::NONE));
    if axis.holds(level.value) {
        whisker(ui, axis, y, level, shade(palette.ink, level));
    } else {
        beyond(ui, axis, y, level.value, colour);
    }
}

/// A partial that only one of the sounds has.
fn lone(
    ui: &Ui,
    columns: &Columns,
    y: f32,
    row: &PartialDifference,
    marks: [(Mark, &str); 2],
    palette: &Palette,
) {
    let side = usize::from(row.present.1);
    let (name, colour) = (marks[side].1, marks[side].0.colour(palette));
    let axis = &columns.levels;
    let (root, end, out) = match side {
        1 => (axis.at(0.0), axis.x.max, 1.0),
        _ => (axis.at(0.0), axis.x.min, -1.0),
    };
    let half = (columns.rows.row() * ROOT.0).min(ROOT.1);
    let points =
        [(0.0, -half), (LONE, 0.0), (0.0, half)].map(|(x, dy)| pos2(root + out * x, y + dy));
    ui.painter().add(Shape::closed_line(points.to_vec(), Stroke::new(1.2, colour)));
    if columns.rows.row() < FIGURE + 1.0 {
        return;
    }
    let mut job = egui::text::LayoutJob::simple_singleline(
        format!("only in {name}"),
        sans(SMALL),
        palette.dim,
    );
    let from = root + out * (LONE + 6.0);
    job.wrap = egui::text::TextWrapping::truncate_at_width(((end - from) * out).max(1.0));
    let galley = ui.painter().layout_job(job);
    let align = if side == 1 { Align2::LEFT_CENTER } else { Align2::RIGHT_CENTER };
    let place = align.anchor_size(pos2(from, y), galley.size());
    ui.painter().galley(place.min, galley, palette.dim);
}

fn bob(ui: &Ui, columns: &Columns, y: f32, cents: Difference, palette: &Palette) {
    let axis = &columns.cents;
    if !cents.value.is_finite() {
        return;
    }
    let colour = shade(palette.pitch, cents);
    if !axis.holds(cents.value) {
        beyond(ui, axis, y, cents.value, colour);
        return;
    }
    let radius = (columns.rows.row() * BOB.0).min(BOB.1).max(1.5);
    whisker(ui, axis, y, cents, colour);
    ui.painter().circle_filled(pos2(axis.at(cents.value), y), radius, colour);
}

fn whisker(ui: &Ui, axis: &Axis, y: f32, difference: Difference, colour: Color32) {
    let reach = WHISKER_SD * difference.sd;
    if !reach.is_finite() {
        return;
    }
    let ends = [difference.value - reach, difference.value + reach].map(|end| axis.at(end));
    if ends[1] - ends[0] < 3.0 {
        return;
    }
    let stroke = Stroke::new(1.2, colour);
    ui.painter().hline(Rangef::new(ends[0], ends[1]), y, stroke);
    for end in ends {
        ui.painter().vline(end, Rangef::new(y - 2.5, y + 2.5), stroke);
    }
}

/// A triangle at the edge: the difference lies beyond the scale.
fn beyond(ui: &Ui, axis: &Axis, y: f32, value: f64, colour: Color32) {
    let (x, by) = if value > 0.0 { (axis.x.max + 8.0, -6.0) } else { (axis.x.min - 8.0, 6.0) };
    let points = vec![pos2(x, y), pos2(x + by, y - 4.0), pos2(x + by, y + 4.0)];
    ui.painter().add(Shape::convex_polygon(points, colour, Stroke::NONE));
}

/// A dial whose hand stands upright without a difference, and its sector of two deviations each way.
fn hand(ui: &Ui, centre: Pos2, row: f32, phase: Difference, palette: &Palette) {
    let radius = (row * DIAL.0).min(DIAL.1);
    if !phase.value.is_finite() || radius < 1.0 {
        return;
    }
    let colour = shade(palette.pitch, phase);
    let at = |angle: f64, radius: f32| {
        let (sine, cosine) = angle.sin_cos();
        centre + radius * egui::vec2(single(sine), -single(cosine))
    };
    if radius >= RIM {
        ui.painter().circle_stroke(centre, radius, Stroke::new(1.0, palette.edge));
        let reach = (WHISKER_SD * phase.sd).min(core::f64::consts::FRAC_PI_2);
        if single(reach) * radius >= ARC_LEAST {
            let arc = (0..=ARC).map(|k| {
                let share = 2.0 * k as f64 / ARC as f64 - 1.0;
                at(phase.value + share * reach, radius)
            });
            let sector: Vec<Pos2> = core::iter::once(centre).chain(arc).collect();
            let fill = palette.pitch.gamma_multiply(0.22);
            ui.painter().add(Shape::convex_polygon(sector, fill, Stroke::NONE));
        }
    }
    ui.painter().line_segment([centre, at(phase.value, radius)], Stroke::new(1.8, colour));
}

fn figures(ui: &Ui, columns: &Columns, y: f32, row: &PartialDifference, palette: &Palette) {
    let right = Align2::RIGHT_CENTER;
    let number = row.number.to_string();
    ink::mark(ui, pos2(columns.numbers, y), right, &number, mono(FIGURE), palette.dim);
    let Some(places) = columns.figures else { return };
    let phase = row.phase_rad.filter(|_| row.number != 1);
    for (x, difference) in places.into_iter().zip([row.level_db, row.cents, phase]) {
        let Some(difference) = difference else {
            ink::mark(ui, pos2(x, y), right, NONE, mono(FIGURE), palette.dim);
            continue;
        };
        let colour = if difference.is_significant() { palette.ink } else { palette.dim };
        let text = format!("{}\u{b1}{:.2}", signed(difference.value, 2), difference.sd.min(99.99));
        ink::mark(ui, pos2(x, y), right, &text, mono(FIGURE), colour);
    }
}
