//! What `recipe`, `keys` and `measure` say to somebody who builds a patch.

use crate::sounds::{AMPLITUDE, Coding, F0_HZ, RATE_HZ, silence, tone, tone_at, wav};
use crate::{folder_with, measure, plumbtone};
use serde_json::Value;
use std::f64::consts::TAU;
use std::path::Path;

fn recipe(folder: &Path, arguments: &[&str]) -> Value {
    let run = plumbtone(folder, "recipe", &[&["--json"], arguments].concat());
    assert_eq!(run.status, Some(0), "{arguments:?}: {}", run.stderr);
    run.objects().remove(0)
}

/// Amplitude and phase of partial `n` in a recipe, the phase against that of partial 1.
fn partial(recipe: &Value, n: u64) -> (f64, f64) {
    let partials = recipe["partials"].as_array().unwrap();
    let found = partials.iter().find(|p| p["number"] == n);
    assert!(found.is_some(), "partial {n} in {recipe}");
    let found = found.unwrap();
    (found["amplitude"].as_f64().unwrap(), found["phase_from_fundamental_rad"].as_f64().unwrap())
}

fn turn(radians: f64) -> f64 {
    radians - TAU * (radians / TAU).round()
}

fn samples(file: &Path) -> Vec<f32> {
    let mut reader = hound::WavReader::open(file).unwrap();
    reader.samples::<f32>().map(Result::unwrap).collect()
}

#[test]
fn a_recipe_is_what_the_sound_was_made_from() {
    let folder = folder_with([("tone.wav", wav(&[tone(2.0)], Coding::F32))]);
    let found = recipe(folder.path(), &["--at", "1.0", "tone.wav"]);
    for n in 1..=6_u32 {
        let number = f64::from(n);
        let (amplitude, phase) = partial(&found, u64::from(n));
        assert!((amplitude / (AMPLITUDE / number) - 1.0).abs() < 2e-3, "partial {n}: {amplitude}");
        // Partial n starts at phase n, so against the fundamental every phase is 0.
        assert!(turn(phase).abs() < 0.02, "partial {n}: phase {phase}");
    }
    let residual = found["residual_db"].as_f64().unwrap();
    assert!(residual < -40.0, "{residual} dB are left");
}

#[test]
fn the_exported_sound_gives_the_recipe_back() {
    let folder = folder_with([("tone.wav", wav(&[tone(2.0)], Coding::F32))]);
    let first = recipe(folder.path(), &["--at", "1.0", "--sound", "again.wav", "tone.wav"]);
    // The sound begins at the instant; farther on, what is left of the frequencies' errors turns the phases.
    let second = recipe(folder.path(), &["--at", "0.2", "again.wav"]);
    for n in 1..=6 {
        let (a, b) = (partial(&first, n), partial(&second, n));
        assert!((a.0 / b.0 - 1.0).abs() < 1e-3, "partial {n}: amplitude {} became {}", a.0, b.0);
        assert!(turn(a.1 - b.1).abs() < 5e-3, "partial {n}: phase {} became {}", a.1, b.1);
    }
    let f0 = |recipe: &Value| recipe["f0_hz"].as_f64().unwrap();
    let off = 1200.0 * (f0(&second) / f0(&first)).log2();
    assert!(off.abs() < 0.01, "{off} cents off");
}

