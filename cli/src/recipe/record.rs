//! A recipe as it is written down.

use crate::measure::{FileFacts, Timebase};
use crate::output::csv::Column;
use crate::output::records::WaveformRecord;
use crate::output::words::{plain, signed, with_deviation, with_unit};
use comfy_table::{CellAlignment, Table, presets};
use plumbtone_analysis::recipe::{Ingredient, Recipe};
use plumbtone_analysis::tuning::Tuning;
use serde::Serialize;
use std::f64::consts::TAU;

/// The recipe of one instant of a file.
#[derive(Debug, Clone, Serialize)]
pub(super) struct RecipeRecord {
    pub(super) file: String,
    pub(super) time_s: f64,
    pub(super) f0_hz: f64,
    pub(super) note: Option<String>,
    pub(super) cents: Option<f64>,
    pub(super) waveform: Option<WaveformRecord>,
    /// What the recipe's sound leaves of the recording around the instant.
    pub(super) residual_db: Option<f64>,
    /// By how much the cycle and the cycles of the table were scaled; null where none was asked for.
    pub(super) cycle_gain_db: Option<f64>,
    pub(super) table_gain_db: Option<f64>,
    pub(super) partials: Vec<IngredientRecord>,
}

/// One partial of a recipe.
#[derive(Debug, Clone, Serialize)]
pub(super) struct IngredientRecord {
    pub(super) number: u32,
    pub(super) ratio: f64,
    pub(super) ratio_sd: f64,
    pub(super) frequency_hz: f64,
    pub(super) amplitude: f64,
    pub(super) amplitude_sd: f64,
    pub(super) level_dbfs: f64,
    pub(super) phase_rad: f64,
    /// Phase after the shift in time that brings partial 1 to phase 0.
    pub(super) phase_from_fundamental_rad: Option<f64>,
}

/// The columns of NAME.recipe.csv.
pub(super) const COLUMNS: &[Column<IngredientRecord>] = &[
    ("number", |_, p| p.number.to_string()),
    ("ratio", |_, p| p.ratio.to_string()),
    ("ratio_sd", |_, p| p.ratio_sd.to_string()),
    ("frequency_hz", |_, p| p.frequency_hz.to_string()),
    ("amplitude", |_, p| p.amplitude.to_string()),
    ("amplitude_sd", |_, p| p.amplitude_sd.to_string()),
    ("level_dbfs", |_, p| p.level_dbfs.to_string()),
    ("phase_rad", |_, p| p.phase_rad.to_string()),
    ("phase_from_fundamental_rad", |_, p| {
        p.phase_from_fundamental_rad.map(|phase| phase.to_string()).unwrap_or_default()
    }),
];

impl RecipeRecord {
    pub(super) fn new(
        recipe: &Recipe,
        residual_db: Option<f64>,
        facts: &FileFacts,
        (timebase, tuning): (Timebase, &Tuning),
    ) -> Self {
        let nearest = tuning.nearest(recipe.f0_hz);
        let parts = &recipe.ingredients;
        let waves: Vec<_> = parts.iter().map(|p| (p.number, p.amplitude, p.phase_rad)).collect();
        let first = parts.iter().find(|p| p.number == 1).map(|p| p.phase_rad);
        Self {
            file: facts.path.to_string_lossy().into_owned(),
            time_s: timebase.seconds(recipe.centre),
            f0_hz: recipe.f0_hz,
            note: nearest.map(|nearest| nearest.note.to_string()),
            cents: nearest.map(|nearest| nearest.cents),
            waveform: WaveformRecord::of(&waves),
            residual_db,
            cycle_gain_db: None,
            table_gain_db: None,
            partials: parts.iter().map(|p| IngredientRecord::new(p, first)).collect(),
        }
    }

    /// The recipe for reading.
    pub(super) fn text(&self) -> String {
        let note = self.note.as_deref().unwrap_or("?");
        let mut text = format!(
            "{} at {:.3} s: {note} {} cents, {:.4} Hz, {} partials; the rest lies {} under the sound\n",
            self.file,
            self.time_s,
            signed(self.cents, 2),
            self.f0_hz,
            self.partials.len(),
            with_unit(&plain(self.residual_db.map(|db| -db), 1), "dB"),
        );
        if let Some(wave) = &self.waveform {
            text += &wave.text();
        }
        for (what, gain) in [("cycle", self.cycle_gain_db), ("table", self.table_gain_db)] {
            if let Some(gain) = gain {
                text += &format!("  the {what} is scaled by {gain:+.2} dB\n");
            }
        }
        let mut table = Table::new();
        table.load_style(presets::NOTHING);
        table.set_header(["partial", "ratio", "amplitude", "dBFS", "phase", "from partial 1"]);
        for p in &self.partials {
            table.add_row([
                p.number.to_string(),
                with_deviation(Some(p.ratio), Some(p.ratio_sd), 6, false),
                with_deviation(Some(p.amplitude), Some(p.amplitude_sd), 7, false),
                plain(Some(p.level_dbfs), 2),
                signed(Some(p.phase_rad), 3),
                signed(p.phase_from_fundamental_rad, 3),
            ]);
        }
        for column in table.column_iter_mut() {
            column.set_cell_alignment(CellAlignment::Right);
        }
        text + &format!("{table}\n")
    }
}

impl IngredientRecord {
    fn new(p: &Ingredient, first: Option<f64>) -> Self {
        let from_first = first.map(|first| {
            let phase = p.phase_rad - f64::from(p.number) * first;
            phase - TAU * (phase / TAU).round()
        });
        Self {
            number: p.number,
            ratio: p.ratio,
            ratio_sd: p.ratio_sd,
            frequency_hz: p.frequency_hz,
            amplitude: p.amplitude,
            amplitude_sd: p.amplitude_sd,
            level_dbfs: 20.0 * p.amplitude.log10(),
            phase_rad: p.phase_rad,
            phase_from_fundamental_rad: from_first,
        }
    }
}
