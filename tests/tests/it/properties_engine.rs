//! What must hold for every sound: the engine's figures follow the sound's own symmetries.

use std::f64::consts::{PI, TAU};

use plumbtone_analysis::signals::{
    Motion, MovingTone, Random, Timbre, Tone, Vibrato, add_noise, narrow,
};
use plumbtone_analysis::{Analyzer, Note, Settings};
use plumbtone_tests::take::{Take, cents};
use proptest::prelude::*;
use proptest::test_runner::{Config, RngSeed};

/// Few cases, for each analyses seconds of sound; the same in every run.
fn config() -> Config {
    Config {
        rng_seed: RngSeed::Fixed(12),
        failure_persistence: None,
        cases: 12,
        ..Config::default()
    }
}

/// A tone to be made.
#[derive(Debug, Clone, Copy)]
struct Sound {
    seed: u64,
    rate_hz: f64,
    f0_hz: f64,
    b: f64,
    snr_db: f64,
    vibrato_cents: f64,
}

impl Sound {
    fn make(&self, duration_s: f64) -> Vec<f32> {
        let mut random = Random::new(self.seed);
        let timbre = Timbre { partials: 20, ..Timbre::default() };
        let tone = Tone::random(&mut random, self.rate_hz, self.f0_hz, self.b, &timbre);
        let vibrato =
            Vibrato { rate_hz: 5.5, extent_cents: self.vibrato_cents, phase_rad: random.phase() };
        let motion = Motion { vibrato: Some(vibrato), ..Motion::default() };
        let count = plumbtone_analysis::signals::sample_count(duration_s, self.rate_hz);
        let mut sound = if self.vibrato_cents > 0.0 {
            MovingTone::new(tone, motion, duration_s).render(count)
        } else {
            tone.render(count)
        };
        add_noise(&mut random, &mut sound, self.snr_db);
        narrow(&sound)
    }

    fn settings(&self) -> Settings {
        Settings::new(self.rate_hz)
    }
}

fn steady() -> impl Strategy<Value = Sound> {
    let rate = prop::sample::select(vec![22_050.0, 44_100.0, 48_000.0, 96_000.0]);
    let f0 = (0.0..5.0).prop_map(|octaves: f64| 55.0 * octaves.exp2());
    let b = prop::sample::select(vec![0.0, 5e-5, 5e-4]);
    (any::<u64>(), rate, f0, b, 40.0..70.0).prop_map(|(seed, rate_hz, f0_hz, b, snr_db)| Sound {
        seed,
        rate_hz,
        f0_hz,
        b,
        snr_db,
        vibrato_cents: 0.0,
    })
}

fn moving() -> impl Strategy<Value = Sound> {
    (steady(), 0.0..80.0).prop_map(|(sound, vibrato_cents)| Sound { vibrato_cents, ..sound })
}

fn only_note(take: &Take) -> Result<&Note, TestCaseError> {
    take.longest_note().ok_or_else(|| TestCaseError::fail("no note"))
}

