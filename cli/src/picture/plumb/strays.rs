//! Strays in the plumb view: each at its true height, its explanation beside it, and no two explanations on one another.

use super::rows::Rows;
use super::{LEVEL_LEFT, LEVEL_RIGHT};
use crate::convert;
use crate::output::records::{NoteRecord, StrayRecord};
use crate::output::words::explanation;
use crate::picture::axis::Axis;
use crate::picture::canvas::{Canvas, Pen, Type};
use crate::picture::theme::{DIM, STRAY};
use anyhow::Result;

/// Left edge of the explanations.
pub(super) const LABEL_LEFT: f64 = 462.0;
const DIAMOND_MIDDLE: f64 = 430.0;
/// From one explanation to the next, at least.
const LABEL_STEP: f64 = 13.0;
/// Explanations at most: beyond these, they are no longer read.
const LABELS_MAX: usize = 24;

/// The strays that lie among the rows, sorted by what is drawn of them.
pub(super) struct Strays<'a> {
    /// Those explained, from the top down.
    explained: Vec<Placed<'a>>,
    /// Those only marked.
    marked: Vec<Placed<'a>>,
    /// How many lie outside.
    outside: usize,
}

/// A stray and its height.
type Placed<'a> = (f64, &'a StrayRecord);

impl<'a> Strays<'a> {
    pub(super) fn new(note: &'a NoteRecord, rows: &Rows) -> Self {
        // The list comes strongest first.
        let mut explained: Vec<Placed<'_>> = note
            .strays
            .iter()
            .filter_map(|stray| Some((rows.y(partial_number(note, stray.frequency_hz?)?), stray)))
            .filter(|(y, _)| rows.holds(*y))
            .collect();
        let outside = note.strays.len() - explained.len();
        let fit = convert::index(convert::samples_in((rows.bottom - rows.top) / LABEL_STEP, 1.0));
        let marked = explained.split_off(explained.len().min(LABELS_MAX).min(fit));
        explained.sort_by(|(a, _), (b, _)| a.total_cmp(b));
        Self { explained, marked, outside }
    }

    /// Draws the weak ones, which lie under everything else.
    pub(super) fn draw_marked(&self, canvas: &Canvas<'_>, levels: &Axis) -> Result<()> {
        let pen = Pen::new(0.8, STRAY).strength(0.5);
        for &(y, stray) in &self.marked {
            canvas.line((DIAMOND_MIDDLE - 3.0, y), (DIAMOND_MIDDLE + 3.0, y), pen)?;
            if let Some(level) = stray.level_dbfs {
                canvas.line((LEVEL_LEFT, y), (levels.within(level), y), pen)?;
            }
        }
        Ok(())
    }

    /// Draws the strong ones with their explanations.
    pub(super) fn draw_explained(
        &self,
        canvas: &Canvas<'_>,
        rows: &Rows,
        levels: &Axis,
    ) -> Result<()> {
        for (y, stray) in &self.explained {
            mark(canvas, *y, stray, levels)?;
        }
        let labels = self.labels();
        let wanted: Vec<f64> = labels.iter().map(|label| label.wanted()).collect();
        let places = spread(&wanted, LABEL_STEP, (rows.top, rows.bottom));
        for (label, place) in labels.iter().zip(places) {
            for y in &label.heights {
                let elbow = [
                    (DIAMOND_MIDDLE + 6.0, *y),
                    (LABEL_LEFT - 10.0, place),
                    (LABEL_LEFT - 4.0, place),
                ];
                canvas.path(&elbow, Pen::new(0.8, STRAY).strength(0.6))?;
            }
            canvas.text(LABEL_LEFT, place, &label.words(), Type::sans(10.0, STRAY))?;
        }
        if self.outside > 0 {
            let text = format!("{} above partial {}", self.outside, rows.count);
            canvas.text(LABEL_LEFT, rows.bottom + 14.0, &text, Type::sans(10.0, DIM))?;
        }
        Ok(())
    }

