//! Axes: values to picture units, and ticks at round values.

/// A linear axis.
#[derive(Debug, Clone, Copy)]
pub(super) struct Axis {
    /// Values at its two ends.
    pub(super) values: (f64, f64),
    /// Picture units at its two ends.
    pub(super) units: (f64, f64),
}

impl Axis {
    pub(super) fn at(&self, value: f64) -> f64 {
        let share = (value - self.values.0) / (self.values.1 - self.values.0);
        self.units.0 + share * (self.units.1 - self.units.0)
    }

    /// Like [`at`](Self::at), but never beyond the ends.
    pub(super) fn within(&self, value: f64) -> f64 {
        let (low, high) = (self.values.0.min(self.values.1), self.values.0.max(self.values.1));
        self.at(value.clamp(low, high))
    }

    /// Where a value lies between the ends, 0 to 1.
    pub(super) fn share(&self, value: f64) -> f64 {
        ((value - self.values.0) / (self.values.1 - self.values.0)).clamp(0.0, 1.0)
    }

    /// Multiples of 1, 2 or 5 times a power of ten within the axis, at most about `most`.
    pub(super) fn ticks(&self, most: u32) -> Vec<f64> {
        let (low, high) = (self.values.0.min(self.values.1), self.values.0.max(self.values.1));
        let least = (high - low) / f64::from(most);
        if !(least > 0.0 && least.is_finite()) {
            return Vec::new();
        }
        let decade = 10_f64.powf(least.log10().floor());
        let step =
            [1.0, 2.0, 5.0].map(|factor| factor * decade).into_iter().find(|&step| step >= least);
        let step = step.unwrap_or(10.0 * decade);
        let mut ticks = Vec::new();
        let mut count = (low / step).ceil();
        while count * step <= high {
            ticks.push(count * step);
            count += 1.0;
        }
        ticks
    }
}

/// Decimals that tell ticks apart.
pub(super) fn tick_decimals(ticks: &[f64]) -> usize {
    let step = match ticks {
        [first, second, ..] => second - first,
        _ => 1.0,
    };
    (0..6).find(|&decimals| step >= 0.999 * 10_f64.powi(-decimals)).map_or(6, i32::unsigned_abs)
        as usize
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_few() {
        for (values, most, expected) in [
            ((-60.0, 70.0), 6, vec![-50.0, 0.0, 50.0]),
            ((0.0, 4.0), 8, vec![0.0, 0.5, 1.0, 1.5, 2.0, 2.5, 3.0, 3.5, 4.0]),
            ((-10.0, -95.0), 5, vec![-80.0, -60.0, -40.0, -20.0]),
            ((1.0, 1.0), 5, vec![]),
            ((0.0, f64::NAN), 5, vec![]),
        ] {
            let axis = Axis { values, units: (0.0, 1.0) };
            assert_eq!(axis.ticks(most), expected, "{values:?}");
        }
        assert_eq!(tick_decimals(&[0.0, 0.5]), 1, "halves");
        assert_eq!(tick_decimals(&[0.0, 20.0]), 0, "twenties");
        assert_eq!(tick_decimals(&[0.0, 0.02]), 2, "fiftieths");
    }
}
