//! The level of each partial over time, in bounded memory however long the file.

use crate::convert::single;
use plumbtone_analysis::Reading;

/// Columns kept at most: more than a picture is wide. When full, neighbours are averaged and each then stands for twice
/// the time.
const COLUMNS_MAX: usize = 4096;

/// Levels over time.
#[derive(Debug, Default)]
pub(crate) struct LevelHistory {
    columns: Vec<Column>,
    /// Readings that a column stands for.
    span: u32,
    /// The column being filled.
    open: Option<(Column, u32)>,
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

impl LevelHistory {
    /// Takes in the next reading.
    pub(crate) fn push(&mut self, reading: &Reading) {
        self.span = self.span.max(1);
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

    /// First and last sample position, if there is more than one.
    pub(crate) fn extent(&self) -> Option<(u64, u64)> {
        let (first, last) = (self.columns.first()?.position, self.columns.last()?.position);
        (last > first).then_some((first, last))
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
    use plumbtone_analysis::Partial;

    #[test]
    fn a_long_file_keeps_its_levels_in_bounded_memory() {
        let mut history = LevelHistory::default();
        let readings = 10 * COLUMNS_MAX as u64;
        for index in 0..readings {
            let partials = if index < readings / 2 { vec![partial(2, -20.0)] } else { Vec::new() };
            history.push(&Reading { centre: index * 480, partials, ..Reading::default() });
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
