//! The plumb view: one row per partial, number upwards, and how far each hangs off the harmonic series.

mod rows;
mod strays;

use super::axis::{Axis, tick_decimals};
use super::canvas::{Canvas, Pen, Side, Type};
use super::theme::{
    ABOVE_ROWS, BELOW_ROWS, DIM, GRID, HEAD, INK, MARGIN, PANEL, PARTIAL, PLUMB_RIGHT,
};
use crate::output::records::{NoteRecord, PartialRecord};
use crate::output::words::plain;
use anyhow::Result;
use rows::Rows;
use strays::Strays;

/// Columns, by their edges or middles.
const NUMBER_MIDDLE: f64 = 46.0;
const CENTS_LEFT: f64 = 72.0;
const CENTS_RIGHT: f64 = 412.0;
const LEVEL_LEFT: f64 = 612.0;
const LEVEL_RIGHT: f64 = 734.0;
const HZ_RIGHT: f64 = 808.0;
const DB_RIGHT: f64 = 866.0;
/// Levels shown below the strongest, at least and at most, in dB.
const LEVEL_SPAN_DB: (f64, f64) = (40.0, 90.0);
/// Room beside the outermost partial, as a share of the span of cents.
const CENTS_MARGIN: f64 = 0.12;
/// Least span of cents on either side of the ideal series, so that a harmonic sound looks like one.
const CENTS_LEAST: f64 = 5.0;
const HEADING: Type = Type::sans(11.0, DIM);

/// Height of the panel for a note.
pub(super) fn height(note: &NoteRecord) -> f64 {
    ABOVE_ROWS + Rows::height_for(note) + BELOW_ROWS
}

/// Draws the view below the head of the picture.
pub(super) fn draw(canvas: &Canvas<'_>, note: &NoteRecord) -> Result<()> {
    let top = HEAD + MARGIN;
    canvas.panel((MARGIN, top), (PLUMB_RIGHT, top + height(note)), PANEL)?;
    let rows = Rows::new(note, top + ABOVE_ROWS);
    let cents = cents_axis(note);
    let levels = level_axis(note);
    headings(canvas, top)?;
    grid(canvas, &rows, &cents)?;
    let strays = Strays::new(note, &rows);
    strays.draw_marked(canvas, &levels)?;
    stretch(canvas, note, &rows, &cents)?;
    for partial in &note.partials {
        row(canvas, partial, rows.y(f64::from(partial.number)), &rows, &cents, &levels)?;
    }
    strays.draw_explained(canvas, &rows, &levels)
}

fn headings(canvas: &Canvas<'_>, top: f64) -> Result<()> {
    let y = top + 16.0;
    canvas.text(NUMBER_MIDDLE, y, "partial", HEADING.at(Side::Centre))?;
    canvas.text(
        0.5 * (CENTS_LEFT + CENTS_RIGHT),
        y,
        "cents off the harmonic series",
        HEADING.at(Side::Centre),
    )?;
    canvas.text(strays::LABEL_LEFT, y, "belongs to no partial", HEADING)?;
    canvas.text(LEVEL_LEFT, y, "level at the start", HEADING)?;
    canvas.text(HZ_RIGHT, y, "Hz", HEADING.at(Side::Right))?;
    canvas.text(DB_RIGHT, y, "dBFS", HEADING.at(Side::Right))
}

