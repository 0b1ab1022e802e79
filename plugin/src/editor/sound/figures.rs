//! The sound's descriptors, held still for the eye.

use plumbtone_analysis::{Descriptors, Reading, Stretch};

use super::super::screen::Shown;
use super::super::steady::{NONE, Steady};

/// A level known to about this many dB tells the rest beside the partials down to this many dB below them.
const HNR_MOST_DB: f64 = 25.0;
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
        help: "Power of the partials over everything else. Above 25 dB the difference of two levels tells no more.",
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
        let descriptors = if held { of(&readout.reading) } else { Descriptors::default() };
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
                    ("harmonic to noise", text) if text.starts_with("+25") => {
                        "over 25 dB".to_owned()
                    }
                    (_, text) => format!("{text}{}", line.unit),
                },
            );
            (line.caption, text, line.help)
        });
        std::iter::once(("stretch B", b, help)).chain(rest)
    }
}

/// The descriptors of a reading. All power beside the partials is what its level holds beyond them; the levels are not
/// exact enough to tell less than [`HNR_MOST_DB`] below.
fn of(reading: &Reading) -> Descriptors {
    let amplitude = |dbfs: f64| 10f64.powf(dbfs / 20.0);
    let partials = reading.partials.iter().map(|p| (p.number, amplitude(p.level_dbfs)));
    let within: f64 = partials.clone().map(|(_, a)| a * a / 2.0).filter(|p| p.is_finite()).sum();
    let whole = amplitude(reading.level_dbfs).powi(2) / 2.0;
    let least = within * 10f64.powf(-HNR_MOST_DB / 10.0);
    Descriptors::of(partials, Some((whole - within).max(least)))
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
    use plumbtone_analysis::Partial;

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

    #[test]
    fn noise_of_a_tenth_of_the_power_is_ten_db() {
        let partial = Partial {
            number: 1,
            frequency_hz: 220.0,
            frequency_sd_hz: 0.0,
            cents_from_harmonic: 0.0,
            cents_sd: 0.0,
            level_dbfs: -12.0,
            level_sd_db: 0.0,
            phase_rad: 0.0,
            snr_db: 40.0,
        };
        let level_dbfs = -12.0 + 10.0 * 1.1f64.log10();
        let mut reading = Reading { partials: vec![partial], level_dbfs, ..Reading::default() };
        let hnr = of(&reading).hnr_db.unwrap();
        assert!((hnr - 10.0).abs() < 1e-6, "{hnr}");
        reading.level_dbfs = -12.5;
        assert_eq!(of(&reading).hnr_db.map(f64::round), Some(25.0), "no less can be told");
    }
}
