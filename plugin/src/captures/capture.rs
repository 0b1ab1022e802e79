//! One capture: a reading as plain data, with what it is called and where it was taken.

use std::time::SystemTime;

use plumbtone_analysis::tuning::NoteName;
use plumbtone_analysis::{
    Descriptors, Partial, Pitch, Reading, State, Stray, StrayKind, Stretch, VERSION,
};
use serde::{Deserialize, Serialize};
use time::OffsetDateTime;

use super::NAME_MAX;
use crate::readout::Readout;
use crate::session::SessionPosition;

/// Colours that a capture can have, each with a shape of its own.
pub const COLOURS: u8 = 6;
/// Most partials and strays of a capture, more than a reading has.
const PARTIALS_MAX: usize = 128;
const STRAYS_MAX: usize = 512;
/// Largest size of a level in dB, and of a phase in radians, that is believed.
const LEVEL_MAX_DB: f64 = 1000.0;
const PHASE_MAX_RAD: f64 = 4.0;

/// A kept reading: frequencies in Hz, levels in dBFS, phases in radians at the reading's centre.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Capture {
    /// Number among those kept, from 1.
    pub number: u64,
    /// What it is called.
    pub name: String,
    /// Index of its colour, below [`COLOURS`].
    pub colour: u8,
    /// When it was taken, in UTC (ISO 8601).
    pub time: String,
    /// Where in the session that was, if the host told.
    pub place: Option<Place>,
    /// The nearest note of the tuning that was set, and the distance from it in cents.
    pub note: Option<String>,
    /// See above.
    pub cents: Option<f64>,
    /// Fundamental, with its deviation in cents and how sure it is the right one, 0 to 1.
    pub f0_hz: f64,
    /// See above.
    pub f0_sd_cents: f64,
    /// See above.
    pub confidence: f64,
    /// Inharmonicity and its deviation.
    pub stretch: Option<(f64, f64)>,
    /// Level of all, and of the noise between the partials.
    pub level_dbfs: f64,
    /// See above; `null` in digital silence.
    pub noise_dbfs: Option<f64>,
    /// Time over which the partials were averaged, in seconds.
    pub integration_s: f64,
    /// The partials, by rising number.
    pub partials: Vec<PartialRecord>,
    /// The strays, strongest first.
    pub strays: Vec<StrayRecord>,
    /// Version of the engine that measured it.
    pub engine_version: String,
}

/// A place in the session.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct Place {
    /// Seconds from its start.
    pub seconds: f64,
    /// Bar and beat, from 1.
    pub bar_beat: Option<(i64, f64)>,
}

/// One partial of a capture.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct PartialRecord {
    number: u32,
    frequency_hz: f64,
    frequency_sd_hz: f64,
    cents_from_harmonic: f64,
    cents_sd: f64,
    level_dbfs: f64,
    level_sd_db: f64,
    phase_rad: f64,
    snr_db: f64,
}

/// One stray of a capture.
#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
pub struct StrayRecord {
    frequency_hz: f64,
    level_dbfs: f64,
    #[serde(flatten)]
    kind: Kind,
}

#[derive(Debug, Clone, Copy, PartialEq, Serialize, Deserialize)]
#[serde(tag = "kind", rename_all = "snake_case")]
enum Kind {
    Alias { partial: u32, folds: u32 },
    Mains { base_hz: f64, multiple: u32 },
    Unexplained,
}

impl Capture {
    /// What a readout shows; `None` without a single pitch. Number, name and colour are given where it is kept.
    #[must_use]
    pub fn of(readout: &Readout, integration_s: f64) -> Option<Self> {
        let pitch = readout.measured.then(|| readout.pitch()).flatten()?;
        let reading = &readout.reading;
        let nearest = readout.tuning.nearest(pitch.f0_hz);
        Some(Self {
            number: 0,
            name: String::new(),
            colour: 0,
            time: now(),
            place: Place::of(&readout.session),
            note: nearest.map(|nearest| nearest.note.to_string()),
            cents: nearest.map(|nearest| nearest.cents),
            f0_hz: pitch.f0_hz,
            f0_sd_cents: pitch.f0_sd_cents,
            confidence: pitch.confidence,
            stretch: reading.stretch.map(|s| (s.b, s.b_sd)),
            level_dbfs: reading.level_dbfs,
            noise_dbfs: Some(reading.noise_dbfs).filter(|level| level.is_finite()),
            integration_s,
            partials: reading.partials.iter().map(PartialRecord::of).collect(),
            strays: reading.strays.iter().map(StrayRecord::of).collect(),
            engine_version: VERSION.to_owned(),
        })
    }

