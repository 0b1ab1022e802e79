//! Fixed data for the editor's pictures and tests: what the worker would have said, without a worker.

use std::sync::{Mutex, PoisonError};

use egui::Vec2;
use egui_kittest::Harness;
use plumbtone_analysis::tuning::ratio;
use plumbtone_analysis::{Cluster, Partial, Pitch, Reading, State, Stray, StrayKind, Stretch};
use plumbtone_plugin::captures::Capture;
use plumbtone_plugin::check::{CheckResult, InTrail};
use plumbtone_plugin::editor::{Gesture, Screen, Shown, Theme, install_fonts};
use plumbtone_plugin::keys::{KeyAlias, Row};
use plumbtone_plugin::parameters::Parameters;
use plumbtone_plugin::readout::{Condition, Readout};
use plumbtone_plugin::session::{BarBeat, SessionPosition};
use plumbtone_plugin::trail::Trail;
use plumbtone_plugin::voices::Voices;

const RATE_HZ: f64 = 48_000.0;
const HOP: u64 = 480;

/// All that a picture is made of.
pub(crate) struct Scene {
    pub(crate) readout: Readout,
    pub(crate) trail: Mutex<Trail>,
    pub(crate) parameters: Parameters,
    pub(crate) screen: Screen,
    pub(crate) lost_samples: u64,
    pub(crate) unsound: Vec<String>,
    pub(crate) time_s: f64,
    /// Gestures of all frames so far.
    pub(crate) gestures: Vec<Gesture>,
}

impl Scene {
    /// Nothing heard yet.
    pub(crate) fn empty(theme: Theme) -> Self {
        Self {
            readout: Readout::default(),
            trail: Mutex::default(),
            parameters: Parameters::default(),
            screen: Screen::new(theme, 1.0),
            lost_samples: 0,
            unsound: Vec::new(),
            time_s: 0.0,
            gestures: Vec::new(),
        }
    }

    /// A plucked string that holds, with an alias and mains hum beside it, and half a minute of drift behind it.
    pub(crate) fn string(theme: Theme) -> Self {
        let mut scene = Self::empty(theme);
        scene.play(3_200, |t| Some(drifting(t)), &string_partials(20), &strays());
        scene
    }

    /// The same with three checks: one within, one outside, one that heard no single pitch.
    pub(crate) fn checked(theme: Theme) -> Self {
        let scene = Self::string(theme);
        for (verdict, start_s, end_s, outside) in [
            ("within", 2.0, 8.0, None),
            ("outside", 16.0, 22.0, Some((18.6, 21.4))),
            ("unmeasured", 24.0, 28.0, None),
        ] {
            if let Ok(result) = check(verdict, (start_s, end_s), outside) {
                scene.parameters.results.add(result);
            }
        }
        scene
    }

    /// The same with a key sheet: a patch over four octaves, a few keys of it still to be played.
    pub(crate) fn keyboard(theme: Theme) -> Self {
        let scene = Self::string(theme);
        for key in (36..=84).filter(|key| ![49, 62, 63, 64, 76].contains(key)) {
            scene.parameters.sheet.take(key_row(key));
        }
        scene.parameters.sheet.take(key_row(60));
        scene
    }

    /// The same after a note that two voices played, 7 cents apart.
    pub(crate) fn detuned(theme: Theme) -> Self {
        let mut scene = Self::string(theme);
        let cluster = |number: u32| Cluster {
            lines: if number.is_multiple_of(5) { 3 } else { 2 },
            spread_cents: 7.0 + 0.05 * f64::from(number % 3),
            beat_hz: 0.89 * f64::from(number),
        };
        scene.readout.voices = Voices {
            f0_hz: 220.2,
            partials: 20,
            clusters: (2..=18).map(|number| (number, cluster(number))).collect(),
        };
        scene
    }

