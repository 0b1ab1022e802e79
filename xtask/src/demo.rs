//! `cargo xtask demo`: synthesises the demo sound, measures it with the program, and says where the pictures are.

use std::fs;
use std::path::Path;

use anyhow::{Context as _, Result};

use crate::command::{root, run_cargo, target};

/// The pictures, each of one note of the sound.
const PICTURES: [(&str, &str); 3] = [("pluck.svg", "1"), ("pluck.png", "1"), ("held.png", "2")];

pub(crate) fn run() -> Result<()> {
    let folder = target().join("demo");
    fs::create_dir_all(&folder)?;
    let sound = text(&folder.join("demo.wav"))?;
    run_cargo(
        &[
            "run",
            "--quiet",
            "--release",
            "--package",
            "plumbtone-tests",
            "--bin",
            "demo_sound",
            "--",
            &sound,
        ],
        true,
    )?;
    for (index, (name, note)) in PICTURES.into_iter().enumerate() {
        let picture = text(&folder.join(name))?;
        let program = ["run", "--quiet", "--release", "--package", "plumbtone-cli", "--"];
        let measure = ["measure", &sound, "--picture", &picture, "--note", note];
        // One table is enough; the other runs are for their pictures.
        run_cargo(&[&program[..], &measure].concat(), index == 0)?;
    }
    println!("\nThe sound and its pictures:");
    for name in ["demo.wav"].into_iter().chain(PICTURES.map(|(name, _)| name)) {
        let path = folder.join(name);
        println!("  {}", path.strip_prefix(root()).unwrap_or(&path).display());
    }
    Ok(())
}

fn text(path: &Path) -> Result<String> {
    path.to_str().map(str::to_owned).with_context(|| format!("{} is no text", path.display()))
}
