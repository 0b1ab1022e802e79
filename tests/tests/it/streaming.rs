//! What the stream of readings promises, whatever is in the samples.

use plumbtone_analysis::signals::{Random, Timbre, Tone, add_noise, narrow, white_noise};
use plumbtone_analysis::{Analyzer, Gap, GapReason, Note, Reading, Settings};
use plumbtone_tests::take::{Take, cents};

const RATE_HZ: f64 = 48_000.0;
const F0_HZ: f64 = 220.0;

fn tone(samples: usize) -> Vec<f32> {
    let mut random = Random::new(17);
    let tone = Tone::random(&mut random, RATE_HZ, F0_HZ, 1e-4, &Timbre::default());
    let mut sound = tone.render(samples);
    add_noise(&mut random, &mut sound, 60.0);
    narrow(&sound)
}

fn assert_finite(take: &Take, what: &str) {
    let finite = |values: &[f64]| values.iter().all(|value| value.is_finite());
    for reading in &take.readings {
        let Reading { pitch, partials, strays, .. } = reading;
        let pitch = pitch.is_none_or(|p| finite(&[p.f0_hz, p.f0_sd_cents, p.confidence]));
        let partials = partials.iter().all(|p| {
            finite(&[p.frequency_hz, p.frequency_sd_hz, p.cents_from_harmonic, p.cents_sd])
                && finite(&[p.level_dbfs, p.level_sd_db, p.phase_rad, p.snr_db])
        });
        let strays = strays.iter().all(|s| finite(&[s.frequency_hz, s.level_dbfs]));
        assert!(pitch && partials && strays, "{what}: {reading:?}");
        assert!(!reading.level_dbfs.is_nan(), "{what}: {reading:?}");
    }
    for note in &take.notes {
        let Note { f0_hz, f0_sd_cents, partials, stretch, .. } = note;
        let partials = partials.iter().all(|p| {
            finite(&[p.frequency_hz, p.frequency_sd_hz, p.cents_from_harmonic, p.cents_sd])
                && finite(&[p.level_dbfs, p.level_sd_db, p.level_relative_db, p.level_mean_dbfs])
                && finite(&[p.phase_rad, p.decay_db_per_s, p.decay_sd, p.snr_db])
        });
        let stretch = stretch.is_none_or(|s| finite(&[s.b, s.b_sd]));
        assert!(finite(&[*f0_hz, *f0_sd_cents]) && partials && stretch, "{what}: {note:?}");
    }
}

#[test]
fn readings_lie_on_a_grid_of_10_ms_or_less_that_covers_the_stream() {
    for rate in [8_000.0, 11_025.0, 44_100.0, 96_000.0, 384_000.0] {
        let settings = Settings::new(rate);
        let hop = Analyzer::new(&settings).unwrap().hop();
        assert!(hop as f64 / rate <= 0.01, "{rate} Hz: a hop of {hop} samples");
        let count = 8_000;
        let take = Take::of(&settings, &vec![0.0; count]).unwrap();
        let centres: Vec<u64> = take.readings.iter().map(|reading| reading.centre).collect();
        let grid: Vec<u64> = (0..count).step_by(hop).map(|centre| centre as u64).collect();
        assert_eq!(centres, grid, "{rate} Hz");
    }
}

#[test]
fn samples_that_are_no_numbers_become_a_gap_and_are_forgotten() {
    let good = tone(48_000);
    let bad = [f32::NAN, f32::INFINITY, f32::NEG_INFINITY, f32::NAN];
    let take = Take::of(&Settings::new(RATE_HZ), &[&good[..], &bad, &good].concat()).unwrap();
    let gap = Gap { start: 48_000, end: 48_004, reason: GapReason::NonFinite };
    assert_eq!(take.gaps, [gap]);
    assert_recovers(&take, &gap);
}

#[test]
fn lost_samples_become_a_gap_and_keep_their_time() {
    let good = tone(48_000);
    let mut analyzer = Analyzer::new(&Settings::new(RATE_HZ)).unwrap();
    let mut take = Take::default();
    analyzer.push(&good, &mut take);
    analyzer.skip(10_000, &mut take);
    analyzer.push(&good, &mut take);
    analyzer.finish(&mut take);
    let gap = Gap { start: 48_000, end: 58_000, reason: GapReason::Lost };
    assert_eq!(take.gaps, [gap]);
    assert_recovers(&take, &gap);
}

/// After a gap, readings are right again within one frame of 200 ms.
fn assert_recovers(take: &Take, gap: &Gap) {
    assert_finite(take, "around a gap");
    let inside = take.readings.iter().filter(|r| (gap.start + 1..gap.end).contains(&r.centre));
    assert_eq!(inside.count(), 0, "readings inside the gap");
    // The last 20 ms see little of the sound.
    let judged = gap.end + 9_600..gap.end + 47_000;
    let after: Vec<&Reading> =
        take.readings.iter().filter(|reading| judged.contains(&reading.centre)).collect();
    assert!(!after.is_empty(), "readings after the gap");
    for reading in after {
        let right = reading.pitch.is_some_and(|pitch| cents(pitch.f0_hz, F0_HZ).abs() < 0.5);
        assert!(right, "{:?} at {}", reading.pitch, reading.centre);
    }
    assert_eq!(take.notes.len(), 2, "a note on either side of the gap");
}

#[test]
fn a_reset_engine_is_a_new_engine() {
    let sound = tone(30_000);
    let settings = Settings::new(RATE_HZ);
    let mut analyzer = Analyzer::new(&settings).unwrap();
    analyzer.push(&tone(20_001), &mut Take::default());
    analyzer.reset();
    let mut again = Take::default();
    analyzer.push(&sound, &mut again);
    analyzer.finish(&mut again);
    let fresh = Take::of(&settings, &sound).unwrap();
    assert_eq!(format!("{again:?}"), format!("{fresh:?}"), "bit for bit");
}

#[test]
fn odd_sounds_give_finite_figures() {
    let mut random = Random::new(4);
    let noise = narrow(&white_noise(&mut random, 30_000, 1.0));
    let clipped: Vec<f32> = tone(30_000).iter().map(|x| (x * 100.0).clamp(-1.0, 1.0)).collect();
    let half_silent = [vec![0.0; 20_000], tone(20_000)].concat();
    let mut impulse = vec![0.0; 30_000];
    impulse[15_000] = 1.0;
    let sounds = [
        ("nothing", Vec::new()),
        ("one sample", vec![0.5]),
        ("silence", vec![0.0; 30_000]),
        ("a constant", vec![0.7; 30_000]),
        ("an impulse", impulse),
        ("noise beyond full scale", noise),
        ("a clipped tone", clipped),
        ("silence, then a tone", half_silent),
        ("denormal numbers", vec![1e-40; 30_000]),
        ("huge numbers", tone(30_000).iter().map(|x| x * 1e15).collect()),
        ("the Nyquist frequency", (0..30_000).map(|n| [0.5, -0.5][n % 2]).collect()),
    ];
    for (what, sound) in sounds {
        let take = Take::of(&Settings::new(RATE_HZ), &sound).unwrap();
        assert_finite(&take, what);
    }
}
