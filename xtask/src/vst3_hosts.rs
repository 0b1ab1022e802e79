//! Sets up the VST3 hosts that the tests use: Python packages in an environment of their own.

use std::fs;
use std::path::PathBuf;

use anyhow::Result;

use crate::command::{root, succeeds, target};

/// The hosts, and what their script needs.
const PACKAGES: [&str; 3] = ["dawdreamer==0.9.0", "pedalboard==0.9.26", "numpy>=2,<3"];

/// Puts the hosts where the tests look for them, unless they are there. `None` says that they could not be fetched.
///
/// # Errors
/// A broken environment that cannot be removed.
pub(crate) fn fetch() -> Result<Option<PathBuf>> {
    let folder = target().join("vst3-hosts");
    let Some(place) = folder.to_str() else { return Ok(None) };
    let python = folder.join("bin").join("python");
    let Some(program) = python.to_str() else { return Ok(None) };
    if succeeds(program, &["-c", "import dawdreamer, pedalboard, numpy"], &root()) {
        return Ok(Some(python));
    }
    if folder.exists() {
        fs::remove_dir_all(&folder)?;
    }
    let install = [&["-m", "pip", "install", "--quiet"], &PACKAGES[..]].concat();
    let made = succeeds("python3", &["-m", "venv", place], &root())
        && succeeds(program, &install, &root());
    Ok(made.then_some(python))
}
