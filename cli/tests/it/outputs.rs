//! What is written: JSON as promised, CSV, pictures, the table.

use crate::sounds::{Coding, tone, tone_at, wav};
use crate::{folder_with, measure};
use serde_json::Value;

const FILE: [&str; 9] = [
    "file",
    "sample_rate_hz",
    "channels",
    "duration_s",
    "concert_pitch_hz",
    "engine_version",
    "gaps",
    "frames",
    "notes",
];
const FRAME: [&str; 6] = ["time_s", "state", "f0_hz", "f0_sd_cents", "confidence", "level_dbfs"];
const NOTE: [&str; 19] = [
    "start_s",
    "end_s",
    "f0_hz",
    "f0_sd_cents",
    "note",
    "cents",
    "inharmonicity_b",
    "inharmonicity_sd",
    "partials",
    "strays",
    "odd_even_db",
    "tilt_db_per_octave",
    "thd_f_percent",
    "thd_r_percent",
    "hnr_db",
    "tristimulus",
    "centroid_partial",
    "strays_left_out",
    "waveform",
];
const PARTIAL: [&str; 16] = [
    "number",
    "frequency_hz",
    "frequency_sd_hz",
    "cents_from_harmonic",
    "cents_sd",
    "level_dbfs",
    "level_relative_db",
    "level_sd_db",
    "level_mean_dbfs",
    "phase_rad",
    "decay_db_per_s",
    "decay_sd",
    "snr_db",
    "lines",
    "spread_cents",
    "beat_hz",
];
const STRAY: [&str; 7] =
    ["frequency_hz", "level_dbfs", "kind", "partial", "folds", "relative_db", "over_mask_db"];

#[test]
fn json_has_the_fields_promised_in_their_order() {
    let folder = folder_with([("hum.wav", wav(&[with_hum()], Coding::F32))]);
    let run = measure(folder.path(), &["--json", "hum.wav"]);
    assert_eq!(run.stdout.lines().count(), 1, "one line per file");
    let object = &run.objects()[0];
    assert_eq!(names(object), FILE, "of a file");
    assert_eq!(names(&object["frames"][0]), FRAME, "of a frame");
    let note = &object["notes"][0];
    assert_eq!(names(note), NOTE, "of a note");
    assert_eq!(names(&note["partials"][0]), PARTIAL, "of a partial");
    assert_eq!(names(&note["strays"][0]), STRAY, "of a stray");
    assert_eq!(
        note["tristimulus"].as_array().map(Vec::len),
        Some(3),
        "three parts of the tristimulus"
    );
}

#[test]
fn what_was_not_measured_is_null() {
    let sound = [vec![0.0; 24_000], tone(0.8)].concat();
    let folder = folder_with([("late.wav", wav(&[sound], Coding::F32))]);
    let run = measure(folder.path(), &["--json", "late.wav"]);
    let frame = &run.objects()[0]["frames"][5];
    let silent = serde_json::json!({
        "time_s": 0.05, "state": "silent", "f0_hz": null, "f0_sd_cents": null, "confidence": null, "level_dbfs": null
    });
    assert_eq!(*frame, silent, "digital silence");
}

#[test]
fn notes_are_named_after_concert_pitch_and_temperament() {
    let folder = folder_with([("a.wav", wav(&[tone_at(415.0, 0.8)], Coding::S16))]);
    for (options, name, cents) in [
        (&["--concert-pitch", "440"][..], "G#4", -1.27),
        (&["--concert-pitch", "415"], "A4", 0.0),
        // A4 is 440 Hz there, and G#4 a tempered semitone of 76.05 cents above G4, 117.11 below A4.
        (&["--temperament", "meantone"], "G#4", 15.84),
    ] {
        let run = measure(folder.path(), &[&["--json", "a.wav"], options].concat());
        let note = &run.objects()[0]["notes"][0];
        assert_eq!(note["note"], name, "{options:?}");
        let off = note["cents"].as_f64().unwrap();
        assert!((off - cents).abs() < 0.05, "{options:?}: {off} cents, not {cents}");
    }
}

#[test]
fn csv_files_of_equal_stems_do_not_collide() {
    let folder = folder_with([
        ("one/a.wav", wav(&[tone_at(440.0, 0.8)], Coding::S16)),
        ("two/a.wav", wav(&[tone_at(330.0, 0.8)], Coding::S16)),
    ]);
    let run = measure(folder.path(), &["--csv", "out/figures", "one/a.wav", "two/a.wav"]);
    assert_eq!(run.status, Some(0), "{}", run.stderr);
    let mut written: Vec<_> = std::fs::read_dir(folder.path().join("out/figures"))
        .unwrap()
        .map(|entry| entry.unwrap().file_name().into_string().unwrap())
        .collect();
    written.sort();
    let expected: Vec<String> = ["a-2", "a"]
        .iter()
        .flat_map(|stem| {
            ["frames", "notes", "partials", "strays"].map(|kind| format!("{stem}.{kind}.csv"))
        })
        .collect();
    assert_eq!(written, expected, "nothing else is left in the folder");
    for (stem, f0_hz) in [("a", 440.0), ("a-2", 330.0)] {
        let path = folder.path().join(format!("out/figures/{stem}.notes.csv"));
        let text = std::fs::read_to_string(path).unwrap();
        let row: Vec<&str> = text.lines().nth(1).unwrap().split(',').collect();
        let measured: f64 = row[3].parse().unwrap();
        assert!((measured - f0_hz).abs() < 0.1, "{stem}: {measured} Hz, not {f0_hz}");
    }
}

