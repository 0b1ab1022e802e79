//! The picture of a key sheet: strips stacked over one axis of note names, one column per key, those still to play hatched.

mod strips;

use super::canvas::{self, Canvas, Pen, Side, Type};
use super::theme::{DIM, GRID, GROUND, HEAD, INK, MARGIN, PANEL, PARTIAL, STRAY, WIDTH};
use crate::keys::record::KeyRecord;
use anyhow::Result;
use plumbtone_analysis::keys::missing_runs;
use plumbtone_analysis::tuning::{NoteName, Temperament};
use std::path::Path;
use strips::STRIPS;

const LABEL: Type = Type::sans(11.0, DIM);
const VALUE: Type = Type::sans(15.0, INK);
const NAME: Type = Type::mono(10.0, DIM);
const MISSING: Type = Type::mono(10.0, STRAY);
/// Left end of the strips, beside captions and ticks, and their right end.
const PLOT_LEFT: f64 = 156.0;
const PLOT_RIGHT: f64 = WIDTH - MARGIN - 14.0;
/// Height of a strip of weight 1, and the space between two.
const STRIP: f64 = 84.0;
const BETWEEN: f64 = 16.0;
/// Room above the strips for the names of missing keys, and below them for those of keys.
const ABOVE: f64 = 34.0;
const BELOW: f64 = 34.0;
/// Fewest keys shown.
const KEYS_LEAST: i16 = 13;
/// Least distance of two names, width of a letter of [`NAME`], and distance of the hatching's lines.
const NAMES_APART: f64 = 34.0;
const LETTER: f64 = 6.1;
const HATCH: f64 = 7.0;
/// Runs of missing keys told in the head.
const RUNS_SHOWN: usize = 6;

/// What is drawn.
pub(crate) struct KeysPicture<'a> {
    rows: &'a [KeyRecord],
    concert_pitch_hz: f64,
    temperament: Temperament,
    compass: Compass,
    /// Missing keys as runs, from and to.
    missing: Vec<(NoteName, NoteName)>,
}

/// Keys against width.
#[derive(Debug, Clone, Copy)]
pub(super) struct Compass {
    first: i16,
    last: i16,
}

/// Draws the picture and puts it in its place.
///
/// # Errors
/// The place cannot be written to.
pub(crate) fn write(place: &Path, picture: &KeysPicture<'_>) -> Result<()> {
    super::write(place, &picture.draw()?)
}

impl Compass {
    fn of(lowest: i16, highest: i16) -> Self {
        let spare = (KEYS_LEAST - (highest - lowest + 3)).max(0);
        Self { first: lowest - 1 - spare / 2, last: highest + 1 + spare - spare / 2 }
    }

    fn width(self) -> f64 {
        (PLOT_RIGHT - PLOT_LEFT) / f64::from(self.last - self.first + 1)
    }

    /// The middle of a key's column.
    pub(super) fn at(self, key: i16) -> f64 {
        PLOT_LEFT + (f64::from(key - self.first) + 0.5) * self.width()
    }

    /// Half the width of a mark.
    pub(super) fn mark(self, most: f64) -> f64 {
        (0.42 * self.width()).clamp(1.0, most)
    }
}

impl<'a> KeysPicture<'a> {
    /// A picture of these rows, which go from low to high; `None` without any.
    pub(crate) fn new(
        rows: &'a [KeyRecord],
        concert_pitch_hz: f64,
        temperament: Temperament,
    ) -> Option<Self> {
        let compass = Compass::of(rows.first()?.note.midi(), rows.last()?.note.midi());
        let keys: Vec<NoteName> = rows.iter().map(|row| row.note).collect();
        Some(Self { rows, concert_pitch_hz, temperament, compass, missing: missing_runs(&keys) })
    }

