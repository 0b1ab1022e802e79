//! Frequencies as the three bytes of the MIDI Tuning Standard.
//!
//! MIDI 1.0 Detailed Specification, "MIDI Tuning", frequency data: the first byte is the equal-tempered semitone at
//! A4 = 440 Hz, the other two (7 bits each, high one first) the fraction of a semitone above it in steps of 100/16384
//! cents. `7F 7F 7F` is reserved for "no change". The formula counts, not the specification's own table of examples,
//! which is wrong in places.

use crate::convert::nearest_index;

use super::{A4, STANDARD_PITCH_HZ, cents, ratio};

/// Steps in a semitone.
const STEPS: f64 = 16384.0;
/// The reserved code, as a number.
const RESERVED: usize = 0x1F_FFFF;

/// The three bytes nearest to a frequency in Hz. `None` outside 8.1758 (`00 00 00`) to 13 289.66 Hz (`7F 7F 7E`), or for
/// what is no frequency.
#[must_use]
pub fn encode(frequency_hz: f64) -> Option<[u8; 3]> {
    let steps = STEPS * (A4 + cents(frequency_hz / STANDARD_PITCH_HZ) / 100.0);
    if !(steps >= -0.5) {
        return None;
    }
    let code = nearest_index(steps);
    (code < RESERVED).then(|| [14, 7, 0].map(|shift| seven_bits(code >> shift)))
}

/// The frequency in Hz of three bytes. `None` for the reserved code and for bytes above `7F`.
#[must_use]
pub fn decode(bytes: [u8; 3]) -> Option<f64> {
    if bytes.iter().any(|&byte| byte > 0x7F) {
        return None;
    }
    let code = bytes.iter().fold(0, |code, &byte| code << 7 | usize::from(byte));
    let semitones = code as f64 / STEPS - A4;
    (code != RESERVED).then(|| STANDARD_PITCH_HZ * ratio(100.0 * semitones))
}

/// The lowest seven bits.
fn seven_bits(code: usize) -> u8 {
    (code & 0x7F).to_le_bytes()[0]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_code_reads_back() {
        for code in (0..RESERVED).step_by(997).chain([RESERVED - 1]) {
            let bytes = [14, 7, 0].map(|shift| seven_bits(code >> shift));
            let frequency = decode(bytes).unwrap();
            assert_eq!(encode(frequency), Some(bytes), "{code:#x} {frequency}");
        }
    }

    #[test]
    fn what_has_no_code_is_refused() {
        for frequency in [f64::NAN, 0.0, -440.0, 8.17, 13289.70, f64::INFINITY] {
            assert_eq!(encode(frequency), None, "{frequency}");
        }
        for bytes in [[0x7F; 3], [0x80, 0, 0], [0, 0x80, 0], [0, 0, 0xFF]] {
            assert_eq!(decode(bytes), None, "{bytes:?}");
        }
    }
}
