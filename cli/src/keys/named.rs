//! The key that a file's name tells: `pad-C4.wav`, `pad_F#3_02.wav`, `060.wav`.

use plumbtone_analysis::tuning::NoteName;
use std::path::Path;

/// The last part of a file's stem that is a note name; failing that, the last that is a MIDI note number.
pub(super) fn key_in(file: &Path) -> Option<NoteName> {
    let stem = file.file_stem()?.to_str()?;
    let parts = || stem.rsplit(|c: char| !(c.is_alphanumeric() || c == '#' || c == '-'));
    let pieces = || parts().flat_map(joined);
    let note = pieces().find_map(|piece| piece.parse::<NoteName>().ok());
    let number = || {
        let midi = pieces().filter_map(|piece| piece.parse::<i16>().ok());
        midi.filter(|number| (0..=127).contains(number)).map(NoteName::from_midi).next()
    };
    note.or_else(number)
}

/// All runs of the pieces between dashes, the last first and of those the longest: a dash may be a minus.
fn joined(part: &str) -> Vec<String> {
    let pieces: Vec<&str> = part.split('-').collect();
    let ends = (1..=pieces.len()).rev();
    ends.flat_map(|end| (0..end).map(move |start| (start, end)))
        .map(|(start, end)| pieces[start..end].join("-"))
        .collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_tell_keys() {
        for (name, key) in [
            ("pad-C4.wav", Some(60)),
            ("pad_F#3_02.wav", Some(54)),
            ("takes/Bb2 loud.aiff", Some(46)),
            ("060.wav", Some(60)),
            ("velocity-100-A-1.wav", Some(9)),
            ("loop.wav", None),
        ] {
            let found = key_in(Path::new(name));
            assert_eq!(found, key.map(NoteName::from_midi), "{name}");
        }
    }
}