    fn draw(&self) -> Result<String> {
        let strips: f64 = STRIPS.iter().map(|strip| STRIP * strip.weight() + BETWEEN).sum();
        let top = HEAD + MARGIN;
        let plot = (top + ABOVE, top + ABOVE + strips - BETWEEN);
        let height = plot.1 + BELOW + MARGIN;
        canvas::svg(WIDTH, height, |canvas| {
            canvas.rectangle((0.0, 0.0), (WIDTH, height), GROUND, 1.0)?;
            self.head(canvas)?;
            canvas.panel((MARGIN, top), (WIDTH - MARGIN, height - MARGIN), PANEL)?;
            self.hatch(canvas, plot)?;
            self.octaves(canvas, plot)?;
            let mut from = plot.0;
            for strip in STRIPS {
                let to = from + STRIP * strip.weight();
                strip.draw(canvas, (from, to), self.rows, self.compass)?;
                from = to + BETWEEN;
            }
            self.names(canvas, plot.1 + 16.0)
        })
    }

    fn head(&self, canvas: &Canvas<'_>) -> Result<()> {
        canvas.rectangle((0.0, 0.0), (WIDTH, HEAD), PANEL, 1.0)?;
        let mut keys: Vec<NoteName> = self.rows.iter().map(|row| row.note).collect();
        keys.dedup();
        let count =
            if keys.len() == 1 { "1 key".to_owned() } else { format!("{} keys", keys.len()) };
        canvas.text(20.0, 37.0, &count, Type::sans(36.0, PARTIAL).bold())?;
        let ends = keys.first().zip(keys.last());
        let compass = ends.map_or_else(String::new, |(low, high)| format!("{low} to {high}"));
        let conditions = [
            ("compass", compass),
            ("concert pitch", format!("{} Hz", self.concert_pitch_hz)),
            ("temperament", self.temperament.to_string()),
        ];
        for ((label, value), left) in conditions.into_iter().zip([250.0, 400.0, 530.0]) {
            canvas.text(left, 28.0, label, LABEL)?;
            canvas.text(left, 49.0, &value, VALUE)?;
        }
        let right = WIDTH - MARGIN;
        canvas.text(right, 28.0, "still to play", LABEL.at(Side::Right))?;
        let told: Vec<String> =
            self.missing.iter().take(RUNS_SHOWN).map(|keys| run(*keys)).collect();
        let more = self.missing.len().saturating_sub(RUNS_SHOWN);
        let text = match (told.is_empty(), more) {
            (true, _) => "nothing in between".to_owned(),
            (false, 0) => told.join(", "),
            (false, more) => format!("{} and {more} more", told.join(", ")),
        };
        let set = if self.missing.is_empty() { VALUE } else { Type::sans(13.0, STRAY) };
        canvas.text(right, 49.0, &text, set.at(Side::Right))
    }

    /// Keys still to play: hatched over all strips, with their names above where there is room.
    fn hatch(&self, canvas: &Canvas<'_>, (top, bottom): (f64, f64)) -> Result<()> {
        let half = 0.5 * self.compass.width();
        let mut free_from = PLOT_LEFT - 20.0;
        for &keys in &self.missing {
            let (from, to) =
                (self.compass.at(keys.0.midi()) - half, self.compass.at(keys.1.midi()) + half);
            canvas.rectangle((from, top), (to, bottom), GROUND, 1.0)?;
            let mut at = from - (bottom - top);
            while at < to {
                // A slanted line, cut at both edges.
                let (a, b) = (at.max(from), (at + bottom - top).min(to));
                canvas.line((a, bottom - (a - at)), (b, bottom - (b - at)), Pen::new(1.0, GRID))?;
                at += HATCH;
            }
            let text = run(keys);
            let wide = 0.5 * LETTER * text.chars().count() as f64;
            let middle = (0.5 * (from + to)).clamp(PLOT_LEFT + wide, PLOT_RIGHT - wide);
            if middle - wide >= free_from {
                canvas.text(middle, top - 12.0, &text, MISSING.at(Side::Centre))?;
                free_from = middle + wide + LETTER;
            } else {
                let x = 0.5 * (from + to);
                canvas.line((x, top - 7.0), (x, top - 2.0), Pen::new(1.5, STRAY))?;
            }
        }
        Ok(())
    }

    fn octaves(&self, canvas: &Canvas<'_>, (top, bottom): (f64, f64)) -> Result<()> {
        for key in (self.compass.first + 1)..=self.compass.last {
            if key.rem_euclid(12) == 0 {
                let x = self.compass.at(key) - 0.5 * self.compass.width();
                canvas.line((x, top), (x, bottom), Pen::new(1.0, GRID))?;
            }
        }
        Ok(())
    }

