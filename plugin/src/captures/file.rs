//! Captures in files.

use std::fs::File;
use std::io::{Read as _, Write as _};
use std::path::Path;

use tempfile::NamedTempFile;

/// Largest file read: many times what a full shelf takes.
const BYTES_MAX: u64 = 16 << 20;

/// Reads a file.
///
/// # Errors
/// In a few words, why it cannot be read.
pub(super) fn read(path: &str) -> Result<String, String> {
    whole(path)?;
    let file = File::open(path).map_err(|error| format!("{path}: {error}"))?;
    let mut text = String::new();
    let read = file.take(BYTES_MAX + 1).read_to_string(&mut text);
    let bytes = read.map_err(|error| format!("{path}: {error}"))?;
    if bytes as u64 > BYTES_MAX {
        return Err(format!("{path} is larger than any captures are"));
    }
    Ok(text)
}

/// Writes a new file, whole or not at all; what is there already stays.
///
/// # Errors
/// In a few words, why there is none.
pub(super) fn write(path: &str, text: &str) -> Result<(), String> {
    let folder = whole(path)?;
    let write = || {
        let mut file = NamedTempFile::new_in(folder)?;
        file.write_all(text.as_bytes())?;
        file.as_file().sync_all()?;
        file.persist_noclobber(path).map_err(|error| error.error)
    };
    write().map(|_| ()).map_err(|error| format!("{path}: {error}"))
}

/// The folder of a whole path.
fn whole(path: &str) -> Result<&Path, String> {
    let place = Path::new(path);
    if path.is_empty() {
        return Err("no file is named".to_owned());
    }
    place
        .parent()
        .filter(|_| place.is_absolute())
        .ok_or_else(|| format!("{path} is not a whole path"))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_file_comes_back_and_is_never_overwritten() {
        let folder = tempfile::tempdir().unwrap();
        let path = folder.path().join("soft pads.json").display().to_string();
        write(&path, "{\u{2603}}").unwrap();
        assert_eq!(read(&path).unwrap(), "{\u{2603}}");
        let again = write(&path, "other").unwrap_err();
        assert!(again.contains("soft pads.json"), "{again}");
        assert_eq!(read(&path).unwrap(), "{\u{2603}}", "as it was");
        assert_eq!(folder.path().read_dir().unwrap().count(), 1, "nothing else is left");
    }

    #[test]
    fn what_stands_in_the_way_is_said() {
        let folder = tempfile::tempdir().unwrap();
        let gone = folder.path().join("gone").join("a.json").display().to_string();
        for (path, why) in [("", "no file"), ("a.json", "whole path"), (&gone, "a.json: ")] {
            let (found, made) = (read(path).unwrap_err(), write(path, "").unwrap_err());
            assert!(found.contains(why) && made.contains(why), "{path}: {found}, {made}");
        }
        let binary = folder.path().join("b.json").display().to_string();
        std::fs::write(&binary, [0xff, 0xfe, 0x00]).unwrap();
        assert!(read(&binary).unwrap_err().contains("b.json"), "no text");
    }
}
