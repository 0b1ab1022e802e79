//! The editor in a real host on a display of its own: opened, resized and closed again and again while audio runs.

use std::io::{BufRead as _, BufReader};
use std::path::Path;
use std::process::{Child, Command, Stdio};

use crate::bundles::{target, there};

/// How often it is opened.
const TIMES: &str = "50";

/// An X server without a screen; ends with this value.
struct Display {
    server: Child,
    name: String,
}

impl Display {
    /// Starts one; `None` where there is no Xvfb.
    fn start() -> Option<Self> {
        let mut server = Command::new("Xvfb")
            .args(["-displayfd", "1", "-screen", "0", "1920x1200x24", "+extension", "GLX"])
            .args(["-nolisten", "tcp"])
            .stdout(Stdio::piped())
            .stderr(Stdio::null())
            .spawn()
            .ok()?;
        let mut number = String::new();
        BufReader::new(server.stdout.take()?).read_line(&mut number).ok()?;
        Some(Self { server, name: format!(":{}", number.trim()) })
    }
}

impl Drop for Display {
    fn drop(&mut self) {
        // It may have ended by itself.
        let _ = self.server.kill();
        let _ = self.server.wait();
    }
}

fn is_there(program: &str) -> bool {
    Command::new(program)
        .arg("--version")
        .stdout(Stdio::null())
        .stderr(Stdio::null())
        .status()
        .is_ok()
}

#[test]
fn the_editor_opens_fifty_times_while_audio_runs() {
    let what = "the editor in a host on a display";
    let bundle = there(target().join("bundled/Plumbtone.vst3"), what);
    let python = there(target().join("vst3-hosts/bin/python"), what);
    let (Some(bundle), Some(python)) = (bundle, python) else { return };
    let display = if is_there("xdotool") { Display::start() } else { None };
    let Some(display) = display else {
        assert!(std::env::var_os("CI").is_none(), "Xvfb or xdotool is missing");
        println!("skipped: {what}; it needs Xvfb and xdotool");
        return;
    };
    let script = Path::new(env!("CARGO_MANIFEST_DIR")).join("hosts/editor_host.py");
    let output = Command::new(python)
        .arg(script)
        .arg(bundle)
        .arg(TIMES)
        .env("DISPLAY", &display.name)
        .env_remove("WAYLAND_DISPLAY")
        .output()
        .expect("the host starts");
    let said = String::from_utf8_lossy(&output.stdout);
    let errors = String::from_utf8_lossy(&output.stderr);
    assert!(output.status.success(), "{}: {said}{errors}", output.status);
    assert!(said.contains("opened 50 times"), "{said}{errors}");
    println!("{said}");
}
