//! `cargo xtask count`: instructions of the plugin's own `process()` per stereo block, beside a bare copy of the block.

use std::fs;
use std::process::Command;

use anyhow::{Context as _, Result, ensure};

use crate::command::{run_cargo, target};

/// Block lengths in samples.
const LENGTHS: [u32; 4] = [64, 256, 512, 1024];
/// Two runs of this many blocks; their difference leaves out what happens once.
const BLOCKS: (u32, u32) = (10, 40);

pub(crate) fn run() -> Result<()> {
    let arguments =
        ["build", "--quiet", "--release", "--package", "plumbtone-plugin", "--example", "block"];
    run_cargo(&arguments, true)?;
    println!("instructions per stereo block     process()   bare copy   target");
    for length in LENGTHS {
        let process = per_block("process", length)?;
        let copy = per_block("copy", length)?;
        println!(
            "{length:5} samples                  {process:9.0}   {copy:9.0}   {:6}",
            500 + 4 * length
        );
    }
    Ok(())
}

/// Instructions of one block.
fn per_block(what: &str, length: u32) -> Result<f64> {
    let few = counted(what, BLOCKS.0, length)?;
    let many = counted(what, BLOCKS.1, length)?;
    Ok((many - few) / f64::from(BLOCKS.1 - BLOCKS.0))
}

/// Instructions within the function of this name, counted by callgrind.
fn counted(what: &str, blocks: u32, length: u32) -> Result<f64> {
    let folder = target().join("count");
    fs::create_dir_all(&folder)?;
    let profile = folder.join("profile");
    let output = Command::new("valgrind")
        .args(["--tool=callgrind", &format!("--toggle-collect=*{what}_block*")])
        .arg(format!("--callgrind-out-file={}", profile.display()))
        .arg(target().join("release/examples/block"))
        .args([what, &blocks.to_string(), &length.to_string()])
        .arg(&folder)
        .output()
        .context("valgrind could not be started")?;
    let said = String::from_utf8_lossy(&output.stderr);
    ensure!(output.status.success(), "valgrind failed: {said}");
    let count = said.lines().find_map(|line| line.split("Collected :").nth(1));
    let count = count.with_context(|| format!("valgrind counted nothing: {said}"))?;
    Ok(count.trim().parse()?)
}