    /// One label for each stray, but for neighbours of the same explanation.
    fn labels(&self) -> Vec<Label> {
        let mut labels: Vec<Label> = Vec::new();
        for (y, stray) in &self.explained {
            let explanation = explanation(stray.explanation);
            match labels.last_mut() {
                Some(last) if last.takes(*y, &explanation) => last.heights.push(*y),
                _ => labels.push(Label { explanation, heights: vec![*y] }),
            }
        }
        labels
    }
}

/// An explanation, and the heights of the strays it explains.
struct Label {
    explanation: String,
    heights: Vec<f64>,
}

impl Label {
    fn takes(&self, y: f64, explanation: &str) -> bool {
        self.explanation == explanation
            && self.heights.last().is_some_and(|last| y - last < LABEL_STEP)
    }

    /// Where it would stand if it were alone.
    fn wanted(&self) -> f64 {
        self.heights.iter().sum::<f64>() / self.heights.len() as f64
    }

    fn words(&self) -> String {
        match self.heights.len() {
            1 => self.explanation.clone(),
            count => format!("{count} {}", self.explanation),
        }
    }
}

fn mark(canvas: &Canvas<'_>, y: f64, stray: &StrayRecord, levels: &Axis) -> Result<()> {
    canvas.diamond((DIAMOND_MIDDLE, y), 4.5, Pen::new(1.4, STRAY))?;
    let Some(level) = stray.level_dbfs else { return Ok(()) };
    let right = levels.within(level).clamp(LEVEL_LEFT + 2.0, LEVEL_RIGHT);
    canvas.line((LEVEL_LEFT, y), (right, y), Pen::new(2.4, STRAY))
}

/// The partial number, not whole, at which the stretched series has a frequency: `f = n·f0·sqrt(1 + B·n²)` solved for n.
fn partial_number(note: &NoteRecord, frequency_hz: f64) -> Option<f64> {
    let ratio = frequency_hz / note.f0_hz?;
    let b = note.inharmonicity_b.unwrap_or(0.0);
    if b.abs() * ratio * ratio < 1e-9 {
        return Some(ratio);
    }
    let root = (1.0 + 4.0 * b * ratio * ratio).sqrt();
    let number = (2.0 * ratio * ratio / (1.0 + root)).sqrt();
    number.is_finite().then_some(number)
}

/// Moves rising places apart to at least `step`, as little as can be, within limits: neighbours that collide form a
/// block centred on the mean of what they want.
fn spread(wanted: &[f64], step: f64, (low, high): (f64, f64)) -> Vec<f64> {
    // Taking out the steps turns "at least a step apart" into "not falling", solved by pooling adjacent violators.
    let mut blocks: Vec<(f64, u32)> = Vec::new();
    for (index, place) in wanted.iter().enumerate() {
        let mut block = (place - step * index as f64, 1);
        while let Some(&(mean, count)) = blocks.last()
            && mean >= block.0
        {
            let sum = mean * f64::from(count) + block.0 * f64::from(block.1);
            block = (sum / f64::from(count + block.1), count + block.1);
            blocks.pop();
        }
        blocks.push(block);
    }
    let last = wanted.len().saturating_sub(1) as f64;
    let highest = (high - step * last).max(low);
    blocks
        .into_iter()
        .flat_map(|(mean, count)| (0..count).map(move |_| mean.clamp(low, highest)))
        .enumerate()
        .map(|(index, place)| place + step * index as f64)
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn labels_keep_their_distance_and_move_little() {
        for (wanted, places) in [
            (vec![], vec![]),
            (vec![50.0], vec![50.0]),
            (vec![20.0, 80.0], vec![20.0, 80.0]),
            (vec![50.0, 50.0, 50.0], vec![40.0, 50.0, 60.0]),
            (vec![2.0, 3.0], vec![0.0, 10.0]),
            (vec![97.0, 98.0, 99.0], vec![80.0, 90.0, 100.0]),
            (vec![10.0, 48.0, 52.0, 90.0], vec![10.0, 45.0, 55.0, 90.0]),
        ] {
            let spread = spread(&wanted, 10.0, (0.0, 100.0));
            assert_eq!(spread.len(), places.len(), "{wanted:?}");
            for (place, expected) in spread.iter().zip(&places) {
                assert!((place - expected).abs() < 1e-9, "{wanted:?}: {spread:?}");
            }
        }
    }
}
