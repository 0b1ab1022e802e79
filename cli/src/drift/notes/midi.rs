//! The notes of a Standard MIDI File (MIDI Manufacturers Association, RP-001), in seconds by its tempo changes. Where the
//! pitch is bent, a note is several, one after the other.

mod player;

use anyhow::{Result, anyhow, bail};
use midly::{Format, MetaMessage, MidiMessage, Smf, Timing, TrackEventKind};
use player::{BEND_FULL, Piece, Player};
use plumbtone_analysis::check::Expected;
use plumbtone_analysis::tuning::Tuning;
use std::collections::{BTreeMap, BTreeSet};

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
    let mut players: BTreeMap<Channel, Player> = BTreeMap::new();
    let mut notes = Vec::new();
    for Played { tick, track, channel, message } in played(&file) {
        if channel.number == DRUMS {
            continue;
        }
        let player = players.entry(channel).or_default();
        let time_s = clock.seconds(tick);
        let mut ends = |piece: Piece| notes.push(piece.until(time_s, tuning));
        match message {
            Some(MidiMessage::NoteOn { key, vel }) if vel > 0 => {
                // A key struck again ends its last note.
                player.end((track, key.as_int())).into_iter().for_each(&mut ends);
                player.strike((track, key.as_int()), time_s);
            }
            Some(MidiMessage::NoteOn { key, .. } | MidiMessage::NoteOff { key, .. }) => {
                player.end((track, key.as_int())).into_iter().for_each(ends);
            }
            Some(MidiMessage::PitchBend { bend }) => {
                player.bend(f64::from(bend.as_int()) / BEND_FULL, time_s, ends);
            }
            Some(MidiMessage::Controller { controller, value }) => {
                player.control(controller.as_int(), value.as_int(), time_s, ends);
            }
            Some(_) => {}
            None => player.end_track(track).into_iter().for_each(ends),
        }
    }
    Ok(notes)
}

/// A message at its tick; none where the track ends.
struct Played {
    tick: u64,
    track: usize,
    channel: Channel,
    message: Option<MidiMessage>,
}

/// A channel of a port: what bends one note of it bends all, whichever track they are in.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
struct Channel {
    port: u8,
    number: u8,
}

/// The messages of all tracks, in order; each channel that a track plays on hears its end.
fn played(file: &Smf<'_>) -> Vec<Played> {
    let mut all = Vec::new();
    for (track, events) in file.tracks.iter().enumerate() {
        let (mut tick, mut port) = (0, 0);
        let mut channels = BTreeSet::new();
        for event in events {
            tick += u64::from(event.delta.as_int());
            match event.kind {
                TrackEventKind::Midi { channel, message } => {
                    let channel = Channel { port, number: channel.as_int() };
                    channels.insert(channel);
                    all.push(Played { tick, track, channel, message: Some(message) });
                }
                TrackEventKind::Meta(MetaMessage::MidiPort(number)) => port = number.as_int(),
                _ => {}
            }
        }
        let end = |channel| Played { tick, track, channel, message: None };
        all.extend(channels.into_iter().map(end));
    }
    all.sort_by_key(|played| played.tick);
    all
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
    fn a_bend_moves_what_sounds_and_what_is_struck_after_it() {
        let cents = plumbtone_analysis::tuning::ratio;
        // A beat lasts half a second; from tick 144 on a quarter of one. Up by a semitone at tick 48, back at tick 144, and a
        // whole tone down before the next note.
        let tempo: &[u8] = &[0x81, 0x10, 0xff, 0x51, 3, 0x03, 0xd0, 0x90, 0, 0xff, 0x2f, 0];
        let melody: &[u8] = &[
            0, 0x90, 69, 100, 48, 0xe0, 0, 0x60, 96, 0xe0, 0, 0x40, 96, 0x80, 69, 0, 0, 0xe0, 0, 0,
            0, 0x90, 57, 100, 96, 0x80, 57, 0, 0, 0xff, 0x2f, 0,
        ];
        check(
            &file(1, [0, 96], &[tempo, melody]),
            &[
                (0.0, 0.25, 440.0),
                (0.25, 0.75, 440.0 * cents(100.0)),
                (0.75, 1.0, 440.0),
                (1.0, 1.25, 220.0 * cents(-200.0)),
            ],
        );
    }

    #[test]
    fn the_range_of_the_bend_is_told_by_its_registered_parameter() {
        let cents = plumbtone_analysis::tuning::ratio;
        let full_up = 8191.0 / 8192.0;
        // Controllers before, the bend, and the note; the last is data for no registered parameter any more.
        for (controllers, range_cents) in [
            (&[(101, 0), (100, 0), (6, 12)][..], 1200.0),
            (&[(101, 0), (100, 0), (6, 12), (38, 50)], 1250.0),
            (&[(101, 0), (100, 1), (6, 12)], 200.0),
            (&[(101, 0), (100, 0), (101, 127), (100, 127), (6, 12)], 200.0),
            (&[(101, 0), (100, 0), (99, 0), (98, 0), (6, 12)], 200.0),
            (&[(6, 12)], 200.0),
        ] {
            let mut track = Vec::new();
            for &(number, value) in controllers {
                track.extend([0, 0xb0, number, value]);
            }
            track
                .extend([0, 0xe0, 0x7f, 0x7f, 0, 0x90, 69, 100, 96, 0x80, 69, 0, 0, 0xff, 0x2f, 0]);
            let hz = 440.0 * cents(full_up * range_cents);
            check(&file(0, [0, 96], &[&track]), &[(0.0, 0.5, hz)]);
        }
        // Changed while the note sounds; then all controllers are reset.
        let track: &[u8] = &[
            0, 0xb0, 101, 0, 0, 0xb0, 100, 0, 0, 0xe0, 0, 0, 0, 0x90, 69, 100, 96, 0xb0, 6, 7, 96,
            0xb0, 121, 0, 96, 0x80, 69, 0, 0, 0xff, 0x2f, 0,
        ];
        let pieces = [
            (0.0, 0.5, 440.0 * cents(-200.0)),
            (0.5, 1.0, 440.0 * cents(-700.0)),
            (1.0, 1.5, 440.0),
        ];
        check(&file(0, [0, 96], &[track]), &pieces);
    }

    #[test]
    fn a_bend_rules_its_channel_in_all_tracks_and_no_other() {
        let cents = plumbtone_analysis::tuning::ratio;
        let bends: &[u8] = &[48, 0xe1, 0, 0x60, 0, 0xff, 0x2f, 0];
        let melody: &[u8] = &[
            0, 0x91, 69, 100, 0, 0x92, 57, 100, 96, 0x91, 69, 0, 0, 0x92, 57, 0, 0, 0xff, 0x2f, 0,
        ];
        let mut other_port = vec![0, 0xff, 0x21, 1, 1];
        other_port.extend(bends);
        let bent = [(0.0, 0.25, 440.0), (0.0, 0.5, 220.0), (0.25, 0.5, 440.0 * cents(100.0))];
        check(&file(1, [0, 96], &[bends, melody]), &bent);
        let straight = [(0.0, 0.5, 440.0), (0.0, 0.5, 220.0)];
        check(&file(1, [0, 96], &[&other_port, melody]), &straight);
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
