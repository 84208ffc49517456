//! Round numbers on an axis: steps of 1, 2 or 5 times a power of ten.

use crate::report::units::fixed;

/// Numbers to mark on an axis, ascending.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Ticks {
    pub values: Vec<f64>,
    decimals: usize,
}

impl Ticks {
    /// At most `most` round numbers between `low` and `high`; none when there is no interval.
    pub fn between(low: f64, high: f64, most: usize) -> Ticks {
        let none = Ticks {
            values: Vec::new(),
            decimals: 0,
        };
        let span = high - low;
        if !(span.is_finite() && span > 0.0) || most == 0 {
            return none;
        }
        let power = (span / most as f64).log10().floor();
        let steps = [1.0, 2.0, 5.0, 10.0, 20.0, 50.0];
        for (multiple, beyond) in steps.into_iter().zip([0, 0, 0, 1, 1, 1]) {
            let step = multiple * 10f64.powf(power);
            // The slack keeps a tick on an end of the axis that rounding moved.
            let first = (low / step - 1e-9).ceil();
            let last = (high / step + 1e-9).floor();
            let count = last - first + 1.0;
            if !(count.is_finite() && step > 0.0) || first.abs() > 1e9 {
                return none;
            }
            if count <= most as f64 {
                return Ticks {
                    values: (0..count.max(0.0) as usize)
                        .map(|index| (first + index as f64) * step)
                        .collect(),
                    decimals: (-(power as i32) - beyond).max(0) as usize,
                };
            }
        }
        none
    }

    /// The text of a tick, all with the same decimals.
    pub fn label(&self, value: f64) -> String {
        fixed(value, self.decimals.min(12))
    }
}

/// The smallest round number (1, 1.5, 2, 2.5, 3, 4, 5, 6, 8 times a power of ten) not below `value`.
pub(super) fn rounded_up(value: f64) -> f64 {
    if !(value.is_finite() && value > 0.0) {
        return 1.0;
    }
    let power = 10f64.powf(value.log10().floor());
    [1.0, 1.5, 2.0, 2.5, 3.0, 4.0, 5.0, 6.0, 8.0, 10.0]
        .into_iter()
        .map(|multiple| multiple * power)
        .find(|round| *round >= value * (1.0 - 1e-9))
        .unwrap_or(value)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn labels(low: f64, high: f64, most: usize) -> Vec<String> {
        let ticks = Ticks::between(low, high, most);
        ticks
            .values
            .iter()
            .map(|value| ticks.label(*value))
            .collect()
    }

    #[test]
    fn ticks_are_round_and_few() {
        assert_eq!(labels(-1.3, 1.3, 5), ["−1.0", "−0.5", "0.0", "0.5", "1.0"]);
        assert_eq!(labels(-43.0, 43.0, 5), ["−40", "−20", "0", "20", "40"]);
        assert_eq!(
            labels(0.0, 1.0, 6),
            ["0.0", "0.2", "0.4", "0.6", "0.8", "1.0"]
        );
        assert_eq!(
            labels(0.831, 0.8394, 5),
            ["0.832", "0.834", "0.836", "0.838"]
        );
        assert_eq!(labels(-40.0, 0.0, 5), ["−40", "−30", "−20", "−10", "0"]);
        assert_eq!(labels(0.0, 7.0, 4), ["0", "2", "4", "6"]);
    }

    #[test]
    fn no_interval_has_no_ticks() {
        for (low, high) in [
            (1.0, 1.0),
            (0.0, f64::NAN),
            (2.0, 1.0),
            (0.0, f64::INFINITY),
            (1e20, 1.000_000_000_000_1e20),
        ] {
            assert!(Ticks::between(low, high, 5).values.is_empty());
        }
    }

    #[test]
    fn ends_are_rounded_up() {
        for (value, expected) in [
            (0.27, 0.3),
            (1.0, 1.0),
            (8.1, 10.0),
            (0.0, 1.0),
            (0.000_13, 0.000_15),
        ] {
            assert!((rounded_up(value) - expected).abs() < 1e-12);
        }
    }
}
