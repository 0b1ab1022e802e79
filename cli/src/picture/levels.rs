//! The level of each partial over the time of the note.

use super::axis::{Axis, tick_decimals};
use super::canvas::{Canvas, Pen, Side, Type};
use super::history::LevelHistory;
use super::theme::{DIM, GRID, INK, LEVELS_HEIGHT, MARGIN, PANEL, PARTIAL, WIDTH};
use crate::measure::Timebase;
use crate::output::records::{GapRecord, NoteRecord};
use crate::output::words::signed;
use anyhow::Result;
use plotters::style::RGBColor;

const PLOT_LEFT: f64 = 60.0;
const PLOT_RIGHT: f64 = WIDTH - MARGIN - 40.0;
/// Levels shown below the highest, in dB, at most.
const SPAN_DB: f64 = 90.0;
/// Largest relative step of the fundamental within a note, from one column to the next.
const SAME_NOTE: f64 = 0.03;
/// Least share of the time that a curve covers to get its number.
const NUMBERED: f64 = 0.05;
/// Type of the numbers at the curves.
const NUMBER: Type = Type::mono(10.0, INK);

/// What is drawn.
pub(super) struct Levels<'a> {
    pub(super) history: &'a LevelHistory,
    pub(super) gaps: &'a [GapRecord],
    pub(super) note: &'a NoteRecord,
    pub(super) timebase: Timebase,
}

/// A curve: where a partial's level is known without interruption.
type Curve = Vec<(f64, f64)>;

impl Levels<'_> {
    /// Draws the panel below `top`.
    pub(super) fn draw(&self, canvas: &Canvas<'_>, top: f64) -> Result<()> {
        canvas.panel((MARGIN, top), (WIDTH - MARGIN, top + LEVELS_HEIGHT), PANEL)?;
        let heading = "level of each partial over time, dBFS";
        canvas.text(MARGIN + 12.0, top + 16.0, heading, Type::sans(11.0, DIM))?;
        let Some((times, levels)) = self.axes(top) else { return Ok(()) };
        let curves: Vec<(u32, Vec<Curve>)> = (1..=self.history.partials())
            .map(|number| (number, self.curves(number, levels.values.0)))
            .collect();
        self.draw_gaps(canvas, &times, &levels)?;
        grid(canvas, &times, &levels)?;
        // Low numbers last: they lie on top.
        for (number, pieces) in curves.iter().rev() {
            for piece in pieces {
                let points: Vec<_> = piece
                    .iter()
                    .map(|&(time, level)| (times.at(time), levels.within(level)))
                    .collect();
                canvas.path(&points, Pen::new(1.5, colour(*number, self.history.partials())))?;
            }
        }
        numbers(canvas, &curves, &times, &levels)
    }

    /// The curves of a partial, as far as they lie above a level.
    fn curves(&self, number: u32, lowest: f64) -> Vec<Curve> {
        let mut pieces = Vec::new();
        let mut piece = Curve::new();
        let mut f0_hz = 0.0;
        for at in self.history.levels(number) {
            let level = at.level_dbfs.filter(|level| *level >= lowest);
            // Another note's partial of the same number is another partial.
            let same_note = (at.f0_hz / f0_hz - 1.0).abs() < SAME_NOTE;
            if (level.is_none() || !same_note) && !piece.is_empty() {
                pieces.push(std::mem::take(&mut piece));
            }
            f0_hz = at.f0_hz;
            piece.extend(level.map(|level| (self.timebase.seconds(at.position), level)));
        }
        pieces.push(piece);
        pieces.retain(|piece| piece.len() > 1);
        pieces
    }

    fn axes(&self, top: f64) -> Option<(Axis, Axis)> {
        let times =
            Axis { values: (self.note.start_s, self.note.end_s), units: (PLOT_LEFT, PLOT_RIGHT) };
        let all = || {
            (1..=self.history.partials())
                .flat_map(|number| self.history.levels(number))
                .filter_map(|at| at.level_dbfs.filter(|level| level.is_finite()))
        };
        let highest = (all().reduce(f64::max)? / 10.0).ceil() * 10.0;
        let lowest = ((all().reduce(f64::min)? / 10.0).floor() * 10.0).max(highest - SPAN_DB);
        let levels = Axis {
            values: (lowest.min(highest - 10.0), highest),
            units: (top + LEVELS_HEIGHT - 28.0, top + 34.0),
        };
        Some((times, levels))
    }

    fn draw_gaps(&self, canvas: &Canvas<'_>, times: &Axis, levels: &Axis) -> Result<()> {
        let (bottom, top) = levels.units;
        let (start_s, end_s) = times.values;
        for gap in self.gaps.iter().filter(|gap| gap.end_s > start_s && gap.start_s < end_s) {
            let (from, to) = (times.within(gap.start_s), times.within(gap.end_s));
            canvas.rectangle((from, top), (to.max(from + 1.0), bottom), DIM, 0.25)?;
            if to - from > 24.0 {
                canvas.text(
                    0.5 * (from + to),
                    top + 8.0,
                    "gap",
                    Type::sans(10.0, DIM).at(Side::Centre),
                )?;
            }
        }
        Ok(())
    }
}

