//! The figures as they are written down: copies of the engine's types with the names, units and order that the JSON
//! promises, so that the engine's can change without breaking anybody's script.

use crate::measure::Timebase;
use plumbtone_analysis::masking::unheard_below_dbfs;
use plumbtone_analysis::tuning::Tuning;
use plumbtone_analysis::waveform::waveform;
use plumbtone_analysis::{Gap, GapReason, Note, NotePartial, Reading, State, Stray, StrayKind};
use serde::Serialize;
use std::ops::Range;

/// One reading.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct FrameRecord {
    pub(crate) time_s: f64,
    pub(crate) state: &'static str,
    pub(crate) f0_hz: Option<f64>,
    pub(crate) f0_sd_cents: Option<f64>,
    pub(crate) confidence: Option<f64>,
    pub(crate) level_dbfs: Option<f64>,
}

/// One gap.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct GapRecord {
    pub(crate) start_s: f64,
    pub(crate) end_s: f64,
    pub(crate) reason: &'static str,
}

/// One note.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct NoteRecord {
    pub(crate) start_s: f64,
    pub(crate) end_s: f64,
    pub(crate) f0_hz: Option<f64>,
    pub(crate) f0_sd_cents: Option<f64>,
    pub(crate) note: Option<String>,
    pub(crate) cents: Option<f64>,
    pub(crate) inharmonicity_b: Option<f64>,
    pub(crate) inharmonicity_sd: Option<f64>,
    pub(crate) partials: Vec<PartialRecord>,
    pub(crate) strays: Vec<StrayRecord>,
    pub(crate) odd_even_db: Option<f64>,
    pub(crate) tilt_db_per_octave: Option<f64>,
    pub(crate) thd_f_percent: Option<f64>,
    pub(crate) thd_r_percent: Option<f64>,
    pub(crate) hnr_db: Option<f64>,
    pub(crate) tristimulus: Option<[f64; 3]>,
    pub(crate) centroid_partial: Option<f64>,
    pub(crate) strays_left_out: usize,
    pub(crate) waveform: Option<WaveformRecord>,
    /// First sample and the one after the last, from where the engine started.
    #[serde(skip)]
    pub(crate) span: Range<u64>,
}

/// One partial of a note.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct PartialRecord {
    pub(crate) number: u32,
    pub(crate) frequency_hz: Option<f64>,
    pub(crate) frequency_sd_hz: Option<f64>,
    pub(crate) cents_from_harmonic: Option<f64>,
    pub(crate) cents_sd: Option<f64>,
    pub(crate) level_dbfs: Option<f64>,
    pub(crate) level_relative_db: Option<f64>,
    pub(crate) level_sd_db: Option<f64>,
    pub(crate) level_mean_dbfs: Option<f64>,
    pub(crate) phase_rad: Option<f64>,
    pub(crate) decay_db_per_s: Option<f64>,
    pub(crate) decay_sd: Option<f64>,
    pub(crate) snr_db: Option<f64>,
    /// Lines that it is made of; of several, their spread and the rate at which the two strongest beat.
    pub(crate) lines: u32,
    pub(crate) spread_cents: Option<f64>,
    pub(crate) beat_hz: Option<f64>,
}

/// The textbook wave that the partials make.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct WaveformRecord {
    pub(crate) name: &'static str,
    /// Of a pulse: the share of the period that it is high.
    pub(crate) width: Option<f64>,
    pub(crate) level_rms_db: f64,
    pub(crate) phase_rms_rad: f64,
    pub(crate) partials: usize,
}

/// One stray of a note.
#[derive(Debug, Clone, Serialize)]
pub(crate) struct StrayRecord {
    pub(crate) frequency_hz: Option<f64>,
    pub(crate) level_dbfs: Option<f64>,
    pub(crate) kind: &'static str,
    pub(crate) partial: Option<u32>,
    /// How often an alias folded.
    pub(crate) folds: Option<u32>,
    /// Level against the strongest partial, and over what the partials mask there.
    pub(crate) relative_db: Option<f64>,
    pub(crate) over_mask_db: Option<f64>,
    /// The explanation in full, for tables and pictures.
    #[serde(skip)]
    pub(crate) explanation: StrayKind,
}

impl FrameRecord {
    pub(crate) fn new(reading: &Reading, timebase: Timebase) -> Self {
        let pitch = reading.pitch;
        Self {
            time_s: timebase.seconds(reading.centre),
            state: match reading.state {
                State::Silent => "silent",
                State::Unpitched => "unpitched",
                State::Several => "several",
                State::Gliding => "gliding",
                State::Steady => "steady",
            },
            f0_hz: pitch.and_then(|pitch| measured(pitch.f0_hz)),
            f0_sd_cents: pitch.and_then(|pitch| measured(pitch.f0_sd_cents)),
            confidence: pitch.and_then(|pitch| measured(pitch.confidence)),
            level_dbfs: measured(reading.level_dbfs),
        }
    }
}

impl GapRecord {
    pub(crate) fn new(gap: &Gap, timebase: Timebase) -> Self {
        Self {
            start_s: timebase.seconds(gap.start),
            end_s: timebase.seconds(gap.end),
            reason: match gap.reason {
                GapReason::NonFinite => "non-finite samples",
                GapReason::Lost => "damaged",
            },
        }
    }
}