fn grid(canvas: &Canvas<'_>, rows: &Rows, cents: &Axis) -> Result<()> {
    for number in 1..=rows.count {
        let number = f64::from(number);
        let y = rows.y(number - 0.5);
        canvas.line((CENTS_LEFT - 8.0, y), (DB_RIGHT + 6.0, y), Pen::new(1.0, GRID))?;
    }
    for number in (1..=rows.count).filter(|number| rows.numbered(*number)) {
        let set = Type::mono(rows.type_size(), DIM).at(Side::Centre);
        canvas.text(NUMBER_MIDDLE, rows.y(f64::from(number)), &number.to_string(), set)?;
    }
    let ticks = cents.ticks(6);
    let decimals = tick_decimals(&ticks);
    for &tick in &ticks {
        let x = cents.at(tick);
        let pen = if tick.abs() < 1e-9 { Pen::new(1.2, DIM) } else { Pen::new(1.0, GRID) };
        canvas.line((x, rows.top), (x, rows.bottom), pen)?;
        let label = crate::output::words::signed(Some(tick), decimals);
        canvas.text(x, rows.bottom + 14.0, &label, Type::sans(10.0, DIM).at(Side::Centre))?;
    }
    Ok(())
}

/// The stiff-string curve, from the ideal series' foot to the highest row.
fn stretch(canvas: &Canvas<'_>, note: &NoteRecord, rows: &Rows, cents: &Axis) -> Result<()> {
    let Some(b) = note.inharmonicity_b else { return Ok(()) };
    let steps = rows.count * 4;
    let points: Vec<_> = (0..=steps)
        .map(|step| f64::from(rows.count) * f64::from(step) / f64::from(steps))
        .map(|number| (600.0 * (1.0 + b * number * number).log2(), rows.y(number)))
        .take_while(|(off, _)| *off >= cents.values.0 && *off <= cents.values.1)
        .map(|(off, y)| (cents.at(off), y))
        .collect();
    canvas.dashed(&points, Pen::new(1.2, DIM))
}

fn row(
    canvas: &Canvas<'_>,
    partial: &PartialRecord,
    y: f64,
    rows: &Rows,
    cents: &Axis,
    levels: &Axis,
) -> Result<()> {
    let share = partial.level_dbfs.map_or(0.0, |level| levels.share(level));
    if let Some(off) = partial.cents_from_harmonic {
        if let Some(sd) = partial.cents_sd {
            let (from, to) = (cents.within(off - 2.0 * sd), cents.within(off + 2.0 * sd));
            canvas.line((from, y), (to, y), Pen::new(1.2, PARTIAL).strength(0.7))?;
        }
        canvas.circle((cents.within(off), y), rows.dot(share), PARTIAL)?;
    }
    if let Some(level) = partial.level_dbfs {
        let half = rows.bar() / 2.0;
        let right = levels.within(level).max(LEVEL_LEFT + 1.0);
        canvas.rectangle((LEVEL_LEFT, y - half), (right, y + half), PARTIAL, 0.45 + 0.5 * share)?;
    }
    let set = Type::mono(rows.type_size(), INK).at(Side::Right);
    canvas.text(HZ_RIGHT, y, &plain(partial.frequency_hz, 1), set)?;
    canvas.text(DB_RIGHT, y, &plain(partial.level_dbfs, 1), set)
}

fn cents_axis(note: &NoteRecord) -> Axis {
    let off = || note.partials.iter().filter_map(|partial| partial.cents_from_harmonic);
    let low = off().fold(-CENTS_LEAST, f64::min);
    let high = off().fold(CENTS_LEAST, f64::max);
    let margin = CENTS_MARGIN * (high - low);
    Axis { values: (low - margin, high + margin), units: (CENTS_LEFT, CENTS_RIGHT) }
}

fn level_axis(note: &NoteRecord) -> Axis {
    let partials = note.partials.iter().filter_map(|partial| partial.level_dbfs);
    let levels = partials.chain(note.strays.iter().filter_map(|stray| stray.level_dbfs));
    let (weakest, strongest) = levels
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), level| {
            (low.min(level), high.max(level))
        });
    let strongest = if strongest.is_finite() { strongest } else { 0.0 };
    let span = (strongest - weakest + 6.0).clamp(LEVEL_SPAN_DB.0, LEVEL_SPAN_DB.1);
    Axis { values: (strongest - span, strongest), units: (LEVEL_LEFT, LEVEL_RIGHT) }
}
