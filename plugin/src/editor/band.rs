//! The band on top: which note, how sure, what holds, and what is set.

use egui::{Align2, Rect, Ui, pos2, vec2};
use plumbtone_analysis::tuning::Nearest;
use plumbtone_analysis::{Pitch, State};

use super::alias::Alias;
use super::captures;
use super::field::{self, Bench, Field, Place};
use super::ink;
use super::knob::Knob;
use super::screen::Shown;
use super::steady::{self, Steady};
use super::theme::{GAP, LARGE, NOTE, Palette, TEXT, bold, sans};
use super::words::{self, Saying};

/// Height of the band.
pub(crate) const HEIGHT: f32 = 76.0;
/// Buttons: size, and from the right edge.
const BUTTON: egui::Vec2 = vec2(72.0, 32.0);
/// Width of a field, at least and at most, and of all that stands left of the fields at its widest.
const FIELD: f32 = 92.0;
const FIELD_MOST: f32 = 124.0;
const FIGURES: f32 = 372.0;
/// Deviation below which "less than" is said, in cents.
const LEAST_SD: f64 = 0.005;
/// Width of the window below which the buttons stand one above the other.
const NARROW: f32 = 560.0;
/// Lines of the figures.
const UPPER: f32 = 31.0;
const LOWER: f32 = 55.0;

/// The fields, in the order in which they are left out when there is no room, last first.
const FIELDS: [Field; 4] = [
    Field {
        knob: Knob::ConcertPitch,
        caption: "concert pitch",
        help: "Frequency of A4. It names notes and changes no measurement. Drag, scroll, or double-click to type; right-click for 440 Hz.",
        place: Place::Under,
    },
    Field {
        knob: Knob::Temperament,
        caption: "temperament",
        help: "Where the notes lie within the octave; A keeps the concert pitch. Click to choose, right-click for equal.",
        place: Place::Under,
    },
    Field {
        knob: Knob::Integration,
        caption: "integration",
        help: "Time over which the partials are averaged: longer is steadier, shorter follows faster. The pitch itself is never averaged.",
        place: Place::Under,
    },
    Field {
        knob: Knob::Channel,
        caption: "listening to",
        help: "Which signal of a stereo pair is measured: mid is half the sum, side half the difference.",
        place: Place::Under,
    },
];

/// The figures on display, held still.
#[derive(Debug, Clone, Default)]
pub(crate) struct Figures {
    centre: u64,
    since: u64,
    cents: Steady,
    cents_sd: Steady,
    hz: Steady,
    alias: Option<Alias>,
}

impl Figures {
    /// Takes the newest reading.
    pub(crate) fn update(&mut self, shown: &Shown<'_>) {
        let readout = shown.readout;
        let Some((pitch, nearest)) = named(shown) else {
            *self = Self::default();
            return;
        };
        if readout.since != self.since {
            *self = Self { since: readout.since, ..Self::default() };
        }
        if readout.reading.centre == self.centre {
            return;
        }
        let elapsed_s =
            readout.reading.centre.saturating_sub(self.centre) as f64 / readout.sample_rate_hz;
        self.centre = readout.reading.centre;
        let sd = pitch.f0_sd_cents;
        self.cents.update(nearest.cents, sd, elapsed_s, 2);
        self.cents_sd.update(sd, sd / 3.0, elapsed_s, 2);
        let sd_hz = pitch.f0_hz * sd / 1731.0;
        self.hz.update(pitch.f0_hz, sd_hz, elapsed_s, 2);
        self.alias = Alias::next(self.alias.take(), &readout.reading, readout.sample_rate_hz);
        if readout.reading.state == State::Gliding {
            // A pitch on the move is followed without delay.
            self.cents.clear();
            self.hz.clear();
            self.cents.update(nearest.cents, sd.max(0.04), 0.0, 1);
            self.hz.update(pitch.f0_hz, sd_hz.max(0.04), 0.0, 1);
        }
    }
}

