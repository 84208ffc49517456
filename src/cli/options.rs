//! The command line, and the scenario that it names.

use clap::{Args, Parser, Subcommand};
use facula::error::{Place, ScenarioError};
use facula::scenario::{Override, Scenario};
use std::io::Read;
use std::path::{Path, PathBuf};

/// The scenario that runs when none is named.
const DEMO: &str = include_str!("../../configs/crater_relay.toml");
/// Its file name.
const DEMO_FILE: &str = "crater_relay.toml";

/// Predict what a tiled, phase-locked laser array puts on its target.
#[derive(Debug, Parser)]
#[command(name = "facula", version, about, after_help = AFTER)]
pub struct Options {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

const AFTER: &str = "\
First steps:
  facula assess                        run the built-in demo and look at its folder
  facula starter > mine.toml           begin a scenario of your own
  facula check mine.toml               see what follows from it, before any long run
  facula assess mine.toml              will it meet its requirement?
  facula assess mine.toml --set \"errors.piston=30 nm\"

Beams like these blind and burn. facula predicts; it clears no hazard. Defer to the site's
laser safety officer (IEC 60825-1, ANSI Z136 series), to local codes and licensed practice,
and for outdoor beams to the airspace and satellite authorities.";

/// What to do.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Run the trials: Strehl ratio, encircled energy, spot size; is the requirement met?
    Assess(StudyOptions),
    /// Validate a scenario and print what follows from it, without any trial
    Check(ScenarioOptions),
    /// Print a commented scenario to begin from
    Starter,
}

/// Options of every command that reads a scenario.
#[derive(Debug, Args)]
pub struct ScenarioOptions {
    /// Scenario file; `-` reads standard input; without it the built-in demo is taken
    pub scenario: Option<PathBuf>,
    /// Seed of every random stream (run.seed)
    #[arg(long, value_name = "N")]
    pub seed: Option<String>,
    /// Monte Carlo trials (run.trials)
    #[arg(long, value_name = "N")]
    pub trials: Option<String>,
    /// Threads [default: one for each core]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u16).range(1..=1024))]
    pub threads: Option<u16>,
    /// Set a key of the scenario, e.g. --set "errors.piston=40 nm"; may be repeated
    #[arg(long, value_name = "SECTION.KEY=VALUE")]
    pub set: Vec<String>,
    /// Print JSON on standard output and nothing else there
    #[arg(long)]
    pub json: bool,
}

/// Options of a study.
#[derive(Debug, Args)]
pub struct StudyOptions {
    /// Options about the scenario.
    #[command(flatten)]
    pub scenario: ScenarioOptions,
    /// Folder for the results [default: outputs/<scenario>/<command>]
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,
    /// Print the answer only
    #[arg(long)]
    pub quiet: bool,
    /// Exit with status 3 when the requirement is not met
    #[arg(long)]
    pub gate: bool,
}

impl ScenarioOptions {
    /// Read the scenario with every override applied.
    pub fn read(&self) -> Result<Scenario, ScenarioError> {
        let mut overrides = Vec::new();
        for (key, option, value) in [
            ("run.seed", "--seed", &self.seed),
            ("run.trials", "--trials", &self.trials),
        ] {
            if let Some(value) = value {
                overrides.push(Override::parse(
                    &format!("{key}={value}"),
                    &format!("{option} {value}"),
                )?);
            }
        }
        for assignment in &self.set {
            overrides.push(Override::parse(assignment, &format!("--set {assignment}"))?);
        }
        match &self.scenario {
            None => Scenario::from_toml(DEMO, DEMO_FILE, Path::new("."), &overrides),
            Some(path) if path == Path::new("-") => {
                let mut text = String::new();
                std::io::stdin()
                    .read_to_string(&mut text)
                    .map_err(|error| ScenarioError {
                        file: "standard input".to_string(),
                        place: Place::File,
                        key: String::new(),
                        found: format!("cannot be read ({error})"),
                        allowed: "a scenario in UTF-8 text is needed".to_string(),
                        nearest: None,
                    })?;
                Scenario::from_toml(&text, "standard input", Path::new("."), &overrides)
            }
            Some(path) => Scenario::read(path, &overrides),
        }
    }

    /// Name for the results' folder.
    pub fn stem(&self) -> String {
        let path = match &self.scenario {
            None => Path::new(DEMO_FILE),
            Some(path) if path == Path::new("-") => return "stdin".to_string(),
            Some(path) => path,
        };
        path.file_stem().map_or("scenario".to_string(), |stem| {
            stem.to_string_lossy().into_owned()
        })
    }

    /// The command with what changes its numbers, as one would type it.
    pub fn command_line(&self, command: &str) -> String {
        let mut words = vec!["facula".to_string(), command.to_string()];
        words.extend(
            self.scenario
                .iter()
                .map(|path| quoted(&path.to_string_lossy())),
        );
        for (option, value) in [("--seed", &self.seed), ("--trials", &self.trials)] {
            if let Some(value) = value {
                words.extend([option.to_string(), quoted(value)]);
            }
        }
        for assignment in &self.set {
            words.extend(["--set".to_string(), quoted(assignment)]);
        }
        words.join(" ")
    }

    /// A thread pool of the size asked for.
    pub fn pool(&self) -> anyhow::Result<rayon::ThreadPool> {
        let mut builder = rayon::ThreadPoolBuilder::new();
        if let Some(threads) = self.threads {
            builder = builder.num_threads(threads.into());
        }
        Ok(builder.build()?)
    }
}

/// A word as a shell would need it.
fn quoted(word: &str) -> String {
    let plain = |c: char| c.is_ascii_alphanumeric() || "-_./=:,+%".contains(c);
    if !word.is_empty() && word.chars().all(plain) {
        word.to_string()
    } else {
        format!("'{}'", word.replace('\'', r"'\''"))
    }
}
