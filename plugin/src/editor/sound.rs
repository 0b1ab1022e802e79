//! The side panel's figures of the sound: what the partials say together, what belongs to none, and the whole track.

mod figures;

use egui::{Align2, Rect, Sense, Stroke, Ui, pos2, vec2};
use plumbtone_analysis::Stray;
use plumbtone_analysis::keys::alias_now;
use plumbtone_analysis::tuning::ratio;

pub(crate) use self::figures::{Figures, power_of_ten, stretch};
use super::screen::Shown;
use super::steady::signed;
use super::theme::{FIGURE, PAD, Palette, SMALL, mono, sans};
use super::words;
use super::{alias, ink};
use crate::offset::{Explanation, explain};
use crate::voices::Summary;

/// Height of a line, and of one in the list of strays.
const LINE: f32 = 25.0;
const STRAY_LINE: f32 = 22.0;
/// Height of a rule and its heading.
const HEADING: f32 = 38.0;
/// Room that is kept for the whole track below the strays.
const TRACK: f32 = 98.0;
/// The same for the last note's voices.
const VOICES: f32 = 78.0;

/// Draws it.
pub(crate) fn show(
    ui: &mut Ui,
    rect: Rect,
    shown: &Shown<'_>,
    figures: &Figures,
    palette: &Palette,
) {
    let mut whole = ui.new_child(egui::UiBuilder::new().max_rect(rect));
    egui::ScrollArea::vertical().id_salt("sound").show(&mut whole, |ui| {
        let area = Rect::from_min_size(ui.cursor().min, rect.size()).shrink2(vec2(PAD, 0.0));
        let bottom = all(ui, area, shown, figures, palette);
        ui.allocate_rect(area.with_max_y(bottom), Sense::hover());
    });
}

/// Draws all of it; gives where it ends.
fn all(ui: &mut Ui, area: Rect, shown: &Shown<'_>, figures: &Figures, palette: &Palette) -> f32 {
    let mut y = area.top() + 10.0;
    for (caption, value, help) in figures.lines() {
        let middle = y + LINE / 2.0;
        let left = (pos2(area.left(), middle), Align2::LEFT_CENTER);
        ink::text(ui, left, caption, sans(12.0), palette.dim).on_hover_text(help);
        let right = (pos2(area.right(), middle), Align2::RIGHT_CENTER);
        ink::text(ui, right, &value, mono(FIGURE), palette.ink).on_hover_text(help);
        y += LINE;
    }
    let held = shown.readout.measured && shown.readout.pitch().is_some();
    if held && !shown.readout.reading.strays.is_empty() {
        let strays = &shown.readout.reading.strays;
        let track = if shown.readout.offset.is_some() { TRACK } else { 0.0 };
        let track = track + if shown.readout.voices.clusters.is_empty() { 0.0 } else { VOICES };
        let least = y + HEADING + 2.0 * STRAY_LINE;
        let lines = area.with_min_y(y).with_max_y((area.bottom() - track).max(least));
        y = self::strays(ui, lines, strays, shown, palette);
    }
    let y = voices(ui, area.with_min_y(y), shown, palette);
    track(ui, area.with_min_y(y), shown, palette)
}

/// A rule and a heading; gives the next line's top.
fn heading(ui: &mut Ui, area: Rect, text: &str, help: &str, palette: &Palette) -> f32 {
    let y = area.top() + 9.0;
    ui.painter().hline(area.x_range(), y, Stroke::new(1.0, palette.edge));
    let at = (pos2(area.left(), y + 17.0), Align2::LEFT_CENTER);
    ink::text(ui, at, text, sans(SMALL), palette.dim).on_hover_text(help);
    area.top() + HEADING
}

