//! The plugin's part of `cargo xtask demo`: plays the demo sound through the CLAP bundle as a host would.

use std::fs;

use anyhow::{Context as _, Result, ensure};

use crate::bundle;
use crate::command::{root, target};

/// The environment variable that makes plugins log their readings into a folder.
const READINGS: &str = "PLUMBTONE_READINGS";

pub(crate) fn run() -> Result<()> {
    bundle::run(&[])?;
    let bundles = bundle::bundles();
    let readings = target().join("demo").join("readings");
    if readings.exists() {
        fs::remove_dir_all(&readings)?;
    }
    println!("\nThe plugin as CLAP, rendering the demo sound offline:");
    let status = std::process::Command::new("cargo")
        .args([
            "run",
            "--quiet",
            "--release",
            "--package",
            "plumbtone-tests",
            "--bin",
            "play",
            "--",
        ])
        .args([&bundles[0], &readings])
        .env(READINGS, &readings)
        .current_dir(root())
        .status()
        .context("cargo could not be started")?;
    ensure!(status.success(), "the plugin could not be played ({status})");
    println!("\nThe bundles, and the log of the readings:");
    for path in bundles.iter().chain([&readings]) {
        println!("  {}", path.strip_prefix(root()).unwrap_or(path).display());
    }
    Ok(())
}