impl NoteRecord {
    pub(crate) fn new(note: &Note, timebase: Timebase, tuning: &Tuning) -> Self {
        let about = &note.descriptors;
        let nearest = tuning.nearest(note.f0_hz);
        let stretch = note.stretch;
        let waves: Vec<_> = (note.partials.iter())
            .map(|p| (p.number, 10_f64.powf(p.level_dbfs / 20.0), p.phase_rad))
            .collect();
        Self {
            start_s: timebase.seconds(note.start),
            end_s: timebase.seconds(note.end),
            f0_hz: measured(note.f0_hz),
            f0_sd_cents: measured(note.f0_sd_cents),
            note: nearest.map(|nearest| nearest.note.to_string()),
            cents: nearest.map(|nearest| nearest.cents),
            inharmonicity_b: stretch.and_then(|stretch| measured(stretch.b)),
            inharmonicity_sd: stretch.and_then(|stretch| measured(stretch.b_sd)),
            partials: note.partials.iter().map(PartialRecord::new).collect(),
            strays: note.strays.iter().map(|stray| StrayRecord::new(stray, note)).collect(),
            odd_even_db: about.odd_even_db.and_then(measured),
            tilt_db_per_octave: about.tilt_db_per_octave.and_then(measured),
            thd_f_percent: about.thd_f_percent.and_then(measured),
            thd_r_percent: about.thd_r_percent.and_then(measured),
            hnr_db: about.hnr_db.and_then(measured),
            tristimulus: about.tristimulus,
            centroid_partial: about.centroid_partial.and_then(measured),
            strays_left_out: note.strays_left_out,
            waveform: WaveformRecord::of(&waves),
            span: note.start..note.end,
        }
    }

    /// Length in seconds.
    pub(crate) fn length_s(&self) -> f64 {
        self.end_s - self.start_s
    }
}

impl PartialRecord {
    fn new(partial: &NotePartial) -> Self {
        Self {
            number: partial.number,
            frequency_hz: measured(partial.frequency_hz),
            frequency_sd_hz: measured(partial.frequency_sd_hz),
            cents_from_harmonic: measured(partial.cents_from_harmonic),
            cents_sd: measured(partial.cents_sd),
            level_dbfs: measured(partial.level_dbfs),
            level_relative_db: measured(partial.level_relative_db),
            level_sd_db: measured(partial.level_sd_db),
            level_mean_dbfs: measured(partial.level_mean_dbfs),
            phase_rad: measured(partial.phase_rad),
            decay_db_per_s: measured(partial.decay_db_per_s),
            decay_sd: measured(partial.decay_sd),
            snr_db: measured(partial.snr_db),
            lines: partial.cluster.map_or(1, |cluster| cluster.lines),
            spread_cents: partial.cluster.and_then(|cluster| measured(cluster.spread_cents)),
            beat_hz: partial.cluster.and_then(|cluster| measured(cluster.beat_hz)),
        }
    }
}

impl WaveformRecord {
    /// Of partials as number, amplitude and phase, all at one instant.
    pub(crate) fn of(partials: &[(u32, f64, f64)]) -> Option<Self> {
        // What lies above the last partial found cannot be told from what the band or the count left out.
        let looked_for = partials.last()?.0;
        let fit = waveform(partials, looked_for)?;
        Some(Self {
            name: fit.waveform.name(),
            width: fit.waveform.width(),
            level_rms_db: fit.level_rms_db,
            phase_rms_rad: fit.phase_rms_rad,
            partials: fit.partials,
        })
    }

    /// A line for reading.
    pub(crate) fn text(&self) -> String {
        let width = self.width.map_or_else(String::new, |width| format!(" of width {width:.3}"));
        format!(
            "  waveform {}{width}: {} partials within {:.2} dB and {:.3} rad (root mean square)\n",
            self.name, self.partials, self.level_rms_db, self.phase_rms_rad
        )
    }
}

impl StrayRecord {
    fn new(stray: &Stray, note: &Note) -> Self {
        let (kind, partial, folds) = match stray.kind {
            StrayKind::Alias { partial, folds } => ("alias", Some(partial), Some(folds)),
            StrayKind::Mains { .. } => ("mains", None, None),
            StrayKind::Unexplained => ("unexplained", None, None),
        };
        let partials = || note.partials.iter().map(|p| (p.frequency_hz, p.level_mean_dbfs));
        let strongest = partials().map(|p| p.1).fold(f64::NEG_INFINITY, f64::max);
        let mask = unheard_below_dbfs(stray.frequency_hz, partials());
        Self {
            frequency_hz: measured(stray.frequency_hz),
            level_dbfs: measured(stray.level_dbfs),
            kind,
            partial,
            folds,
            relative_db: measured(stray.level_dbfs - strongest),
            over_mask_db: measured(stray.level_dbfs - mask),
            explanation: stray.kind,
        }
    }
}

/// A figure, or nothing where the engine says infinity or not-a-number.
fn measured(value: f64) -> Option<f64> {
    value.is_finite().then_some(value)
}
