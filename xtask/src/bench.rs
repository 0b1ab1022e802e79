//! `cargo xtask bench`: the speed of the engine.

use anyhow::Result;

use crate::command::run_cargo;

pub(crate) fn run() -> Result<()> {
    run_cargo(&["bench", "--quiet", "--package", "plumbtone-tests", "--bench", "speed"], true)
}
