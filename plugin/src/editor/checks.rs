//! The side panel's drift checks: results, what is done with them, and their reports.

mod midi;
pub(super) mod reports;
mod rows;

use egui::{Color32, Pos2, Rect, RichText, Shape, Stroke, Ui, pos2};

use super::field::Bench;
use super::parts::{self, act, say, tick};
use super::steady::signed;
use super::theme::{FIGURE, Palette};
use crate::check::{CheckResult, Results, Snapshot, VerdictWord};

/// What is told where there is nothing yet.
const NOTHING: &str = "Switch Check on, or automate it: each stretch over which it is on ends in a verdict here, kept with the session.";

/// The results as the editor saw them last, and what is opened of them.
#[derive(Debug, Clone, Default)]
pub(crate) struct Checks {
    snapshot: Snapshot,
    opened: Option<u64>,
    /// Whether it was asked to forget all, and is to be asked again.
    clearing: bool,
    /// A stretch of the trail that is to be shown.
    pub(crate) jump: Option<(f64, f64)>,
}

impl Checks {
    /// Looks at the results; never waits for them.
    pub(crate) fn update(&mut self, results: &Results) {
        results.look(&mut self.snapshot);
    }

    /// All that is known of the checks.
    pub(crate) fn snapshot(&self) -> &Snapshot {
        &self.snapshot
    }

    /// What the check that is on says, or the newest one within a stretch of the trail.
    pub(crate) fn verdict(&self, (from, to): (f64, f64)) -> Option<(VerdictWord, String)> {
        if let Some(running) = &self.snapshot.running {
            let text =
                format!("check on: {}{}", running.verdict.name(), worst(running.worst_cents));
            return Some((running.verdict, text));
        }
        let within = |result: &&CheckResult| {
            result.in_trail.as_ref().is_some_and(|at| at.start < to && at.end > from)
        };
        let result = self.snapshot.stored.results.iter().rev().find(within)?;
        let (number, word) = (result.number, result.verdict.name());
        Some((result.verdict, format!("check {number}: {word}{}", worst(result.worst_cents))))
    }
}

/// Draws it.
pub(crate) fn show(ui: &mut Ui, rect: Rect, checks: &mut Checks, bench: &mut Bench<'_>) {
    let palette = bench.palette;
    parts::list(ui, rect, "checks", palette, |ui| {
        let results = &bench.parameters.results;
        head(ui, checks, palette);
        rows::show(ui, checks, results, palette);
        passes(ui, checks, results, palette);
        reports::show(ui, checks, results, palette);
        midi::show(ui, bench);
    });
    if checks.snapshot.writing {
        // What comes of the report is told without further news.
        ui.ctx().request_repaint_after(core::time::Duration::from_millis(100));
    }
}

fn head(ui: &mut Ui, checks: &Checks, palette: &Palette) {
    let Snapshot { stored, running, .. } = checks.snapshot();
    if let Some(running) = running {
        let text = format!(
            "on: {} so far{}, against {} \u{b1} {} ct",
            running.verdict.name(),
            worst(running.worst_cents),
            running.reference,
            running.tolerance_cents
        );
        ui.label(RichText::new(text).size(FIGURE).color(colour(running.verdict, palette)));
    }
    if stored.results.is_empty() {
        if running.is_none() {
            say(ui, NOTHING, palette);
        }
        return;
    }
    let count = |word| stored.results.iter().filter(|r| r.verdict == word).count();
    let text = format!(
        "{} outside, {} within, {} unmeasured",
        count(VerdictWord::Outside),
        count(VerdictWord::Within),
        count(VerdictWord::Unmeasured)
    );
    say(ui, &text, palette);
    if stored.left_out > 0 {
        say(ui, &format!("{} older ones had to go for these", stored.left_out), palette);
    }
}

/// Which passes are kept, and forgetting all of them.
fn passes(ui: &mut Ui, checks: &mut Checks, results: &Results, palette: &Palette) {
    ui.add_space(4.0);
    let mut every = checks.snapshot.stored.every_pass;
    let help =
        "Off: a new pass over the same stretch of the session replaces the results that it covers.";
    if tick(ui, &mut every, "keep every pass", help) {
        checks.snapshot.stored.every_pass = every;
        results.keep_every_pass(every);
    }
    let count = checks.snapshot.stored.results.len();
    if count == 0 {
        checks.clearing = false;
        return;
    }
    ui.horizontal(|ui| {
        if !checks.clearing {
            checks.clearing = act(ui, "forget all results", palette);
            return;
        }
        if act(ui, &format!("forget {count}, for good"), palette) {
            results.clear();
            checks.clearing = false;
        }
        if act(ui, "keep them", palette) {
            checks.clearing = false;
        }
    });
}

/// The colour of a verdict; a word or a shape always stands beside it.
pub(crate) fn colour(verdict: VerdictWord, palette: &Palette) -> Color32 {
    match verdict {
        VerdictWord::Within => palette.within,
        VerdictWord::Outside => palette.stray,
        VerdictWord::Unmeasured => palette.dim,
    }
}

/// The shape of a verdict: a disc, a triangle, a ring.
pub(crate) fn shape(at: Pos2, verdict: VerdictWord, palette: &Palette) -> Shape {
    let colour = colour(verdict, palette);
    match verdict {
        VerdictWord::Within => Shape::circle_filled(at, 4.0, colour),
        VerdictWord::Outside => {
            let corners = [(-5.0, 4.0), (0.0, -5.0), (5.0, 4.0)];
            let points = corners.map(|(x, y)| pos2(at.x + x, at.y + y));
            Shape::convex_polygon(points.to_vec(), colour, Stroke::NONE)
        }
        VerdictWord::Unmeasured => Shape::circle_stroke(at, 4.0, Stroke::new(1.5, colour)),
    }
}

fn worst(cents: Option<f64>) -> String {
    cents.map_or_else(String::new, |cents| format!(", worst {} ct", signed(cents, 1)))
}
