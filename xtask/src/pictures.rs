//! `cargo xtask pictures`: renders the editor's views from fixed data into `target/pictures`.

use anyhow::{Context as _, Result};

use crate::command::{run_cargo, target};

/// Renders them; further arguments are sound files, each rendered past its middle instead.
pub(crate) fn run(sounds: &[String]) -> Result<()> {
    let folder = target().join("pictures");
    let folder = folder.to_str().context("the target folder's name is no text")?;
    let program = ["run", "--quiet", "--package", "plumbtone-plugin", "--example", "editor", "--"];
    let sounds: Vec<&str> = sounds.iter().map(String::as_str).collect();
    run_cargo(&[&program[..], &["pictures", folder], &sounds[..]].concat(), true)
}