/// Draws it.
pub(crate) fn show(
    ui: &mut Ui,
    rect: Rect,
    shown: &Shown<'_>,
    figures: &Figures,
    bench: &mut Bench<'_>,
) {
    let palette = bench.palette;
    ui.painter().rect_filled(rect, 0, palette.card);
    let left = rect.left() + 20.0;
    match (words::saying(shown.readout, shown.position), named(shown)) {
        (Saying::Pitch(state), Some((pitch, nearest))) => {
            pitched(ui, pos2(left, rect.top()), shown, (state, &pitch, &nearest), figures, palette);
        }
        (Saying::Pitch(word) | Saying::NoPitch(word), _) => {
            unpitched(ui, pos2(left, rect.top()), shown, word, palette);
        }
    }
    controls(ui, rect, shown, figures.alias.as_ref(), bench);
}

/// The note of the reading.
fn named(shown: &Shown<'_>) -> Option<(Pitch, Nearest)> {
    let pitch = shown.readout.measured.then(|| shown.readout.pitch()).flatten()?;
    Some((pitch, shown.readout.tuning.nearest(pitch.f0_hz)?))
}

fn pitched(
    ui: &mut Ui,
    at: egui::Pos2,
    shown: &Shown<'_>,
    (state, pitch, nearest): (&str, &Pitch, &Nearest),
    figures: &Figures,
    palette: &Palette,
) {
    let note = words::note(nearest.note);
    let place = (pos2(at.x, at.y + HEIGHT / 2.0), Align2::LEFT_CENTER);
    let response = ink::text(ui, place, &note, bold(NOTE), palette.ink);
    let played = shown.readout.played.map(|key| format!(" Played: {key}.")).unwrap_or_default();
    let response = response.on_hover_text(format!(
        "The nearest note of the temperament.{played} How sure it is this pitch and no other: {:.0} %.",
        100.0 * pitch.confidence
    ));
    let x = (response.rect.right() + 14.0).max(at.x + 84.0);
    let upper = |x| (pos2(x, at.y + UPPER), Align2::LEFT_CENTER);
    let lower = |x| (pos2(x, at.y + LOWER), Align2::LEFT_CENTER);
    let cents = format!("{} ct", figures.cents.text(true));
    let cents = ink::text(ui, upper(x), &cents, bold(LARGE), palette.pitch);
    let cents_right = cents.rect.right();
    cents.on_hover_text("Cents off that note: a hundredth of a semitone each.");
    let sd = match pitch.f0_sd_cents {
        sd if sd < LEAST_SD => "\u{b1} < 0.01".to_owned(),
        _ => format!("\u{b1} {}", figures.cents_sd.text(false)),
    };
    ink::text(ui, lower(x), &sd, sans(TEXT), palette.dim).on_hover_text(
        "One standard deviation of the cents: two of them hold 95 % of what noise does.",
    );
    let x = (x + 118.0).max(cents_right + 16.0);
    let hz = format!("{} Hz", figures.hz.text(false));
    ink::text(ui, upper(x), &hz, sans(LARGE), palette.ink)
        .on_hover_text(format!("Fundamental, {:.4} Hz in this reading.", pitch.f0_hz));
    state_line(ui, lower(x), shown, state, palette);
}

/// What stands where a pitch would.
fn unpitched(ui: &mut Ui, at: egui::Pos2, shown: &Shown<'_>, word: &str, palette: &Palette) {
    let place = (pos2(at.x, at.y + UPPER), Align2::LEFT_CENTER);
    let coming = coming(shown);
    let word = coming.as_deref().unwrap_or(word);
    ink::text(ui, place, word, bold(26.0), palette.ink);
    let place = (pos2(at.x, at.y + LOWER + 3.0), Align2::LEFT_CENTER);
    let below = if shown.readout.measured { "no single pitch" } else { "" };
    let below = match words::condition(&shown.readout.condition) {
        Some(condition) => condition,
        None if shown.readout.measured && coming.is_none() => {
            format!("{below} {}, {}", since(shown), words::level_dbfs(&shown.readout.reading))
        }
        None => below.to_owned(),
    };
    ink::text_within(ui, place, (&below, FIGURES - 10.0), sans(TEXT), palette.dim)
        .on_hover_text(below.clone());
}