    /// The same with three captures: two versions of the string before this one, and a saw an octave up.
    pub(crate) fn captured(theme: Theme) -> Self {
        let mut scene = Self::string(theme);
        let now = scene.readout.reading.clone();
        scene.capture("Pluck, first idea", |p| {
            let n = f64::from(p.number);
            p.level_dbfs += [0.0, 1.4, -4.2, 0.1, 2.6][p.number as usize % 5] + 0.25 * n;
            p.cents_from_harmonic *= 1.3;
            p.phase_rad = (p.phase_rad + 0.25 * n) % 3.0;
            p.level_sd_db = 0.02 * n;
            p.number != 7
        });
        scene.capture("Pluck, softer", |p| {
            p.level_dbfs -= 0.9 * f64::from(p.number);
            p.number < 15
        });
        let f0 = 440.0;
        scene.readout.reading.pitch = now.pitch.map(|pitch| Pitch { f0_hz: f0, ..pitch });
        scene.readout.reading.stretch = Some(Stretch { b: 0.0, b_sd: 1e-7 });
        scene.capture("Saw", |p| {
            let n = f64::from(p.number);
            p.frequency_hz = n * f0;
            p.cents_from_harmonic = 0.0;
            p.level_dbfs = -9.0 - 20.0 * n.log10();
            p.phase_rad = -core::f64::consts::FRAC_PI_2;
            true
        });
        scene.readout.reading = now;
        scene
    }

    /// Captures what is shown after a change to its partials; a change that gives false drops the partial.
    fn capture(&mut self, name: &str, change: impl FnMut(&mut Partial) -> bool) {
        let kept = self.readout.reading.partials.clone();
        self.readout.reading.partials.retain_mut(change);
        let capture = Capture::of(&self.readout, 0.4);
        self.readout.reading.partials = kept;
        let time = "2026-05-04T10:20:30Z".to_owned();
        let captures = &self.parameters.captures;
        let number = captures.add(capture.map(|capture| Capture { time, ..capture }));
        captures.rename(number.unwrap_or_default(), name);
    }

    /// Feeds so many readings, 10 ms apart, of a pitch given as cents off A3; without one there is none.
    pub(crate) fn play(
        &mut self,
        readings: u64,
        cents: impl Fn(f64) -> Option<f64>,
        partials: &[Partial],
        strays: &[Stray],
    ) {
        self.readout.condition = Condition::Measuring;
        self.readout.sample_rate_hz = RATE_HZ;
        self.readout.stream = 1;
        let mut trail = self.trail.lock().unwrap_or_else(PoisonError::into_inner);
        trail.grid(480, RATE_HZ);
        for number in 0..readings {
            let t = number as f64 * HOP as f64 / RATE_HZ;
            let pitch = cents(t).map(|cents| Pitch {
                f0_hz: 220.0 * ratio(cents),
                f0_sd_cents: 0.11,
                confidence: 0.97,
            });
            let last = number + 1 == readings && pitch.is_some();
            let reading = Reading {
                centre: number * HOP,
                state: if pitch.is_some() { State::Steady } else { State::Silent },
                pitch,
                level_dbfs: if pitch.is_some() { level(partials) } else { f64::NEG_INFINITY },
                noise_dbfs: if pitch.is_some() { -61.4 } else { f64::NEG_INFINITY },
                stretch: pitch.map(|_| Stretch { b: 1.6e-4, b_sd: 2e-6 }),
                partials: if last { partials.to_vec() } else { Vec::new() },
                strays: if last { strays.to_vec() } else { Vec::new() },
            };
            let session = SessionPosition {
                playing: true,
                samples: None,
                seconds: Some(t),
                bar_beat: Some(BarBeat {
                    bar: 1 + i64::try_from(number / 200).unwrap_or(0),
                    beat: 1.0,
                }),
            };
            trail.push(1, &reading, &session);
            self.readout.take(&reading, session);
            self.readout.weigh(&reading);
        }
        self.readout.trail_end = trail.next();
        drop(trail);
    }

