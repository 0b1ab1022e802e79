//! What must not be overlooked: samples that were not measured, and what of a loaded session was unsound.

use egui::{Align2, Rect, Stroke, Ui, vec2};

use super::ink;
use super::screen::Shown;
use super::theme::{CORNER, GAP, Palette, sans};
use crate::readout::Condition;

/// Height of a line.
const LINE: f32 = 20.0;

/// One sentence for each.
pub(crate) fn notices(shown: &Shown<'_>) -> Vec<String> {
    let mut out = Vec::new();
    if matches!(shown.readout.condition, Condition::Failed | Condition::Refused(_))
        && let Some(condition) = super::words::condition(&shown.readout.condition)
    {
        out.push(format!("Nothing is measured: {condition}."));
    }
    let gaps = &shown.readout.gaps;
    let rate = shown.readout.sample_rate_hz;
    for (samples, what) in [
        (gaps.overrun, "not measured in this stream, for lack of computing time"),
        (gaps.non_finite, "in this stream were not finite numbers"),
        (shown.lost_samples, "lost since this instance was loaded"),
    ] {
        if samples > 0 {
            out.push(format!(
                "{samples} samples ({:.2} s) {what}.",
                samples as f64 / rate.max(1.0)
            ));
        }
    }
    if shown.lost_notes > 0 {
        out.push(format!("{} note events lost since this instance was loaded.", shown.lost_notes));
    }
    if shown.late_messages > 0 {
        out.push(format!(
            "{} MIDI messages of checks were sent late, for lack of computing time.",
            shown.late_messages
        ));
    }
    out.extend(shown.unsound.iter().map(|finding| format!("Loaded session: {finding}.")));
    out
}

/// Height that they take.
pub(crate) fn height(count: usize) -> f32 {
    if count == 0 { 0.0 } else { LINE * count.min(4) as f32 + 12.0 + GAP }
}

/// Draws them.
pub(crate) fn show(ui: &mut Ui, rect: Rect, notices: &[String], palette: &Palette) {
    let rect = rect.with_max_y(rect.bottom() - GAP);
    let edge = Stroke::new(1.0, palette.stray);
    ui.painter().rect(rect, CORNER, palette.card, edge, egui::StrokeKind::Inside);
    let mut y = rect.top() + 6.0 + LINE / 2.0;
    for notice in notices.iter().take(4) {
        let at = egui::pos2(rect.left() + 14.0, y);
        ink::mark(ui, at, Align2::LEFT_CENTER, "!", super::theme::bold(13.0), palette.stray);
        let width = rect.width() - 40.0;
        let place = (at + vec2(16.0, 0.0), Align2::LEFT_CENTER);
        ink::text_within(ui, place, (notice, width), sans(12.5), palette.ink).on_hover_text(notice);
        y += LINE;
    }
}