    /// The reading that it keeps, as if its centre were position 0.
    #[must_use]
    pub fn reading(&self) -> Reading {
        Reading {
            centre: 0,
            state: State::Steady,
            pitch: Some(Pitch {
                f0_hz: self.f0_hz,
                f0_sd_cents: self.f0_sd_cents,
                confidence: self.confidence,
            }),
            level_dbfs: self.level_dbfs,
            noise_dbfs: self.noise_dbfs.unwrap_or(f64::NEG_INFINITY),
            stretch: self.stretch.map(|(b, b_sd)| Stretch { b, b_sd }),
            partials: self.partials.iter().map(PartialRecord::partial).collect(),
            strays: self.strays.iter().map(StrayRecord::stray).collect(),
        }
    }

    /// What its partials say together.
    #[must_use]
    pub fn descriptors(&self) -> Descriptors {
        Descriptors::of_reading(&self.reading())
    }

    /// The note, or what stands for one.
    #[must_use]
    pub fn note_name(&self) -> &str {
        self.note.as_deref().unwrap_or("sound")
    }

    /// Whether every figure is one that a reading could hold.
    pub(super) fn is_sound(&self) -> bool {
        let level = |level: f64| level.abs() <= LEVEL_MAX_DB;
        let sd = |sd: f64| sd >= 0.0;
        let note = self.note.as_ref().is_none_or(|note| note.parse::<NoteName>().is_ok());
        let rising = self.partials.is_sorted_by(|a, b| a.number < b.number);
        let b = self.stretch.is_none_or(|(b, b_sd)| b.is_finite() && sd(b_sd));
        note && rising
            && b
            && self.name.chars().count() <= NAME_MAX
            && self.colour < COLOURS
            && self.cents.is_none_or(f64::is_finite)
            && self.f0_hz > 0.0
            && self.f0_hz.is_finite()
            && sd(self.f0_sd_cents)
            && (0.0..=1.0).contains(&self.confidence)
            && level(self.level_dbfs)
            && self.noise_dbfs.is_none_or(level)
            && self.integration_s >= 0.0
            && self.partials.len() <= PARTIALS_MAX
            && self.strays.len() <= STRAYS_MAX
            && self.partials.iter().all(|p| {
                p.number > 0
                    && p.frequency_hz > 0.0
                    && [p.frequency_sd_hz, p.cents_sd, p.level_sd_db].into_iter().all(sd)
                    && p.cents_from_harmonic.is_finite()
                    && level(p.level_dbfs)
                    && p.phase_rad.abs() <= PHASE_MAX_RAD
                    && level(p.snr_db)
            })
            && self.strays.iter().all(|s| s.frequency_hz > 0.0 && level(s.level_dbfs))
    }
}

impl Place {
    fn of(session: &SessionPosition) -> Option<Self> {
        let bar_beat = session.bar_beat.map(|at| (at.bar, at.beat));
        Some(Self { seconds: session.seconds.filter(|_| session.playing)?, bar_beat })
    }
}

impl PartialRecord {
    fn of(p: &Partial) -> Self {
        Self {
            number: p.number,
            frequency_hz: p.frequency_hz,
            frequency_sd_hz: p.frequency_sd_hz,
            cents_from_harmonic: p.cents_from_harmonic,
            cents_sd: p.cents_sd,
            level_dbfs: p.level_dbfs,
            level_sd_db: p.level_sd_db,
            phase_rad: p.phase_rad,
            snr_db: p.snr_db,
        }
    }

    fn partial(&self) -> Partial {
        Partial {
            number: self.number,
            frequency_hz: self.frequency_hz,
            frequency_sd_hz: self.frequency_sd_hz,
            cents_from_harmonic: self.cents_from_harmonic,
            cents_sd: self.cents_sd,
            level_dbfs: self.level_dbfs,
            level_sd_db: self.level_sd_db,
            phase_rad: self.phase_rad,
            snr_db: self.snr_db,
        }
    }
}

