//! The strips of a key sheet's picture: one figure of all keys each.

use super::{Compass, PLOT_LEFT, PLOT_RIGHT};
use crate::keys::record::KeyRecord;
use crate::output::words::signed;
use crate::picture::axis::{Axis, tick_decimals};
use crate::picture::canvas::{Canvas, Pen, Side, Type};
use crate::picture::theme::{DIM, GRID, INK, MARGIN, PARTIAL, STRAY};
use anyhow::Result;
use plotters::style::RGBColor;
use plumbtone_analysis::keys::{StretchFound, in_order_cents};

const NAME: Type = Type::sans(12.0, INK).bold();
const UNIT: Type = Type::sans(10.0, DIM);
const TICK: Type = Type::sans(10.0, DIM);
/// Deviations that a whisker spans each way.
const WHISKER_SD: f64 = 2.0;
/// Most ticks of a strip of weight 1, and how far their figures stay from its ends.
const TICKS: f64 = 4.0;
const INSET: f64 = 4.0;

/// How deep an alias may be masked and still be drawn to scale, in dB.
const MASKED_DB: f64 = -40.0;

/// A figure of the keys.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Strip {
    Cents,
    Level,
    Tilt,
    Alias,
    Settling,
    Stretch,
}

/// All of them, from top to bottom.
pub(super) const STRIPS: [Strip; 6] =
    [Strip::Cents, Strip::Level, Strip::Tilt, Strip::Alias, Strip::Settling, Strip::Stretch];

impl Strip {
    /// Share of the height.
    pub(super) fn weight(self) -> f64 {
        if self == Self::Cents { 1.7 } else { 1.0 }
    }

    fn caption(self) -> (&'static str, &'static str) {
        match self {
            Self::Cents => ("pitch", "cents off, ±2 deviations"),
            Self::Level => ("level", "dBFS"),
            Self::Tilt => ("tilt", "dB/octave"),
            Self::Alias => ("worst alias", "dB over mask"),
            Self::Settling => ("settling", "s"),
            Self::Stretch => ("stretch B", "log"),
        }
    }

    /// Where a row lies on the scale; `None` when it has no such figure.
    fn value(self, row: &KeyRecord) -> Option<f64> {
        match self {
            Self::Cents => Some(row.cents),
            Self::Level => row.level_dbfs,
            Self::Tilt => row.tilt_db_per_octave,
            Self::Alias => row.worst_alias.as_ref()?.over_mask_db,
            Self::Settling => row.settling_s,
            Self::Stretch => match stretch(row)? {
                StretchFound::Measured { b, .. } | StretchFound::Below(b) => Some(b.log10()),
            },
        }
    }

    /// Ends of the scale: all that is in order, in whole steps.
    fn range(self, rows: &[KeyRecord]) -> (f64, f64) {
        let values = rows.iter().filter_map(|row| self.value(row));
        let found = values
            .filter(|value| value.is_finite())
            .map(|value| (value, value))
            .reduce(|a, b| (a.0.min(b.0), a.1.max(b.1)));
        match self {
            Self::Cents => cents_range(rows),
            Self::Level => steps(found.unwrap_or((-30.0, -12.0)), 0.5, 6.0, 12.0),
            Self::Tilt => steps(found.unwrap_or((-9.0, 0.0)), 0.2, 3.0, 6.0),
            // The threshold is always to be seen.
            Self::Alias => {
                let (low, high) = found.unwrap_or((0.0, 0.0));
                steps((low.clamp(MASKED_DB, 0.0), high.max(0.0)), 1.0, 10.0, 20.0)
            }
            Self::Settling => {
                let most = found.map_or(0.0, |found| found.1);
                let ladder = [0.05, 0.1, 0.2, 0.5, 1.0, 2.0, 5.0, 10.0];
                let top = ladder.into_iter().find(|&top| top >= 1.05 * most);
                (0.0, top.unwrap_or(1.05 * most))
            }
            Self::Stretch => steps(found.unwrap_or((-5.0, -3.0)), 0.0, 1.0, 2.0),
        }
    }

