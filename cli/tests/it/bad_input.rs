//! Bad files: a clear reason, the right exit status, never a panic.

use crate::sounds::{Coding, aiff, flac, silence, tone, wav};
use crate::{folder_with, measure};
use tempfile::TempDir;

/// What a file must lead to: whether there is an object of figures, the exit status, and what is said.
struct Case {
    name: &'static str,
    bytes: Vec<u8>,
    object: bool,
    status: i32,
    said: &'static str,
}

fn check(cases: Vec<Case>) {
    for Case { name, bytes, object, status, said } in cases {
        let folder = folder_with([(name, bytes)]);
        let run = measure(folder.path(), &["--json", name]);
        assert_eq!(run.status, Some(status), "{name}: {}", run.stderr);
        assert_eq!(run.objects().len(), usize::from(object), "{name}: objects printed");
        let line = format!("plumbtone: {name}: {said}");
        assert!(run.stderr.contains(&line), "{name}: expected {line:?}, got {:?}", run.stderr);
    }
}

#[test]
fn files_that_are_no_sound_are_refused() {
    let case = |name, bytes: &[u8], said| Case {
        name,
        bytes: bytes.to_vec(),
        object: false,
        status: 2,
        said,
    };
    check(vec![
        case("empty.wav", b"", "is empty"),
        case("text.wav", b"this is a text and no sound", "is not a WAV, AIFF or FLAC file"),
        case("short.wav", b"RIFF\x10", "ends within its header"),
        case("nothing.wav", b"RIFF\x04\0\0\0WAVE", "holds no sound data"),
        case("marker.flac", b"fLaC", "cannot be decoded"),
        case("form.aiff", b"FORM\0\0\0\x04AIFF", "has no description of its sound"),
    ]);
}

#[test]
fn sound_without_a_pitch_is_measured_and_said_to_have_none() {
    let no_pitch = "nothing measurable: no single pitch was found";
    let case = |name, samples, coding| Case {
        name,
        bytes: wav(&[samples], coding),
        object: true,
        status: 2,
        said: no_pitch,
    };
    check(vec![
        case("silence.wav", silence(0.5), Coding::S16),
        case("constant.wav", vec![0.5; 24_000], Coding::S16),
        case("one.wav", vec![0.5], Coding::S16),
        case("all-nan.wav", vec![f64::NAN; 24_000], Coding::F32),
        case("all-infinite.wav", vec![f64::INFINITY; 24_000], Coding::F64),
    ]);
    check(vec![Case {
        name: "none.wav",
        bytes: wav(&[Vec::new()], Coding::S16),
        object: false,
        status: 2,
        said: "holds no samples",
    }]);
}

#[test]
fn broken_sound_is_measured_as_far_as_it_goes() {
    let whole = wav(&[tone(0.8)], Coding::S16);
    let cut = |bytes: Vec<u8>| bytes[..bytes.len() / 2 + 22].to_vec();
    let case = |name, bytes, said| Case { name, bytes, object: true, status: 0, said };
    let mut loud = tone(0.8);
    loud.iter_mut().for_each(|sample| *sample = (4.0 * *sample).clamp(-1.0, 1.0));
    let mut holed = tone(0.8);
    holed[4_800..9_600].fill(f64::NAN);
    check(vec![
        case(
            "cut.wav",
            cut(whole.clone()),
            "truncated: only the first 0.400 s of 0.800 s are there",
        ),
        case(
            "cut.aiff",
            cut(aiff(&[tone(0.8)], false)),
            "truncated: only the first 0.400 s of 0.800 s are there",
        ),
        case("cut.flac", cut(flac(&[tone(0.8)])), "truncated: only the first"),
        case(
            "clipped.wav",
            wav(&[loud], Coding::S16),
            "clipped: the samples stay at full scale in",
        ),
        case("holed.wav", wav(&[holed], Coding::F32), "samples that are not numbers: 0.100 s"),
        case("damaged.flac", damaged(flac(&[tone(0.8)])), "damaged: "),
        case("unfinished.wav", with_sizes(&whole, 0, 0), "the header was never completed"),
        case(
            "huge.wav",
            with_sizes(&whole, 0x7fff_ffff, 0x7fff_fff0),
            "truncated: only the first 0.800 s",
        ),
        case("small.wav", with_sizes(&whole, 0x100, 48_000), "28800 bytes behind the sound data"),
    ]);
}

#[test]
fn a_flac_file_may_state_any_length() {
    let whole = flac(&[tone(0.8)]);
    for (what, frames) in [("nothing", 0_u32), ("too little", 9_600)] {
        let mut file = whole.clone();
        // The lowest 32 of the 36 bits of the number of frames (RFC 9639, 8.2).
        file[22..26].copy_from_slice(&frames.to_be_bytes());
        let folder = folder_with([("a.flac", file)]);
        let run = measure(folder.path(), &["--json", "a.flac"]);
        assert_eq!((run.status, run.stderr.as_str()), (Some(0), ""), "states {what}");
        assert_eq!(run.objects()[0]["duration_s"], 0.8, "states {what}");
    }
}

#[test]
fn a_lost_span_becomes_a_gap() {
    let mut holed = tone(0.8);
    holed[9_600..14_400].fill(f64::NAN);
    let folder = folder_with([("holed.wav", wav(&[holed], Coding::F32))]);
    let run = measure(folder.path(), &["--json", "holed.wav"]);
    let object = &run.objects()[0];
    let gaps = serde_json::json!([{"start_s": 0.2, "end_s": 0.3, "reason": "non-finite samples"}]);
    assert_eq!(object["gaps"], gaps, "the span that is no numbers");
}

