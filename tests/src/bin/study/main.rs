//! Prints what the engine reaches, beside the figures to reach.
//!
//! `study [SECTION...] [--count N] [--seed N] [--worst N]`; the sections are `exact`, `decays`, `aliases`, `hum`, `claims`,
//! `moving`, `drift`, `recorded` and `live`, all of them when none is named. Each draws `count` sounds from `seed` on and prints the
//! `worst` cases of each figure.
#![expect(clippy::print_stdout, reason = "printing is the program's purpose")]

mod drift;
mod moving;
mod recorded;
mod table;
mod tones;

use std::error::Error;

use plumbtone_tests::figures::Draw;

/// The sections in the order of printing.
const SECTIONS: [&str; 9] =
    ["exact", "decays", "aliases", "hum", "claims", "moving", "drift", "recorded", "live"];

/// What was asked for.
struct Options {
    sections: Vec<String>,
    draw: Draw,
    worst: usize,
}

fn main() -> Result<(), Box<dyn Error>> {
    let options = options(std::env::args().skip(1))?;
    for section in SECTIONS {
        if options.sections.is_empty() || options.sections.iter().any(|name| name == section) {
            print(section, &options)?;
        }
    }
    Ok(())
}

fn print(section: &str, options: &Options) -> Result<(), Box<dyn Error>> {
    let (draw, worst) = (options.draw, options.worst);
    match section {
        "exact" => tones::exact(draw, worst)?,
        "decays" => tones::decays(draw, worst)?,
        "aliases" => tones::aliases(draw, worst)?,
        "hum" => tones::hum(draw, worst)?,
        "claims" => tones::claims(draw, worst)?,
        "moving" => moving::moving(draw, worst)?,
        "drift" => drift::drift(draw, worst)?,
        "recorded" => recorded::print(worst)?,
        _ => moving::live()?,
    }
    Ok(())
}

fn options(mut arguments: impl Iterator<Item = String>) -> Result<Options, Box<dyn Error>> {
    let mut options = Options { sections: Vec::new(), draw: Draw { seed: 1, count: 40 }, worst: 5 };
    while let Some(argument) = arguments.next() {
        let mut number = || arguments.next().ok_or("a number is missing").map(|n| n.parse::<u32>());
        match argument.as_str() {
            "--count" => options.draw.count = u64::from(number()??),
            "--seed" => options.draw.seed = u64::from(number()??),
            "--worst" => options.worst = usize::try_from(number()??)?,
            name if SECTIONS.contains(&name) => options.sections.push(argument),
            other => return Err(format!("{other} is no section or option").into()),
        }
    }
    Ok(options)
}
