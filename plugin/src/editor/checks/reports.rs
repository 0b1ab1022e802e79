//! Where reports go, when they are written, and what came of the last one.

use egui::{Role, TextEdit, Ui, WidgetInfo};

use super::super::parts::{act, say, tick, warn};
use super::super::theme::{FIGURE, Palette, sans};
use super::Checks;
use crate::check::{CAUTION, Results};
use crate::report_files::Told;

/// Draws it.
pub(super) fn show(ui: &mut Ui, checks: &mut Checks, results: &Results, palette: &Palette) {
    ui.add_space(6.0);
    ui.separator();
    let mut reports = checks.snapshot.stored.reports.clone();
    let mut changed =
        entry(ui, &mut reports.folder, ("reports into the folder", "whole path"), palette);
    changed |= entry(ui, &mut reports.name, ("named", "Plumbtone"), palette);
    let help = "When the host has rendered offline, what was checked in that render is written.";
    changed |= tick(ui, &mut reports.automatic, "a report after each bounce", help);
    if changed {
        checks.snapshot.stored.reports.clone_from(&reports);
        results.set_reports(reports);
    }
    if act(ui, "write report", palette) {
        results.report();
        checks.snapshot.writing = true;
    }
    told(ui, checks.snapshot.told.as_ref(), ".csv, .json, .svg", palette);
    say(ui, CAUTION, palette);
}

/// What came of writing files with some endings.
pub(in crate::editor) fn told(ui: &mut Ui, told: Option<&Told>, endings: &str, palette: &Palette) {
    match told {
        Some(Told::Written(place)) => say(ui, &format!("written: {place}{endings}"), palette),
        Some(Told::Failed(why)) => {
            let text = format!("No report was written: {why}. The results are still here.");
            warn(ui, &text, palette);
        }
        None => {}
    }
}

/// A line of text; true when it changed.
pub(in crate::editor) fn entry(
    ui: &mut Ui,
    text: &mut String,
    (caption, hint): (&str, &str),
    palette: &Palette,
) -> bool {
    say(ui, caption, palette);
    let edit = TextEdit::singleline(text).hint_text(hint).desired_width(f32::INFINITY);
    let response = ui.add(edit.font(sans(FIGURE)));
    response.widget_info(|| WidgetInfo::labeled(Role::TextInput, true, caption));
    response.changed()
}
