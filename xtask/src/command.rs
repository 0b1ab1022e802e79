//! Running other programs, and the folders they run in.

use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

use anyhow::{Context as _, Result, ensure};

/// The workspace's root.
pub(crate) fn root() -> PathBuf {
    let package = Path::new(env!("CARGO_MANIFEST_DIR"));
    package.parent().map_or_else(|| package.to_path_buf(), Path::to_path_buf)
}

/// Where everything built or fetched goes.
pub(crate) fn target() -> PathBuf {
    std::env::var_os("CARGO_TARGET_DIR").map_or_else(|| root().join("target"), PathBuf::from)
}

/// Runs cargo in the workspace's root; shows what it prints, or with `shown` false only what it says of errors.
///
/// # Errors
/// Cargo could not be started, or failed.
pub(crate) fn run_cargo(arguments: &[&str], shown: bool) -> Result<()> {
    let status = Command::new("cargo")
        .args(arguments)
        .current_dir(root())
        .stdout(if shown { Stdio::inherit() } else { Stdio::null() })
        .status()
        .context("cargo could not be started")?;
    ensure!(status.success(), "cargo {} failed ({status})", arguments.join(" "));
    Ok(())
}

/// Runs a program in a folder without showing what it prints; says whether it was there and succeeded.
pub(crate) fn succeeds(program: &str, arguments: &[&str], folder: &Path) -> bool {
    Command::new(program)
        .args(arguments)
        .current_dir(folder)
        .stdin(Stdio::null())
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .status()
        .is_ok_and(|status| status.success())
}
