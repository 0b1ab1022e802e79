//! The rows of the plumb view: each partial's place off the harmonic series with its deviation, its level and figures.

use egui::{
    Align2, Color32, CornerRadius, Rangef, Rect, Response, Role, Sense, Shape, Stroke, StrokeKind,
    Ui, WidgetInfo, pos2,
};
use plumbtone_analysis::{Cluster, Partial, Stretch};

use super::super::ink;
use super::super::steady::signed;
use super::super::theme::{FIGURE, Palette, mono};
use super::super::words::hertz;
use super::axis::{Axis, RowAxis};
use crate::convert::single;

/// Deviations that a whisker spans each way.
pub(crate) const WHISKER_SD: f64 = 2.0;
/// Radius of a dot: of the strongest partial, and of one this many dB below it and weaker.
const DOT: (f32, f32) = (5.5, 2.5);
const DOT_RANGE_DB: f64 = 60.0;
/// Least distance between figures of two rows.
const FIGURE_APART: f32 = 13.0;
/// Points between two of the stretch curve.
const CURVE_STEP: f32 = 6.0;

/// The columns.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Columns {
    pub(crate) rows: RowAxis,
    /// Right edge of the numbers.
    pub(crate) numbers: f32,
    pub(crate) cents: Axis,
    pub(crate) levels: Axis,
    /// Right edges of the figures, where there is room for them.
    pub(crate) hz: Option<f32>,
    pub(crate) db: Option<f32>,
    pub(crate) whole: Rect,
}

/// What is done to the rows.
#[derive(Debug, Clone, Copy, Default)]
pub(crate) struct Done {
    pub(crate) clicked: Option<u32>,
}

/// Draws all rows; `level` gives a level on the axis, and the figure of it, `cluster` what a partial is made of.
pub(crate) fn show(
    ui: &mut Ui,
    columns: &Columns,
    (partials, pinned): (&[Partial], Option<u32>),
    (level, cluster): (impl Fn(f64) -> f64, impl Fn(u32) -> Option<Cluster>),
    palette: &Palette,
) -> Done {
    let mut done = Done::default();
    let strongest = partials.iter().map(|p| p.level_dbfs).fold(f64::NEG_INFINITY, f64::max);
    let every = figures_every(columns.rows.row());
    for partial in partials {
        let number = single(f64::from(partial.number));
        if !columns.rows.shows(number) {
            continue;
        }
        let y = columns.rows.at(number);
        let half = columns.rows.row() / 2.0;
        let band = Rect::from_x_y_ranges(columns.whole.x_range(), Rangef::new(y - half, y + half));
        let response = row(ui, band, partial, pinned == Some(partial.number), palette);
        if response.clicked() {
            done.clicked = Some(partial.number);
        }
        let lit = response.hovered() || pinned == Some(partial.number);
        bar(ui, columns, y, level(partial.level_dbfs), (partial, strongest), palette);
        let cluster = cluster(partial.number);
        if let Some(cluster) = cluster {
            spread(ui, columns, y, (partial, cluster), palette);
        }
        dot(ui, columns, y, (partial, strongest), palette);
        if lit || (partial.number - 1).is_multiple_of(every) {
            figures(ui, columns, y, (partial, level(partial.level_dbfs)), lit, palette);
        }
        response.on_hover_ui_at_pointer(|ui| tell(ui, partial, cluster));
    }
    done
}

/// The ground of a row: what is under the pointer, and what a screen reader is told.
fn row(ui: &Ui, band: Rect, partial: &Partial, pinned: bool, palette: &Palette) -> Response {
    let response = ui.interact(band, ui.scope_id().with(("partial", partial.number)), Sense::CLICK);
    response.widget_info(|| {
        let said = format!(
            "partial {}: {} Hz, {} \u{b1} {:.2} ct, {:.1} dBFS",
            partial.number,
            hertz(partial.frequency_hz, 2),
            signed(partial.cents_from_harmonic, 2),
            partial.cents_sd,
            partial.level_dbfs
        );
        WidgetInfo::selected(Role::Button, true, pinned, said)
    });
    let corner = CornerRadius::same(3);
    if response.hovered() {
        ui.painter().rect_filled(band, corner, palette.lit);
    }
    if pinned {
        let stroke = Stroke::new(1.0, palette.pitch);
        ui.painter().rect_stroke(band, corner, stroke, StrokeKind::Inside);
    }
    response
}

