//! A plain readout: what the newest reading says, in words and figures.

use egui::{RichText, ScrollArea, Ui};
use plumbtone_analysis::{Partial, Reading, Stray, StrayKind};

use crate::readings_log::state_name;
use crate::readout::{Condition, Live, Readout};

/// Confidence below which a pitch is not shown as one.
const CONFIDENCE_SHOWN: f64 = 0.5;

/// All that the view draws from.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Shown<'a> {
    pub(crate) readout: &'a Readout,
    /// Stream position of the newest sample.
    pub(crate) position: u64,
    /// Samples and notes lost since the instance was made.
    pub(crate) lost_samples: u64,
    pub(crate) lost_notes: u64,
    /// What was unsound in the last loaded state.
    pub(crate) unsound: &'a [String],
}

/// Draws it.
pub(crate) fn show(ui: &mut Ui, shown: &Shown<'_>) {
    let readout = shown.readout;
    ui.label(condition(&readout.condition));
    for finding in shown.unsound {
        ui.label(format!("Loaded session: {finding}."));
    }
    if let Some(live) = readout.live {
        provisional(ui, shown, &live);
    }
    if readout.measured {
        headline(ui, readout);
        place(ui, shown);
        ui.separator();
        lists(ui, &readout.reading);
        ui.separator();
    }
    gaps(ui, shown);
}

fn condition(condition: &Condition) -> String {
    match condition {
        Condition::Waiting => "Waiting for sound".to_owned(),
        Condition::Measuring => "Measuring".to_owned(),
        Condition::Frozen => "Frozen: the reading below is held".to_owned(),
        Condition::Paused => "Paused".to_owned(),
        Condition::Ended => "Stopped by the host".to_owned(),
        Condition::Refused(error) => format!("Cannot measure: {error}"),
        Condition::Failed => {
            "The analysis failed by a defect of this program; it begins anew when the host restarts it"
                .to_owned()
        }
    }
}

/// What the provisional reading says, in one line.
fn provisional(ui: &mut Ui, shown: &Shown<'_>, live: &Live) {
    let Readout { tuning, sample_rate_hz, .. } = shown.readout;
    let age_s = shown.position.saturating_sub(live.centre) as f64 / sample_rate_hz;
    let pitch = live.pitch.filter(|pitch| pitch.confidence >= CONFIDENCE_SHOWN);
    let what = pitch.and_then(|pitch| tuning.nearest(pitch.f0_hz)).map_or_else(
        || format!("no single pitch, {}", level(live.level_dbfs)),
        |at| format!("{} {:+.1} ct", at.note, at.cents),
    );
    ui.label(format!("Provisional, {:.0} ms old: {what}", 1000.0 * age_s));
}

/// The pitch, or why there is none.
fn headline(ui: &mut Ui, readout: &Readout) {
    let reading = &readout.reading;
    let pitch = reading.pitch.filter(|pitch| pitch.confidence >= CONFIDENCE_SHOWN);
    let nearest = pitch.and_then(|pitch| readout.tuning.nearest(pitch.f0_hz));
    let (Some(pitch), Some(nearest)) = (pitch, nearest) else {
        ui.label(RichText::new("No single pitch").size(36.0));
        ui.label(format!("{}, {}", state_name(reading.state), level(reading.level_dbfs)));
        return;
    };
    let off = format!("{}  {:+.2} ct", nearest.note, nearest.cents);
    ui.label(RichText::new(off).size(36.0));
    ui.label(format!(
        "{:.4} Hz \u{b1} {:.2} ct, {}, confidence {:.2}, {}",
        pitch.f0_hz,
        pitch.f0_sd_cents,
        state_name(reading.state),
        pitch.confidence,
        level(reading.level_dbfs),
    ));
    ui.label(reading.stretch.map_or_else(
        || "Inharmonicity B not measurable".to_owned(),
        |stretch| format!("Inharmonicity B {:.3e} \u{b1} {:.1e}", stretch.b, stretch.b_sd),
    ));
    let tuning = &readout.tuning;
    ui.label(format!("A4 = {:.2} Hz, {}", tuning.concert_pitch_hz(), tuning.temperament()));
}

/// Where in the session the reading lies, and how old it is.
fn place(ui: &mut Ui, shown: &Shown<'_>) {
    let Readout { reading, session, sample_rate_hz, played, .. } = shown.readout;
    let mut parts = Vec::new();
    if session.samples.is_some() && !session.playing {
        parts.push("transport stopped".to_owned());
    }
    if let Some(at) = session.bar_beat {
        parts.push(format!("bar {} | beat {:.2}", at.bar, at.beat));
    }
    if let (Some(seconds), Some(samples)) = (session.seconds, session.samples) {
        parts.push(format!("{seconds:.3} s, sample {samples}"));
    }
    if parts.is_empty() {
        parts.push(format!("{:.3} s of the stream", reading.centre as f64 / sample_rate_hz));
    }
    let age = shown.position.saturating_sub(reading.centre) as f64 / sample_rate_hz;
    parts.push(format!("{:.0} ms old", 1000.0 * age));
    if let Some(note) = played {
        parts.push(format!("played {note}"));
    }
    ui.label(parts.join(", "));
}

fn lists(ui: &mut Ui, reading: &Reading) {
    let height = (ui.available_height() - 60.0).max(80.0);
    ScrollArea::vertical().max_height(height).auto_shrink([false, false]).show(ui, |ui| {
        partials(ui, &reading.partials);
        if !reading.strays.is_empty() {
            ui.separator();
            strays(ui, &reading.strays);
        }
    });
}