#[test]
fn a_cycle_is_one_period_with_these_partials() {
    let folder = folder_with([("tone.wav", wav(&[tone(2.0)], Coding::F32))]);
    let arguments = [
        "--at",
        "1.0",
        "--cycle",
        "cycle.wav",
        "--table",
        "table.wav",
        "--cycles",
        "8",
        "tone.wav",
    ];
    let found = recipe(folder.path(), &arguments);
    let cycle = samples(&folder.path().join("cycle.wav"));
    assert_eq!(cycle.len(), 2048, "samples");
    let peak = cycle.iter().fold(0.0_f32, |peak, x| x.abs().max(peak));
    assert!((peak - 0.988).abs() < 1e-4, "scaled to {peak}");
    let gain = 10_f64.powf(found["cycle_gain_db"].as_f64().unwrap() / 20.0);
    for n in 1..=8_u32 {
        let step = TAU * f64::from(n) / 2048.0;
        let sum = |part: fn(f64) -> f64| -> f64 {
            let each = |(i, x): (usize, &f32)| f64::from(*x) * part(step * i as f64);
            cycle.iter().enumerate().map(each).sum::<f64>() / 1024.0
        };
        let amplitude = sum(f64::cos).hypot(sum(f64::sin)) / gain;
        let expected = if n <= 6 { partial(&found, u64::from(n)).0 } else { 0.0 };
        assert!((amplitude - expected).abs() < 1e-5, "partial {n}: {amplitude} for {expected}");
    }
    let table = samples(&folder.path().join("table.wav"));
    assert_eq!(table.len(), 8 * 2048, "samples of the table");
    for k in 1..8 {
        let off = (0..2048).map(|i| (table[i] - table[2048 * k + i]).abs()).fold(0.0, f32::max);
        assert!(off < 0.02, "cycle {k} of a sound that holds is off by {off}");
    }
}

#[test]
fn silence_has_no_recipe() {
    let folder = folder_with([("silence.wav", wav(&[silence(1.0)], Coding::S16))]);
    let run = plumbtone(folder.path(), "recipe", &["--cycle", "cycle.wav", "silence.wav"]);
    assert_eq!(run.status, Some(2), "{}", run.stderr);
    assert!(run.stderr.contains("silence.wav: nothing measurable"), "{}", run.stderr);
    assert!(!folder.path().join("cycle.wav").exists(), "no cycle of silence");
}

#[test]
fn keys_come_from_a_scale_with_its_holes() {
    let mut scale = Vec::new();
    for key in [57, 58, 60] {
        scale.extend(tone_at(440.0 * 2_f64.powf((f64::from(key) - 69.0) / 12.0) * 1.001, 0.8));
        scale.extend(silence(0.3));
    }
    let folder = folder_with([("scale.wav", wav(&[scale], Coding::S24))]);
    let run = plumbtone(folder.path(), "keys", &["--json", "--csv", "sheet.csv", "scale.wav"]);
    assert_eq!(run.status, Some(0), "{}", run.stderr);
    let sheet = run.objects().remove(0);
    let keys: Vec<_> = sheet["keys"].as_array().unwrap().iter().map(|k| k["key"].clone()).collect();
    assert_eq!(keys, ["A3", "Bb3", "C4"].map(Value::from), "{sheet}");
    assert_eq!(sheet["missing"], serde_json::json!(["B3"]), "{sheet}");
    for row in sheet["keys"].as_array().unwrap() {
        let cents = row["cents"].as_f64().unwrap();
        assert!((cents - 1.730_4).abs() < 0.02, "0.1 % sharp: {row}");
        let settling = row["settling_s"].as_f64().unwrap();
        assert!(settling < 0.1, "it holds from the start: {row}");
    }
    for (name, beginning) in [("sheet.svg", &b"<svg"[..]), ("sheet.png", b"\x89PNG")] {
        let run = plumbtone(folder.path(), "keys", &["--picture", name, "scale.wav"]);
        assert_eq!(run.status, Some(0), "{}", run.stderr);
        let drawn = std::fs::read(folder.path().join(name)).unwrap();
        assert!(drawn.starts_with(beginning), "{name}: {} bytes", drawn.len());
    }
    let drawn = std::fs::read_to_string(folder.path().join("sheet.svg")).unwrap();
    for text in ["3 keys", "A3 to C4", "still to play", "B3", "worst alias", "settling"] {
        assert!(drawn.contains(text), "{text} is in the picture");
    }
    let csv = std::fs::read_to_string(folder.path().join("sheet.csv")).unwrap();
    assert_eq!(csv.lines().count(), 4, "a head and three rows: {csv}");
    let table = plumbtone(folder.path(), "keys", &["scale.wav"]).stdout;
    let hole = table.lines().find(|line| line.contains("B3") && !line.contains("Bb3"));
    assert!(hole.is_some_and(|line| line.contains("not found")), "{table}");
}

