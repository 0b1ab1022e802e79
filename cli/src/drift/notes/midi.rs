//! The notes of a Standard MIDI File (MIDI Manufacturers Association, RP-001), in seconds by its tempo changes.

use anyhow::{Result, anyhow, bail};
use midly::{Format, MetaMessage, MidiMessage, Smf, Timing, TrackEventKind};
use plumbtone_analysis::check::Expected;
use plumbtone_analysis::tuning::{NoteName, Tuning};
use std::collections::BTreeMap;

/// Tempo until one is told: 120 quarter notes a minute.
const TEMPO_US: u32 = 500_000;
/// Channel of the drums (General MIDI's 10), whose keys are no pitches.
const DRUMS: u8 = 9;

/// The notes of all tracks.
///
/// # Errors
/// What is no MIDI file, or one of independent sequences.
pub(super) fn notes(bytes: &[u8], tuning: &Tuning) -> Result<Vec<Expected>> {
    let file = Smf::parse(bytes).map_err(|error| anyhow!("is no sound MIDI file: {error}"))?;
    if file.header.format == Format::Sequential {
        bail!("holds independent sequences (format 2), which no single recording follows");
    }
    let clock = Clock::new(&file);
    let mut notes = Vec::new();
    for track in &file.tracks {
        let mut sounding: BTreeMap<(u8, u8), u64> = BTreeMap::new();
        let mut tick = 0;
        let mut end = |channel: u8, key: u8, from: u64, to: u64| {
            if channel != DRUMS {
                let name = NoteName::from_midi(i16::from(key));
                notes.push(Expected {
                    start_s: clock.seconds(from),
                    end_s: clock.seconds(to),
                    f0_hz: tuning.frequency_hz(name),
                });
            }
        };
        for event in track {
            tick += u64::from(event.delta.as_int());
            let TrackEventKind::Midi { channel, message } = event.kind else { continue };
            let (key, on) = match message {
                MidiMessage::NoteOn { key, vel } => (key, vel > 0),
                MidiMessage::NoteOff { key, .. } => (key, false),
                _ => continue,
            };
            let at = (channel.as_int(), key.as_int());
            // A key struck again ends its last note.
            if let Some(from) = sounding.remove(&at) {
                end(at.0, at.1, from, tick);
            }
            if on {
                sounding.insert(at, tick);
            }
        }
        for ((channel, key), from) in sounding {
            end(channel, key, from, tick);
        }
    }
    Ok(notes)
}

/// Turns ticks into seconds.
struct Clock {
    /// Tick, its time in seconds, and the seconds of a tick from there on.
    changes: Vec<(u64, f64, f64)>,
}

impl Clock {
    fn new(file: &Smf<'_>) -> Self {
        let ticks_per_beat = match file.header.timing {
            Timing::Metrical(ticks) => f64::from(ticks.as_int().max(1)),
            Timing::Timecode(rate, ticks) => {
                let tick_s = 1.0 / (f64::from(rate.as_f32()) * f64::from(ticks.max(1)));
                return Self { changes: vec![(0, 0.0, tick_s)] };
            }
        };
        let tick_s = |tempo_us: u32| f64::from(tempo_us) / 1e6 / ticks_per_beat;
        let mut changes = vec![(0, 0.0, tick_s(TEMPO_US))];
        for (tick, tempo_us) in tempo_changes(file) {
            let &(since, since_s, each_s) = changes.last().unwrap_or(&(0, 0.0, 0.0));
            let time_s = since_s + (tick - since) as f64 * each_s;
            changes.push((tick, time_s, tick_s(tempo_us)));
        }
        Self { changes }
    }

    fn seconds(&self, tick: u64) -> f64 {
        let after = self.changes.partition_point(|change| change.0 <= tick);
        let (since, since_s, each_s) = self.changes[after.max(1) - 1];
        since_s + (tick - since) as f64 * each_s
    }
}

