//! The picture of a file: the plumb view of one of its notes, what the note's partials say together, and the level of
//! each over its time.

mod axis;
mod canvas;
pub(crate) mod drift;
mod head;
mod history;
pub(crate) mod keys;
mod levels;
mod plumb;
mod raster;
mod sound;
mod theme;

use crate::measure::{FileFacts, Timebase};
use crate::output::records::{GapRecord, NoteRecord};
use crate::output::{Ending, Report, new_file_for, publish};
use anyhow::{Context as _, Result};
use history::LevelHistory;
use levels::Levels;
use plumbtone_analysis::{Gap, Reading};
use std::io::Write as _;
use std::path::{Path, PathBuf};
use theme::{GROUND, HEAD, LEVELS_HEIGHT, MARGIN, WIDTH};

/// Gaps marked at most.
const GAPS_MAX: usize = 1024;

/// The note to be drawn.
struct Chosen {
    number: u64,
    note: NoteRecord,
    levels: LevelHistory,
}

/// The picture of one file in the making.
pub(crate) struct PictureReport {
    place: PathBuf,
    wanted: Option<u32>,
    timebase: Timebase,
    notes: u64,
    chosen: Option<Chosen>,
    /// Since the last note.
    history: LevelHistory,
    gaps: Vec<GapRecord>,
}

impl PictureReport {
    /// Draws note number `wanted`, or the longest.
    pub(crate) fn new(place: PathBuf, wanted: Option<u32>, timebase: Timebase) -> Self {
        let history = LevelHistory::default();
        Self { place, wanted, timebase, notes: 0, chosen: None, history, gaps: Vec::new() }
    }

    /// The picture as an SVG document.
    fn draw(&self, facts: &FileFacts, chosen: &Chosen) -> Result<String> {
        let Chosen { number, note, levels } = chosen;
        let plumb_height = plumb::height(note);
        let levels_top = HEAD + MARGIN + plumb_height + 12.0;
        let height = levels_top + LEVELS_HEIGHT + MARGIN;
        let levels = Levels { history: levels, gaps: &self.gaps, note, timebase: self.timebase };
        canvas::svg(WIDTH, height, |canvas| {
            canvas.rectangle((0.0, 0.0), (WIDTH, height), GROUND, 1.0)?;
            head::draw(canvas, facts, note, *number)?;
            plumb::draw(canvas, note)?;
            sound::draw(canvas, note, plumb_height)?;
            levels.draw(canvas, levels_top)
        })
    }
}

impl Report for PictureReport {
    fn reading(&mut self, reading: &Reading) -> Result<()> {
        self.history.push(reading);
        Ok(())
    }

    fn note(&mut self, note: &NoteRecord) -> Result<()> {
        self.notes += 1;
        let choose = match self.wanted {
            Some(wanted) => self.notes == u64::from(wanted),
            None => {
                self.chosen.as_ref().is_none_or(|chosen| note.length_s() > chosen.note.length_s())
            }
        };
        let levels = self.history.take(note.span.clone());
        if choose {
            self.chosen = Some(Chosen { number: self.notes, note: note.clone(), levels });
        }
        Ok(())
    }

    fn gap(&mut self, gap: &Gap) -> Result<()> {
        if self.gaps.len() < GAPS_MAX {
            self.gaps.push(GapRecord::new(gap, self.timebase));
        }
        Ok(())
    }

    fn finish(self: Box<Self>, facts: &FileFacts) -> Result<Ending> {
        match (&self.chosen, self.wanted) {
            (Some(chosen), _) => {
                write(&self.place, &self.draw(facts, chosen)?)?;
                Ok(Ending::default())
            }
            (None, Some(wanted)) => Ok(Ending::unmet(format!(
                "no picture was drawn: there is no note {wanted}, the file has {}",
                facts.notes
            ))),
            (None, None) => Ok(Ending::unmet("no picture was drawn: there is no note".to_owned())),
        }
    }
}

