//! The level of each partial over time, in bounded memory however long the file.

use crate::convert::single;
use plumbtone_analysis::Reading;
use std::ops::Range;

/// Columns kept at most: more than a picture is wide. When full, neighbours are averaged and each then stands for twice
/// the time.
const COLUMNS_MAX: usize = 4096;
/// Readings without a pitch in a row that are kept: a note bridges fewer.
const IDLE_MAX: u32 = 100;

/// Levels over time.
#[derive(Debug)]
pub(crate) struct LevelHistory {
    columns: Vec<Column>,
    /// Readings that a column stands for.
    span: u32,
    /// The column being filled.
    open: Option<(Column, u32)>,
    /// Readings without a pitch since the last one with.
    idle: u32,
}

/// The level of one partial at one time.
#[derive(Debug, Clone, Copy)]
pub(crate) struct LevelAt {
    /// Sample position.
    pub(crate) position: u64,
    /// Fundamental there, in Hz; 0 without one.
    pub(crate) f0_hz: f64,
    /// `None` where the partial is not there.
    pub(crate) level_dbfs: Option<f64>,
}

/// Mean power of each partial over a stretch of time.
#[derive(Debug, Clone, Default)]
struct Column {
    position: u64,
    /// Fundamental at its first reading, in Hz; 0 without one.
    f0_hz: f64,
    /// By partial number less one: sum of powers, and readings that had the partial.
    powers: Vec<(f32, u32)>,
}

impl Default for LevelHistory {
    fn default() -> Self {
        Self { columns: Vec::new(), span: 1, open: None, idle: 0 }
    }
}

impl LevelHistory {
    /// Takes in the next reading.
    pub(crate) fn push(&mut self, reading: &Reading) {
        self.idle = if reading.pitch.is_some() { 0 } else { self.idle.saturating_add(1) };
        if self.idle > IDLE_MAX {
            return;
        }
        let (mut column, count) = self.open.take().unwrap_or_else(|| (Column::at(reading), 0));
        for partial in &reading.partials {
            let slot = crate::convert::index(u64::from(partial.number.saturating_sub(1)));
            if column.powers.len() <= slot {
                column.powers.resize(slot + 1, (0.0, 0));
            }
            column.powers[slot].0 += single(10_f64.powf(partial.level_dbfs / 10.0));
            column.powers[slot].1 += 1;
        }
        if count + 1 < self.span {
            self.open = Some((column, count + 1));
        } else {
            self.columns.push(column);
        }
        if self.columns.len() >= COLUMNS_MAX {
            self.halve();
        }
    }

    /// Moves what lies within a span of sample positions out, and forgets what lies before its end.
    pub(crate) fn take(&mut self, span: Range<u64>) -> Self {
        let rest = self
            .columns
            .split_off(self.columns.partition_point(|column| column.position < span.end));
        let mut columns = std::mem::replace(&mut self.columns, rest);
        columns.retain(|column| span.contains(&column.position));
        let taken = Self { columns, span: self.span, open: None, idle: 0 };
        if self.columns.is_empty() {
            *self = Self::default();
        }
        taken
    }

    /// Highest partial number met.
    pub(crate) fn partials(&self) -> u32 {
        self.columns
            .iter()
            .map(|column| column.powers.len())
            .max()
            .map_or(0, |most| u32::try_from(most).unwrap_or(0))
    }

    /// The level of a partial over time.
    pub(crate) fn levels(&self, number: u32) -> impl Iterator<Item = LevelAt> {
        let slot = crate::convert::index(u64::from(number.saturating_sub(1)));
        self.columns.iter().map(move |column| {
            let mean = column.powers.get(slot).filter(|(_, count)| *count > 0);
            LevelAt {
                position: column.position,
                f0_hz: column.f0_hz,
                level_dbfs: mean
                    .map(|&(power, count)| 10.0 * (f64::from(power) / f64::from(count)).log10()),
            }
        })
    }

    fn halve(&mut self) {
        self.columns = self.columns.chunks(2).map(Column::joined).collect();
        self.span *= 2;
    }
}

impl Column {
    fn at(reading: &Reading) -> Self {
        let f0_hz = reading.pitch.map_or(0.0, |pitch| pitch.f0_hz);
        Self { position: reading.centre, f0_hz, powers: Vec::new() }
    }

    fn joined(columns: &[Self]) -> Self {
        let mut sum = columns[0].clone();
        for column in &columns[1..] {
            sum.powers.resize(sum.powers.len().max(column.powers.len()), (0.0, 0));
            for (into, from) in sum.powers.iter_mut().zip(&column.powers) {
                into.0 += from.0;
                into.1 += from.1;
            }
        }
        sum
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use plumbtone_analysis::{Partial, Pitch};

    #[test]
    fn a_long_file_keeps_its_levels_in_bounded_memory() {
        let mut history = LevelHistory::default();
        let readings = 10 * COLUMNS_MAX as u64;
        for index in 0..readings {
            let partials = if index < readings / 2 { vec![partial(2, -20.0)] } else { Vec::new() };
            history.push(&Reading {
                centre: index * 480,
                pitch: PITCH,
                partials,
                ..Reading::default()
            });
        }
        assert!(history.columns.len() < COLUMNS_MAX, "{} columns", history.columns.len());
        assert_eq!(history.partials(), 2, "highest partial");
        let (sounding, silent): (Vec<_>, Vec<_>) =
            history.levels(2).partition(|at| at.position < readings / 2 * 480);
        assert!(!sounding.is_empty() && !silent.is_empty(), "both halves are there");
        for at in sounding {
            assert!(at.level_dbfs.is_some_and(|level| (level + 20.0).abs() < 1e-3), "{at:?}");
        }
        assert!(
            silent.iter().all(|at| at.level_dbfs.is_none()),
            "no level where the partial is gone"
        );
        assert!(
            history.levels(1).all(|at| at.level_dbfs.is_none()),
            "no level of a partial never met"
        );
    }

    #[test]
    fn each_note_takes_its_own_levels_in_full_detail() {
        let mut history = LevelHistory::default();
        // Long unpitched sound before a note must not coarsen it.
        for index in 0..10 * COLUMNS_MAX as u64 {
            history.push(&Reading { centre: index, ..Reading::default() });
        }
        for index in 0..60 {
            let partials = vec![partial(1, -20.0)];
            history.push(&Reading {
                centre: 1_000_000 + index,
                pitch: PITCH,
                partials,
                ..Reading::default()
            });
        }
        for (span, count) in
            [(1_000_000..1_000_030, 30), (1_000_040..1_000_050, 10), (1_000_000..1_000_060, 10)]
        {
            let taken = history.take(span.clone());
            let positions: Vec<u64> = taken.levels(1).map(|at| at.position).collect();
            assert_eq!(positions.len(), count, "{span:?}: {positions:?}");
            assert!(positions.iter().all(|at| span.contains(at)), "{span:?}: {positions:?}");
        }
    }

    const PITCH: Option<Pitch> = Some(Pitch { f0_hz: 100.0, f0_sd_cents: 1.0, confidence: 1.0 });

    fn partial(number: u32, level_dbfs: f64) -> Partial {
        Partial {
            number,
            level_dbfs,
            frequency_hz: 0.0,
            frequency_sd_hz: 0.0,
            cents_from_harmonic: 0.0,
            cents_sd: 0.0,
            level_sd_db: 0.0,
            phase_rad: 0.0,
            snr_db: 0.0,
        }
    }
}
