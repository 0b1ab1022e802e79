//! The head of the picture: which note, how far off, how sure, and under which conditions.

use super::canvas::{Canvas, Side, Type};
use super::theme::{DIM, HEAD, INK, MARGIN, PANEL, PARTIAL, SANS_WIDTH, WIDTH};
use crate::measure::FileFacts;
use crate::output::records::NoteRecord;
use crate::output::words::{deviation_hz, with_deviation};
use anyhow::Result;

const NAME: Type = Type::sans(44.0, INK).bold();
const LABEL: Type = Type::sans(11.0, DIM);
const VALUE: Type = Type::sans(15.0, INK);
/// Where each condition stands: concert pitch, temperament, channel, note.
const CONDITIONS_LEFT: [f64; 4] = [480.0, 590.0, 730.0, 840.0];
/// Left end of the room for the file's name.
const FILE_LEFT: f64 = 940.0;

/// Draws the head for note `number` of a file.
pub(super) fn draw(
    canvas: &Canvas<'_>,
    facts: &FileFacts,
    note: &NoteRecord,
    number: u64,
) -> Result<()> {
    canvas.rectangle((0.0, 0.0), (WIDTH, HEAD), PANEL, 1.0)?;
    let name = note.note.as_deref().unwrap_or("?");
    canvas.text(20.0, 37.0, name, NAME)?;
    // Capitals and figures of the bold type are wide.
    let cents_left = 32.0 + 0.72 * NAME.size * name.chars().count() as f64;
    let cents = with_deviation(note.cents, note.f0_sd_cents, 3, true);
    pair(canvas, cents_left, &cents, "ct", Type::sans(20.0, PARTIAL).bold())?;
    let hz = with_deviation(note.f0_hz, deviation_hz(note), 4, false);
    pair(canvas, cents_left + 150.0, &hz, "Hz", Type::sans(20.0, INK))?;
    let conditions = [
        ("concert pitch", format!("{} Hz", facts.concert_pitch_hz)),
        ("temperament", facts.temperament.to_string()),
        (
            "listening to",
            if facts.channel.is_empty() { "mono".to_owned() } else { facts.channel.clone() },
        ),
        ("note", format!("{number} of {}", facts.notes)),
    ];
    for ((label, value), left) in conditions.into_iter().zip(CONDITIONS_LEFT) {
        canvas.text(left, 28.0, label, LABEL)?;
        canvas.text(left, 49.0, &value, VALUE)?;
    }
    let right = WIDTH - MARGIN;
    canvas.text(right, 28.0, "file", LABEL.at(Side::Right))?;
    let room = (right - FILE_LEFT) / (SANS_WIDTH * VALUE.size);
    canvas.text(right, 49.0, &shortened(&file_name(facts), room), VALUE.at(Side::Right))
}

/// A figure, and its deviation in small below it.
fn pair(canvas: &Canvas<'_>, left: f64, figure: &str, unit: &str, set: Type) -> Result<()> {
    let (value, deviation) = figure.split_once(" ± ").unwrap_or((figure, ""));
    canvas.text(left, 31.0, &format!("{value} {unit}"), set)?;
    if deviation.is_empty() {
        Ok(())
    } else {
        canvas.text(left, 56.0, &format!("± {deviation}"), Type::sans(13.0, DIM))
    }
}

/// The file's name without its folders.
pub(super) fn file_name(facts: &FileFacts) -> String {
    facts.path.file_name().unwrap_or(facts.path.as_os_str()).to_string_lossy().into_owned()
}

/// A text cut in the middle to so many characters.
pub(super) fn shortened(text: &str, room: f64) -> String {
    let letters: Vec<char> = text.chars().collect();
    let room = crate::convert::index(crate::convert::samples_in(room, 1.0)).max(8);
    if letters.len() <= room {
        return text.to_owned();
    }
    let (head, tail) = ((room - 1).div_ceil(2), (room - 1) / 2);
    letters[..head].iter().chain(&['…']).chain(&letters[letters.len() - tail..]).collect()
}
