//! Every format is read, and read alike.

use crate::sounds::{
    AMPLITUDE, Coding, F0_HZ, aiff, flac, silence, tone, tone_at, wav, wav_64, wav_extensible,
};
use crate::{folder_with, measure};

#[test]
fn a_tone_measures_alike_in_every_format() {
    let stereo = [tone(0.8), tone(0.8)];
    let folder = folder_with([
        ("u8.wav", wav(&stereo, Coding::U8)),
        ("s16.wav", wav(&stereo, Coding::S16)),
        ("s24.wav", wav(&stereo, Coding::S24)),
        ("s32.wav", wav(&stereo, Coding::S32)),
        ("f32.wav", wav(&stereo, Coding::F32)),
        ("f64.wav", wav(&stereo, Coding::F64)),
        ("extensible.wav", wav_extensible(&stereo, Coding::S24)),
        ("extensible-float.wav", wav_extensible(&stereo, Coding::F32)),
        ("rf64.wav", wav_64(&stereo, Coding::S16)),
        ("a.aiff", aiff(&stereo, false)),
        ("float.aifc", aiff(&stereo, true)),
        ("a.flac", flac(&stereo)),
    ]);
    let names = [
        "u8.wav",
        "s16.wav",
        "s24.wav",
        "s32.wav",
        "f32.wav",
        "f64.wav",
        "extensible.wav",
        "extensible-float.wav",
        "rf64.wav",
        "a.aiff",
        "float.aifc",
        "a.flac",
    ];
    let run = measure(folder.path(), &[&["--json"], &names[..]].concat());
    assert_eq!((run.status, run.stderr.as_str()), (Some(0), ""), "exit status and remarks");
    let objects = run.objects();
    assert_eq!(objects.len(), names.len(), "one object per file");
    for (object, name) in objects.iter().zip(names) {
        assert_eq!(object["file"], name, "files come in the order given");
        assert_eq!(object["sample_rate_hz"], 48_000, "{name}");
        assert_eq!(object["channels"], 2, "{name}");
        assert_eq!(object["duration_s"], 0.8, "{name}");
        let note = &object["notes"][0];
        let cents = 1200.0 * (note["f0_hz"].as_f64().unwrap() / F0_HZ).log2();
        // 8 bits leave audible noise.
        let tolerance = if name == "u8.wav" { 1.0 } else { 0.02 };
        assert!(cents.abs() < tolerance, "{name}: {cents} cents off");
        let level = note["partials"][0]["level_dbfs"].as_f64().unwrap();
        let expected = 20.0 * AMPLITUDE.log10();
        assert!((level - expected).abs() < 5.0 * tolerance, "{name}: {level} dBFS, not {expected}");
        assert_eq!(note["note"], "A4", "{name}");
    }
}

#[test]
fn the_channel_asked_for_is_measured() {
    let left = tone_at(440.0, 0.8);
    let right: Vec<f64> = tone_at(330.0, 0.8);
    let third = tone_at(220.0, 0.8);
    let folder = folder_with([
        ("three.wav", wav(&[left.clone(), right, third], Coding::S16)),
        ("opposed.wav", wav(&[left.clone(), left.iter().map(|x| -x).collect()], Coding::F32)),
        ("mono.wav", wav(&[left], Coding::S16)),
    ]);
    for (channel, file, f0_hz) in [
        ("left", "three.wav", 440.0),
        ("right", "three.wav", 330.0),
        ("3", "three.wav", 220.0),
        ("side", "opposed.wav", 440.0),
        ("mid", "mono.wav", 440.0),
    ] {
        let run = measure(folder.path(), &["--json", "--channel", channel, file]);
        assert_eq!(run.status, Some(0), "{channel} of {file}: {}", run.stderr);
        let measured = run.objects()[0]["notes"][0]["f0_hz"].as_f64().unwrap();
        assert!((measured - f0_hz).abs() < 0.1, "{channel} of {file}: {measured} Hz, not {f0_hz}");
    }
    let silent = measure(folder.path(), &["--json", "opposed.wav"]);
    assert_eq!(silent.status, Some(2), "the middle of opposed channels is silent");
    let absent = measure(folder.path(), &["--channel", "side", "mono.wav"]);
    assert_eq!(absent.status, Some(2), "side of a file with one channel");
    assert!(
        absent.stderr.contains("mono.wav: has one channel: there is no side"),
        "{}",
        absent.stderr
    );
}

#[test]
fn start_and_end_cut_out_a_span_in_times_of_the_file() {
    let sound = [silence(0.5), tone_at(440.0, 1.0), tone_at(330.0, 1.0)].concat();
    let folder = folder_with([("two.wav", wav(&[sound], Coding::S16))]);
    let run = measure(folder.path(), &["--json", "--start", "1.6", "--end", "2.4", "two.wav"]);
    assert_eq!(run.status, Some(0), "{}", run.stderr);
    let object = &run.objects()[0];
    assert_eq!(object["duration_s"], 2.5, "the file's duration, not the span's");
    let frames = object["frames"].as_array().unwrap();
    let times: Vec<f64> = frames.iter().map(|frame| frame["time_s"].as_f64().unwrap()).collect();
    assert!(
        times.iter().all(|time| (1.6..2.4).contains(time)),
        "{:?} to {:?}",
        times.first(),
        times.last()
    );
    let notes = object["notes"].as_array().unwrap();
    assert_eq!(notes.len(), 1, "{notes:?}");
    let f0_hz = notes[0]["f0_hz"].as_f64().unwrap();
    assert!((f0_hz - 330.0).abs() < 0.1, "{f0_hz} Hz");
    for (arguments, reason) in [
        (vec!["--start", "9", "two.wav"], "two.wav: ends before the start asked for, at 2.500 s"),
        (vec!["--start", "2", "--end", "1", "two.wav"], "--end must lie after --start"),
    ] {
        let run = measure(folder.path(), &arguments);
        assert_eq!(run.status, Some(2), "{arguments:?}");
        assert!(run.stderr.contains(reason), "{arguments:?}: {}", run.stderr);
    }
}
