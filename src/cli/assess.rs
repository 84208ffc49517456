//! `facula assess`.

use super::folder::Folder;
use super::options::StudyOptions;
use super::progress::Bar;
use super::{Stop, interrupt, terminal};
use facula::error::ScenarioError;
use facula::report::console;
use facula::report::files::{self, File};
use facula::report::summary::{RunInfo, of_assess};
use facula::scenario::{Layout, Scenario};
use facula::study::assess::assess;
use facula::study::setup::Setup;
use facula::trials::Progress;
use std::path::{Path, PathBuf};
use std::time::Instant;

/// Run the study, write its folder, print its answer.
pub fn run(options: &StudyOptions) -> Result<(), Stop> {
    let start = Instant::now();
    let scenario = options.scenario.read()?;
    if options.scenario.scenario.is_none() {
        terminal::remark("No scenario given: running the built-in demo (crater_relay.toml).");
    }
    let table = carry_table(&scenario)?;
    let pool = options.scenario.pool()?;
    let bar = Bar::new(options.quiet);
    bar.stage("array without errors", 1);
    let setup = pool.install(|| Setup::new(scenario))?;
    interrupt::watch();
    let target = options.out.clone().unwrap_or_else(|| {
        let stem = options.scenario.stem();
        Path::new("outputs").join(stem).join("assess")
    });
    // The folder comes before the long run: a bad path fails at once.
    let folder = Folder::begin(&target)?;
    let outcome = pool.install(|| assess(setup, &bar));
    bar.stage("pictures and files", 1);
    let pictures = pool.install(|| files::pictures(&outcome));
    let mut run = RunInfo {
        command_line: options.scenario.command_line("assess"),
        timing: Vec::new(),
    };
    let tables = files::tables(&outcome).map_err(anyhow::Error::from)?;
    for (name, bytes) in tables.iter().chain(&pictures).chain(&table) {
        folder.write(name, bytes)?;
    }
    run.timing = bar.finish();
    run.timing
        .push(("threads".to_string(), pool.current_num_threads() as f64));
    run.timing
        .push(("total_s".to_string(), start.elapsed().as_secs_f64()));
    let summary = format!("{:#}\n", of_assess(&outcome, &run));
    folder.write("summary.json", summary.as_bytes())?;
    folder.finish()?;

    if options.scenario.json {
        terminal::print(&summary)?;
    } else {
        let met = outcome.verdict.met != Some(false);
        let answer = console::answer(&outcome);
        let text = if options.quiet {
            answer.clone() + "\n"
        } else {
            console::of_assess(&outcome) + &format!("Results: {}\n", target.display())
        };
        for line in text.lines() {
            // The answer may be wrapped: each of its lines is part of it.
            let is_answer = console::wrap(&answer).iter().any(|part| part == line);
            let line = if is_answer {
                terminal::coloured(line, met)
            } else {
                line.to_string()
            };
            terminal::print(&(line + "\n"))?;
        }
    }
    if options.gate && outcome.verdict.met == Some(false) {
        return Err(Stop::Gate);
    }
    Ok(())
}

/// The table that a scenario names, to be copied beside the results; the copy's name is its bare file name.
fn carry_table(scenario: &Scenario) -> Result<Option<File>, ScenarioError> {
    let Layout::Table { file } = &scenario.array.layout else {
        return Ok(None);
    };
    let name = file.file_name().unwrap_or_default().to_string_lossy();
    if files::NAMES.contains(&name.as_ref()) {
        return Err(scenario.error(
            "array.table",
            format!("found \"{name}\", which is also the name of a result"),
            "the table is copied beside the results: rename it",
        ));
    }
    let path: PathBuf = scenario.source.folder.join(file);
    // A table that cannot be read is reported when the array is laid out.
    Ok(std::fs::read(path)
        .ok()
        .map(|bytes| (name.into_owned(), bytes)))
}