fn strays(ui: &mut Ui, area: Rect, strays: &[Stray], shown: &Shown<'_>, palette: &Palette) -> f32 {
    let help = "Peaks that are no partial of this pitch: aliases, mains hum, another sound.";
    let mut y = heading(ui, area, "belongs to no partial", help, palette);
    let strongest = shown
        .readout
        .reading
        .partials
        .iter()
        .map(|p| p.level_dbfs)
        .fold(f64::NEG_INFINITY, f64::max);
    for (number, stray) in strays.iter().enumerate() {
        let left = strays.len() - number;
        if y + STRAY_LINE * if left > 1 { 2.0 } else { 1.0 } > area.bottom() + 1.0 {
            let more = format!("and {left} weaker");
            let at = (pos2(area.left() + 18.0, y + STRAY_LINE / 2.0), Align2::LEFT_CENTER);
            ink::text(ui, at, &more, sans(12.0), palette.dim);
            return y + STRAY_LINE;
        }
        let middle = y + STRAY_LINE / 2.0;
        ink::diamond(ui, pos2(area.left() + 5.0, middle), 4.5, palette.stray);
        let hz = format!("{} Hz", words::hertz(stray.frequency_hz, 1));
        let at = (pos2(area.left() + 18.0, middle), Align2::LEFT_CENTER);
        ink::text(ui, at, &hz, mono(FIGURE), palette.ink);
        let what = format!("{}, {} dB", words::stray_short(stray), signed(stray.level_dbfs, 0));
        let at = (pos2(area.right(), middle), Align2::RIGHT_CENTER);
        let reading = &shown.readout.reading;
        ink::text(ui, at, &what, sans(12.0), palette.dim).on_hover_ui(|ui| {
            ui.label(alias_now(reading, stray).map_or_else(
                || {
                    format!(
                        "{}: {} dBFS, {} dB to the strongest partial.",
                        words::stray(stray),
                        signed(stray.level_dbfs, 1),
                        signed(stray.level_dbfs - strongest, 1)
                    )
                },
                |alias| alias::sentence(&alias),
            ));
        });
        y += STRAY_LINE;
    }
    y
}

/// Partials that are several lines.
fn voices(ui: &mut Ui, area: Rect, shown: &Shown<'_>, palette: &Palette) -> f32 {
    let voices = &shown.readout.voices;
    let Some(Summary { lines, spread_cents, lowest, highest }) = voices.summary() else {
        return area.top();
    };
    let help = "How many of the partials are no single line: detuned voices, a chorus, strings in pairs. Told from the last whole note, for a reading is too short to tell such lines apart; the plumb view shows how wide they lie.";
    let mut y = heading(ui, area, "several lines, in the last note", help, palette);
    let note = shown.readout.tuning.nearest(voices.f0_hz).map(|nearest| words::note(nearest.note));
    let count = match lines {
        (few, most) if few == most => format!("{few} lines"),
        (few, most) => format!("{few} to {most} lines"),
    };
    let first = format!(
        "{}: {count}, {spread_cents:.1} ct wide, in {} of {}",
        note.unwrap_or_else(|| "?".to_owned()),
        voices.clusters.len(),
        voices.partials
    );
    let mut second = format!("beats: partial {} {:.2} Hz", lowest.0, lowest.1);
    if highest.0 != lowest.0 {
        second = format!("{second}, {} {:.2} Hz", highest.0, highest.1);
    }
    for (line, colour) in [(first, palette.ink), (second, palette.dim)] {
        let at = (pos2(area.left(), y + 9.0), Align2::LEFT_CENTER);
        ink::text_within(ui, at, (&line, area.width()), sans(FIGURE), colour)
            .on_hover_text(line.clone());
        y += 20.0;
    }
    y
}

fn track(ui: &mut Ui, area: Rect, shown: &Shown<'_>, palette: &Palette) -> f32 {
    let Some(offset) = shown.readout.offset else { return area.top() };
    let help =
        "All notes so far lie this far off: one constant for the whole track, and what it fits.";
    let mut y = heading(ui, area, "this whole track", help, palette);
    let concert_hz = shown.readout.tuning.concert_pitch_hz();
    let found = explain(&offset, concert_hz);
    let first = format!("{} \u{b1} {:.1} ct, constant", signed(offset.cents, 1), offset.sd_cents);
    let pitch = format!("as if A4 = {:.1} Hz", concert_hz * ratio(offset.cents));
    let in_tune = found.contains(&Explanation::InTune);
    let lines = [Some(first), (!in_tune).then_some(pitch)].into_iter().flatten();
    let lines = lines.chain(found.iter().map(Explanation::to_string));
    for (number, line) in lines.enumerate() {
        let at = (pos2(area.left(), y + 9.0), Align2::LEFT_CENTER);
        let colour = if number == 0 { palette.ink } else { palette.dim };
        ink::text_within(ui, at, (&line, area.width()), sans(12.5), colour)
            .on_hover_text(line.clone());
        y += 20.0;
    }
    y
}
