//! A note made by hand, for the tests of what is written down and drawn.

use crate::measure::{FileFacts, Timebase};
use crate::output::records::NoteRecord;
use plumbtone_analysis::tuning::{Temperament, Tuning};
use plumbtone_analysis::{
    Descriptors, Note, NotePartial, Partial, Pitch, Reading, State, Stray, StrayKind, Stretch,
};

pub(crate) const TIMEBASE: Timebase = Timebase { offset: 0, sample_rate_hz: 48_000.0, hop: 480 };

/// A stiff string a little above A3 with that many partials, and strays.
pub(crate) fn note(partials: u32, strays: Vec<Stray>) -> Note {
    let (f0_hz, b) = (220.23, 1.6e-4);
    Note {
        start: 24_000,
        end: 144_000,
        f0_hz,
        f0_sd_cents: 0.012,
        stretch: Some(Stretch { b, b_sd: 2.3e-6 }),
        partials: (1..=partials).map(|number| partial(number, f0_hz, b)).collect(),
        strays,
        strays_left_out: 0,
        descriptors: Descriptors {
            odd_even_db: Some(2.31),
            tilt_db_per_octave: Some(-6.12),
            thd_f_percent: Some(41.83),
            thd_r_percent: None,
            hnr_db: Some(48.2),
            tristimulus: Some([0.41, 0.32, 0.27]),
            centroid_partial: Some(3.41),
        },
    }
}

pub(crate) fn record(note: &Note) -> NoteRecord {
    NoteRecord::new(note, TIMEBASE, &Tuning::default())
}

/// Hum, an alias, and a peak without an explanation.
pub(crate) fn few_strays() -> Vec<Stray> {
    vec![
        Stray {
            frequency_hz: 100.0,
            level_dbfs: -58.1,
            kind: StrayKind::Mains { base_hz: 50.0, multiple: 2 },
        },
        Stray {
            frequency_hz: 2999.6,
            level_dbfs: -61.4,
            kind: StrayKind::Alias { partial: 204, folds: 1 },
        },
        Stray { frequency_hz: 1550.2, level_dbfs: -71.0, kind: StrayKind::Unexplained },
    ]
}

/// More strays than anybody can label.
pub(crate) fn many_strays(count: u32) -> Vec<Stray> {
    (0..count)
        .map(|index| Stray {
            frequency_hz: 37.0 + 41.7 * f64::from(index),
            level_dbfs: -50.0 - 0.05 * f64::from(index),
            kind: StrayKind::Alias { partial: 1000 + index, folds: 2 },
        })
        .collect()
}

/// The reading at one instant of the note.
pub(crate) fn reading(centre: u64, partials: u32) -> Reading {
    let (f0_hz, b) = (220.23, 1.6e-4);
    let seconds = centre as f64 / TIMEBASE.sample_rate_hz;
    Reading {
        centre,
        state: State::Steady,
        pitch: Some(Pitch { f0_hz, f0_sd_cents: 0.31, confidence: 0.97 }),
        level_dbfs: -11.2,
        noise_dbfs: -61.2,
        stretch: None,
        partials: (1..=partials)
            .map(|number| {
                let whole = partial(number, f0_hz, b);
                Partial {
                    number,
                    frequency_hz: whole.frequency_hz,
                    frequency_sd_hz: whole.frequency_sd_hz,
                    cents_from_harmonic: whole.cents_from_harmonic,
                    cents_sd: whole.cents_sd,
                    level_dbfs: whole.level_dbfs - whole.decay_db_per_s * (seconds - 0.5),
                    level_sd_db: whole.level_sd_db,
                    phase_rad: whole.phase_rad,
                    snr_db: whole.snr_db,
                }
            })
            .collect(),
        strays: Vec::new(),
    }
}

pub(crate) fn facts() -> FileFacts {
    FileFacts {
        path: "takes/pluck.wav".into(),
        sample_rate_hz: 48_000,
        channels: 2,
        duration_s: 3.5,
        channel: "mid".to_owned(),
        concert_pitch_hz: 440.0,
        temperament: Temperament::Equal,
        notes: 1,
    }
}

fn partial(number: u32, f0_hz: f64, b: f64) -> NotePartial {
    let n = f64::from(number);
    let level_dbfs = -16.2 - 20.0 * n.log10() - 4.0 * (2.3 * n).sin();
    NotePartial {
        number,
        frequency_hz: n * f0_hz * (1.0 + b * n * n).sqrt(),
        frequency_sd_hz: 0.001 * n,
        cents_from_harmonic: 600.0 * (1.0 + b * n * n).log2() + (7.7 * n).sin(),
        cents_sd: 0.4 + 0.1 * n,
        level_dbfs,
        level_sd_db: 0.02 * n,
        level_relative_db: level_dbfs + 16.2,
        level_mean_dbfs: level_dbfs - 3.0,
        phase_rad: (1.3 * n).sin(),
        decay_db_per_s: 3.0 + n,
        decay_sd: 0.05,
        snr_db: 70.0 - n,
        cluster: None,
    }
}