fn bar(
    ui: &Ui,
    columns: &Columns,
    y: f32,
    level: f64,
    (partial, strongest): (&Partial, f64),
    palette: &Palette,
) {
    let half = (columns.rows.row() * 0.22).clamp(0.75, 5.0);
    let x = Rangef::new(columns.levels.x.min, columns.levels.at(level));
    let colour = faded(palette, partial.level_dbfs - strongest);
    ui.painter().rect_filled(
        Rect::from_x_y_ranges(x, Rangef::new(y - half, y + half)),
        half.min(2.0),
        colour,
    );
    if let Some(zero) = columns.levels.holds(0.0).then(|| columns.levels.at(0.0))
        && columns.levels.high > 0.0
    {
        ui.painter().vline(zero, Rangef::new(y - half, y + half), Stroke::new(1.0, palette.card));
    }
}

fn dot(
    ui: &Ui,
    columns: &Columns,
    y: f32,
    (partial, strongest): (&Partial, f64),
    palette: &Palette,
) {
    let axis = &columns.cents;
    let cents = partial.cents_from_harmonic;
    let below = ((strongest - partial.level_dbfs) / DOT_RANGE_DB).clamp(0.0, 1.0);
    let radius = (DOT.0 + (DOT.1 - DOT.0) * single(if below.is_nan() { 1.0 } else { below }))
        .min(columns.rows.row() * 0.48)
        .max(1.5);
    if !axis.holds(cents) {
        beyond(ui, axis, y, cents, palette);
        return;
    }
    let x = axis.at(cents);
    let reach = WHISKER_SD * partial.cents_sd;
    if reach.is_finite() {
        let whisker = Rangef::new(axis.at(cents - reach), axis.at(cents + reach));
        let stroke = Stroke::new(1.5, palette.pitch.gamma_multiply(0.6));
        ui.painter().hline(whisker, y, stroke);
        for end in [whisker.min, whisker.max] {
            if (end - x).abs() > radius {
                let tick = Rangef::new(y - 2.5, y + 2.5);
                ui.painter().vline(end, tick, stroke);
            }
        }
    }
    ui.painter().circle_filled(pos2(x, y), radius, palette.pitch);
}

/// How wide the lines of a partial lie, around it: a bar as long as they spread.
fn spread(
    ui: &Ui,
    columns: &Columns,
    y: f32,
    (partial, cluster): (&Partial, Cluster),
    palette: &Palette,
) {
    let axis = &columns.cents;
    let (cents, half) = (partial.cents_from_harmonic, cluster.spread_cents / 2.0);
    if !axis.holds(cents) || !half.is_finite() {
        return;
    }
    let x = Rangef::new(axis.at(cents - half), axis.at(cents + half));
    let height = (columns.rows.row() * 0.32).clamp(1.5, 6.0);
    let bar = Rect::from_x_y_ranges(x, Rangef::new(y - height, y + height));
    ui.painter().rect_filled(bar, 2.0, palette.pitch.gamma_multiply(0.28));
}

/// A triangle at the edge: the partial lies beyond the scale.
fn beyond(ui: &Ui, axis: &Axis, y: f32, cents: f64, palette: &Palette) {
    if cents.is_nan() {
        return;
    }
    let right = cents > axis.high;
    let (x, by) = if right { (axis.x.max, -6.0) } else { (axis.x.min, 6.0) };
    let points = vec![pos2(x, y), pos2(x + by, y - 4.0), pos2(x + by, y + 4.0)];
    ui.painter().add(Shape::convex_polygon(points, palette.pitch, Stroke::NONE));
}

