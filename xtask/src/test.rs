//! `cargo xtask test`: all tests, with all they need.

use anyhow::{Result, bail};

use crate::command::{root, run_cargo, succeeds};
use crate::{bundle, sound_bank, tidy, vst3_hosts};

/// Said when the recorded instruments could not be fetched.
const SKIPPED: &str = "skipped: the recorded instruments. No package registry could be reached to fetch their sound bank, \
                       so that part of the tests measured nothing.";

/// Said when the VST3 hosts could not be fetched.
const HOSTS_SKIPPED: &str = "skipped: the VST3 bundle in hosts. No package registry could be reached to fetch dawdreamer and \
                             pedalboard, so that part of the tests tried nothing.";

pub(crate) fn run(arguments: &[String]) -> Result<()> {
    let bank = sound_bank::fetch()?;
    if bank.is_none() && std::env::var_os("CI").is_some() {
        bail!(
            "the sound bank of the recorded instruments could not be fetched, and CI does not skip it"
        );
    }
    let hosts = vst3_hosts::fetch()?;
    if hosts.is_none() && std::env::var_os("CI").is_some() {
        bail!("the VST3 hosts could not be fetched, and CI does not skip them");
    }
    tidy::run()?;
    bundle::run(&[])?;
    let arguments: Vec<&str> = arguments.iter().map(String::as_str).collect();
    if succeeds("cargo", &["nextest", "--version"], &root()) {
        run_cargo(
            &[&["nextest", "run", "--workspace", "--no-fail-fast"], &arguments[..]].concat(),
            true,
        )?;
        run_cargo(&["test", "--workspace", "--doc"], true)?;
    } else {
        run_cargo(&[&["test", "--workspace", "--no-fail-fast"], &arguments[..]].concat(), true)?;
    }
    if bank.is_none() {
        println!("{SKIPPED}");
    }
    if hosts.is_none() {
        println!("{HOSTS_SKIPPED}");
    }
    Ok(())
}
