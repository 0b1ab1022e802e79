//! Checks against notes expected over time.

use crate::drift::a3;
use crate::sounds::{Channel, Coding, tone_at, wav};
use crate::{drift, folder_with};

/// A3 for a second, then E4 for a second and a half, both 4 cents sharp.
fn melody() -> Channel {
    let sharp = 2.0_f64.powf(4.0 / 1200.0);
    [tone_at(220.0 * sharp, 1.0), tone_at(329.627_557 * sharp, 1.5)].concat()
}

/// The same notes as a MIDI file of format 1: a tempo track that changes from 60 to 120 beats a minute after the first
/// beat, and a melody in running status.
fn midi(second_key: u8) -> Vec<u8> {
    let tempo: &[u8] = &[
        0, 0xff, 0x51, 3, 0x0f, 0x42, 0x40, 96, 0xff, 0x51, 3, 0x07, 0xa1, 0x20, 0, 0xff, 0x2f, 0,
    ];
    // 288 ticks are three beats of the faster tempo.
    let melody: &[u8] = &[
        0, 0x90, 57, 100, 96, 57, 0, 0, second_key, 100, 0x82, 0x20, second_key, 0, 0, 0xff, 0x2f,
        0,
    ];
    let mut bytes = b"MThd\x00\x00\x00\x06\x00\x01\x00\x02\x00\x60".to_vec();
    for track in [tempo, melody] {
        bytes.extend(b"MTrk");
        bytes.extend(u32::try_from(track.len()).unwrap().to_be_bytes());
        bytes.extend(track);
    }
    bytes
}

#[test]
fn a_melody_is_checked_against_midi_and_csv_alike() {
    let notes = "start_s,end_s,note\n0,1,A3\n1,2.5,E4\n";
    let folder = folder_with([
        ("melody.wav", wav(&[melody()], Coding::S16)),
        ("right.mid", midi(64)),
        ("wrong.mid", midi(65)),
        ("right.csv", notes.into()),
        ("wrong.csv", notes.replace("E4", "F4").into()),
    ]);
    for (expected, status) in
        [("right.mid", 0), ("right.csv", 0), ("wrong.mid", 1), ("wrong.csv", 1)]
    {
        let run = drift(folder.path(), &["--json", "--expect", expected, "melody.wav"]);
        assert_eq!(run.status, Some(status), "{expected}: {} {}", run.stdout, run.stderr);
        let found = &run.objects()[0];
        assert_eq!(found["reference_kind"], "expected", "{expected}");
        if status == 0 {
            let mean = found["mean_cents"].as_f64().unwrap();
            assert!((mean - 4.0).abs() < 0.2, "{expected}: {mean}");
        } else {
            let start_s = found["spans"][0]["start_s"].as_f64().unwrap();
            assert!((start_s - 1.0).abs() < 0.05, "{expected}: from {start_s} s");
        }
    }
}

#[test]
fn a_bent_note_is_expected_where_the_bend_takes_it() {
    // A3, a semitone up from half a second on.
    let bent = a3(|t| if t < 0.5 { 0.0 } else { 100.0 }, 1.5);
    // 96 ticks a beat of half a second; without and with a bend by half of two semitones after a beat.
    let notes = |bend: &[u8]| {
        let track = [
            &[0, 0x90, 57, 100][..],
            bend,
            &[if bend.is_empty() { 0x82 } else { 0x81 }, if bend.is_empty() { 0x20 } else { 0x40 }],
            &[0x80, 57, 0, 0, 0xff, 0x2f, 0],
        ]
        .concat();
        let size = u32::try_from(track.len()).unwrap().to_be_bytes();
        [&b"MThd\x00\x00\x00\x06\x00\x00\x00\x01\x00\x60MTrk"[..], &size, &track].concat()
    };
    let folder = folder_with([
        ("bent.wav", wav(&[bent], Coding::S16)),
        ("straight.mid", notes(&[])),
        ("bent.mid", notes(&[96, 0xe0, 0, 0x60])),
    ]);
    for (expected, status) in [("bent.mid", 0), ("straight.mid", 1)] {
        let run = drift(folder.path(), &["--json", "--expect", expected, "bent.wav"]);
        assert_eq!(run.status, Some(status), "{expected}: {} {}", run.stdout, run.stderr);
    }
}

#[test]
fn expected_times_are_those_of_the_file_wherever_the_check_starts() {
    let folder =
        folder_with([("melody.wav", wav(&[melody()], Coding::S16)), ("notes.mid", midi(64))]);
    let run = drift(
        folder.path(),
        &["--json", "--expect", "notes.mid", "--start", "1.2", "--tolerance", "6", "melody.wav"],
    );
    assert_eq!(run.status, Some(0), "{} {}", run.stdout, run.stderr);
}

#[test]
fn what_is_expected_nowhere_is_not_judged() {
    let folder = folder_with([
        ("drone.wav", wav(&[a3(|t| if t > 1.0 { 300.0 } else { 0.0 }, 2.0)], Coding::S16)),
        ("notes.csv", b"start_s,end_s,note\n0,0.8,A3\n".to_vec()),
        ("later.csv", b"start_s,end_s,note\n7,8,A3\n".to_vec()),
    ]);
    let run = drift(folder.path(), &["--json", "--expect", "notes.csv", "drone.wav"]);
    assert_eq!(run.status, Some(0), "{} {}", run.stdout, run.stderr);
    let run = drift(folder.path(), &["--json", "--expect", "later.csv", "drone.wav"]);
    assert_eq!(run.status, Some(2), "{} {}", run.stdout, run.stderr);
    assert!(run.stderr.contains("unmeasured: there is no reference"), "{}", run.stderr);
}

#[test]
fn notes_that_cannot_be_read_stop_before_anything_is_checked() {
    let folder = folder_with([
        ("a.wav", wav(&[tone_at(220.0, 0.5)], Coding::S16)),
        ("empty.csv", b"start_s,end_s,note\n".to_vec()),
        ("odd.csv", b"start_s,end_s,note\n0,1,H9\n".to_vec()),
        ("broken.mid", b"MThd broken".to_vec()),
    ]);
    for (file, reason) in [
        ("empty.csv", "empty.csv: expects no note"),
        ("odd.csv", "odd.csv: line 2"),
        ("broken.mid", "broken.mid: is no sound MIDI file"),
        ("missing.mid", "missing.mid: cannot be read"),
    ] {
        let run = drift(folder.path(), &["--expect", file, "a.wav"]);
        assert_eq!((run.status, run.stdout.as_str()), (Some(2), ""), "{file}");
        assert!(run.stderr.contains(reason), "{file}: {}", run.stderr);
    }
}
