//! Drives the built program on sound files of every kind, good and bad.
#![forbid(unsafe_code)]
#![expect(clippy::unwrap_used, reason = "a test fails by panicking")]

mod bad_input;
mod batch;
mod drift;
mod drift_batch;
mod drift_expected;
mod formats;
mod outputs;
mod patch;
mod sounds;

use serde_json::Value;
use std::path::Path;
use std::process::{Command, Output};
use tempfile::TempDir;

/// What the program did.
struct Run {
    status: Option<i32>,
    stdout: String,
    stderr: String,
}

/// Runs `plumbtone measure` in a folder.
fn measure(folder: &Path, arguments: &[&str]) -> Run {
    plumbtone(folder, "measure", arguments)
}

/// Runs `plumbtone drift` in a folder.
fn drift(folder: &Path, arguments: &[&str]) -> Run {
    plumbtone(folder, "drift", arguments)
}

fn plumbtone(folder: &Path, command: &str, arguments: &[&str]) -> Run {
    let Output { status, stdout, stderr } = Command::new(env!("CARGO_BIN_EXE_plumbtone"))
        .arg(command)
        .args(arguments)
        .current_dir(folder)
        .output()
        .unwrap();
    Run {
        status: status.code(),
        stdout: String::from_utf8(stdout).unwrap(),
        stderr: String::from_utf8(stderr).unwrap(),
    }
}

impl Run {
    /// The JSON objects printed, one per line.
    fn objects(&self) -> Vec<Value> {
        self.stdout.lines().map(|line| serde_json::from_str(line).unwrap()).collect()
    }
}

/// A folder with files in it, gone at the end of the test.
fn folder_with<const N: usize>(files: [(&str, Vec<u8>); N]) -> TempDir {
    let folder = TempDir::new().unwrap();
    for (name, bytes) in files {
        let path = folder.path().join(name);
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        std::fs::write(path, bytes).unwrap();
    }
    folder
}
