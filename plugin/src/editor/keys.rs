//! The key sheet: how the sound before this plugin behaves over the keyboard. A row per key in the side panel, and a
//! picture of all of them where the plumb view stands otherwise.

mod compass;
mod picture;
mod rows;
mod scales;
mod strips;
mod words;

use egui::{Rect, RichText, ScrollArea, Stroke, Ui, vec2};

use self::scales::Scales;
use super::checks::reports;
use super::parts::{BAR, act, say, tick};
use super::screen::Shown;
use super::theme::{FIGURE, PAD, Palette};
use crate::keys::{self, Snapshot, Stored};

/// What is told where there is nothing yet.
const NOTHING: &str = "Play notes from the host: into the instrument before this plugin, and the same notes into this plugin. Each key gets a row here by itself, kept with the session; playing a key again replaces its row.";
const UNPLAYED_HELP: &str = "On: sound for which no key is held makes a row too, of the note nearest to its pitch. Off: only keys that the host plays make rows.";

/// Height of the panel below which all of it scrolls, not the rows alone.
const TALL: f32 = 330.0;

/// The sheet as the editor saw it last, and how it is shown.
#[derive(Debug, Clone, Default)]
pub(crate) struct Keys {
    snapshot: Snapshot,
    scales: Scales,
    /// The keys under the pointer: in the sheet, and in the picture.
    in_sheet: Option<u8>,
    in_picture: Option<u8>,
    /// A key whose row is to be scrolled to.
    sought: Option<u8>,
    /// The newest take seen.
    newest: Option<u64>,
    /// Whether it was asked to forget all, and is to be asked again.
    clearing: bool,
}

impl Keys {
    /// Looks at the sheet; never waits for it.
    pub(crate) fn update(&mut self, shown: &Shown<'_>) {
        shown.parameters.sheet.look(&mut self.snapshot);
        let tuning = &shown.readout.tuning;
        self.scales.update(&self.snapshot.stored.rows, tuning, shown.time_s);
        let newest = self.snapshot.stored.newest().map(|row| (row.take, row.key));
        let seen = core::mem::replace(&mut self.newest, newest.map(|(take, _)| take));
        // What has just been played is to be seen, unless somebody is looking at another row.
        if let Some((take, key)) = newest
            && seen.is_some_and(|seen| seen < take)
            && self.in_sheet.is_none()
        {
            self.sought = Some(key);
        }
    }

    /// The sheet as lines of text.
    pub(crate) fn text(&self, shown: &Shown<'_>) -> String {
        words::text(&self.snapshot.stored.rows, &shown.readout.tuning)
    }

    /// The sheet as CSV.
    pub(crate) fn csv(&self, shown: &Shown<'_>) -> String {
        keys::csv(&self.snapshot.stored.rows, &shown.readout.tuning)
    }

    /// Draws the picture.
    pub(crate) fn picture(
        &mut self,
        ui: &mut Ui,
        rect: Rect,
        shown: &Shown<'_>,
        palette: &Palette,
    ) {
        let rows = &self.snapshot.stored.rows;
        let lit = self.in_sheet;
        let done =
            picture::show(ui, rect, (rows, &self.scales, lit), &shown.readout.tuning, palette);
        self.in_picture = done.under_pointer;
        self.sought = done.clicked.or(self.sought);
    }
}

/// Draws the sheet into the side panel.
pub(crate) fn show(ui: &mut Ui, rect: Rect, keys: &mut Keys, shown: &Shown<'_>, palette: &Palette) {
    let area = rect.shrink2(vec2(PAD, 0.0));
    let mut whole = ui.new_child(egui::UiBuilder::new().max_rect(area));
    // A fade in the toolkit's colour would not be the card's.
    whole.spacing_mut().scroll.fade.strength = 0.0;
    whole.visuals_mut().widgets.inactive.bg_stroke = Stroke::new(1.0, palette.edge);
    whole.spacing_mut().item_spacing = vec2(6.0, 5.0);
    let list = ScrollArea::vertical().id_salt("keys").auto_shrink(false).min_scrolled_height(0.0);
    let width = area.width() - BAR;
    keys.in_sheet = if rect.height() < TALL {
        let whole = list.show(&mut whole, |ui| {
            ui.set_width(width);
            above(ui, width, keys, shown, palette);
            sheet(ui, keys, shown, palette)
        });
        whole.inner
    } else {
        above(&mut whole, width, keys, shown, palette);
        let rows = list.show(&mut whole, |ui| {
            ui.set_width(width);
            sheet(ui, keys, shown, palette)
        });
        rows.inner
    };
}

