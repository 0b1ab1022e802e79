//! Expected notes from CSV: a head line, then one note a line.

use anyhow::{Context as _, Result, bail};
use plumbtone_analysis::check::Expected;
use plumbtone_analysis::tuning::{NoteName, Tuning};

/// The columns that count; others are left alone.
const START: &str = "start_s";
const END: &str = "end_s";
const NOTE: &str = "note";
const FREQUENCY: &str = "f0_hz";

/// The notes of a sheet. A note's name counts where there is one, else its frequency.
///
/// # Errors
/// A column that is missing, a line that is no note.
pub(super) fn notes(bytes: &[u8], tuning: &Tuning) -> Result<Vec<Expected>> {
    let mut rows = csv::ReaderBuilder::new().trim(csv::Trim::All).from_reader(bytes);
    let head = rows.headers().context("is neither a MIDI file nor CSV")?.clone();
    let column = |name: &str| head.iter().position(|head| head.eq_ignore_ascii_case(name));
    let (Some(start), Some(end)) = (column(START), column(END)) else {
        bail!("has no columns {START} and {END} in its head line");
    };
    let (note, frequency) = (column(NOTE), column(FREQUENCY));
    if note.is_none() && frequency.is_none() {
        bail!("has neither a column {NOTE} nor {FREQUENCY} in its head line");
    }
    let mut notes = Vec::new();
    for row in rows.records() {
        let row = row.context("is no sound CSV")?;
        let line = row.position().map_or(0, csv::Position::line);
        let cell =
            |at: Option<usize>| at.and_then(|at| row.get(at)).filter(|cell| !cell.is_empty());
        let number = |at, what| {
            let text = cell(Some(at)).unwrap_or_default();
            finite(text).with_context(|| format!("line {line}: {what} is no number: {text:?}"))
        };
        let f0_hz = match (cell(note), cell(frequency)) {
            (Some(name), _) => {
                let name: NoteName = name.parse().with_context(|| format!("line {line}"))?;
                tuning.frequency_hz(name)
            }
            (None, Some(hz)) => finite(hz)
                .filter(|hz| *hz > 0.0)
                .with_context(|| format!("line {line}: {FREQUENCY} is no frequency: {hz:?}"))?,
            (None, None) => bail!("line {line}: tells neither a note nor a frequency"),
        };
        notes.push(Expected { start_s: number(start, START)?, end_s: number(end, END)?, f0_hz });
    }
    Ok(notes)
}

fn finite(text: &str) -> Option<f64> {
    text.parse::<f64>().ok().filter(|value| value.is_finite())
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn notes_are_named_or_told_by_frequency() {
        let text =
            "note_number, start_s, end_s, f0_hz, note\n1, 0.5, 1.5, 219.1, A3\n2, 2, 3, 330.5,\n";
        let found = notes(text.as_bytes(), &Tuning::default()).unwrap();
        let expected = [(0.5, 1.5, 220.0), (2.0, 3.0, 330.5)]
            .map(|(start_s, end_s, f0_hz)| Expected { start_s, end_s, f0_hz });
        assert_eq!(found, expected, "{text}");
    }

    #[test]
    fn what_is_wrong_is_said_with_its_line() {
        for (text, reason) in [
            ("start,end,note\n", "no columns start_s and end_s"),
            ("start_s,end_s\n", "neither a column note nor f0_hz"),
            ("start_s,end_s,note\n0,1,H3\n", "line 2"),
            ("start_s,end_s,note\n0,1,A3\nx,2,A3\n", "line 3: start_s is no number: \"x\""),
            ("start_s,end_s,f0_hz\n0,1,-3\n", "line 2: f0_hz is no frequency"),
            ("start_s,end_s,note,f0_hz\n0,1,,\n", "line 2: tells neither"),
        ] {
            let error = notes(text.as_bytes(), &Tuning::default()).unwrap_err();
            assert!(format!("{error:#}").contains(reason), "{text:?}: {error:#}");
        }
    }
}
