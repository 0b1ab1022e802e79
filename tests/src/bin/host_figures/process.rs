//! What the system knows of this process: its memory, and the time its worker threads took.

use std::fs;

use plumbtone_tests::clap_host::Failure;

/// Ticks a second in which Linux tells times to programs.
const TICKS: f64 = 100.0;
/// How the names of the workers begin.
const WORKER: &str = "plumbtone";

/// Resident memory in MiB.
pub(crate) fn resident_mib() -> Result<f64, Failure> {
    let status = fs::read_to_string("/proc/self/status")?;
    let line = status.lines().find_map(|line| line.strip_prefix("VmRSS:")).ok_or("no VmRSS")?;
    let kib: f64 = line.trim().trim_end_matches("kB").trim().parse()?;
    Ok(kib / 1024.0)
}

/// Time that the worker threads have taken so far, in seconds.
pub(crate) fn worker_seconds() -> Result<f64, Failure> {
    let mut ticks = 0.0;
    for task in fs::read_dir("/proc/self/task")? {
        let folder = task?.path();
        if !fs::read_to_string(folder.join("comm"))?.starts_with(WORKER) {
            continue;
        }
        let stat = fs::read_to_string(folder.join("stat"))?;
        // Fields 14 and 15, counted from the command's closing bracket, which ends field 2.
        let fields = stat.rsplit(')').next().unwrap_or_default();
        for field in fields.split_whitespace().skip(11).take(2) {
            ticks += field.parse::<f64>()?;
        }
    }
    Ok(ticks / TICKS)
}
