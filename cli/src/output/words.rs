//! How figures are put in words for reading, in tables and pictures alike.

use super::records::NoteRecord;
use crate::convert::decimals_for;
use plumbtone_analysis::StrayKind;

/// What stands where nothing was measured.
pub(crate) const UNMEASURED: &str = "–";
/// The minus sign, as wide as the plus.
const MINUS: &str = "−";

/// A figure with its deviation, both to the deviation's second digit but at most `most` decimals.
pub(crate) fn with_deviation(
    value: Option<f64>,
    deviation: Option<f64>,
    most: usize,
    sign: bool,
) -> String {
    let Some(value) = value else { return UNMEASURED.to_owned() };
    match deviation {
        Some(deviation) => {
            let decimals = decimals_for(deviation, most);
            let shown = format!("{deviation:.decimals$}");
            // Too small for these decimals is still not nothing.
            let shown =
                if is_zero(&shown) && deviation > 0.0 { format!("{deviation:.0e}") } else { shown };
            format!("{} ± {shown}", fixed(value, decimals, sign))
        }
        None => fixed(value, most, sign),
    }
}

/// A figure with so many decimals, or the sign for none.
pub(crate) fn plain(value: Option<f64>, decimals: usize) -> String {
    value.map_or_else(|| UNMEASURED.to_owned(), |value| fixed(value, decimals, false))
}

/// A figure with so many decimals and always a sign, or the sign for none.
pub(crate) fn signed(value: Option<f64>, decimals: usize) -> String {
    value.map_or_else(|| UNMEASURED.to_owned(), |value| fixed(value, decimals, true))
}

/// A figure in words, followed by its unit if there is a figure.
pub(crate) fn with_unit(figure: &str, unit: &str) -> String {
    if figure == UNMEASURED { figure.to_owned() } else { format!("{figure} {unit}") }
}

/// Inharmonicity with its deviation under one power of ten.
pub(crate) fn inharmonicity(note: &NoteRecord) -> String {
    let Some(b) = note.inharmonicity_b else { return UNMEASURED.to_owned() };
    let sd = note.inharmonicity_sd.unwrap_or(0.0);
    let largest = b.abs().max(sd);
    if largest == 0.0 {
        return "0".to_owned();
    }
    let exponent = largest.log10().floor();
    let scale = 10_f64.powf(exponent);
    let decimals = decimals_for(sd / scale, 4);
    let value = fixed(b / scale, decimals, false);
    format!("{value}e{exponent} ± {:.decimals$}e{exponent}", sd / scale)
}

/// The deviation of f0 in Hz: small, so the slope of the cents at f0 will do.
pub(crate) fn deviation_hz(note: &NoteRecord) -> Option<f64> {
    Some(note.f0_hz? * note.f0_sd_cents? * std::f64::consts::LN_2 / 1200.0)
}

/// Why a stray is there.
pub(crate) fn explanation(kind: StrayKind) -> String {
    match kind {
        StrayKind::Alias { partial, .. } => format!("alias of partial {partial}"),
        StrayKind::Mains { base_hz, multiple: 1 } => format!("mains {base_hz} Hz"),
        StrayKind::Mains { base_hz, multiple } => format!("mains {multiple} × {base_hz} Hz"),
        StrayKind::Unexplained => "unexplained".to_owned(),
    }
}

fn fixed(value: f64, decimals: usize, sign: bool) -> String {
    let digits = format!("{:.decimals$}", value.abs());
    match (is_zero(&digits), value < 0.0, sign) {
        (false, true, _) => format!("{MINUS}{digits}"),
        (false, false, true) => format!("+{digits}"),
        _ => digits,
    }
}

fn is_zero(digits: &str) -> bool {
    digits.bytes().all(|digit| matches!(digit, b'0' | b'.'))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn figures_go_to_the_second_digit_of_their_deviation() {
        for (value, deviation, most, sign, text) in [
            (220.23456, 0.00123, 6, false, "220.2346 ± 0.0012"),
            (220.23456, 0.96, 6, false, "220.23 ± 0.96"),
            (220.23456, 12.3, 6, false, "220 ± 12"),
            (-1.25, 0.01, 4, true, "−1.250 ± 0.010"),
            (0.000001, 0.001, 4, true, "0.0000 ± 0.0010"),
            (220.23456, 0.00000371, 4, false, "220.2346 ± 4e-6"),
            (-0.000001, 0.0, 2, true, "0.00 ± 0.00"),
        ] {
            let shown = with_deviation(Some(value), Some(deviation), most, sign);
            assert_eq!(shown, text, "{value} ± {deviation}");
        }
        assert_eq!(with_deviation(None, Some(1.0), 2, false), UNMEASURED, "nothing measured");
    }

    #[test]
    fn strays_are_explained_in_words() {
        for (kind, text) in [
            (StrayKind::Alias { partial: 204, folds: 2 }, "alias of partial 204"),
            (StrayKind::Mains { base_hz: 50.0, multiple: 2 }, "mains 2 × 50 Hz"),
            (StrayKind::Mains { base_hz: 60.0, multiple: 1 }, "mains 60 Hz"),
            (StrayKind::Unexplained, "unexplained"),
        ] {
            assert_eq!(explanation(kind), text, "{kind:?}");
        }
    }
}
