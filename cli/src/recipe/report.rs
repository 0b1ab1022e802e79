//! The recipe of one file in the making.

use super::record::{COLUMNS, RecipeRecord};
use super::wav;
use crate::convert::samples_in;
use crate::measure::{FileFacts, Timebase};
use crate::output::csv::Sheet;
use crate::output::{Ending, Report, Spool};
use anyhow::Result;
use plumbtone_analysis::recipe::Recipe;
use plumbtone_analysis::tuning::Tuning;
use plumbtone_analysis::{Reading, State};
use std::collections::VecDeque;
use std::io::Write as _;
use std::path::PathBuf;

/// Samples of a cycle.
const CYCLE: usize = 2048;
/// Sound kept back, in seconds: readings come about 0.2 s after their centre.
const TAIL_S: f64 = 1.0;
/// Span over which the residual is measured: seconds, and periods of the fundamental, whichever is longer.
const RESIDUAL_S: f64 = 0.08;
const RESIDUAL_PERIODS: f64 = 8.0;
/// Confidence from which an instant is taken unasked.
const CONFIDENT: f64 = 0.8;
/// Recipes of a file kept; when they are more, every other one is dropped.
const RECIPES_MAX: usize = 4096;

/// Where the recipe of a file goes.
pub(super) struct Places {
    pub(super) json: bool,
    /// Folder and name.
    pub(super) csv: Option<(PathBuf, String)>,
    pub(super) cycle: Option<PathBuf>,
    /// With the number of cycles.
    pub(super) table: Option<(PathBuf, usize)>,
    /// With its length in seconds.
    pub(super) sound: Option<(PathBuf, f64)>,
}

/// The recipe of one file.
pub(super) struct RecipeReport {
    /// The instant asked for, in seconds from the file's start.
    at_s: Option<f64>,
    timebase: Timebase,
    tuning: Tuning,
    places: Places,
    tail: Tail,
    best: Option<Found>,
    over_time: Recipes,
}

/// The best instant so far.
struct Found {
    /// How good it is, the greater the better.
    rank: f64,
    recipe: Recipe,
    around: Vec<f32>,
}

/// The last samples.
#[derive(Default)]
struct Tail {
    samples: VecDeque<f32>,
    /// Position after the newest.
    end: u64,
}

impl Tail {
    fn push(&mut self, from: u64, samples: &[f32], most: usize) {
        if from != self.end {
            self.samples.clear();
        }
        self.samples.extend(samples);
        let excess = self.samples.len().saturating_sub(most);
        self.samples.drain(..excess);
        self.end = from + samples.len() as u64;
    }

    /// Samples with a position in the middle; silence where there are none.
    fn around(&self, centre: u64, half: u64) -> Vec<f32> {
        let start = self.end - self.samples.len() as u64;
        let at =
            |k: u64| (centre + k).checked_sub(start + half).and_then(|i| usize::try_from(i).ok());
        (0..2 * half)
            .map(|k| at(k).and_then(|i| self.samples.get(i)).copied().unwrap_or(0.0))
            .collect()
    }
}

/// Recipes from the file's start to its end, evenly spaced.
#[derive(Default)]
struct Recipes {
    recipes: Vec<Recipe>,
    every: usize,
    seen: usize,
}

impl Recipes {
    fn push(&mut self, recipe: &Recipe) {
        self.every = self.every.max(1);
        if self.seen.is_multiple_of(self.every) {
            if self.recipes.len() == RECIPES_MAX {
                let mut place = 0;
                self.recipes.retain(|_| {
                    place += 1;
                    place % 2 == 1
                });
                self.every *= 2;
            }
            self.recipes.push(recipe.clone());
        }
        self.seen += 1;
    }

    /// So many cycles, one after the other, all with the phase of the first.
    fn cycles(&self, count: usize) -> Vec<f32> {
        let last = self.recipes.len().saturating_sub(1);
        let Some(first) = self.recipes.first().and_then(|r| r.ingredients.first()) else {
            return Vec::new();
        };
        let phase_rad = first.phase_rad / f64::from(first.number);
        (0..count)
            .flat_map(|k| {
                let recipe = &self.recipes[k * last / (count - 1)];
                recipe.clone().turned_to(phase_rad).cycle(CYCLE)
            })
            .collect()
    }
}

