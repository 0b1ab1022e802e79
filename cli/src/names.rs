//! Names for the files written beside each other, one per input.

use std::collections::HashSet;
use std::path::{Path, PathBuf};

/// Where the picture of the input with an index goes: to the name given for one input; with the input's name in it for
/// several.
pub(crate) fn picture_place(picture: &Path, names: &[String], index: usize) -> PathBuf {
    if names.len() == 1 {
        return picture.to_owned();
    }
    let mut name = picture.file_stem().unwrap_or_default().to_owned();
    name.push("-");
    name.push(&names[index]);
    name.push(".");
    name.push(picture.extension().unwrap_or_default());
    picture.with_file_name(name)
}

/// A name for each input: its stem, with a number where an earlier input has that name already. Names that differ only
/// in case count as the same, for file systems that think so.
pub(crate) fn distinct_names<P: AsRef<Path>>(inputs: &[P]) -> Vec<String> {
    let mut taken = HashSet::new();
    let stem = |path: &Path| {
        path.file_stem()
            .map_or_else(|| "sound".to_owned(), |stem| stem.to_string_lossy().into_owned())
    };
    // First come the plain stems, so that "a-2.wav" keeps its name when two "a.wav" are there.
    let mut names: Vec<Option<String>> = inputs
        .iter()
        .map(|path| Some(stem(path.as_ref())).filter(|name| taken.insert(name.to_lowercase())))
        .collect();
    for (name, path) in names.iter_mut().zip(inputs) {
        if name.is_none() {
            let stem = stem(path.as_ref());
            *name = (2_u32..)
                .map(|n| format!("{stem}-{n}"))
                .find(|name| taken.insert(name.to_lowercase()));
        }
    }
    names.into_iter().flatten().collect()
}

#[cfg(test)]
mod tests {
    use super::distinct_names;

    #[test]
    fn same_stems_never_collide() {
        let inputs = ["x/a.wav", "y/a.wav", "a.flac", "a-2.wav", "A.aiff", "b.wav", "a.b.wav"];
        let names = ["a", "a-3", "a-4", "a-2", "A-5", "b", "a.b"];
        assert_eq!(distinct_names(&inputs), names, "for {inputs:?}");
    }
}
