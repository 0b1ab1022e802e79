//! The side panel's captures: what is kept, what is compared, and where it goes.

mod files;
mod rows;
mod sheet;

use egui::{Rect, Ui, vec2};
use plumbtone_analysis::Reading;

use super::difference::Comparison;
use super::mark::Mark;
use super::parts::{self, say};
use super::screen::Shown;
use super::theme::{CORNER, Palette, sans};
use crate::captures::{CAPTURES_MAX, Capture, Captures as Kept, Snapshot, Told};

/// What is told where there is nothing yet.
const NOTHING: &str = "Capture keeps the present reading with its name: to compare it with what sounds later, or with another. Captures stay with the session.";
/// How long what was done is told, in seconds.
const TOLD_S: f64 = 4.0;

/// One of the two sounds that are compared.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(crate) enum Side {
    /// What is heard now.
    #[default]
    Live,
    /// A capture, by its number.
    Kept(u64),
}

/// The captures as the editor saw them last, and what is done with them.
#[derive(Debug, Clone, Default)]
pub(crate) struct Captures {
    snapshot: Snapshot,
    opened: Option<u64>,
    /// What is compared with what: the first one, if any, and the second.
    first: Option<u64>,
    second: Side,
    comparison: Option<Comparison>,
    /// A file to read or write.
    path: String,
    /// Number of the last thing told, when that was, and whether it is old news.
    told: Option<(u64, f64)>,
    looked: bool,
}

impl Captures {
    /// Looks at the captures, never waiting for them, and compares what is chosen.
    pub(crate) fn update(&mut self, shown: &Shown<'_>) {
        shown.parameters.captures.look(&mut self.snapshot);
        let newest = self.snapshot.told.as_ref().map(|told| told.number);
        if newest != self.told.map(|told| told.0) {
            // What was told before the editor was opened is no news.
            let at = if self.looked { shown.time_s } else { f64::NEG_INFINITY };
            self.told = newest.map(|number| (number, at));
        }
        self.looked = true;
        self.first = self.first.filter(|&number| self.capture(number).is_some());
        if let Side::Kept(number) = self.second
            && self.capture(number).is_none()
        {
            self.second = Side::Live;
        }
        self.compare(shown);
    }

    /// What is compared, if anything is.
    pub(crate) fn comparison(&mut self) -> Option<&mut Comparison> {
        self.comparison.as_mut()
    }

    /// How many there are.
    pub(crate) fn count(&self) -> usize {
        self.snapshot.captures.len()
    }

    /// Compares a capture with another one or with what is heard; `None` ends it.
    pub(crate) fn choose(&mut self, first: Option<u64>, second: Side) {
        (self.first, self.second) = (first, second);
    }

    fn capture(&self, number: u64) -> Option<&Capture> {
        self.snapshot.captures.iter().find(|capture| capture.number == number)
    }

    fn compare(&mut self, shown: &Shown<'_>) {
        let side = |capture: &Capture| (Mark::of(capture), capture.name.clone(), capture.reading());
        let Some(first) = self.first.and_then(|number| self.capture(number)).map(side) else {
            self.comparison = None;
            return;
        };
        let second = match self.second {
            Side::Live => (Mark::Live, "live".to_owned(), live(shown)),
            Side::Kept(number) => match self.capture(number) {
                Some(capture) => side(capture),
                None => return,
            },
        };
        self.comparison.get_or_insert_default().update([first, second], shown.time_s);
    }

    /// What was done last, while it is news, and for how long it will be.
    fn news(&self, now_s: f64) -> Option<(&Told, f64)> {
        let (_, at) = self.told?;
        let left = TOLD_S - (now_s - at);
        Some((self.snapshot.told.as_ref()?, left)).filter(|_| left > 0.0)
    }
}

/// The reading on display, if it is one that could be captured.
fn live(shown: &Shown<'_>) -> Reading {
    let held = shown.readout.measured && shown.readout.pitch().is_some();
    if held { shown.readout.reading.clone() } else { Reading::default() }
}

/// Keeps what is shown.
pub(crate) fn capture(shown: &Shown<'_>) {
    let integration_s = f64::from(shown.parameters.analysis.integration.value()) / 1000.0;
    shown.parameters.captures.add(Capture::of(shown.readout, integration_s));
}

/// Draws the panel.
pub(crate) fn show(
    ui: &mut Ui,
    rect: Rect,
    captures: &mut Captures,
    shown: &Shown<'_>,
    palette: &Palette,
) {
    let kept: &Kept = &shown.parameters.captures;
    parts::list(ui, rect, "captures", palette, |ui| {
        if captures.snapshot.captures.is_empty() {
            say(ui, NOTHING, palette);
        } else {
            let text = format!(
                "{} of at most {CAPTURES_MAX}. A and B choose what is compared.",
                captures.count()
            );
            say(ui, &text, palette);
            rows::show(ui, captures, kept, palette);
            if let Some(comparison) = &captures.comparison {
                sheet::show(ui, comparison, palette);
            }
        }
        files::show(ui, captures, kept, palette);
    });
    if captures.snapshot.busy {
        // What comes of it is told without further news.
        ui.ctx().request_repaint_after(core::time::Duration::from_millis(100));
    }
}

/// Tells for a few seconds what came of the last capture, over a view.
pub(crate) fn tell(ui: &mut Ui, view: Rect, captures: &Captures, now_s: f64, palette: &Palette) {
    let Some((told, left_s)) = captures.news(now_s) else { return };
    let colour = if told.done { palette.within } else { palette.stray };
    let width = (view.width() - 48.0).min(620.0);
    let galley = ui.painter().layout(told.text.clone(), sans(13.0), palette.ink, width);
    let size = galley.size() + vec2(40.0, 16.0);
    let at = egui::pos2(view.center().x - size.x / 2.0, view.top() + 34.0);
    let card = Rect::from_min_size(at, size);
    let edge = egui::Stroke::new(1.0, colour);
    ui.painter().rect(card, CORNER, palette.lit, edge, egui::StrokeKind::Inside);
    let sign = if told.done { "\u{2713}" } else { "!" };
    let place = card.left_center() + vec2(16.0, 0.0);
    super::ink::mark(
        ui,
        place,
        egui::Align2::CENTER_CENTER,
        sign,
        super::theme::bold(13.0),
        colour,
    );
    ui.painter().galley(card.min + vec2(30.0, 8.0), galley, palette.ink);
    super::ink::label(ui, card, &told.text);
    let wait = core::time::Duration::try_from_secs_f64(left_s).unwrap_or_default();
    ui.ctx().request_repaint_after(wait);
}
