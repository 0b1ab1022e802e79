//! The files that the user means by files, folders and patterns.

use anyhow::{Context as _, Result, bail};
use std::collections::HashSet;
use std::path::{Path, PathBuf};

/// Endings of the files taken from a folder.
const ENDINGS: [&str; 7] = ["wav", "wave", "aif", "aiff", "aifc", "flac", "rf64"];

/// Replaces folders by the sound files below them and patterns by what they match; each file once, in order.
///
/// # Errors
/// A folder or pattern without a sound file; a pattern that is none.
pub(crate) fn expand(named: &[PathBuf]) -> Result<Vec<PathBuf>> {
    let mut files = Vec::new();
    let mut seen = HashSet::new();
    for path in named {
        let found = if path.is_dir() {
            matching(&in_folder(path)?, is_sound).with_context(|| format!("{}", path.display()))?
        } else if path.exists() || !is_pattern(path) {
            // What is not there is said with its name when its turn comes.
            vec![path.clone()]
        } else {
            matching(&path.to_string_lossy(), Path::is_file)
                .with_context(|| format!("{}", path.display()))?
        };
        files.extend(found.into_iter().filter(|file| seen.insert(file.clone())));
    }
    Ok(files)
}

fn in_folder(folder: &Path) -> Result<String> {
    let folder = folder.to_str().context("has a name that is no text")?;
    Ok(format!("{}/**/*", glob::Pattern::escape(folder.trim_end_matches('/'))))
}

fn matching(pattern: &str, wanted: impl Fn(&Path) -> bool) -> Result<Vec<PathBuf>> {
    let paths = glob::glob(pattern).context("is no pattern")?;
    let files: Vec<_> = paths.filter_map(Result::ok).filter(|path| wanted(path)).collect();
    if files.is_empty() {
        bail!("there is no sound file");
    }
    Ok(files)
}

fn is_sound(path: &Path) -> bool {
    let ending = path.extension().and_then(|ending| ending.to_str()).unwrap_or_default();
    path.is_file() && ENDINGS.iter().any(|known| ending.eq_ignore_ascii_case(known))
}

fn is_pattern(path: &Path) -> bool {
    path.to_string_lossy().contains(['*', '?', '['])
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn folders_and_patterns_become_files_in_order_each_once() {
        let folder = tempfile::TempDir::new().unwrap();
        for name in ["b.wav", "a.WAV", "notes.txt", "deep/er/c.flac", "x[1].wav"] {
            let path = folder.path().join(name);
            std::fs::create_dir_all(path.parent().unwrap()).unwrap();
            std::fs::write(path, b"").unwrap();
        }
        let names = |named: &[&str]| -> Vec<String> {
            let named: Vec<_> = named.iter().map(|name| folder.path().join(name)).collect();
            let files = expand(&named).unwrap();
            let short = |f: &PathBuf| f.strip_prefix(folder.path()).unwrap().display().to_string();
            files.iter().map(short).collect()
        };
        assert_eq!(names(&[""]), ["a.WAV", "b.wav", "deep/er/c.flac", "x[1].wav"], "the folder");
        assert_eq!(names(&["b.wav", "*.wav"]), ["b.wav", "x[1].wav"], "a file and a pattern");
        assert_eq!(names(&["**/*.flac"]), ["deep/er/c.flac"], "a deep pattern");
        assert_eq!(names(&["x[1].wav"]), ["x[1].wav"], "a file whose name looks like a pattern");
        assert_eq!(names(&["missing.wav"]), ["missing.wav"], "what is not there");
        let none = expand(&[folder.path().join("*.ogg")]).unwrap_err();
        assert!(format!("{none:#}").contains("there is no sound file"), "{none:#}");
    }
}