    fn names(&self, canvas: &Canvas<'_>, y: f64) -> Result<()> {
        let room = |step: &i16| f64::from(*step) * self.compass.width() >= NAMES_APART;
        let step = [1, 2, 3, 4, 6, 12].into_iter().find(room).unwrap_or(24);
        for key in (self.compass.first..=self.compass.last).filter(|key| key.rem_euclid(step) == 0)
        {
            let x = self.compass.at(key);
            canvas.line((x, y - 12.0), (x, y - 8.0), Pen::new(1.0, DIM))?;
            canvas.text(x, y, &NoteName::from_midi(key).to_string(), NAME.at(Side::Centre))?;
        }
        Ok(())
    }
}

/// A run of keys.
fn run((low, high): (NoteName, NoteName)) -> String {
    match high.midi() - low.midi() {
        0 => low.to_string(),
        1 => format!("{low}, {high}"),
        _ => format!("{low} to {high}"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::keys::record::AliasRecord;
    use crate::picture::tests::check_texts;

    fn row(key: i16) -> KeyRecord {
        let at = f64::from(key) - 60.0;
        KeyRecord {
            key: NoteName::from_midi(key).to_string(),
            file: "scale.wav".to_owned(),
            start_s: 0.0,
            end_s: 1.0,
            f0_hz: 440.0,
            cents: 4.0 - 0.1 * at,
            f0_sd_cents: 0.2,
            inharmonicity_b: Some(1e-4 * 2_f64.powf(at / 12.0)),
            inharmonicity_sd: Some(2e-6),
            tilt_db_per_octave: Some(-6.0 + 0.05 * at),
            level_dbfs: Some(-18.0 - 0.1 * at),
            settling_s: (key != 61).then_some(0.05),
            worst_alias: (key > 50).then_some(AliasRecord {
                frequency_hz: 3_000.0,
                partial: 99,
                folds: 1,
                relative_db: -50.0,
                over_mask_db: Some(0.5 * at),
            }),
            note: NoteName::from_midi(key),
        }
    }

    fn drawn(rows: &[KeyRecord]) -> String {
        KeysPicture::new(rows, 440.0, Temperament::Equal).unwrap().draw().unwrap()
    }

    #[test]
    fn no_text_lies_on_another_or_leaves_the_picture() {
        let keys = |keys: &[i16]| -> Vec<KeyRecord> { keys.iter().copied().map(row).collect() };
        let holes: Vec<i16> = (21..=108).filter(|key| key % 7 != 0).collect();
        for (what, rows) in [
            ("one key", keys(&[60])),
            ("an octave", keys(&(60..73).collect::<Vec<_>>())),
            ("a wide keyboard with holes", keys(&holes)),
            ("two keys far apart", keys(&[0, 127])),
            ("every other key", keys(&(40..90).step_by(2).collect::<Vec<_>>())),
            ("a key found twice", keys(&[60, 60, 61])),
            ("beyond what MIDI has", keys(&[-8, 3, 140])),
        ] {
            check_texts(what, &drawn(&rows));
        }
        let bare = KeyRecord {
            cents: -1_200.0,
            inharmonicity_b: None,
            inharmonicity_sd: None,
            tilt_db_per_octave: None,
            level_dbfs: None,
            settling_s: None,
            worst_alias: None,
            ..row(66)
        };
        check_texts("a key without figures", &drawn(&[row(60), row(61), bare.clone()]));
        check_texts("nothing but such a key", &drawn(&[bare]));
    }

    #[test]
    fn missing_keys_are_told_as_runs() {
        let rows: Vec<KeyRecord> = [60, 62, 66, 69].map(row).into();
        let picture = KeysPicture::new(&rows, 440.0, Temperament::Equal).unwrap();
        let told: Vec<String> = picture.missing.iter().map(|keys| run(*keys)).collect();
        assert_eq!(told, ["C#4", "Eb4 to F4", "G4, G#4"]);
        assert!(KeysPicture::new(&[], 440.0, Temperament::Equal).is_none(), "nothing to draw");
    }
}