fn write(place: &Path, svg: &str) -> Result<()> {
    let is_png = place.extension().is_some_and(|extension| extension.eq_ignore_ascii_case("png"));
    let bytes = if is_png { raster::png(svg)? } else { svg.as_bytes().to_vec() };
    let mut file = new_file_for(place)?;
    file.write_all(&bytes).with_context(|| format!("cannot write {}", place.display()))?;
    publish(file, place)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::fixtures;
    use plumbtone_analysis::Note;
    use plumbtone_analysis::tuning::Temperament;
    use resvg::usvg;

    #[test]
    fn no_text_lies_on_another_or_leaves_the_picture() {
        for (what, partials, strays) in [
            ("a usual note", 20, fixtures::few_strays()),
            ("no strays", 40, Vec::new()),
            ("a single partial", 1, fixtures::few_strays()),
            ("everything at once", 128, fixtures::many_strays(700)),
        ] {
            check_texts(what, &picture(&fixtures::note(partials, strays), &fixtures::facts()));
        }
        let long = FileFacts {
            path: format!("{}.wav", "a very long name of a take ".repeat(9)).into(),
            channel: "channel 26".to_owned(),
            concert_pitch_hz: 415.305,
            temperament: Temperament::Werckmeister3,
            notes: 12_345,
            ..fixtures::facts()
        };
        let low = Note { f0_hz: 17.7, f0_sd_cents: 23.4, ..fixtures::note(20, Vec::new()) };
        check_texts("long words in the head", &picture(&low, &long));
        let high = Note { f0_hz: 4_971.3, f0_sd_cents: 0.0004, ..fixtures::note(4, Vec::new()) };
        check_texts("many digits in the head", &picture(&high, &long));
    }

    pub(super) fn check_texts(what: &str, svg: &str) {
        // Texts are laid out with the fonts brought along; without one they would be missing here.
        let tree = raster::tree(svg).unwrap();
        let mut texts = Vec::new();
        collect_texts(tree.root(), &mut texts);
        assert!(texts.len() > 20, "{what}: {} texts", texts.len());
        let (width, height) = (tree.size().width(), tree.size().height());
        for (index, (text, place)) in texts.iter().enumerate() {
            let across = place.left() >= 0.0 && place.right() <= width;
            let down = place.top() >= 0.0 && place.bottom() <= height;
            assert!(across && down, "{what}: {text:?} leaves the picture: {place:?}");
            for (other, other_place) in &texts[..index] {
                let apart = !overlap(place, other_place);
                assert!(apart, "{what}: {text:?} lies on {other:?}: {place:?}, {other_place:?}");
            }
        }
    }

    fn picture(note: &Note, facts: &FileFacts) -> String {
        let mut report = PictureReport::new("a.svg".into(), None, fixtures::TIMEBASE);
        let partials = note.partials.last().map_or(0, |partial| partial.number);
        for index in 0..300 {
            report.reading(&fixtures::reading(24_000 + index * 400, partials)).unwrap();
        }
        report.note(&fixtures::record(note)).unwrap();
        let chosen = report.chosen.take().unwrap();
        report.draw(facts, &Chosen { number: facts.notes, ..chosen }).unwrap()
    }

    fn collect_texts(group: &usvg::Group, texts: &mut Vec<(String, usvg::Rect)>) {
        for node in group.children() {
            match node {
                usvg::Node::Group(group) => collect_texts(group, texts),
                usvg::Node::Text(text) => {
                    let letters = text.chunks().iter().map(|chunk| chunk.text()).collect();
                    texts.push((letters, text.abs_bounding_box()));
                }
                usvg::Node::Path(_) | usvg::Node::Image(_) => {}
            }
        }
    }

    fn overlap(a: &usvg::Rect, b: &usvg::Rect) -> bool {
        a.left() < b.right() && b.left() < a.right() && a.top() < b.bottom() && b.top() < a.bottom()
    }
}
