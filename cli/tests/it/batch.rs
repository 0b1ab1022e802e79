//! Many files in one run.

use crate::sounds::{Coding, tone_at, wav};
use crate::{folder_with, measure};
use std::process::{Command, Stdio};
use tempfile::TempDir;

#[test]
fn one_bad_file_does_not_stop_the_others_and_order_is_kept() {
    // The first takes the longest, so that the others are ready before it.
    let folder = folder_with([
        ("long.wav", wav(&[tone_at(220.0, 4.0)], Coding::S16)),
        ("bad.wav", b"no sound".to_vec()),
        ("b.wav", wav(&[tone_at(330.0, 0.5)], Coding::S16)),
        ("c.wav", wav(&[tone_at(440.0, 0.5)], Coding::S16)),
    ]);
    let run = measure(folder.path(), &["--json", "long.wav", "bad.wav", "b.wav", "c.wav"]);
    assert_eq!(run.status, Some(2), "one file was bad");
    assert_eq!(run.stderr, "plumbtone: bad.wav: is not a WAV, AIFF or FLAC file\n");
    let files: Vec<_> = run.objects().iter().map(|object| object["file"].clone()).collect();
    assert_eq!(files, ["long.wav", "b.wav", "c.wav"], "order of the objects");
}

#[test]
fn more_files_than_run_ahead_all_come_out() {
    let folder = folder_of(150, 0.3);
    let run = measure(folder.path(), &["--json", "."]);
    assert_eq!(run.status, Some(0), "{}", run.stderr);
    let mut objects = run.objects();
    let files: Vec<String> = objects.iter().map(|object| object["file"].to_string()).collect();
    let expected: Vec<String> = (0..150).map(|k| format!("\"{k:03}.wav\"")).collect();
    assert_eq!(files, expected, "in the folder's order");
    for object in &mut objects {
        object["file"].take();
    }
    objects.dedup();
    assert_eq!(objects.len(), 1, "equal files give equal figures");
}

/// A folder of so many files of the same sound, some seconds long.
fn folder_of(count: usize, seconds: f64) -> TempDir {
    let folder = folder_with([]);
    let sound = wav(&[tone_at(440.0, seconds)], Coding::S16);
    for k in 0..count {
        std::fs::write(folder.path().join(format!("{k:03}.wav")), &sound).unwrap();
    }
    folder
}

#[test]
fn folders_and_patterns_are_measured_as_they_are_checked() {
    let sound = || wav(&[tone_at(440.0, 0.3)], Coding::S16);
    let folder = folder_with([
        ("takes/b.wav", sound()),
        ("takes/deep/a.WAV", sound()),
        ("takes/notes.txt", b"no sound".to_vec()),
        ("c.wav", sound()),
    ]);
    for (arguments, files) in [
        (&["takes"][..], &["takes/b.wav", "takes/deep/a.WAV"][..]),
        (&["c.wav", "*/*.wav", "c.wav"], &["c.wav", "takes/b.wav"]),
        (&["takes/**/*.[wW]*"], &["takes/b.wav", "takes/deep/a.WAV"]),
    ] {
        let run = measure(folder.path(), &[&["--json", "--csv", "out"], arguments].concat());
        assert_eq!(run.status, Some(0), "{arguments:?}: {}", run.stderr);
        let named: Vec<_> = run.objects().iter().map(|o| o["file"].clone()).collect();
        assert_eq!(named, files, "{arguments:?}");
    }
    let names = ["a.notes.csv", "b.notes.csv", "c.notes.csv"];
    assert!(names.iter().all(|name| folder.path().join("out").join(name).exists()), "{names:?}");
    let run = measure(folder.path(), &["*.flac", "c.wav"]);
    assert_eq!((run.status, run.stdout.as_str()), (Some(2), ""), "nothing matches");
    assert!(run.stderr.contains("*.flac: there is no sound file"), "{}", run.stderr);
}

#[test]
fn a_reader_that_stops_early_is_no_failure() {
    let folder = folder_of(60, 3.0);
    let mut child = Command::new(env!("CARGO_BIN_EXE_plumbtone"))
        .args(["measure", "--json", "."])
        .current_dir(folder.path())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(0), "{}", String::from_utf8_lossy(&output.stderr));
}

#[test]
fn bad_usage_is_refused_before_anything_is_measured() {
    let folder = folder_with([("a.wav", wav(&[tone_at(440.0, 0.3)], Coding::S16))]);
    for arguments in [
        &["a.wav", "--concert-pitch", "200"][..],
        &["a.wav", "--temperament", "wobbly"],
        &["a.wav", "--lowest", "10"],
        &["a.wav", "--lowest", "500", "--highest", "400"],
        &["a.wav", "--partials", "0"],
        &["a.wav", "--picture", "a.gif"],
        &[],
    ] {
        let run = measure(folder.path(), arguments);
        assert_eq!((run.status, run.stdout.as_str()), (Some(2), ""), "{arguments:?}");
        assert!(!run.stderr.is_empty(), "{arguments:?}: a reason");
    }
}