fn figures(
    ui: &Ui,
    columns: &Columns,
    y: f32,
    (partial, level): (&Partial, f64),
    lit: bool,
    palette: &Palette,
) {
    let right = Align2::RIGHT_CENTER;
    let dim = if lit { palette.ink } else { palette.dim };
    let number = partial.number.to_string();
    ink::mark(ui, pos2(columns.numbers, y), right, &number, mono(FIGURE), dim);
    if let Some(x) = columns.hz {
        let hz = hertz(partial.frequency_hz, 1);
        ink::mark(ui, pos2(x, y), right, &hz, mono(FIGURE), palette.ink);
    }
    if let Some(x) = columns.db {
        ink::mark(ui, pos2(x, y), right, &signed(level, 1), mono(FIGURE), palette.ink);
    }
}

/// All figures of a partial.
fn tell(ui: &mut Ui, partial: &Partial, cluster: Option<Cluster>) {
    ui.label(egui::RichText::new(format!("partial {}", partial.number)).strong());
    let Partial {
        frequency_hz, frequency_sd_hz, cents_sd, level_dbfs, level_sd_db, snr_db, ..
    } = *partial;
    let cents = signed(partial.cents_from_harmonic, 3);
    for line in [
        format!("{frequency_hz:.4} \u{b1} {frequency_sd_hz:.4} Hz"),
        format!("{cents} \u{b1} {cents_sd:.3} ct off n \u{b7} f0"),
        format!("{} \u{b1} {level_sd_db:.2} dBFS", signed(level_dbfs, 2)),
        format!("{snr_db:.1} dB over the noise"),
        format!("phase {} rad", signed(partial.phase_rad, 2)),
    ] {
        ui.monospace(line);
    }
    if let Some(Cluster { lines, spread_cents, beat_hz }) = cluster {
        ui.monospace(format!(
            "{lines} lines, {spread_cents:.1} ct wide, beating at {beat_hz:.2} Hz"
        ));
        ui.label("in the last note: no single line, so its figures stand for all of them.");
    }
    ui.label("Click to pin it and see its past.");
}

/// The colour of a bar: weaker partials stand back a little.
fn faded(palette: &Palette, below_db: f64) -> Color32 {
    let share = single((-below_db / DOT_RANGE_DB).clamp(0.0, 1.0));
    palette.pitch.lerp_to_gamma(palette.card, 0.15 + 0.35 * share)
}

/// Figures are written for one row of this many.
pub(crate) fn figures_every(row: f32) -> u32 {
    [1, 2, 4, 5, 8, 10, 16]
        .into_iter()
        .find(|&every| row * every as f32 >= FIGURE_APART)
        .unwrap_or(20)
}

/// The stretch curve: where a stiff string's partials lie, up to a little above the highest one found.
pub(crate) fn curve(
    ui: &Ui,
    columns: &Columns,
    stretch: Option<Stretch>,
    highest: u32,
    palette: &Palette,
) {
    let Some(Stretch { b, .. }) = stretch.filter(|stretch| stretch.b.is_finite()) else { return };
    let axis = &columns.rows;
    let rows = columns.whole.with_min_y(axis.y.min).with_max_y(axis.y.max);
    let mut y = axis.y.max;
    let mut points = Vec::new();
    while y >= axis.y.min {
        let n = f64::from(axis.number(y));
        let cents = 600.0 * (1.0 + b * n * n).max(1e-9).log2();
        if n >= 0.0 && n <= f64::from(highest) + 0.7 && columns.cents.holds(cents) {
            points.push(pos2(columns.cents.at(cents), y));
        }
        y -= CURVE_STEP;
    }
    let painter = ui.painter().with_clip_rect(rows);
    let stroke = Stroke::new(1.2, palette.ink.gamma_multiply(0.7));
    painter.extend(Shape::dashed_line(&points, stroke, 4.0, 3.0));
}