#[test]
fn csv_and_json_say_the_same() {
    let folder = folder_with([("hum.wav", wav(&[with_hum()], Coding::F32))]);
    let run = measure(folder.path(), &["--json", "--csv", ".", "hum.wav"]);
    let object = &run.objects()[0];
    let note = &object["notes"][0];
    for (kind, list) in [
        ("frames", &object["frames"]),
        ("partials", &note["partials"]),
        ("strays", &note["strays"]),
    ] {
        let text = std::fs::read_to_string(folder.path().join(format!("hum.{kind}.csv"))).unwrap();
        let mut lines = text.lines().map(|line| line.split(',').collect::<Vec<_>>());
        let columns = lines.next().unwrap();
        let rows: Vec<_> = lines.collect();
        let list = list.as_array().unwrap();
        assert_eq!(rows.len(), list.len(), "{kind}");
        for (row, element) in rows.iter().zip(list) {
            for (name, value) in element.as_object().unwrap() {
                let cell = row[columns.iter().position(|column| column == name).unwrap()];
                let same = match value {
                    Value::Null => cell.is_empty(),
                    Value::String(text) => cell == text,
                    number => cell.parse::<f64>().ok() == number.as_f64(),
                };
                assert!(same, "{kind}, {name}: {cell:?} in CSV, {value} in JSON");
            }
        }
    }
}

#[test]
fn pictures_are_named_after_their_inputs() {
    let folder = folder_with([
        ("a.wav", wav(&[tone_at(440.0, 0.8)], Coding::S16)),
        ("b.wav", wav(&[tone_at(330.0, 0.8)], Coding::S16)),
    ]);
    for (picture, files, written, start) in [
        ("one.svg", &["a.wav"][..], &["one.svg"][..], &b"<svg "[..]),
        ("two.PNG", &["a.wav"], &["two.PNG"], b"\x89PNG"),
        ("many.svg", &["a.wav", "b.wav"], &["many-a.svg", "many-b.svg"], b"<svg "),
    ] {
        let run = measure(folder.path(), &[&["--picture", picture], files].concat());
        assert_eq!(run.status, Some(0), "{picture}: {}", run.stderr);
        for name in written {
            let bytes = std::fs::read(folder.path().join(name)).unwrap();
            assert!(bytes.starts_with(start), "{name} starts with {:?}", &bytes[..8]);
        }
    }
}

#[test]
fn a_note_that_is_not_there_cannot_be_drawn() {
    let folder = folder_with([("a.wav", wav(&[tone(0.8)], Coding::S16))]);
    let run = measure(folder.path(), &["--picture", "a.svg", "--note", "9", "a.wav"]);
    assert_eq!(run.status, Some(2), "{}", run.stderr);
    assert!(run.stdout.contains("note 1: A4"), "the table is there all the same: {}", run.stdout);
    assert!(
        run.stderr.contains("no picture was drawn: there is no note 9, the file has 1"),
        "{}",
        run.stderr
    );
    assert!(!folder.path().join("a.svg").exists(), "no picture");
}

#[test]
fn the_table_shows_each_figure_with_its_deviation() {
    let folder = folder_with([("hum.wav", wav(&[with_hum()], Coding::F32))]);
    let run = measure(folder.path(), &["hum.wav"]);
    assert!(
        run.stdout.starts_with("hum.wav: 48000 Hz, 1 channel, 0.800 s, 1 note\n"),
        "{}",
        run.stdout
    );
    for part in [
        "note 1: A4 +2.7",
        " ± ",
        "stretch B",
        "tilt",
        "THD",
        "tristimulus",
        "belongs to no partial",
    ] {
        assert!(run.stdout.contains(part), "{part:?} in:\n{}", run.stdout);
    }
}

/// The tone with mains hum under it.
fn with_hum() -> Vec<f64> {
    let hum =
        |frame: usize| 0.003 * (std::f64::consts::TAU * 150.0 * frame as f64 / 48_000.0).sin();
    tone(0.8).iter().enumerate().map(|(frame, sample)| sample + hum(frame)).collect()
}

fn names(object: &Value) -> Vec<&str> {
    object.as_object().unwrap().keys().map(String::as_str).collect()
}