#[test]
fn headers_that_cannot_be_right_are_refused() {
    let whole = wav(&[tone(0.2)], Coding::S16);
    let patched = |at: usize, bytes: &[u8]| {
        let mut file = whole.clone();
        file[at..at + bytes.len()].copy_from_slice(bytes);
        file
    };
    let case = |name, bytes, said| Case { name, bytes, object: false, status: 2, said };
    check(vec![
        case(
            "no-channels.wav",
            patched(22, &[0, 0]),
            "has a header that cannot be right: 0 channels of 16 bits",
        ),
        case(
            "many-channels.wav",
            patched(22, &[0xff, 0xff]),
            "has 65535 channels; at most 26 can be read",
        ),
        case(
            "no-bits.wav",
            patched(34, &[0, 0]),
            "has a header that cannot be right: 1 channels of 0 bits",
        ),
        case(
            "coded.wav",
            patched(20, &[2, 0]),
            "is coded in a way that is not supported (WAV format 0x0002)",
        ),
        case("rate-0.wav", patched(24, &[0; 4]), "sample rate in Hz is 0, outside 8000 to 384000"),
        case(
            "rate-7999.wav",
            patched(24, &7_999_u32.to_le_bytes()),
            "sample rate in Hz is 7999, outside",
        ),
        case("rate-huge.wav", patched(24, &[0xff; 4]), "sample rate in Hz is 4294967295, outside"),
    ]);
}

#[test]
fn what_is_no_readable_file_is_refused() {
    let folder = TempDir::new().unwrap();
    std::fs::create_dir(folder.path().join("takes")).unwrap();
    for (name, said) in [("takes", "there is no sound file"), ("absent.wav", "does not exist")] {
        let run = measure(folder.path(), &[name]);
        assert_eq!((run.status, run.stdout.as_str()), (Some(2), ""), "{name}");
        assert_eq!(run.stderr, format!("plumbtone: {name}: {said}\n"), "{name}");
    }
}

#[cfg(unix)]
#[test]
fn a_file_without_read_permission_is_refused() {
    use std::os::unix::fs::PermissionsExt as _;
    let folder = folder_with([("secret.wav", wav(&[tone(0.2)], Coding::S16))]);
    let path = folder.path().join("secret.wav");
    std::fs::set_permissions(&path, std::fs::Permissions::from_mode(0o000)).unwrap();
    let run = measure(folder.path(), &["secret.wav"]);
    // The superuser reads it all the same.
    if std::fs::File::open(&path).is_err() {
        assert_eq!(run.status, Some(2), "{}", run.stderr);
        assert_eq!(run.stderr, "plumbtone: secret.wav: cannot be read: permission denied\n");
    } else {
        assert_eq!(run.status, Some(0), "{}", run.stderr);
    }
}

#[test]
fn no_damage_makes_it_panic() {
    let sound = tone(0.05);
    let wholes = [
        ("wav", wav(std::slice::from_ref(&sound), Coding::S16)),
        ("wav", crate::sounds::wav_extensible(&[sound.clone(), sound.clone()], Coding::F32)),
        ("wav", crate::sounds::wav_64(std::slice::from_ref(&sound), Coding::S24)),
        ("aiff", aiff(&[sound.clone(), sound.clone()], false)),
        ("aifc", aiff(std::slice::from_ref(&sound), true)),
        ("flac", flac(&[sound])),
    ];
    let folder = TempDir::new().unwrap();
    let mut random = Random(20_260_101);
    let names: Vec<String> = (0..400)
        .map(|index| {
            let (extension, bytes) = &wholes[random.below(wholes.len())];
            let mut bytes = bytes.clone();
            for _ in 0..=random.below(6) {
                let reach = if random.below(4) > 0 { 100.min(bytes.len()) } else { bytes.len() };
                let place = random.below(reach);
                bytes[place] = [0, 1, 0x7f, 0x80, 0xff][random.below(5)];
            }
            if random.below(4) == 0 {
                bytes.truncate(random.below(bytes.len()));
            }
            let name = format!("{index}.{extension}");
            std::fs::write(folder.path().join(&name), bytes).unwrap();
            name
        })
        .collect();
    let arguments: Vec<&str> =
        std::iter::once("--json").chain(names.iter().map(String::as_str)).collect();
    let run = measure(folder.path(), &arguments);
    assert_eq!(run.status, Some(2), "some of these files cannot be read");
    let complaint =
        run.stderr.lines().find(|line| line.contains("panicked") || line.contains("defect"));
    assert_eq!(complaint, None, "the program ran into a defect");
    let measured = run.objects().len();
    assert!(measured > 40, "only {measured} files were left with something to measure");
}

/// A WAV file with other sizes in its header.
fn with_sizes(whole: &[u8], all: u32, data: u32) -> Vec<u8> {
    let mut file = whole.to_vec();
    file[4..8].copy_from_slice(&all.to_le_bytes());
    file[40..44].copy_from_slice(&data.to_le_bytes());
    file
}

/// A FLAC file with its middle overwritten.
fn damaged(mut file: Vec<u8>) -> Vec<u8> {
    let middle = file.len() / 2;
    file[middle..middle + 2_000].fill(0x55);
    file
}

/// A small generator of numbers that look random (Steele, Lea and Flood, "Fast splittable pseudorandom number
/// generators", 2014: `SplitMix64`).
struct Random(u64);

impl Random {
    fn below(&mut self, limit: usize) -> usize {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut mixed = self.0;
        mixed = (mixed ^ (mixed >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        mixed = (mixed ^ (mixed >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        let limit = u64::try_from(limit).unwrap();
        usize::try_from((mixed ^ (mixed >> 31)) % limit).unwrap()
    }
}
