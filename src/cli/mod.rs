//! What the user types: options in, exit status out.

mod assess;
mod check;
mod folder;
mod interrupt;
mod options;
mod progress;
mod terminal;

use clap::Parser;
use facula::error::ScenarioError;
use options::{Command, Options};
use std::process::ExitCode;

/// Failed while running.
const FAILED: u8 = 1;
/// Wrong usage or wrong scenario.
const WRONG_INPUT: u8 = 2;
/// With `--gate`: the requirement is not met.
const NOT_MET: u8 = 3;

/// Why a command stopped.
enum Stop {
    /// The scenario or an option cannot be used.
    Input(ScenarioError),
    /// The machine did not do as asked: disk, memory, permissions.
    Running(anyhow::Error),
    /// The requirement is not met, and `--gate` asks to fail then.
    Gate,
}

impl From<ScenarioError> for Stop {
    fn from(error: ScenarioError) -> Stop {
        Stop::Input(error)
    }
}

impl From<anyhow::Error> for Stop {
    fn from(error: anyhow::Error) -> Stop {
        Stop::Running(error)
    }
}

/// Parse the command line, run, and say how it went.
pub fn run() -> ExitCode {
    let options = Options::parse();
    let done = match options.command {
        Command::Assess(options) => assess::run(&options),
        Command::Check(options) => check::run(&options),
        Command::Starter => terminal::print(facula::scenario::STARTER).map_err(Stop::from),
    };
    let status = match done {
        Ok(()) => return ExitCode::SUCCESS,
        Err(Stop::Input(error)) => {
            terminal::complain(&error.to_string());
            WRONG_INPUT
        }
        Err(Stop::Running(error)) => {
            terminal::complain(&format!("{error:#}"));
            FAILED
        }
        Err(Stop::Gate) => NOT_MET,
    };
    ExitCode::from(status)
}