/// A pitch that the quick, less sure look already sees before the reading does.
fn coming(shown: &Shown<'_>) -> Option<String> {
    let live = shown.readout.live?;
    let newer = live.centre > shown.readout.reading.centre;
    let pitch =
        live.pitch.filter(|pitch| newer && pitch.confidence >= crate::trail::CONFIDENCE_SHOWN)?;
    let measuring = words::condition(&shown.readout.condition).is_none();
    let nearest = shown.readout.tuning.nearest(pitch.f0_hz).filter(|_| measuring)?;
    Some(format!("{}, about {} ct", words::note(nearest.note), steady::signed(nearest.cents, 0)))
}

fn state_line(
    ui: &mut Ui,
    place: (egui::Pos2, Align2),
    shown: &Shown<'_>,
    state: &str,
    palette: &Palette,
) {
    let mut text = format!("{state} {}", since(shown));
    if let Some(condition) = words::condition(&shown.readout.condition) {
        text = format!("{condition}, {text}");
    }
    ink::text_within(ui, place, (&text, 168.0), sans(TEXT), palette.dim).on_hover_text(
        "Steady: the pitch holds. Gliding: it is on the move. The time is how long this note has been so.",
    );
}

/// How long the reading has said the same.
fn since(shown: &Shown<'_>) -> String {
    let readout = shown.readout;
    let lasted = readout.reading.centre.saturating_sub(readout.since) as f64;
    words::lasting(lasted / readout.sample_rate_hz)
}

/// Freeze, Capture and Check, what is set, and the worst alias if there is one.
fn controls(
    ui: &mut Ui,
    rect: Rect,
    shown: &Shown<'_>,
    alias: Option<&Alias>,
    bench: &mut Bench<'_>,
) {
    let narrow = rect.width() < NARROW;
    let place = |number: f32| {
        if narrow {
            let size = vec2(BUTTON.x, 21.0);
            let y = rect.top() + 4.0 + 23.0 * number;
            Rect::from_min_size(pos2(rect.right() - 14.0 - size.x, y), size)
        } else {
            let x = rect.right() - 14.0 - BUTTON.x - (2.0 - number) * (BUTTON.x + 8.0);
            Rect::from_min_size(pos2(x, rect.top() + 22.0), BUTTON)
        }
    };
    let help = "Holds the present reading on display. Measuring and the drift check go on.";
    field::switch(ui, place(0.0), (Knob::Freeze, "Freeze", help), bench);
    let help = "Keeps the present reading, to compare it later. A host can do the same with the parameter Capture: each time it is switched on.";
    if field::button(ui, place(1.0), "Capture", bench.palette).on_hover_text(help).clicked() {
        captures::capture(shown);
    }
    let help = "Arms the drift check: the pitch is measured even while the editor is closed.";
    field::switch(ui, place(2.0), (Knob::Check, "Check", help), bench);
    if narrow {
        return;
    }
    let left = rect.left() + 20.0 + FIGURES;
    let room = place(0.0).left() - GAP - left;
    let parts = FIELDS.len() + usize::from(alias.is_some());
    let count = (1..=parts).take_while(|&count| count as f32 * FIELD <= room).count();
    let width = (room / count.max(1) as f32).min(FIELD_MOST);
    let slot = |number: usize| {
        let x = left + number as f32 * width;
        Rect::from_min_size(pos2(x, rect.top() + 20.0), vec2(width - 8.0, 38.0))
    };
    let fields = count.min(parts - usize::from(alias.is_some()));
    let fields = if alias.is_some() && count < parts { count.saturating_sub(1) } else { fields };
    for (number, field) in FIELDS.iter().take(fields).enumerate() {
        field::field(ui, slot(number), field, bench);
    }
    if let Some(alias) = alias.filter(|_| count > 0) {
        alias.show(ui, slot(fields), bench.palette);
    }
}