impl RecipeReport {
    pub(super) fn new(
        at_s: Option<f64>,
        timebase: Timebase,
        tuning: Tuning,
        places: Places,
    ) -> Self {
        let (tail, over_time) = (Tail::default(), Recipes::default());
        Self { at_s, timebase, tuning, places, tail, best: None, over_time }
    }

    /// How good an instant is: near to the one asked for, or loud, steady and sure.
    fn rank(&self, reading: &Reading) -> f64 {
        if let Some(at_s) = self.at_s {
            return -(self.timebase.seconds(reading.centre) - at_s).abs();
        }
        let sure = reading.pitch.is_some_and(|pitch| pitch.confidence >= CONFIDENT);
        let steady = reading.state == State::Steady;
        reading.level_dbfs - if sure && steady { 0.0 } else { 1000.0 }
    }

    /// Writes the WAV files and says by how much their cycles were scaled.
    fn write_sounds(
        &self,
        recipe: &Recipe,
        facts: &FileFacts,
    ) -> Result<(Option<f64>, Option<f64>)> {
        let (mut cycle_gain_db, mut table_gain_db) = (None, None);
        if let Some(place) = &self.places.cycle {
            let mut cycle = recipe.cycle(CYCLE);
            cycle_gain_db = Some(wav::scale_up(&mut cycle));
            wav::write(place, &cycle, facts.sample_rate_hz)?;
        }
        if let Some((place, count)) = &self.places.table {
            let mut cycles = self.over_time.cycles(*count);
            table_gain_db = Some(wav::scale_up(&mut cycles));
            wav::write(place, &cycles, facts.sample_rate_hz)?;
        }
        if let Some((place, length_s)) = &self.places.sound {
            let rate = f64::from(facts.sample_rate_hz);
            let samples = usize::try_from(samples_in(*length_s, rate)).unwrap_or(usize::MAX);
            wav::write(place, &recipe.sound(rate, samples, 0), facts.sample_rate_hz)?;
        }
        Ok((cycle_gain_db, table_gain_db))
    }
}

impl Report for RecipeReport {
    fn samples(&mut self, from: u64, samples: &[f32]) {
        let most = samples_in(TAIL_S, self.timebase.sample_rate_hz);
        // A block may be longer than the tail.
        let most = usize::try_from(most).unwrap_or(usize::MAX).max(2 * samples.len());
        self.tail.push(from, samples, most);
    }

    fn reading(&mut self, reading: &Reading) -> Result<()> {
        let Some(recipe) = Recipe::of(reading) else { return Ok(()) };
        if self.places.table.is_some() {
            self.over_time.push(&recipe);
        }
        let rank = self.rank(reading);
        if self.best.as_ref().is_none_or(|best| rank > best.rank) {
            let span_s = (0.5 * RESIDUAL_S).max(0.5 * RESIDUAL_PERIODS / recipe.f0_hz);
            let half = samples_in(span_s, self.timebase.sample_rate_hz);
            let around = self.tail.around(reading.centre, half);
            self.best = Some(Found { rank, recipe, around });
        }
        Ok(())
    }

    fn finish(self: Box<Self>, facts: &FileFacts) -> Result<Ending> {
        let Some(Found { recipe, around, .. }) = &self.best else { return Ok(Ending::default()) };
        let residual_db = recipe.residual_db(self.timebase.sample_rate_hz, around);
        let context = (self.timebase, &self.tuning);
        let mut record = RecipeRecord::new(recipe, residual_db, facts, context);
        (record.cycle_gain_db, record.table_gain_db) = self.write_sounds(recipe, facts)?;
        if let Some((folder, name)) = &self.places.csv {
            let mut sheet = Sheet::new(folder, name, COLUMNS)?;
            record.partials.iter().try_for_each(|p| sheet.row(COLUMNS, 0, p))?;
            sheet.publish()?;
        }
        let mut text = Spool::new();
        if self.places.json {
            serde_json::to_writer(&mut text, &record)?;
            text.write_all(b"\n")?;
        } else {
            text.write_all(record.text().as_bytes())?;
        }
        Ok(Ending::print(text))
    }
}
