//! What the editor says in words.

use plumbtone_analysis::tuning::NoteName;
use plumbtone_analysis::waveform::WaveformFit;
use plumbtone_analysis::{Reading, State, Stray, StrayKind};

use super::steady::{NONE, signed};
use crate::readout::{Condition, Readout};

/// How long a gap is told in the band, in seconds.
const GAP_TOLD_S: f64 = 1.0;

/// What there is to say of an instant: a word that stands where the note would, or the state of the note.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) enum Saying {
    /// A single pitch; its state in a word.
    Pitch(&'static str),
    /// No single pitch: why.
    NoPitch(&'static str),
}

/// What is to be said, the most important first.
pub(crate) fn saying(readout: &Readout, position: u64) -> Saying {
    match readout.condition {
        Condition::Failed => return Saying::NoPitch("analysis failed"),
        Condition::Refused(_) => return Saying::NoPitch("cannot measure"),
        Condition::Waiting => return Saying::NoPitch("waiting for sound"),
        Condition::Measuring | Condition::Frozen | Condition::Paused | Condition::Ended => {}
    }
    let rate = readout.sample_rate_hz;
    let in_gap = readout.last_gap.is_some_and(|gap| {
        gap.end > readout.reading.centre
            && (position.saturating_sub(gap.end) as f64) < GAP_TOLD_S * rate
    });
    if in_gap {
        return Saying::NoPitch("gap");
    }
    if !readout.measured {
        return Saying::NoPitch("listening");
    }
    match (readout.reading.state, readout.pitch()) {
        (State::Steady, Some(_)) => Saying::Pitch("steady"),
        (State::Gliding, Some(_)) => Saying::Pitch("gliding"),
        (State::Silent, _) => Saying::NoPitch("silent"),
        (State::Several, _) => Saying::NoPitch("several pitches"),
        (State::Unpitched, _) => Saying::NoPitch("unpitched"),
        (State::Steady | State::Gliding, None) => Saying::NoPitch("no sure pitch"),
    }
}

/// How the analysis stands, when that needs saying beside the reading.
pub(crate) fn condition(condition: &Condition) -> Option<String> {
    match condition {
        Condition::Waiting | Condition::Measuring => None,
        Condition::Frozen => Some("frozen".to_owned()),
        Condition::Paused => Some("paused".to_owned()),
        Condition::Ended => Some("stopped by the host".to_owned()),
        Condition::Refused(error) => Some(error.to_string()),
        Condition::Failed => {
            Some("a defect of this program; it begins anew when the host restarts it".to_owned())
        }
    }
}

/// How long something has lasted.
pub(crate) fn lasting(seconds: f64) -> String {
    match seconds {
        s if !(s >= 0.0) => String::new(),
        s if s < 9.95 => format!("for {s:.1} s"),
        s if s < 120.0 => format!("for {s:.0} s"),
        s => format!("for {:.0} min", (s / 60.0).floor()),
    }
}

/// A note with its accidental as print has it.
pub(crate) fn note(note: NoteName) -> String {
    let name = note.to_string();
    let (letter, rest) = name.split_at(1);
    format!("{letter}{}", rest.replace('#', "\u{266f}").replace('b', "\u{266d}"))
}

/// A stray's explanation.
pub(crate) fn stray(stray: &Stray) -> String {
    match stray.kind {
        StrayKind::Alias { partial, .. } => format!("alias of partial {partial}"),
        StrayKind::Mains { base_hz, multiple: 1 } => format!("mains {base_hz:.0} Hz"),
        StrayKind::Mains { base_hz, multiple } => {
            format!("mains {multiple} \u{d7} {base_hz:.0} Hz")
        }
        StrayKind::Unexplained => "unexplained".to_owned(),
    }
}

/// The same, short enough for a list.
pub(crate) fn stray_short(stray: &Stray) -> String {
    match stray.kind {
        StrayKind::Alias { partial, .. } => format!("alias of {partial}"),
        StrayKind::Mains { .. } => "mains".to_owned(),
        StrayKind::Unexplained => "unexplained".to_owned(),
    }
}

/// A textbook wave, and how well it fits.
pub(crate) fn waveform(fit: &WaveformFit) -> String {
    let width = fit.waveform.width().map_or_else(String::new, |width| format!(" {width:.3}"));
    format!("{}{width}, to {:.1} dB", fit.waveform.name(), fit.level_rms_db)
}

/// A level, or silence.
pub(crate) fn level_dbfs(reading: &Reading) -> String {
    let level = reading.level_dbfs;
    if level.is_finite() {
        format!("{} dBFS", signed(level, 1))
    } else {
        "digital silence".to_owned()
    }
}

/// A frequency, with thousands set apart.
pub(crate) fn hertz(hz: f64, decimals: usize) -> String {
    if !hz.is_finite() {
        return NONE.to_owned();
    }
    let text = format!("{hz:.decimals$}");
    let (whole, rest) =
        text.split_once('.').map_or((text.as_str(), ""), |(a, _)| (a, &text[a.len()..]));
    if whole.len() > 3 && hz < 1e6 && whole.bytes().all(|byte| byte.is_ascii_digit()) {
        let (thousands, units) = whole.split_at(whole.len() - 3);
        format!("{thousands}\u{202f}{units}{rest}")
    } else {
        text
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn accidentals_are_those_of_print() {
        let names = [57, 58, 61, 71].map(|midi| note(NoteName::from_midi(midi)));
        assert_eq!(names, ["A3", "B\u{266d}3", "C\u{266f}4", "B4"]);
    }

    #[test]
    fn frequencies_and_times_read_well() {
        for (hz, decimals, expected) in [
            (220.23, 1, "220.2"),
            (2999.64, 1, "2\u{202f}999.6"),
            (12_000.0, 0, "12\u{202f}000"),
            (f64::NAN, 1, NONE),
        ] {
            assert_eq!(hertz(hz, decimals), expected);
        }
        for (seconds, expected) in
            [(2.44, "for 2.4 s"), (12.0, "for 12 s"), (185.0, "for 3 min"), (f64::NAN, "")]
        {
            assert_eq!(lasting(seconds), expected);
        }
    }
}
