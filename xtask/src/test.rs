//! `cargo xtask test`: all tests, with all they need.

use anyhow::{Result, bail};

use crate::command::{root, run_cargo, succeeds};
use crate::{sound_bank, tidy};

/// Said when the recorded instruments could not be fetched.
const SKIPPED: &str = "skipped: the recorded instruments. No package registry could be reached to fetch their sound bank, \
                       so that part of the tests measured nothing.";

pub(crate) fn run(arguments: &[String]) -> Result<()> {
    let bank = sound_bank::fetch()?;
    if bank.is_none() && std::env::var_os("CI").is_some() {
        bail!(
            "the sound bank of the recorded instruments could not be fetched, and CI does not skip it"
        );
    }
    tidy::run()?;
    let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
    if succeeds("cargo", &["nextest", "--version"], &root()) {
        run_cargo(&[&["nextest", "run", "--workspace"], &arguments[..]].concat(), true)?;
        run_cargo(&["test", "--workspace", "--doc"], true)?;
    } else {
        run_cargo(&[&["test", "--workspace"], &arguments[..]].concat(), true)?;
    }
    if bank.is_none() {
        println!("{SKIPPED}");
    }
    Ok(())
}
