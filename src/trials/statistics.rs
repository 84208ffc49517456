//! Statistics over trials.

use statrs::distribution::{Beta, ContinuousCDF};

/// Statistics of one figure over trials; a field is `None` where it is undefined.
#[derive(Debug, Clone, Copy, PartialEq, Default, serde::Serialize)]
pub struct Summary {
    /// Mean.
    pub mean: Option<f64>,
    /// Standard deviation, with n − 1.
    pub std: Option<f64>,
    /// Standard error of the mean.
    pub standard_error: Option<f64>,
    /// 5th percentile, linear between order statistics.
    pub p05: Option<f64>,
    /// Median.
    pub p50: Option<f64>,
    /// 95th percentile.
    pub p95: Option<f64>,
    /// Smallest.
    pub min: Option<f64>,
    /// Largest.
    pub max: Option<f64>,
    /// Trials in which the figure is defined.
    pub count: usize,
}

/// What an undefined value means.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Undefined {
    /// Nothing: it is left out.
    LeftOut,
    /// A value larger than any other, such as a circle larger than the window.
    Largest,
}

impl Summary {
    /// Statistics of the values of one figure, a trial each.
    pub fn of(values: &[Option<f64>], undefined: Undefined) -> Summary {
        let mut defined: Vec<f64> = values.iter().copied().flatten().collect();
        let count = defined.len();
        let complete = count == values.len() || undefined == Undefined::LeftOut;
        if undefined == Undefined::Largest {
            defined.resize(values.len(), f64::INFINITY);
        }
        defined.sort_by(f64::total_cmp);
        let finite = |value: f64| Some(value).filter(|value| value.is_finite());
        let percentile = |share| quantile(&defined, share).and_then(finite);
        let mut summary = Summary {
            p05: percentile(0.05),
            p50: percentile(0.50),
            p95: percentile(0.95),
            min: defined.first().copied().and_then(finite),
            max: defined.last().copied().and_then(finite),
            count,
            ..Summary::default()
        };
        if complete && count > 0 {
            let n = count as f64;
            // Deviations from a value in the middle: no digits are lost to a large mean.
            let pivot = defined[count / 2];
            let mean = pivot + defined.iter().map(|value| value - pivot).sum::<f64>() / n;
            summary.mean = Some(mean);
            if count > 1 {
                let squares: f64 = defined.iter().map(|value| (value - mean).powi(2)).sum();
                let std = (squares / (n - 1.0)).sqrt();
                summary.std = Some(std);
                summary.standard_error = Some(std / n.sqrt());
            }
        }
        summary
    }
}

/// Quantile of ascending values, linear between order statistics; `None` of nothing.
pub fn quantile(ascending: &[f64], share: f64) -> Option<f64> {
    let last = ascending.len().checked_sub(1)?;
    let place = share * last as f64;
    let below = place.floor() as usize;
    let (low, high) = (ascending[below], ascending[(below + 1).min(last)]);
    let way = place - below as f64;
    // Guarded, since 0 × ∞ would be undefined.
    Some(if way > 0.0 {
        low + way * (high - low)
    } else {
        low
    })
}

/// 95 % Clopper–Pearson interval of a share of which `met` in `trials` were seen
/// (Clopper & Pearson, Biometrika 26, 404 (1934)).
pub fn clopper_pearson(met: u64, trials: u64) -> (f64, f64) {
    let (k, n) = (met as f64, trials as f64);
    let beta = |a: f64, b: f64, share: f64| {
        Beta::new(a, b).map_or(f64::NAN, |distribution| distribution.inverse_cdf(share))
    };
    let low = if met == 0 {
        0.0
    } else {
        beta(k, n - k + 1.0, 0.025)
    };
    let high = if met == trials {
        1.0
    } else {
        beta(k + 1.0, n - k, 0.975)
    };
    (low, high)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percentiles_are_linear_between_order_statistics() {
        let values: Vec<Option<f64>> = (1..=5).map(|value| Some(f64::from(value))).collect();
        let summary = Summary::of(&values, Undefined::LeftOut);
        assert_eq!(summary.p05, Some(1.2));
        assert_eq!(summary.p50, Some(3.0));
        assert!((summary.std.unwrap_or(0.0) - 2.5f64.sqrt()).abs() < 1e-15);
    }

    #[test]
    fn a_circle_beyond_the_window_is_larger_than_any_other_and_has_no_mean() {
        let values = [Some(1.0), None, Some(2.0), Some(3.0)];
        let summary = Summary::of(&values, Undefined::Largest);
        assert_eq!((summary.mean, summary.max, summary.p95), (None, None, None));
        assert_eq!((summary.p50, summary.count), (Some(2.5), 3));
        let left_out = Summary::of(&values, Undefined::LeftOut);
        assert_eq!(left_out.mean, Some(2.0));
    }

    /// NIST/SEMATECH e-Handbook, section 7.2.4.1 states the equations that the limits
    /// solve; here they are put back into the binomial sum, for 4 in 20.
    #[test]
    fn clopper_pearson_limits_leave_two_and_a_half_per_cent_in_each_tail() {
        let (low, high) = clopper_pearson(4, 20);
        let term = |k: i32, p: f64| {
            let choose = (0..k).fold(1.0, |c, i| c * f64::from(20 - i) / f64::from(i + 1));
            choose * p.powi(k) * (1.0 - p).powi(20 - k)
        };
        let at_least_4: f64 = (4..=20).map(|k| term(k, low)).sum();
        let at_most_4: f64 = (0..=4).map(|k| term(k, high)).sum();
        assert!((at_least_4 - 0.025).abs() < 1e-9, "{at_least_4}");
        assert!((at_most_4 - 0.025).abs() < 1e-9, "{at_most_4}");
        assert!(clopper_pearson(0, 20).0.abs() < 1e-12);
        assert!((clopper_pearson(20, 20).1 - 1.0).abs() < 1e-12);
    }
}
