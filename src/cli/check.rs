//! `facula check`: what follows from a scenario, without any trial.

use super::options::ScenarioOptions;
use super::{Stop, terminal};
use facula::report::{check, summary};
use facula::study::setup::Setup;
use std::time::Instant;

/// Validate and describe.
pub fn run(options: &ScenarioOptions) -> Result<(), Stop> {
    let scenario = options.read()?;
    if options.scenario.is_none() {
        terminal::remark("No scenario given: checking the built-in demo (crater_relay.toml).");
    }
    let pool = options.pool()?;
    let setup = pool.install(|| Setup::new(scenario))?;
    let threads = pool.current_num_threads();
    let pace = pace();
    if options.json {
        let mut facts = summary::array(&setup);
        facts["run"] = check::run_facts(&setup, threads, pace);
        terminal::print(&format!("{facts:#}\n"))?;
    } else {
        terminal::print(&check::describe(&setup, threads, pace))?;
    }
    Ok(())
}

/// Time of this machine over the time of the machine that the cost figures were taken on,
/// from a few milliseconds of arithmetic of the same kind.
fn pace() -> f64 {
    const ROUNDS: usize = 40;
    let mut best = f64::INFINITY;
    for _ in 0..3 {
        let start = Instant::now();
        facula::farfield::choose::reference_work(ROUNDS);
        best = best.min(start.elapsed().as_secs_f64());
    }
    best / (ROUNDS as f64 * facula::farfield::choose::REFERENCE_WORK_S)
}