    /// Draws caption, scale and all keys between two heights.
    pub(super) fn draw(
        self,
        canvas: &Canvas<'_>,
        (top, bottom): (f64, f64),
        rows: &[KeyRecord],
        compass: Compass,
    ) -> Result<()> {
        let (name, unit) = self.caption();
        canvas.text(MARGIN + 12.0, top + 7.0, name, NAME)?;
        // The unit may be long: in two lines.
        for (line, part) in unit.split(", ").enumerate() {
            canvas.text(MARGIN + 12.0, top + 23.0 + 13.0 * line as f64, part, UNIT)?;
        }
        let axis = Axis { values: self.range(rows), units: (bottom, top) };
        self.grid(canvas, &axis)?;
        match self {
            Self::Cents => rows.iter().try_for_each(|row| pitch(canvas, &axis, row, compass)),
            Self::Level | Self::Tilt => self.joined(canvas, &axis, rows, compass),
            Self::Alias => rows.iter().try_for_each(|row| alias(canvas, &axis, row, compass)),
            Self::Settling => rows.iter().try_for_each(|row| settling(canvas, &axis, row, compass)),
            Self::Stretch => rows.iter().try_for_each(|row| stiff(canvas, &axis, row, compass)),
        }
    }

    fn grid(self, canvas: &Canvas<'_>, axis: &Axis) -> Result<()> {
        let (bottom, top) = axis.units;
        if self == Self::Alias {
            canvas.rectangle((PLOT_LEFT, top), (PLOT_RIGHT, axis.within(0.0)), STRAY, 0.08)?;
        }
        let most = crate::convert::drawing_unit(TICKS * self.weight()).unsigned_abs();
        let mut ticks = axis.ticks(most);
        if self == Self::Stretch {
            ticks.retain(|tick| (tick - tick.round()).abs() < 1e-6);
        }
        let decimals = tick_decimals(&ticks);
        for &tick in &ticks {
            let y = axis.at(tick);
            let pen = match self {
                Self::Cents if tick == 0.0 => Pen::new(1.5, DIM),
                Self::Alias if tick == 0.0 => Pen::new(1.0, STRAY),
                _ => Pen::new(1.0, GRID),
            };
            canvas.line((PLOT_LEFT, y), (PLOT_RIGHT, y), pen)?;
            let text = match self {
                Self::Stretch => format!("1e{tick:.0}"),
                Self::Settling => format!("{tick:.decimals$}"),
                _ => signed(Some(tick), decimals),
            };
            let y = y.clamp(top + INSET, bottom - INSET);
            canvas.text(PLOT_LEFT - 8.0, y, &text, TICK.at(Side::Right))?;
        }
        Ok(())
    }

    /// Dots, joined where keys follow each other.
    fn joined(
        self,
        canvas: &Canvas<'_>,
        axis: &Axis,
        rows: &[KeyRecord],
        compass: Compass,
    ) -> Result<()> {
        let places = rows.iter().map(|row| {
            let y = self.value(row).map(|value| axis.within(value));
            (row.note.midi(), y)
        });
        let places: Vec<(i16, Option<f64>)> = places.collect();
        for pair in places.windows(2) {
            if let [(a, Some(from)), (b, Some(to))] = *pair
                && b - a == 1
            {
                let pen = Pen::new(1.0, PARTIAL).strength(0.45);
                canvas.line((compass.at(a), from), (compass.at(b), to), pen)?;
            }
        }
        let dots = places.iter().filter_map(|(key, y)| Some((*key, (*y)?)));
        dots.into_iter().try_for_each(|(key, y)| {
            canvas.circle((compass.at(key), y), compass.mark(3.2), PARTIAL)
        })
    }
}

fn stretch(row: &KeyRecord) -> Option<StretchFound> {
    StretchFound::of(row.inharmonicity_b?, row.inharmonicity_sd?)
}

/// Zero and all keys that are in order, with their whiskers.
fn cents_range(rows: &[KeyRecord]) -> (f64, f64) {
    let most = in_order_cents(rows.iter().map(|row| row.cents));
    let held = rows.iter().filter(|row| row.cents.abs() <= most);
    let (low, high) = held.fold((0.0_f64, 0.0_f64), |(low, high), row| {
        let reach = (WHISKER_SD * row.f0_sd_cents).min(most);
        (low.min(row.cents - reach), high.max(row.cents + reach))
    });
    let largest = high.max(-low).max(1.0);
    let room = 0.12 * largest;
    (low.min(-0.25 * largest) - room, high.max(0.25 * largest) + room)
}