fn partials(ui: &mut Ui, partials: &[Partial]) {
    if partials.is_empty() {
        ui.label("No partials");
        return;
    }
    egui::Grid::new("partials").striped(true).num_columns(5).show(ui, |ui| {
        for head in ["Partial", "Hz", "ct off n\u{b7}f0", "\u{b1} ct", "dBFS"] {
            ui.strong(head);
        }
        ui.end_row();
        for partial in partials {
            ui.monospace(format!("{:>3}", partial.number));
            ui.monospace(format!("{:>10.3}", partial.frequency_hz));
            ui.monospace(format!("{:>+8.2}", partial.cents_from_harmonic));
            ui.monospace(format!("{:>6.2}", partial.cents_sd));
            ui.monospace(format!("{:>7.2} \u{b1} {:.2}", partial.level_dbfs, partial.level_sd_db));
            ui.end_row();
        }
    });
}

fn strays(ui: &mut Ui, strays: &[Stray]) {
    egui::Grid::new("strays").striped(true).num_columns(3).show(ui, |ui| {
        for head in ["Stray", "Hz", "dBFS"] {
            ui.strong(head);
        }
        ui.end_row();
        for stray in strays {
            ui.label(stray_name(&stray.kind));
            ui.monospace(format!("{:>10.3}", stray.frequency_hz));
            ui.monospace(format!("{:>7.2}", stray.level_dbfs));
            ui.end_row();
        }
    });
}

fn stray_name(kind: &StrayKind) -> String {
    match kind {
        StrayKind::Alias { partial, .. } => format!("alias of partial {partial}"),
        StrayKind::Mains { base_hz, multiple } => {
            format!("mains {base_hz:.0} Hz \u{d7} {multiple}")
        }
        StrayKind::Unexplained => "unexplained".to_owned(),
    }
}

/// What is missing, if anything is.
fn gaps(ui: &mut Ui, shown: &Shown<'_>) {
    let gaps = &shown.readout.gaps;
    for (samples, what) in [
        (gaps.overrun, "not measured in this stream, for lack of computing time"),
        (gaps.unwatched, "not measured in this stream, with no editor open and no check armed"),
        (gaps.non_finite, "in this stream were not finite numbers"),
        (shown.lost_samples, "lost since this instance was loaded"),
    ] {
        if samples > 0 {
            ui.label(format!("{samples} samples {what}"));
        }
    }
    if shown.lost_notes > 0 {
        ui.label(format!("{} note events lost since this instance was loaded", shown.lost_notes));
    }
}

fn level(dbfs: f64) -> String {
    if dbfs.is_finite() { format!("{dbfs:.1} dBFS") } else { "digital silence".to_owned() }
}

#[cfg(test)]
mod tests {
    use egui_kittest::Harness;
    use egui_kittest::kittest::Queryable as _;
    use plumbtone_analysis::{Pitch, State, Stretch};

    use super::*;
    use crate::readout::Gaps;
    use crate::session::{BarBeat, SessionPosition};

    fn measured() -> Readout {
        let pitch = Pitch { f0_hz: 220.5, f0_sd_cents: 0.02, confidence: 0.97 };
        let partial = Partial {
            number: 7,
            frequency_hz: 1544.25,
            frequency_sd_hz: 0.01,
            cents_from_harmonic: 0.79,
            cents_sd: 0.03,
            level_dbfs: -31.5,
            level_sd_db: 0.1,
            phase_rad: 0.0,
            snr_db: 50.0,
        };
        Readout {
            condition: Condition::Measuring,
            sample_rate_hz: 48_000.0,
            stream: 1,
            measured: true,
            reading: Reading {
                centre: 48_000,
                state: State::Steady,
                pitch: Some(pitch),
                level_dbfs: -12.0,
                stretch: Some(Stretch { b: 2e-4, b_sd: 1e-6 }),
                partials: vec![partial],
                strays: Vec::new(),
            },
            session: SessionPosition {
                playing: true,
                samples: Some(96_000),
                seconds: Some(2.0),
                bar_beat: Some(BarBeat { bar: 2, beat: 1.5 }),
            },
            ..Readout::default()
        }
    }

    fn shown(readout: &Readout) -> Harness<'_> {
        Harness::new_ui(move |ui| {
            let shown =
                Shown { readout, position: 52_800, lost_samples: 0, lost_notes: 0, unsound: &[] };
            show(ui, &shown);
        })
    }

    #[test]
    fn a_pitch_is_named_with_cents_deviation_place_and_age() {
        let readout = measured();
        let harness = shown(&readout);
        for text in [
            "A3  +3.93 ct",
            "220.5000 Hz \u{b1} 0.02 ct",
            "bar 2 | beat 1.50",
            "100 ms old",
            "2.000 s, sample 96000",
            "1544.250",
        ] {
            assert!(harness.query_by_label_contains(text).is_some(), "{text} is shown");
        }
    }

    #[test]
    fn without_a_sure_pitch_none_is_named() {
        let mut readout = measured();
        for pitch in [None, readout.reading.pitch.map(|pitch| Pitch { confidence: 0.3, ..pitch })] {
            readout.reading.pitch = pitch;
            let harness = shown(&readout);
            assert!(harness.query_by_label("No single pitch").is_some(), "{pitch:?}");
            assert!(harness.query_by_label_contains("A3").is_none(), "{pitch:?}");
        }
    }

    #[test]
    fn gaps_and_failures_are_said() {
        let mut readout = measured();
        readout.gaps = Gaps { overrun: 1024, ..Gaps::default() };
        readout.condition = Condition::Failed;
        let harness = shown(&readout);
        for text in ["1024 samples", "failed by a defect"] {
            assert!(harness.query_by_label_contains(text).is_some(), "{text} is shown");
        }
    }
}