#[test]
fn without_a_key_there_is_no_picture() {
    let folder = folder_with([("silence.wav", wav(&[silence(1.0)], Coding::S16))]);
    let run = plumbtone(folder.path(), "keys", &["--picture", "sheet.svg", "silence.wav"]);
    assert_eq!(run.status, Some(2), "{}", run.stderr);
    assert!(run.stderr.contains("no picture was drawn: no key was found"), "{}", run.stderr);
    assert!(!folder.path().join("sheet.svg").exists(), "no picture of silence");
}

#[test]
fn keys_come_from_the_names_of_files() {
    let folder = folder_with([
        ("takes/pad-A4.wav", wav(&[tone_at(F0_HZ, 0.8)], Coding::S24)),
        ("takes/pad-A3.wav", wav(&[tone_at(F0_HZ, 0.8)], Coding::S24)),
    ]);
    let run = plumbtone(folder.path(), "keys", &["--json", "--named", "takes"]);
    assert_eq!(run.status, Some(0), "{}", run.stderr);
    let sheet = run.objects().remove(0);
    let cents = |i: usize| sheet["keys"][i]["cents"].as_f64().unwrap();
    assert!((cents(0) - 1202.75).abs() < 0.05, "an octave off its name: {sheet}");
    assert!((cents(1) - 2.75).abs() < 0.05, "{sheet}");
    let run = plumbtone(folder.path(), "keys", &["--named", "takes", "nameless.wav"]);
    assert_eq!(run.status, Some(2), "{}", run.stdout);
    assert!(run.stderr.contains("nameless.wav"), "{}", run.stderr);
}

#[test]
fn a_saw_is_called_a_saw_and_a_detuned_pair_a_cluster() {
    let saw = |f0: f64| -> Vec<f64> {
        let sample = |i: u32| {
            let at = f64::from(i) / f64::from(RATE_HZ);
            let partial = |n: f64| 0.3 / n * (TAU * n * f0 * at).sin();
            (1..=40).map(f64::from).map(partial).sum()
        };
        (0..2 * RATE_HZ).map(sample).collect()
    };
    let pair = saw(220.0).iter().zip(saw(221.3)).map(|(a, b)| 0.5 * (a + b)).collect();
    let folder = folder_with([
        ("saw.wav", wav(&[saw(220.0)], Coding::F32)),
        ("pair.wav", wav(&[pair], Coding::F32)),
    ]);
    let note = |file: &str| {
        measure(folder.path(), &["--json", file]).objects().remove(0)["notes"][0].clone()
    };
    let one = note("saw.wav");
    assert_eq!(one["waveform"]["name"], "saw", "{}", one["waveform"]);
    let clusters = |note: &Value| -> Vec<Value> {
        let partials = note["partials"].as_array().unwrap();
        partials.iter().filter(|p| p["lines"] != 1).cloned().collect()
    };
    assert!(clusters(&one).is_empty(), "a single voice: {:?}", clusters(&one));
    let two = clusters(&note("pair.wav"));
    assert!(two.len() >= 30, "{} of 40 partials are clusters", two.len());
    for partial in &two {
        let n = partial["number"].as_f64().unwrap();
        assert_eq!(partial["lines"], 2, "partial {n}: {partial}");
        let spread = partial["spread_cents"].as_f64().unwrap();
        assert!((spread - 10.2).abs() < 0.3, "partial {n}: {spread} cents");
        let beat = partial["beat_hz"].as_f64().unwrap();
        assert!((beat - 1.3 * n).abs() < 0.1, "partial {n}: beats at {beat} Hz");
    }
}
