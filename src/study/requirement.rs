//! Is the requirement met, and by what share of the trials?

use crate::figures::Figures;
use crate::scenario::{Bound, Comparison, Figure, Requirement, Statistic};
use crate::trials::Trial;
use crate::trials::statistics::clopper_pearson;

/// Bounds compare with this relative slack.
const SLACK: f64 = 1e-9;

/// The verdict on a requirement.
#[derive(Debug, Clone, PartialEq)]
pub struct Verdict {
    /// Share of trials that meet every bound; `None` unless the bounds apply to trials.
    pub met_share: Option<f64>,
    /// Its 95 % Clopper–Pearson interval.
    pub interval: Option<(f64, f64)>,
    /// Whether the requirement is met; `None` without bounds.
    pub met: Option<bool>,
    /// Every bound on its own.
    pub bounds: Vec<BoundVerdict>,
}

/// The verdict on one bound.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct BoundVerdict {
    /// The bound.
    pub bound: Bound,
    /// Share of trials that meet it.
    pub met_share: f64,
    /// The value judged, where the bounds apply to a mean or the long exposure.
    pub judged: Option<f64>,
    /// Whether it is met on its own.
    pub met: bool,
}

/// Whether a value meets a bound; an undefined one never does.
pub fn meets(bound: &Bound, value: Option<f64>) -> bool {
    let slack = SLACK * bound.value.abs();
    value.is_some_and(|value| match bound.comparison {
        Comparison::AtLeast => value >= bound.value - slack,
        Comparison::AtMost => value <= bound.value + slack,
    })
}

/// Judge trials, their means and the long exposure by a requirement.
pub fn judge(
    requirement: &Requirement,
    trials: &[Trial],
    mean: impl Fn(Figure) -> Option<f64>,
    long_exposure: &Figures,
) -> Verdict {
    let share = |count: usize| count as f64 / trials.len() as f64;
    let enough = |share: f64| share >= requirement.confidence * (1.0 - SLACK);
    let bounds: Vec<BoundVerdict> = requirement
        .bounds
        .iter()
        .map(|&bound| {
            let met_share = share(
                trials
                    .iter()
                    .filter(|trial| meets(&bound, trial.figures.get(bound.figure)))
                    .count(),
            );
            let judged = match requirement.statistic {
                Statistic::Trials => None,
                Statistic::Mean => mean(bound.figure),
                Statistic::LongExposure => long_exposure.get(bound.figure),
            };
            let met = match requirement.statistic {
                Statistic::Trials => enough(met_share),
                Statistic::Mean | Statistic::LongExposure => meets(&bound, judged),
            };
            BoundVerdict {
                bound,
                met_share,
                judged,
                met,
            }
        })
        .collect();
    if bounds.is_empty() {
        return Verdict {
            met_share: None,
            interval: None,
            met: None,
            bounds,
        };
    }
    if requirement.statistic != Statistic::Trials {
        return Verdict {
            met_share: None,
            interval: None,
            met: Some(bounds.iter().all(|each| each.met)),
            bounds,
        };
    }
    let all = trials
        .iter()
        .filter(|trial| {
            requirement
                .bounds
                .iter()
                .all(|bound| meets(bound, trial.figures.get(bound.figure)))
        })
        .count();
    Verdict {
        met_share: Some(share(all)),
        interval: Some(clopper_pearson(all as u64, trials.len() as u64)),
        met: Some(enough(share(all))),
        bounds,
    }
}
