//! What a person types into a parameter: notes, frequencies, cents and times, with or without their unit.

use plumbtone_analysis::tuning::{NoteName, Temperament, Tuning, ratio};

use super::STANDARD_HZ;
use crate::convert::single;

/// A frequency in Hz from `440`, `440 Hz`, `0.44 kHz`, `A3`, `A3 -3.5 ct`. Notes are those of equal temperament.
pub(super) fn frequency(entry: &str, concert_pitch_hz: f32) -> Option<f32> {
    hertz(entry).or_else(|| note(entry, concert_pitch_hz))
}

/// A concert pitch in Hz from `442`, `442 Hz`, `A4 = 442`, or from cents off the standard: `-3.5 ct`.
pub(super) fn concert_pitch(entry: &str) -> Option<f32> {
    let value = entry.rsplit('=').next().unwrap_or(entry);
    let off_standard = || {
        let (number, unit) = split(value)?;
        is_cents(unit).then(|| STANDARD_HZ * single(ratio(f64::from(number))))
    };
    hertz(value).or_else(off_standard)
}

/// Cents from `5`, `5 ct`, `5 cents`.
pub(super) fn cents(entry: &str) -> Option<f32> {
    let (number, unit) = split(entry)?;
    (unit.is_empty() || is_cents(unit)).then_some(number)
}

/// Milliseconds from `400`, `400 ms`, `0.4 s`.
pub(super) fn milliseconds(entry: &str) -> Option<f32> {
    let (number, unit) = split(entry)?;
    match unit {
        "" | "ms" => Some(number),
        "s" => Some(1000.0 * number),
        _ => None,
    }
}

/// A MIDI number from `60`, or from the name of a note: `C4`.
pub(super) fn midi_number(entry: &str) -> Option<i32> {
    let entry = entry.trim();
    let named = || entry.parse().ok().map(|note: NoteName| i32::from(note.midi()));
    entry.parse().ok().or_else(named).filter(|number| (0..=127).contains(number))
}

fn hertz(entry: &str) -> Option<f32> {
    let (number, unit) = split(entry)?;
    let hz = match unit.to_ascii_lowercase().as_str() {
        "" | "hz" => number,
        "khz" | "k" => 1000.0 * number,
        _ => return None,
    };
    (hz > 0.0).then_some(hz)
}

/// A note name, perhaps followed by cents.
fn note(entry: &str, concert_pitch_hz: f32) -> Option<f32> {
    let entry = entry.trim();
    // The octave ends the name; its minus sign directly follows a letter or accidental, that of the cents a digit.
    let octave = entry.find(|c: char| c.is_ascii_digit())?;
    let name_end = octave
        + entry[octave..].find(|c: char| !c.is_ascii_digit()).unwrap_or(entry.len() - octave);
    let (name, rest) = entry.split_at(name_end);
    let name: NoteName = name.parse().ok()?;
    let off = if rest.trim().is_empty() { 0.0 } else { cents(rest)? };
    let tuning = Tuning::new(f64::from(concert_pitch_hz), Temperament::Equal).ok()?;
    Some(single(tuning.frequency_hz(name) * ratio(f64::from(off))))
}

/// A finite number (a decimal comma will do) and the unit behind it.
fn split(entry: &str) -> Option<(f32, &str)> {
    let entry = entry.trim();
    let end = entry
        .find(|c: char| {
            !(c.is_ascii_digit() || matches!(c, '+' | '-' | '.' | ',' | '\u{2212}' | ' '))
        })
        .unwrap_or(entry.len());
    let (number, unit) = entry.split_at(end);
    let number = number.replace(' ', "").replace(',', ".").replace('\u{2212}', "-");
    let number: f32 = number.parse().ok()?;
    number.is_finite().then_some((number, unit.trim()))
}

fn is_cents(unit: &str) -> bool {
    matches!(unit.to_ascii_lowercase().as_str(), "ct" | "cent" | "cents" | "\u{a2}")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn midi_numbers_read_as_numbers_or_notes() {
        let entries = [("60", 60), (" 0 ", 0), ("127", 127), ("C4", 60), ("a4", 69), ("Bb3", 58)];
        for (entry, expected) in entries {
            assert_eq!(midi_number(entry), Some(expected), "{entry}");
        }
        for entry in ["", "128", "-1", "H4", "C20", "1.5"] {
            assert_eq!(midi_number(entry), None, "{entry}");
        }
    }

    #[test]
    fn frequencies_read_as_hertz_or_notes() {
        for (entry, expected) in [
            ("440", 440.0),
            ("440 Hz", 440.0),
            ("440,5hz", 440.5),
            ("0.44 kHz", 440.0),
            ("A3", 220.0),
            ("a3", 220.0),
            ("A-1", 13.75),
            ("A4 +1200 ct", 880.0),
            ("A4-1200ct", 220.0),
            ("C4 0 cents", 261.62558),
            ("Bb3", 233.08188),
        ] {
            let hz = frequency(entry, 440.0).unwrap_or(0.0);
            assert!((hz / expected - 1.0).abs() < 1e-6, "{entry}: {hz}");
        }
        let baroque = frequency("A3", 415.0).unwrap_or(0.0);
        assert!((baroque - 207.5).abs() < 1e-4, "notes follow the concert pitch: {baroque}");
    }

    #[test]
    fn concert_pitch_reads_cents_off_the_standard() {
        for (entry, expected) in [
            ("442", 442.0),
            ("A4 = 442 Hz", 442.0),
            ("-3.5 ct", 439.11136),
            ("\u{2212}100 cents", 415.3047),
        ] {
            let hz = concert_pitch(entry).unwrap_or(0.0);
            assert!((hz / expected - 1.0).abs() < 1e-6, "{entry}: {hz}");
        }
    }

    #[test]
    fn times_read_in_both_units() {
        for (entry, expected) in [("400", 400.0), ("400 ms", 400.0), ("0.4 s", 400.0)] {
            let ms = milliseconds(entry).unwrap_or(0.0);
            assert!((ms - expected).abs() < 1e-3, "{entry}: {ms}");
        }
    }

    #[test]
    fn nonsense_is_refused() {
        for entry in
            ["", "Hz", "-440", "0", "nan", "inf", "1e400", "A", "A4 Hz", "440 ct", "--1", "A4 +x"]
        {
            assert_eq!(frequency(entry, 440.0), None, "{entry:?}");
        }
        for entry in ["", "ct", "5 Hz", "five"] {
            assert_eq!(cents(entry), None, "{entry:?}");
            assert_eq!(milliseconds(entry), None, "{entry:?}");
        }
    }
}