proptest! {
    #![proptest_config(config())]

    #[test]
    fn cutting_the_input_differently_changes_no_bit(
        sound in moving(),
        blocks in prop::collection::vec(prop::sample::select(vec![1, 7, 64, 480, 511, 4096]), 4..40),
    ) {
        let samples = sound.make(0.8);
        let whole = Take::of(&sound.settings(), &samples).unwrap();
        let mut analyzer = Analyzer::new(&sound.settings()).unwrap();
        let mut cut = Take::default();
        let mut rest = &samples[..];
        for &block in blocks.iter().cycle() {
            let (now, later) = rest.split_at(block.min(rest.len()));
            analyzer.push(now, &mut cut);
            rest = later;
            if rest.is_empty() {
                break;
            }
        }
        analyzer.finish(&mut cut);
        // Debug prints the shortest digits that read back as the same double.
        prop_assert_eq!(format!("{:?}", whole), format!("{:?}", cut));
    }

    #[test]
    fn gain_moves_levels_only(sound in moving(), gain_db in -30.0_f64..12.0) {
        let samples = sound.make(1.0);
        let gain = 10.0_f64.powf(gain_db / 20.0);
        let louder = narrow(&samples.iter().map(|&x| f64::from(x) * gain).collect::<Vec<_>>());
        let take = Take::of(&sound.settings(), &samples).unwrap();
        let moved = Take::of(&sound.settings(), &louder).unwrap();
        prop_assert_eq!(take.readings.len(), moved.readings.len());
        for (a, b) in take.readings.iter().zip(&moved.readings) {
            prop_assert_eq!(a.state, b.state, "at {}", a.centre);
            prop_assert!((b.level_dbfs - a.level_dbfs - gain_db).abs() < 1e-3, "{:?}, {:?}", a, b);
            if let (Some(p), Some(q)) = (a.pitch, b.pitch) {
                let apart = cents(q.f0_hz, p.f0_hz);
                prop_assert!(apart.abs() < 0.01 + 0.1 * p.f0_sd_cents, "{} at {}", apart, a.centre);
            }
        }
        let (a, b) = (only_note(&take)?, only_note(&moved)?);
        let apart = cents(b.f0_hz, a.f0_hz);
        prop_assert!(apart.abs() < 0.001 + 0.1 * a.f0_sd_cents, "f0 moved by {} cents", apart);
    }

    #[test]
    fn polarity_turns_phases_only(sound in moving()) {
        let samples = sound.make(1.0);
        let turned: Vec<f32> = samples.iter().map(|x| -x).collect();
        let take = Take::of(&sound.settings(), &samples).unwrap();
        let other = Take::of(&sound.settings(), &turned).unwrap();
        let pitches = |take: &Take| -> Vec<_> { take.readings.iter().map(|r| r.pitch).collect() };
        prop_assert_eq!(pitches(&take), pitches(&other));
        for (a, b) in only_note(&take)?.partials.iter().zip(&only_note(&other)?.partials) {
            let turn = (b.phase_rad - a.phase_rad - PI) / TAU;
            prop_assert!((turn - turn.round()).abs() < 1e-6, "{:?}, {:?}", a, b);
            prop_assert!((b.level_dbfs - a.level_dbfs).abs() < 1e-6, "{:?}, {:?}", a, b);
        }
    }

    #[test]
    fn a_later_start_moves_positions_only(sound in steady(), hops in 1_u16..40) {
        let samples = sound.make(1.5);
        let hop = Analyzer::new(&sound.settings()).unwrap().hop();
        let shift = usize::from(hops) * hop;
        let later = [vec![0.0; shift], samples.clone()].concat();
        let take = Take::of(&sound.settings(), &samples).unwrap();
        let moved = Take::of(&sound.settings(), &later).unwrap();
        // Frames that reach beyond the sound see less of it, and not the same part.
        let inside = (0.5 * sound.rate_hz, 1.35 * sound.rate_hz);
        let within = |centre: u64| centre as f64 > inside.0 && (centre as f64) < inside.1;
        for reading in take.readings.iter().filter(|r| within(r.centre)) {
            let centre = reading.centre + shift as u64;
            let same = moved.readings.iter().find(|r| r.centre == centre);
            let (Some(p), Some(q)) = (reading.pitch, same.and_then(|r| r.pitch)) else {
                return Err(TestCaseError::fail(format!("no pitch at {centre}")));
            };
            let apart = cents(q.f0_hz, p.f0_hz);
            prop_assert!(apart.abs() < 0.01 + p.f0_sd_cents, "{} cents at {}", apart, centre);
        }
        let (a, b) = (only_note(&take)?, only_note(&moved)?);
        let late_ms = 1000.0 * (b.start as f64 - shift as f64) / sound.rate_hz;
        prop_assert!(late_ms.abs() < 15.0, "the onset lies {} ms off", late_ms);
        let apart = cents(b.f0_hz, a.f0_hz);
        let sd = a.f0_sd_cents.hypot(b.f0_sd_cents);
        prop_assert!(apart.abs() < 0.001 + 4.0 * sd, "f0 moved by {} cents, sd {}", apart, sd);
    }

    #[test]
    fn another_sample_rate_scales_every_frequency(sound in steady(), ratio in 0.85_f64..1.18) {
        let samples = sound.make(1.5);
        let other = Settings::new(sound.rate_hz * ratio);
        let take = Take::of(&sound.settings(), &samples).unwrap();
        let scaled = Take::of(&other, &samples).unwrap();
        let (a, b) = (only_note(&take)?, only_note(&scaled)?);
        let apart = cents(b.f0_hz / ratio, a.f0_hz);
        let sd = a.f0_sd_cents.hypot(b.f0_sd_cents);
        prop_assert!(apart.abs() < 0.001 + 4.0 * sd, "f0 off by {} cents, sd {}", apart, sd);
        for p in &a.partials {
            let Some(q) = b.partials.iter().find(|q| q.number == p.number) else { continue };
            let apart = q.frequency_hz / ratio - p.frequency_hz;
            let sd = p.frequency_sd_hz.hypot(q.frequency_sd_hz / ratio);
            prop_assert!(apart.abs() < 6.0 * sd, "{:?}, {:?}", p, q);
        }
    }
}
