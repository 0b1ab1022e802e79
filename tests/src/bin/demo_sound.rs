//! Writes the embedded demo sound to the WAV file named on the command line and prints what it is made of.
#![expect(clippy::print_stdout, reason = "printing is the program's purpose")]

use std::error::Error;

use plumbtone_analysis::signals::{Demo, demo};

fn main() -> Result<(), Box<dyn Error>> {
    let path = std::env::args_os().nth(1).ok_or("the file to write is missing")?;
    let sound = demo();
    let mut writer = hound::WavWriter::create(path, format(&sound))?;
    for &sample in &sound.samples {
        writer.write_sample(sample)?;
    }
    writer.finalize()?;
    println!("{}", contents(&sound));
    Ok(())
}

#[expect(clippy::cast_possible_truncation, reason = "a sample rate in whole Hz")]
#[expect(clippy::cast_sign_loss, reason = "a sample rate is positive")]
fn format(sound: &Demo) -> hound::WavSpec {
    hound::WavSpec {
        channels: 1,
        sample_rate: sound.sample_rate_hz as u32,
        bits_per_sample: 32,
        sample_format: hound::SampleFormat::Float,
    }
}

fn contents(sound: &Demo) -> String {
    let hum: Vec<String> =
        sound.hum.lines.iter().map(|line| format!("{} Hz", line.frequency_hz)).collect();
    format!(
        "The demo sound holds
  from {:.2} to {:.2} s a plucked string: f0 {:.4} Hz, B {:.2e}, {} partials, and {} more that fold, from
    partial {} at {:.2} Hz on;
  from {:.2} to {:.2} s the same string, held, while it drifts by {} cents per second;
  under both, mains hum at {}.
",
        sound.pluck_s.0,
        sound.pluck_s.1,
        sound.pluck.f0_hz,
        sound.pluck.b,
        sound.pluck.partials.len(),
        sound.aliases.len(),
        sound.aliases[0].number,
        sound.aliases[0].frequency_hz,
        sound.held_s.0,
        sound.held_s.1,
        sound.held.motion.drift_cents_per_s,
        hum.join(", "),
    )
}
