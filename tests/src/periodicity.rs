//! How well a sound repeats with a given period: the plain definition, as a reference.

/// Half width of the search about the stated period, and its step, in cents.
const SEARCH_CENTS: (i32, usize) = (36, 3);
/// Fewest samples that are compared, and fewest periods.
const COMPARED: (f64, f64) = (4096.0, 4.0);

/// Highest normalised correlation of the sound's start with itself, a period later, within 36 cents of `period` samples:
/// 1 for an exact repetition; 0 for a sound shorter than two periods.
#[must_use]
pub fn periodicity(sound: &[f32], period: f64) -> f64 {
    (-SEARCH_CENTS.0..=SEARCH_CENTS.0)
        .step_by(SEARCH_CENTS.1)
        .map(|cents| correlation(sound, period * 2.0_f64.powf(f64::from(cents) / 1200.0)))
        .fold(0.0, f64::max)
}

fn correlation(sound: &[f32], lag: f64) -> f64 {
    let whole = crate::cast::index(lag.floor());
    let part = lag - lag.floor();
    let longest = sound.len().saturating_sub(whole + 3);
    let count = longest.min(crate::cast::index(COMPARED.0.max(COMPARED.1 * lag)));
    if (count as f64) < lag {
        return 0.0;
    }
    let (mut ab, mut aa, mut bb) = (0.0, 0.0, 0.0);
    for n in 1..=count {
        let a = f64::from(sound[n]);
        let b = between(&sound[n + whole - 1..], part);
        ab += a * b;
        aa += a * a;
        bb += b * b;
    }
    if aa > 0.0 && bb > 0.0 { ab / (aa * bb).sqrt() } else { 0.0 }
}

/// Value at `1 + part` by cubic interpolation through the first four samples (Catmull and Rom 1974).
fn between(sound: &[f32], part: f64) -> f64 {
    let y: [f64; 4] = core::array::from_fn(|i| f64::from(sound[i]));
    let c1 = 0.5 * (y[2] - y[0]);
    let c2 = y[0] - 2.5 * y[1] + 2.0 * y[2] - 0.5 * y[3];
    let c3 = 0.5 * (y[3] - y[0]) + 1.5 * (y[1] - y[2]);
    ((c3 * part + c2) * part + c1) * part + y[1]
}
