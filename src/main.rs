//! The command-line tool: what a user types → a study → a folder and an answer.

mod cli;

use std::process::ExitCode;

fn main() -> ExitCode {
    cli::run()
}