    /// A twentieth of a second goes by: partials fade, each at its own rate, and beat.
    pub(crate) fn advance(&mut self) {
        self.time_s += 0.05;
        let reading = &mut self.readout.reading;
        reading.centre += 5 * HOP;
        let t = self.time_s;
        for partial in &mut reading.partials {
            let n = f64::from(partial.number);
            partial.level_dbfs -= 0.006 * n.sqrt() - 0.04 * (0.9 * n + 1.7 * t).cos();
            partial.cents_from_harmonic += 0.01 * (n + 2.3 * t).cos();
        }
        reading.level_dbfs = level(&reading.partials);
    }

    /// Draws a frame.
    pub(crate) fn frame(&mut self, ui: &mut egui::Ui) {
        let mut screen = core::mem::take(&mut self.screen);
        let gestures = screen.show(ui, &self.shown());
        self.screen = screen;
        self.gestures.extend(gestures);
    }

    /// The picture as SVG.
    pub(crate) fn svg(&self, size: Vec2) -> String {
        self.screen.svg(size, &self.shown())
    }

    fn shown(&self) -> Shown<'_> {
        Shown {
            readout: &self.readout,
            trail: &self.trail,
            parameters: &self.parameters,
            position: self.readout.reading.centre + 4_800,
            lost_samples: self.lost_samples,
            lost_notes: 0,
            late_messages: 0,
            unsound: &self.unsound,
            time_s: self.time_s,
        }
    }

    /// An editor of this size in points that shows the scene.
    pub(crate) fn open(self, size: Vec2, pixels_per_point: f32) -> Harness<'static, Self> {
        Harness::builder()
            .with_size(size)
            .with_pixels_per_point(pixels_per_point)
            .with_step_dt(1.0 / 60.0)
            .with_context_setup(install_fonts)
            .build_ui_state(|ui, scene: &mut Self| scene.frame(ui), self)
    }
}

/// A key of a patch that is a little sharp in the bass, bright at the top, where its aliases come out, and slow at the bottom.
pub(crate) fn key_row(key: u8) -> Row {
    let at = f64::from(key) - 60.0;
    let wobble = (1.7 * at).sin();
    let cents = 3.2 * (-(at + 24.0) / 14.0).exp() - 0.04 * at + 0.4 * wobble;
    let over = -14.0 + 0.75 * at + 4.0 * (2.9 * at).sin();
    Row {
        key,
        take: 0,
        told: key != 70,
        length_s: 1.2,
        f0_hz: 440.0 * ratio(100.0 * (at - 9.0) + cents),
        f0_sd_cents: 0.05 + 0.5 * (-(at + 24.0) / 8.0).exp(),
        inharmonicity_b: (key != 55)
            .then(|| if key < 79 { 6e-5 * 2f64.powf(at / 9.0) } else { 1e-6 }),
        inharmonicity_sd: (key != 55).then_some(4e-6),
        tilt_db_per_octave: Some(-7.5 + 0.06 * at + 0.5 * wobble),
        level_dbfs: Some(-18.0 - 0.09 * at + 1.1 * (0.9 * at).cos()),
        settling_s: (key != 83).then_some(0.02 + 0.09 * (-(at + 24.0) / 10.0).exp()),
        worst_alias: (key > 40).then_some(KeyAlias {
            frequency_hz: 2_000.0 + 70.0 * at,
            partial: 120,
            folds: 1,
            relative_db: -60.0 + 0.5 * at,
            over_mask_db: Some(over),
        }),
    }
}

