//! The sound's descriptors, held still for the eye.

use plumbtone_analysis::waveform::{self, WaveformFit};
use plumbtone_analysis::{Descriptors, Stretch};

use super::super::screen::Shown;
use super::super::steady::{NONE, Steady};
use super::super::words;

/// How often a textbook wave is looked for, in seconds of sound: it takes longer than a frame should.
const LOOK_S: f64 = 0.5;
/// Deviations that the figures are rounded by: these descriptors come without one.
const SHOWN_SD: f64 = 0.03;

/// What a descriptor is called, how it is written, and what it means.
struct Line {
    caption: &'static str,
    unit: &'static str,
    signed: bool,
    help: &'static str,
}

const LINES: [Line; 6] = [
    Line {
        caption: "tilt",
        unit: " dB/oct",
        signed: true,
        help: "How fast the partials fall: slope of their levels per doubling of the partial number.",
    },
    Line {
        caption: "odd \u{2212} even",
        unit: " dB",
        signed: true,
        help: "Power of the odd partials over that of the even ones.",
    },
    Line {
        caption: "THD (to fundamental)",
        unit: " %",
        signed: false,
        help: "Total harmonic distortion: partials 2 and up against partial 1.",
    },
    Line {
        caption: "harmonic to noise",
        unit: " dB",
        signed: true,
        help: "Power of the partials over the noise between them and over what belongs to none. Partials that move or lie closer than 30 Hz count as noise with their skirts.",
    },
    Line {
        caption: "centroid",
        unit: "",
        signed: false,
        help: "Mean partial number, weighted by amplitude: brightness.",
    },
    Line {
        caption: "level",
        unit: " dBFS",
        signed: true,
        help: "Root mean square of the sound; 0 dBFS is a full-scale sine.",
    },
];

/// The figures on display.
#[derive(Debug, Clone, Default)]
pub(crate) struct Figures {
    centre: u64,
    since: u64,
    stretch: Option<Stretch>,
    values: [Option<Steady>; LINES.len()],
    /// The textbook wave, and where it was looked for last.
    waveform: Option<WaveformFit>,
    looked: u64,
}

impl Figures {
    /// Takes the newest reading.
    pub(crate) fn update(&mut self, shown: &Shown<'_>) {
        let readout = shown.readout;
        if !readout.measured || readout.reading.centre == self.centre {
            return;
        }
        if readout.since != self.since {
            *self = Self { since: readout.since, ..Self::default() };
        }
        let elapsed_s =
            readout.reading.centre.saturating_sub(self.centre) as f64 / readout.sample_rate_hz;
        self.centre = readout.reading.centre;
        let held = readout.pitch().is_some();
        self.stretch = readout.reading.stretch.filter(|_| held);
        let descriptors =
            if held { Descriptors::of_reading(&readout.reading) } else { Descriptors::default() };
        let looked_s = self.centre.saturating_sub(self.looked) as f64 / readout.sample_rate_hz;
        if !held {
            self.waveform = None;
        } else if self.looked == 0 || looked_s >= LOOK_S {
            self.looked = self.centre;
            self.waveform = waveform::of_reading(&readout.reading);
        }
        let level = Some(readout.reading.level_dbfs);
        let newest = [
            descriptors.tilt_db_per_octave,
            descriptors.odd_even_db,
            descriptors.thd_f_percent,
            descriptors.hnr_db,
            descriptors.centroid_partial,
            level,
        ];
        for (value, newest) in self.values.iter_mut().zip(newest) {
            match newest.filter(|newest| newest.is_finite()) {
                Some(newest) => {
                    value.get_or_insert_default().update(newest, SHOWN_SD, elapsed_s, 1);
                }
                None => *value = None,
            }
        }
    }

    /// Caption, value and meaning of each.
    pub(crate) fn lines(&self) -> impl Iterator<Item = (&'static str, String, &'static str)> {
        let b = self.stretch.map_or_else(|| NONE.to_owned(), stretch);
        let help = "Inharmonicity of a stiff string: partial n lies at n f0 \u{221a}(1 + B n\u{b2}). 0 is a harmonic sound.";
        let rest = LINES.iter().zip(&self.values).map(|(line, value)| {
            let text = value.as_ref().map_or_else(
                || NONE.to_owned(),
                |value| match (line.caption, value.text(line.signed)) {
                    ("centroid", text) => format!("partial {text}"),
                    (_, text) => format!("{text}{}", line.unit),
                },
            );
            (line.caption, text, line.help)
        });
        let wave = self.waveform.as_ref().map(|fit| {
            let help = "The textbook wave whose partials have these levels and phases, and how well the levels fit.";
            ("waveform", words::waveform(fit), help)
        });
        std::iter::once(("stretch B", b, help)).chain(rest).chain(wave)
    }
}

/// B with its deviation, both over one power of ten.
pub(crate) fn stretch(stretch: Stretch) -> String {
    let Stretch { b, b_sd } = stretch;
    if !(b.is_finite() && b_sd.is_finite()) {
        return NONE.to_owned();
    }
    let size = b.abs().max(b_sd);
    if !(size > 0.0 && size.is_finite()) {
        return "0".to_owned();
    }
    let exponent = crate::convert::floor(size.log10());
    let scale = 10f64.powf(size.log10().floor());
    let sign = if b < 0.0 { "\u{2212}" } else { "" };
    let power = power_of_ten(exponent);
    format!("({sign}{:.2} \u{b1} {:.2})\u{b7}{power}", b.abs() / scale, b_sd / scale)
}

/// A power of ten as print has it.
pub(crate) fn power_of_ten(exponent: i64) -> String {
    let raised: String = exponent.to_string().chars().map(superscript).collect();
    format!("10{raised}")
}

fn superscript(digit: char) -> char {
    match digit {
        '-' => '\u{207b}',
        '1' => '\u{b9}',
        '2' => '\u{b2}',
        '3' => '\u{b3}',
        '0' => '\u{2070}',
        digit => char::from_u32(0x2070 + digit.to_digit(10).unwrap_or(0)).unwrap_or(digit),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn b_is_written_with_one_power_of_ten() {
        for (b, b_sd, expected) in [
            (1.6e-4, 2e-6, "(1.60 \u{b1} 0.02)\u{b7}10\u{207b}\u{2074}"),
            (-3e-6, 2e-6, "(\u{2212}3.00 \u{b1} 2.00)\u{b7}10\u{207b}\u{2076}"),
            (0.0, 0.0, "0"),
            (f64::NAN, 1.0, NONE),
        ] {
            assert_eq!(stretch(Stretch { b, b_sd }), expected);
        }
    }
}