impl StrayRecord {
    fn of(stray: &Stray) -> Self {
        let kind = match stray.kind {
            StrayKind::Alias { partial, folds } => Kind::Alias { partial, folds },
            StrayKind::Mains { base_hz, multiple } => Kind::Mains { base_hz, multiple },
            StrayKind::Unexplained => Kind::Unexplained,
        };
        Self { frequency_hz: stray.frequency_hz, level_dbfs: stray.level_dbfs, kind }
    }

    fn stray(&self) -> Stray {
        let kind = match self.kind {
            Kind::Alias { partial, folds } => StrayKind::Alias { partial, folds },
            Kind::Mains { base_hz, multiple } => StrayKind::Mains { base_hz, multiple },
            Kind::Unexplained => StrayKind::Unexplained,
        };
        Stray { frequency_hz: self.frequency_hz, level_dbfs: self.level_dbfs, kind }
    }
}

fn now() -> String {
    let t = OffsetDateTime::from(SystemTime::now());
    format!(
        "{:04}-{:02}-{:02}T{:02}:{:02}:{:02}Z",
        t.year(),
        u8::from(t.month()),
        t.day(),
        t.hour(),
        t.minute(),
        t.second()
    )
}

#[cfg(test)]
pub(crate) mod tests {
    use super::*;
    use crate::readout::Condition;

    /// A capture of a sound with three partials and one stray of every kind.
    pub(crate) fn capture(f0_hz: f64) -> Capture {
        Capture::of(&readout(f0_hz, 0.97), 0.4).unwrap()
    }

    pub(crate) fn readout(f0_hz: f64, confidence: f64) -> Readout {
        let partial = |number: u32| Partial {
            number,
            frequency_hz: f0_hz * f64::from(number),
            frequency_sd_hz: 0.001,
            cents_from_harmonic: 0.01 * f64::from(number),
            cents_sd: 0.02,
            level_dbfs: -10.0 - f64::from(number),
            level_sd_db: 0.05,
            phase_rad: 0.3 * f64::from(number),
            snr_db: 50.0,
        };
        let stray = |frequency_hz, kind| Stray { frequency_hz, level_dbfs: -70.0, kind };
        let reading = Reading {
            centre: 48_000,
            state: State::Steady,
            pitch: Some(Pitch { f0_hz, f0_sd_cents: 0.1, confidence }),
            level_dbfs: -9.0,
            noise_dbfs: -80.0,
            stretch: Some(Stretch { b: 1e-4, b_sd: 1e-6 }),
            partials: (1..=3).map(partial).collect(),
            strays: vec![
                stray(1234.5, StrayKind::Alias { partial: 200, folds: 3 }),
                stray(100.0, StrayKind::Mains { base_hz: 50.0, multiple: 2 }),
                stray(777.0, StrayKind::Unexplained),
            ],
        };
        let mut readout = Readout::default();
        readout.condition = Condition::Measuring;
        readout.sample_rate_hz = 48_000.0;
        let session =
            SessionPosition { playing: true, seconds: Some(1.0), ..SessionPosition::default() };
        readout.take(&reading, session);
        readout
    }

    #[test]
    fn a_capture_keeps_the_whole_reading() {
        let readout = readout(220.0, 0.97);
        let capture = Capture::of(&readout, 0.4).unwrap();
        assert!(capture.is_sound(), "{capture:?}");
        assert_eq!((capture.note_name(), capture.place.map(|p| p.seconds)), ("A3", Some(1.0)));
        let kept = capture.reading();
        assert_eq!(
            (kept.partials, kept.strays),
            (readout.reading.partials, readout.reading.strays)
        );
        assert_eq!((kept.pitch, kept.noise_dbfs), (readout.reading.pitch, -80.0));
    }

    #[test]
    fn what_is_not_shown_as_a_pitch_is_not_captured() {
        assert_eq!(Capture::of(&readout(220.0, 0.2), 0.4), None, "too unsure");
        let mut nothing = readout(220.0, 0.97);
        nothing.measured = false;
        assert_eq!(Capture::of(&nothing, 0.4), None, "not measured");
    }
}
