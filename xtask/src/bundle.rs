//! `cargo xtask bundle`: the VST3 and CLAP bundles, under `target/bundled`.

use std::path::PathBuf;

use anyhow::Result;

use crate::command::target;

/// Builds the plugin for release and bundles it; further arguments go to cargo.
pub(crate) fn run(arguments: &[String]) -> Result<()> {
    let fixed = ["bundle", "plumbtone-plugin", "--release"].map(str::to_owned);
    nice_plug_xtask::main_with_args(
        "cargo xtask",
        fixed.into_iter().chain(arguments.iter().cloned()),
    )
}

/// The CLAP and the VST3 bundle.
pub(crate) fn bundles() -> [PathBuf; 2] {
    ["Plumbtone.clap", "Plumbtone.vst3"].map(|name| target().join("bundled").join(name))
}