fn grid(canvas: &Canvas<'_>, times: &Axis, levels: &Axis) -> Result<()> {
    let (bottom, top) = levels.units;
    for tick in levels.ticks(6) {
        let y = levels.at(tick);
        canvas.line((PLOT_LEFT, y), (PLOT_RIGHT, y), Pen::new(1.0, GRID))?;
        canvas.text(
            PLOT_LEFT - 8.0,
            y,
            &signed(Some(tick), 0),
            Type::sans(10.0, DIM).at(Side::Right),
        )?;
    }
    let ticks = times.ticks(12);
    let decimals = tick_decimals(&ticks);
    for &tick in &ticks {
        let x = times.at(tick);
        canvas.line((x, top), (x, bottom), Pen::new(1.0, GRID))?;
        canvas.text(
            x,
            bottom + 13.0,
            &format!("{tick:.decimals$} s"),
            Type::sans(10.0, DIM).at(Side::Centre),
        )?;
    }
    Ok(())
}

/// Numbers at the ends of the curves, low ones first, wherever none stands yet.
fn numbers(
    canvas: &Canvas<'_>,
    curves: &[(u32, Vec<Curve>)],
    times: &Axis,
    levels: &Axis,
) -> Result<()> {
    let mut taken: Vec<(f64, f64)> = Vec::new();
    for (number, pieces) in curves {
        let longest = pieces.iter().max_by(|a, b| length(a).total_cmp(&length(b)));
        let long =
            longest.filter(|piece| length(piece) > NUMBERED * (times.values.1 - times.values.0));
        let Some(&(time, level)) = long.and_then(|piece| piece.last()) else { continue };
        let (x, y) = (times.at(time) + 6.0, levels.within(level));
        if taken
            .iter()
            .all(|(other_x, other_y)| (x - other_x).abs() > 22.0 || (y - other_y).abs() > 11.0)
        {
            canvas.text(x, y, &number.to_string(), NUMBER)?;
            taken.push((x, y));
        }
    }
    Ok(())
}

fn length(piece: &Curve) -> f64 {
    match (piece.first(), piece.last()) {
        (Some(first), Some(last)) => last.0 - first.0,
        _ => 0.0,
    }
}

/// Partial 1 in full colour, higher ones sinking towards the panel.
fn colour(number: u32, of: u32) -> RGBColor {
    let share = f64::from(number - 1) / f64::from(of.max(2));
    let strength = 1.0 - 0.72 * share.sqrt();
    let blend = |ink: u8, ground: u8| {
        let value = f64::from(ground) + strength * (f64::from(ink) - f64::from(ground));
        u8::try_from(crate::convert::drawing_unit(value)).unwrap_or(ink)
    };
    RGBColor(blend(PARTIAL.0, PANEL.0), blend(PARTIAL.1, PANEL.1), blend(PARTIAL.2, PANEL.2))
}
