//! What `drift` says of a file: verdict, spans, figures, in all its forms.

use crate::sounds::{Channel, Coding, moving_tone, silence, tone_at, wav};
use crate::{drift, folder_with};
use serde_json::Value;
use std::f64::consts::TAU;
use std::path::Path;

/// The fields promised, in their order; others follow.
const PROMISED: [&str; 13] = [
    "file",
    "reference_hz",
    "reference_kind",
    "tolerance_cents",
    "verdict",
    "worst_cents",
    "mean_cents",
    "drift_cents_per_s",
    "drift_sd",
    "vibrato_hz",
    "vibrato_extent_cents",
    "measured_share",
    "spans",
];

/// A tone at A3 with cents over time on top.
pub(crate) fn a3(cents: impl Fn(f64) -> f64, seconds: f64) -> Channel {
    moving_tone(|t| 220.0 * 2.0_f64.powf(cents(t) / 1200.0), seconds)
}

fn step(t: f64) -> f64 {
    if t >= 1.0 && t < 2.0 { 12.0 } else { 0.0 }
}

fn object(folder: &Path, arguments: &[&str]) -> Value {
    let run = drift(folder, &[&["--json"], arguments].concat());
    assert_eq!(run.stdout.lines().count(), 1, "{arguments:?}: {}", run.stderr);
    run.objects().remove(0)
}

fn number(object: &Value, name: &str) -> f64 {
    assert!(object[name].is_number(), "{name} in {object}");
    object[name].as_f64().unwrap()
}

#[test]
fn the_verdict_is_the_exit_status() {
    let folder = folder_with([
        ("still.wav", wav(&[a3(|_| 3.0, 2.0)], Coding::S16)),
        ("step.wav", wav(&[a3(step, 3.0)], Coding::S16)),
        ("silence.wav", wav(&[silence(1.0)], Coding::S16)),
        ("bad.wav", b"no sound".to_vec()),
    ]);
    for (files, status, verdicts) in [
        (&["still.wav"][..], 0, &["within"][..]),
        (&["step.wav"], 1, &["outside"]),
        (&["still.wav", "step.wav"], 1, &["within", "outside"]),
        (&["silence.wav"], 2, &["unmeasured"]),
        (&["silence.wav", "step.wav"], 2, &["unmeasured", "outside"]),
        (&["bad.wav", "still.wav"], 2, &["within"]),
        (&["missing.wav"], 2, &[]),
    ] {
        let arguments = [&["--json", "--reference", "A3", "--tolerance", "5"][..], files].concat();
        let run = drift(folder.path(), &arguments);
        assert_eq!(run.status, Some(status), "{files:?}: {}", run.stderr);
        let said: Vec<_> = run.objects().iter().map(|o| o["verdict"].clone()).collect();
        assert_eq!(said, verdicts, "{files:?}");
        assert_eq!(run.stderr.is_empty(), status < 2, "{files:?}: a reason: {:?}", run.stderr);
    }
}

#[test]
fn the_json_has_the_fields_promised_in_their_order() {
    let folder = folder_with([
        ("step.wav", wav(&[a3(step, 3.0)], Coding::S16)),
        ("silence.wav", wav(&[silence(1.0)], Coding::S16)),
    ]);
    let found = object(folder.path(), &["--reference", "A3", "--tolerance", "5", "step.wav"]);
    let names: Vec<&str> = found.as_object().unwrap().keys().map(String::as_str).collect();
    assert_eq!(names[..PROMISED.len()], PROMISED, "of a file");
    let span = &found["spans"][0];
    let names: Vec<&str> = span.as_object().unwrap().keys().map(String::as_str).collect();
    assert_eq!(names[..3], ["start_s", "end_s", "worst_cents"], "of a span");
    let near = |value: f64, due: f64| (value - due).abs() < 0.03;
    assert!(near(number(span, "start_s"), 1.0) && near(number(span, "end_s"), 2.0), "{span}");
    assert!((number(&found, "worst_cents") - 12.0).abs() < 0.3, "{found}");
    assert!((number(&found, "mean_cents") - 4.0).abs() < 0.3, "{found}");
    let silent = object(folder.path(), &["--reference", "A3", "silence.wav"]);
    for name in &PROMISED[5..12] {
        assert!(silent[name].is_null(), "{name} of silence: {silent}");
    }
    assert_eq!(silent["spans"], serde_json::json!([]), "spans of silence");
}

#[test]
fn drift_is_told_from_vibrato() {
    let vibrato = |t: f64| 40.0 * (TAU * 5.5 * t).sin();
    let folder = folder_with([
        ("drift.wav", wav(&[a3(|t| 2.0 * t, 4.0)], Coding::S24)),
        ("vibrato.wav", wav(&[a3(vibrato, 4.0)], Coding::S24)),
        ("both.wav", wav(&[a3(|t| 2.0 * t + vibrato(t), 4.0)], Coding::S24)),
    ]);
    for (name, rate, swings, verdict) in [
        ("drift.wav", 2.0, false, "outside"),
        ("vibrato.wav", 0.0, true, "within"),
        ("both.wav", 2.0, true, "outside"),
    ] {
        let found = object(folder.path(), &["--reference", "220", "--tolerance", "5", name]);
        assert_eq!(found["verdict"], verdict, "{name}: {found}");
        let (drift, sd) = (number(&found, "drift_cents_per_s"), number(&found, "drift_sd"));
        assert!((drift - rate).abs() < 0.05 && sd < 0.05, "{name}: {drift} ± {sd}");
        assert!((number(&found, "drift_cents_per_min") - 60.0 * drift).abs() < 1e-9, "{name}");
        if swings {
            assert!((number(&found, "vibrato_hz") / 5.5 - 1.0).abs() < 0.02, "{name}: {found}");
            let extent = number(&found, "vibrato_extent_cents");
            assert!((extent / 40.0 - 1.0).abs() < 0.05, "{name}: {extent}");
            assert!(number(&found, "raw_highest_cents") > 38.0, "{name}: {found}");
        } else {
            assert!(found["vibrato_hz"].is_null(), "{name}: {found}");
        }
    }
}