/// A check over a stretch of the session, in seconds; bars last two of them.
fn check(
    verdict: &str,
    ends: (f64, f64),
    outside: Option<(f64, f64)>,
) -> serde_json::Result<CheckResult> {
    let extent = |(start_s, end_s): (f64, f64)| {
        let place =
            |s: f64| ((s * RATE_HZ).round(), (s / 2.0).floor() + 1.0, 1.0 + (s % 2.0) * 2.0);
        let ((start, start_bar, start_beat), (end, end_bar, end_beat)) =
            (place(start_s), place(end_s));
        format!(
            r#""start_s":{start_s},"end_s":{end_s},"start_sample":{start},"end_sample":{end},
            "start_bar":{start_bar},"start_beat":{start_beat:?},"end_bar":{end_bar},"end_beat":{end_beat:?}"#
        )
    };
    let reason = if verdict == "unmeasured" { "\"no single pitch was found\"" } else { "null" };
    let (worst, mean) = match verdict {
        "within" => ("2.1", "1.9"),
        "outside" => ("-9.2", "-3.4"),
        _ => ("null", "null"),
    };
    let spans = outside.map_or_else(String::new, |ends| {
        format!(r#"{{{},"worst_cents":-9.2,"mean_cents":-7.1}}"#, extent(ends))
    });
    let text = format!(
        r#"{{"number":0,{},"in_session":true,"verdict":"{verdict}","reason":{reason},
        "reference":"nearest note","reference_kind":"nearest","tolerance_cents":5.0,
        "worst_cents":{worst},"mean_cents":{mean},"drift_cents_per_s":0.08,"drift_sd":0.02,
        "measured_s":6.0,"measured_share":0.98,"outside_s":0.0,"spans":[{spans}],"spans_left_out":0,
        "lost_samples":0,"sample_rate_hz":48000.0,"concert_pitch_hz":440.0,"temperament":"equal",
        "engine_version":"0","comment":""}}"#,
        extent(ends)
    );
    let mut result: CheckResult = serde_json::from_str(&text)?;
    result.in_trail =
        Some(InTrail { start: 100.0 * ends.0, end: 100.0 * ends.1, readings_per_s: 100.0 });
    Ok(result)
}

/// Cents over time: a slow rise, a vibrato, a dip below the tolerance, a bump above it.
fn drifting(t: f64) -> f64 {
    let bump = |at: f64, width: f64, by: f64| by * (-((t - at) / width).powi(2)).exp();
    let vibrato = if t > 4.0 && t < 16.0 { 1.5 } else { 0.15 };
    1.8 + vibrato * (core::f64::consts::TAU * 5.6 * t).sin()
        + 0.08 * t.min(15.0)
        + bump(20.0, 1.6, -11.0)
        + bump(27.3, 0.5, 5.6)
}

/// Level of partials and of noise 30 dB below them.
fn level(partials: &[Partial]) -> f64 {
    let power: f64 = partials.iter().map(|p| 10f64.powf(p.level_dbfs / 10.0)).sum();
    10.0 * (1.001 * power).max(1e-9).log10()
}

/// Partials of a stiff string at A3 +1.8 ct, falling 6 dB an octave with dents.
pub(crate) fn string_partials(count: u32) -> Vec<Partial> {
    let f0 = 220.0 * ratio(1.8);
    (1..=count)
        .map(|number| {
            let n = f64::from(number);
            let off = 600.0 * (1.0 + 1.6e-4 * n * n).log2();
            let dent = [0.0, -3.0, 1.5, -2.0, 0.5, 2.0, -1.0][number as usize % 7];
            let cents_sd = 0.05 + 0.003 * n * n;
            let wobble = cents_sd * (n * 2.4).sin();
            Partial {
                number,
                frequency_hz: n * f0 * ratio(off + wobble),
                frequency_sd_hz: 0.01 * n,
                cents_from_harmonic: off + wobble,
                cents_sd,
                level_dbfs: -13.2 - 6.1 * n.log2() - 0.3 * n + dent,
                level_sd_db: 0.1,
                phase_rad: 0.4 * n % 3.0,
                snr_db: 60.0 - n,
            }
        })
        .collect()
}

/// An alias, mains hum, and one that nobody knows.
pub(crate) fn strays() -> Vec<Stray> {
    let stray = |frequency_hz, level_dbfs, kind| Stray { frequency_hz, level_dbfs, kind };
    vec![
        stray(100.0, -58.2, StrayKind::Mains { base_hz: 50.0, multiple: 2 }),
        stray(2_999.6, -61.0, StrayKind::Alias { partial: 204, folds: 1 }),
        stray(1_210.0, -66.4, StrayKind::Unexplained),
    ]
}
