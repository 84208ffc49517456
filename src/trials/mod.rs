//! Monte Carlo: trial after trial through far field and figures.
//!
//! Trials run in parallel in batches of a fixed size. Each batch adds up its own maps
//! in trial order, and batches are added in batch order, so the sums are the same to
//! the last bit however many threads there are.

pub mod statistics;

use crate::farfield::{FarField, Map};
use crate::figures::{Figures, Reader};
use crate::perturb::TrialErrors;
use crate::scenario::Errors;
use std::collections::BTreeMap;
use std::sync::Mutex;
use std::sync::atomic::{AtomicU64, Ordering};

/// Trials in a batch. Part of the reproducibility promise: other sizes round otherwise.
const BATCH: u64 = 8;

/// Told how a long computation gets on; the library itself prints nothing.
pub trait Progress: Sync {
    /// A stage begins that will advance by `steps` in all.
    fn stage(&self, name: &str, steps: u64);
    /// So many more steps are done.
    fn advance(&self, steps: u64);
}

/// What repeats a trial.
#[derive(Clone, Copy)]
pub struct Machine<'a> {
    /// The errors.
    pub errors: &'a Errors,
    /// Seed of every stream.
    pub seed: u64,
    /// The far field, made ready.
    pub far_field: &'a dyn FarField,
    /// The figures, with their reference set.
    pub reader: &'a Reader,
}

impl std::fmt::Debug for Machine<'_> {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Machine")
            .field("seed", &self.seed)
            .finish_non_exhaustive()
    }
}

/// One trial's result.
#[derive(Debug, Clone, PartialEq)]
pub struct Trial {
    /// Its number, from 0.
    pub trial: u64,
    /// Elements that radiate nothing.
    pub dark: usize,
    /// Elements at a random phase.
    pub unlocked: usize,
    /// Its figures.
    pub figures: Figures,
    /// Share of its power within each radius of the reader.
    pub encircled: Vec<f32>,
}

/// All trials, in order, and the mean over them.
#[derive(Debug, Clone, PartialEq)]
pub struct Trials {
    /// Every trial.
    pub trials: Vec<Trial>,
    /// Mean irradiance over the trials: the long exposure.
    pub mean_map: Map,
    /// Mean radiated power.
    pub mean_power_w: f64,
}

/// Run trials 0 to `count`, on at most `workers` threads of the current pool.
pub fn run(machine: Machine<'_>, count: u64, workers: usize, progress: &dyn Progress) -> Trials {
    let gathered = Mutex::new(Gathered {
        batches: BTreeMap::new(),
        next: 0,
        trials: Vec::new(),
        sum: Map::dark(machine.far_field.grid()),
    });
    let next = AtomicU64::new(0);
    let batches = count.div_ceil(BATCH);
    rayon::broadcast(|context| {
        if context.index() >= workers.max(1) {
            // This thread is free to help inside the transforms of the others.
            return;
        }
        let mut worker = machine.far_field.worker();
        let mut workspace = machine.reader.workspace();
        let mut map = Map::dark(machine.far_field.grid());
        loop {
            let number = next.fetch_add(1, Ordering::Relaxed);
            if number >= batches {
                return;
            }
            let mut batch = Batch {
                trials: Vec::new(),
                sum: Map::dark(machine.far_field.grid()),
            };
            for trial in number * BATCH..((number + 1) * BATCH).min(count) {
                let errors = TrialErrors {
                    errors: machine.errors,
                    seed: machine.seed,
                    trial,
                };
                let radiated = worker.irradiance(errors, &mut map);
                let reading = machine.reader.read(&map, radiated.power_w, &mut workspace);
                add(&mut batch.sum, &map);
                batch.trials.push(Trial {
                    trial,
                    dark: radiated.dark,
                    unlocked: radiated.unlocked,
                    figures: reading.figures,
                    encircled: reading
                        .encircled
                        .iter()
                        .map(|&share| share as f32)
                        .collect(),
                });
                progress.advance(1);
            }
            gathered
                .lock()
                .unwrap_or_else(std::sync::PoisonError::into_inner)
                .take(number, batch);
        }
    });
    let gathered = gathered
        .into_inner()
        .unwrap_or_else(std::sync::PoisonError::into_inner);
    let mut mean_map = gathered.sum;
    for value in &mut mean_map.irradiance_w_m2 {
        *value /= count as f64;
    }
    let radiated = gathered
        .trials
        .iter()
        .filter_map(|trial| trial.figures.get(crate::scenario::Figure::RadiatedPower));
    Trials {
        mean_power_w: radiated.sum::<f64>() / count as f64,
        trials: gathered.trials,
        mean_map,
    }
}

/// Trials of one batch, and the sum of their maps.
struct Batch {
    trials: Vec<Trial>,
    sum: Map,
}

/// Batches, added up in their order whatever order they arrive in.
struct Gathered {
    batches: BTreeMap<u64, Batch>,
    next: u64,
    trials: Vec<Trial>,
    sum: Map,
}

impl Gathered {
    fn take(&mut self, number: u64, batch: Batch) {
        self.batches.insert(number, batch);
        while let Some(batch) = self.batches.remove(&self.next) {
            add(&mut self.sum, &batch.sum);
            self.trials.extend(batch.trials);
            self.next += 1;
        }
    }
}

fn add(sum: &mut Map, map: &Map) {
    for (sum, value) in sum.irradiance_w_m2.iter_mut().zip(&map.irradiance_w_m2) {
        *sum += value;
    }
}
