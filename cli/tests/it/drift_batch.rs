//! Many files under one check: folders, patterns, the JUnit report, interrupts.

use crate::drift::a3;
use crate::sounds::{Coding, silence, wav};
use crate::{drift, folder_with};

#[test]
fn folders_and_patterns_are_checked_in_order() {
    let sound = || wav(&[a3(|_| 0.0, 0.5)], Coding::S16);
    let folder = folder_with([
        ("stems/b.wav", sound()),
        ("stems/a.WAV", sound()),
        ("stems/deep/c.wav", sound()),
        ("stems/notes.txt", b"no sound".to_vec()),
        ("d.wav", sound()),
    ]);
    for (arguments, files) in [
        (&["stems"][..], &["stems/a.WAV", "stems/b.wav", "stems/deep/c.wav"][..]),
        (&["d.wav", "stems/*.wav"], &["d.wav", "stems/b.wav"]),
        (&["**/c.wav"], &["stems/deep/c.wav"]),
    ] {
        let run = drift(folder.path(), &[&["--json"], arguments].concat());
        assert_eq!(run.status, Some(0), "{arguments:?}: {}", run.stderr);
        let named: Vec<_> = run.objects().iter().map(|o| o["file"].clone()).collect();
        assert_eq!(named, files, "{arguments:?}");
    }
    let run = drift(folder.path(), &["*.flac"]);
    assert_eq!(run.status, Some(2), "nothing matches");
    assert!(run.stderr.contains("*.flac: there is no sound file"), "{}", run.stderr);
}

#[test]
fn the_junit_report_has_a_case_for_each_file() {
    let folder = folder_with([
        ("good.wav", wav(&[a3(|_| 0.0, 1.0)], Coding::S16)),
        ("sharp & flat.wav", wav(&[a3(|_| 30.0, 1.0)], Coding::S16)),
        ("silence.wav", wav(&[silence(0.5)], Coding::S16)),
        ("bad.wav", b"no sound".to_vec()),
    ]);
    let arguments =
        ["--junit", "report.xml", "good.wav", "sharp & flat.wav", "silence.wav", "bad.wav"];
    let run = drift(folder.path(), &arguments);
    assert_eq!(run.status, Some(2), "{}", run.stderr);
    let report = std::fs::read_to_string(folder.path().join("report.xml")).unwrap();
    for part in [
        "tests=\"4\"",
        "failures=\"1\"",
        "errors=\"2\"",
        "<testcase name=\"good.wav\"",
        "<testcase name=\"sharp &amp; flat.wav\"",
        "<failure message=\"OUTSIDE ±10 cents of nearest note",
        "<error message=\"unmeasured: no sound where a pitch is due\"",
        "<error message=\"is not a WAV, AIFF or FLAC file\"",
    ] {
        assert!(report.contains(part), "{part:?} in:\n{report}");
    }
}

#[test]
fn bad_usage_is_refused_before_anything_is_checked() {
    let folder = folder_with([("a.wav", wav(&[a3(|_| 0.0, 0.3)], Coding::S16))]);
    for arguments in [
        &["a.wav", "--reference", "H3"][..],
        &["a.wav", "--reference", "-3"],
        &["a.wav", "--tolerance", "0"],
        &["a.wav", "--tolerance", "nan"],
        &["a.wav", "--min-span", "0"],
        &["a.wav", "--min-share", "2"],
        &["a.wav", "--reference", "A3", "--expect", "a.mid"],
        &["a.wav", "--junit", "nowhere/report.xml"],
        &["a.wav", "--picture", "a.gif"],
        &[],
    ] {
        let run = drift(folder.path(), arguments);
        assert_eq!((run.status, run.stdout.as_str()), (Some(2), ""), "{arguments:?}");
        assert!(!run.stderr.is_empty(), "{arguments:?}: a reason");
    }
}

#[cfg(unix)]
#[test]
fn an_interrupt_leaves_no_half_file_behind() {
    use std::io::{BufRead as _, BufReader};
    use std::process::{Command, Stdio};

    let folder = folder_with([
        ("short.wav", wav(&[a3(|_| 0.0, 0.3)], Coding::S16)),
        ("long.wav", wav(&[a3(|_| 0.0, 60.0)], Coding::S16)),
    ]);
    let files = [vec!["short.wav"], vec!["long.wav"; 50]].concat();
    let mut child = Command::new(env!("CARGO_BIN_EXE_plumbtone"))
        .args(["drift", "--json", "--csv", "out", "--picture", "p.svg", "--junit", "j.xml"])
        .args(files)
        .current_dir(folder.path())
        .stdout(Stdio::piped())
        .stderr(Stdio::piped())
        .spawn()
        .unwrap();
    // The short file's result is there: the long ones are being worked on.
    let mut lines = BufReader::new(child.stdout.take().unwrap()).lines();
    let first = lines.next().unwrap().unwrap();
    assert!(first.contains("short.wav"), "{first}");
    let id = child.id().to_string();
    assert!(Command::new("kill").args(["-INT", &id]).status().unwrap().success(), "kill {id}");
    drop(lines);
    let output = child.wait_with_output().unwrap();
    let stderr = String::from_utf8_lossy(&output.stderr);
    assert_eq!(output.status.code(), Some(130), "{stderr}");
    assert!(!folder.path().join("j.xml").exists(), "no report of half a batch");
    for place in [folder.path().to_owned(), folder.path().join("out")] {
        for entry in std::fs::read_dir(place).unwrap() {
            let name = entry.unwrap().file_name().into_string().unwrap();
            assert!(!name.starts_with('.'), "{name} is left behind");
            if name.ends_with(".drift.csv") {
                let text = std::fs::read_to_string(folder.path().join("out").join(&name)).unwrap();
                assert!(text.ends_with("false\n"), "{name} is whole");
            }
        }
    }
}
