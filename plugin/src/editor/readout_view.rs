//! A plain readout: what the newest reading says, in words and figures.

use egui::{RichText, ScrollArea, Ui};
use plumbtone_analysis::{Partial, Reading, Stray, StrayKind};

use crate::readings_log::state_name;
use crate::readout::{Condition, Readout};

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