/// What stands above the rows.
fn above(ui: &mut Ui, width: f32, keys: &mut Keys, shown: &Shown<'_>, palette: &Palette) {
    ui.add_space(8.0);
    head(ui, keys, palette);
    settings(ui, keys, shown, palette);
    if !keys.snapshot.stored.rows.is_empty() {
        ui.add_space(2.0);
        rows::heading(ui, width, palette);
    }
}

/// The rows; gives the key under the pointer.
fn sheet(ui: &mut Ui, keys: &mut Keys, shown: &Shown<'_>, palette: &Palette) -> Option<u8> {
    let lit = (keys.in_picture, keys.sought.take());
    rows::show(ui, &keys.snapshot.stored, lit, &shown.readout.tuning, palette)
}

/// Which keys there are, which are still to be played, and what the last note came to if it has no row.
fn head(ui: &mut Ui, keys: &Keys, palette: &Palette) {
    let Snapshot { stored: Stored { rows, .. }, declined, .. } = &keys.snapshot;
    if rows.is_empty() {
        say(ui, NOTHING, palette);
    } else {
        ui.label(RichText::new(words::compass(rows)).size(FIGURE).color(palette.ink));
        if let Some(missing) = words::still_to_play(rows) {
            ui.label(RichText::new(missing).size(FIGURE).color(palette.stray));
        }
    }
    if let Some(declined) = declined {
        say(ui, &words::declined(declined), palette);
    }
}

/// What makes rows, and forgetting all of them.
fn settings(ui: &mut Ui, keys: &mut Keys, shown: &Shown<'_>, palette: &Palette) {
    let sheet = &shown.parameters.sheet;
    let mut unplayed = keys.snapshot.stored.unplayed;
    if tick(ui, &mut unplayed, "rows without played keys", UNPLAYED_HELP) {
        keys.snapshot.stored.unplayed = unplayed;
        sheet.take_unplayed(unplayed);
    }
    let count = keys.snapshot.stored.rows.len();
    if count == 0 {
        keys.clearing = false;
        return;
    }
    ui.horizontal(|ui| {
        if !keys.clearing {
            keys.clearing = act(ui, "forget all keys", palette);
            if act(ui, "write CSV", palette) {
                sheet.write(shown.parameters.results.place(), shown.readout.tuning);
                keys.snapshot.writing = true;
            }
            return;
        }
        if act(ui, &format!("forget {count}, for good"), palette) {
            sheet.clear();
            keys.clearing = false;
        }
        if act(ui, "keep them", palette) {
            keys.clearing = false;
        }
    });
    file(ui, keys, shown, palette);
}

/// Where the file goes, while no folder is set, and what came of the last one.
fn file(ui: &mut Ui, keys: &Keys, shown: &Shown<'_>, palette: &Palette) {
    let Snapshot { told, writing, .. } = &keys.snapshot;
    if told.is_some() || *writing {
        let results = &shown.parameters.results;
        let mut set = results.reports();
        let hint = ("files into the folder", "whole path");
        if reports::entry(ui, &mut set.folder, hint, palette) {
            results.set_reports(set);
        }
    }
    reports::told(ui, told.as_ref(), ".csv", palette);
    if *writing {
        // What comes of the file is told without further news.
        ui.ctx().request_repaint_after(core::time::Duration::from_millis(100));
    }
}