#[test]
fn references_are_notes_frequencies_first_or_nearest() {
    let folder = folder_with([("a.wav", wav(&[tone_at(224.0, 2.0)], Coding::S16))]);
    let off = 1200.0 * (224.0_f64 / 220.0).log2();
    for (arguments, kind, reference_hz, mean) in [
        (&["--reference", "A3"][..], "note", Some(220.0), off),
        (&["--reference", "A3", "--concert-pitch", "448"], "note", Some(224.0), 0.0),
        (&["--reference", "222.5"], "frequency", Some(222.5), 1200.0 * (224.0_f64 / 222.5).log2()),
        (&["--reference", "first"], "first", Some(224.0), 0.0),
        (&["--reference", "nearest"], "nearest", None, off),
        (&[], "nearest", None, off),
    ] {
        let found = object(folder.path(), &[arguments, &["a.wav"]].concat());
        assert_eq!(found["reference_kind"], kind, "{arguments:?}");
        let hz = found["reference_hz"].as_f64();
        let close = match (hz, reference_hz) {
            (Some(a), Some(b)) => (a - b).abs() < 0.01,
            (a, b) => a.is_none() && b.is_none(),
        };
        assert!(close, "{arguments:?}: {hz:?}");
        let found = number(&found, "mean_cents");
        assert!((found - mean).abs() < 0.1, "{arguments:?}: {found} cents, not {mean}");
    }
}

#[test]
fn csv_files_hold_the_pitch_and_the_spans() {
    let folder = folder_with([("step.wav", wav(&[a3(step, 3.0)], Coding::S16))]);
    let arguments = ["--reference", "A3", "--tolerance", "5", "--csv", "out", "step.wav"];
    let found = object(folder.path(), &arguments);
    let read = |name: &str| {
        let text = std::fs::read_to_string(folder.path().join("out").join(name)).unwrap();
        text.lines().map(|l| l.split(',').map(str::to_owned).collect()).collect::<Vec<Vec<_>>>()
    };
    let spans = read("step.spans.csv");
    assert_eq!(spans[0], ["span_number", "start_s", "end_s", "worst_cents", "mean_cents"]);
    assert_eq!(spans.len(), 2, "{spans:?}");
    for (column, name) in [(1, "start_s"), (2, "end_s"), (3, "worst_cents"), (4, "mean_cents")] {
        let cell: f64 = spans[1][column].parse().unwrap();
        assert_eq!(Some(cell), found["spans"][0][name].as_f64(), "{name}");
    }
    let course = read("step.drift.csv");
    let head = "time_s,reference_hz,heard_cents,heard_sd_cents,raw_cents,beyond_tolerance";
    assert_eq!(course[0].join(","), head);
    let beyond = course.iter().filter(|row| row[5] == "true").count();
    assert!(course.len() > 280 && beyond.abs_diff(100) < 4, "{beyond} of {}", course.len());
    let entries = std::fs::read_dir(folder.path().join("out")).unwrap().count();
    assert_eq!(entries, 2, "nothing else is left in the folder");
}

#[test]
fn the_table_tells_verdict_figures_and_spans() {
    let folder = folder_with([("step.wav", wav(&[a3(step, 3.0)], Coding::S16))]);
    let run = drift(folder.path(), &["--reference", "A3", "--tolerance", "5", "step.wav"]);
    let verdict = "step.wav: OUTSIDE ±5 cents of A3 (220.00 Hz): 1.0";
    assert!(run.stdout.starts_with(verdict), "{}", run.stdout);
    for part in ["worst    +12.0", "drift", "cents/min", "vibrato  none", "outside  from s"] {
        assert!(run.stdout.contains(part), "{part:?} in:\n{}", run.stdout);
    }
}

#[test]
fn pictures_are_drawn_for_each_file() {
    let folder = folder_with([
        ("a.wav", wav(&[a3(step, 3.0)], Coding::S16)),
        ("b.wav", wav(&[silence(0.5)], Coding::S16)),
    ]);
    for (picture, files, written, start) in [
        ("one.svg", &["a.wav"][..], &["one.svg"][..], &b"<svg "[..]),
        ("one.png", &["a.wav"], &["one.png"], b"\x89PNG"),
        ("many.svg", &["a.wav", "b.wav"], &["many-a.svg", "many-b.svg"], b"<svg "),
    ] {
        drift(folder.path(), &[&["--picture", picture], files].concat());
        for name in written {
            let bytes = std::fs::read(folder.path().join(name)).unwrap();
            assert!(bytes.starts_with(start), "{name} starts with {:?}", &bytes[..8]);
        }
    }
}

#[test]
fn lost_sound_is_a_gap_that_no_span_bridges() {
    let mut sound = a3(|_| 20.0, 3.0);
    sound[60_000..72_000].fill(f64::NAN);
    let folder = folder_with([("holed.wav", wav(&[sound], Coding::F32))]);
    let found = object(folder.path(), &["--reference", "A3", "holed.wav"]);
    assert_eq!(found["gaps"].as_array().map(Vec::len), Some(1), "{found}");
    assert_eq!(found["spans"].as_array().map(Vec::len), Some(2), "{found}");
    assert!((number(&found, "measured_share") - 2.75 / 3.0).abs() < 0.02, "{found}");
}
