//! The project's own commands, each with all the set-up it needs: `cargo xtask test`, `bundle`, `bench`, `demo`, `tidy`.
#![forbid(unsafe_code)]
#![expect(
    clippy::print_stdout,
    clippy::print_stderr,
    reason = "printing is what these commands are for"
)]

mod bench;
mod bundle;
mod command;
mod count;
mod demo;
mod demo_host;
mod pictures;
mod sound_bank;
mod test;
mod tidy;
mod vst3_hosts;

use std::process::ExitCode;

use anyhow::{Result, bail};

const USAGE: &str = "\
cargo xtask test [ARGUMENT...]   fetch what the tests need, then run them all; arguments go to the test runner
cargo xtask fetch                only fetch the sound bank of the recorded instruments
cargo xtask bundle [ARGUMENT...] build the VST3 and CLAP bundles under target/bundled; arguments go to cargo build
cargo xtask bench                print how fast the engine is, as ratios measured in one run
cargo xtask count                count the instructions of the plugin's own process(), beside a bare copy (needs valgrind)
cargo xtask demo                 synthesise the demo sound, measure it, play it through the plugin, say where the pictures are
cargo xtask pictures [WAV...]    render the editor from fixed data, or of recorded sounds, into target/pictures (needs Vulkan)
cargo xtask tidy                 check the rules of the source tree that no lint knows";

fn main() -> ExitCode {
    match run() {
        Ok(()) => ExitCode::SUCCESS,
        Err(error) => {
            eprintln!("error: {error:#}");
            ExitCode::FAILURE
        }
    }
}

fn run() -> Result<()> {
    let arguments: Vec<String> = std::env::args().skip(1).collect();
    let Some((command, rest)) = arguments.split_first() else { bail!("{USAGE}") };
    match command.as_str() {
        "test" => test::run(rest),
        "fetch" => fetch(),
        "bench" => bench::run(),
        "bundle" => bundle::run(rest),
        "count" => count::run(),
        "demo" => demo::run().and_then(|()| demo_host::run()),
        "pictures" => pictures::run(rest),
        "tidy" => tidy::run(),
        _ => bail!("no command {command}\n{USAGE}"),
    }
}

fn fetch() -> Result<()> {
    let Some(bank) = sound_bank::fetch()? else { bail!("no package registry could be reached") };
    println!("the sound bank is at {}", bank.display());
    Ok(())
}