/// Tempo changes of all tracks, in order.
fn tempo_changes(file: &Smf<'_>) -> Vec<(u64, u32)> {
    let mut changes = Vec::new();
    for track in &file.tracks {
        let mut tick = 0;
        for event in track {
            tick += u64::from(event.delta.as_int());
            if let TrackEventKind::Meta(MetaMessage::Tempo(tempo_us)) = event.kind {
                changes.push((tick, tempo_us.as_int()));
            }
        }
    }
    changes.sort_by_key(|change| change.0);
    changes
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A chunk of a MIDI file.
    fn chunk(name: &[u8; 4], body: &[u8]) -> Vec<u8> {
        let size = u32::try_from(body.len()).unwrap().to_be_bytes();
        [&name[..], &size, body].concat()
    }

    fn file(format: u8, division: [u8; 2], tracks: &[&[u8]]) -> Vec<u8> {
        let count = u8::try_from(tracks.len()).unwrap();
        let mut bytes = chunk(b"MThd", &[0, format, 0, count, division[0], division[1]]);
        for track in tracks {
            bytes.extend(chunk(b"MTrk", track));
        }
        bytes
    }

    fn check(bytes: &[u8], expected: &[(f64, f64, f64)]) {
        let mut found = notes(bytes, &Tuning::default()).unwrap();
        found.sort_by(|a, b| a.start_s.total_cmp(&b.start_s));
        assert_eq!(found.len(), expected.len(), "{found:?}");
        for (note, &(start_s, end_s, f0_hz)) in found.iter().zip(expected) {
            let close = (note.start_s - start_s).abs() < 1e-9
                && (note.end_s - end_s).abs() < 1e-9
                && (note.f0_hz - f0_hz).abs() < 1e-9;
            assert!(close, "{note:?}, not {start_s} to {end_s} s at {f0_hz} Hz");
        }
    }

    #[test]
    fn tempo_changes_of_one_track_rule_the_notes_of_another() {
        // 96 ticks a beat; 60 beats a minute, from tick 96 on 120. A3 from tick 48 to 144: half a beat at either tempo.
        let tempo: &[u8] = &[
            0, 0xff, 0x51, 3, 0x0f, 0x42, 0x40, 96, 0xff, 0x51, 3, 0x07, 0xa1, 0x20, 0, 0xff, 0x2f,
            0,
        ];
        let melody: &[u8] = &[48, 0x90, 57, 100, 96, 0x80, 57, 0, 0, 0xff, 0x2f, 0];
        check(&file(1, [0, 96], &[tempo, melody]), &[(0.5, 1.25, 220.0)]);
    }

    #[test]
    fn running_status_and_velocity_0_end_notes() {
        // Without a tempo a beat of 96 ticks lasts half a second.
        let track: &[u8] = &[0, 0x90, 69, 100, 96, 69, 0, 0, 57, 90, 96, 57, 0, 0, 0xff, 0x2f, 0];
        check(&file(0, [0, 96], &[track]), &[(0.0, 0.5, 440.0), (0.5, 1.0, 220.0)]);
    }

    #[test]
    fn keys_struck_again_and_notes_never_ended_end_all_the_same() {
        let track: &[u8] = &[0, 0x90, 69, 100, 96, 69, 100, 96, 0xff, 0x2f, 0];
        check(&file(0, [0, 96], &[track]), &[(0.0, 0.5, 440.0), (0.5, 1.0, 440.0)]);
    }

    #[test]
    fn drums_are_no_pitches() {
        let track: &[u8] = &[0, 0x99, 38, 100, 96, 38, 0, 0, 0xff, 0x2f, 0];
        check(&file(0, [0, 96], &[track]), &[]);
    }

    #[test]
    fn time_code_counts_frames() {
        // 25 frames of 40 ticks: a tick is a millisecond.
        let track: &[u8] = &[100, 0x90, 69, 100, 100, 69, 0, 0, 0xff, 0x2f, 0];
        check(&file(0, [0xe7, 40], &[track]), &[(0.1, 0.2, 440.0)]);
    }

    #[test]
    fn what_no_recording_follows_is_refused() {
        let end: &[u8] = &[0, 0xff, 0x2f, 0];
        for bytes in [file(2, [0, 96], &[end]), b"MThd".to_vec()] {
            assert!(notes(&bytes, &Tuning::default()).is_err(), "{bytes:?}");
        }
    }
}