/// Ends in whole steps around some, at least so far apart.
fn steps((low, high): (f64, f64), room: f64, step: f64, least: f64) -> (f64, f64) {
    let (low, high) = (((low - room) / step).floor() * step, ((high + room) / step).ceil() * step);
    if high - low < least { (low, low + least) } else { (low, high) }
}

fn pitch(canvas: &Canvas<'_>, axis: &Axis, row: &KeyRecord, compass: Compass) -> Result<()> {
    let x = compass.at(row.note.midi());
    let (low, high) = axis.values;
    if !(row.cents >= low && row.cents <= high) {
        return beyond(canvas, axis, x, row.cents > high);
    }
    let reach = WHISKER_SD * row.f0_sd_cents;
    let (from, to) = (axis.within(row.cents - reach), axis.within(row.cents + reach));
    let (half, pen) = (compass.mark(3.5), Pen::new(1.2, PARTIAL).strength(0.6));
    canvas.line((x, from), (x, to), pen)?;
    for end in [from, to] {
        if (end - axis.at(row.cents)).abs() > half {
            canvas.line((x - half, end), (x + half, end), pen)?;
        }
    }
    canvas.circle((x, axis.at(row.cents)), half, PARTIAL)
}

/// A stem from the threshold: up where it may be heard, down where it is masked; a short line at the foot where there is none.
fn alias(canvas: &Canvas<'_>, axis: &Axis, row: &KeyRecord, compass: Compass) -> Result<()> {
    let x = compass.at(row.note.midi());
    let Some(over) = Strip::Alias.value(row) else {
        let (half, y) = (compass.mark(3.0), axis.units.0 - 2.0);
        return canvas.line((x - half, y), (x + half, y), Pen::new(1.0, DIM));
    };
    let colour = if over > 0.0 { STRAY } else { DIM };
    let y = axis.within(over);
    canvas.line((x, axis.within(0.0)), (x, y), Pen::new(2.0, colour).strength(0.7))?;
    canvas.diamond((x, y), compass.mark(4.0), Pen::new(1.5, colour))
}

fn settling(canvas: &Canvas<'_>, axis: &Axis, row: &KeyRecord, compass: Compass) -> Result<()> {
    let x = compass.at(row.note.midi());
    let Some(settling_s) = row.settling_s else {
        return beyond(canvas, axis, x, true);
    };
    let half = compass.mark(4.0);
    let top = axis.within(settling_s).min(axis.units.0 - 1.0);
    canvas.rectangle((x - half, top), (x + half, axis.units.0), PARTIAL, 0.75)
}

/// A dot with its whisker; an arrow down where none can be told from noise.
fn stiff(canvas: &Canvas<'_>, axis: &Axis, row: &KeyRecord, compass: Compass) -> Result<()> {
    let (x, half) = (compass.at(row.note.midi()), compass.mark(3.2));
    match stretch(row) {
        None => Ok(()),
        Some(StretchFound::Below(most)) => {
            let y = axis.within(most.log10()).min(axis.units.0 - 2.0 * half);
            let (pen, tip) = (Pen::new(1.0, DIM), y + 2.0 * half);
            canvas.line((x - half, y), (x + half, y), pen)?;
            canvas.line((x, y), (x, tip), pen)?;
            canvas.path(&[(x - half, tip - half), (x, tip), (x + half, tip - half)], pen)
        }
        Some(StretchFound::Measured { b, b_sd }) => {
            let low = (b - WHISKER_SD * b_sd).max(f64::MIN_POSITIVE);
            let (from, to) = (low.log10(), (b + WHISKER_SD * b_sd).log10());
            let pen = Pen::new(1.2, PARTIAL).strength(0.6);
            canvas.line((x, axis.within(from)), (x, axis.within(to)), pen)?;
            canvas.circle((x, axis.within(b.log10())), half, PARTIAL)
        }
    }
}

/// A triangle at the edge: the value lies beyond the scale, or is never reached.
fn beyond(canvas: &Canvas<'_>, axis: &Axis, x: f64, up: bool) -> Result<()> {
    let (bottom, top) = axis.units;
    let (tip, base) = if up { (top, top + 6.0) } else { (bottom, bottom - 6.0) };
    let colour: RGBColor = STRAY;
    canvas
        .path(&[(x - 4.0, base), (x, tip), (x + 4.0, base), (x - 4.0, base)], Pen::new(1.5, colour))
}
