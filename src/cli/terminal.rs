//! Writing to the terminal. A reader that has gone away (a closed pipe) is no failure.

use anyhow::{Context, Result};
use std::io::{ErrorKind, IsTerminal, Write, stderr, stdout};

/// Write to standard output.
pub fn print(text: &str) -> Result<()> {
    let written = stdout()
        .write_all(text.as_bytes())
        .and_then(|()| stdout().flush());
    match written {
        Err(error) if error.kind() != ErrorKind::BrokenPipe => {
            Err(error).context("standard output cannot be written")
        }
        _ => Ok(()),
    }
}

/// Write a line to standard error.
pub fn remark(text: &str) {
    let _ = writeln!(stderr(), "{text}");
}

/// Write an error to standard error: one line, whatever was typed.
pub fn complain(text: &str) {
    let line: String = text
        .chars()
        .take(2000)
        .map(|letter| if letter.is_control() { ' ' } else { letter })
        .collect();
    remark(&format!("facula: {line}"));
}

/// A line for standard output in bold green or red where it shows colour:
/// a terminal, and `NO_COLOR` unset (no-color.org).
pub fn coloured(line: &str, good: bool) -> String {
    let wanted = std::env::var_os("NO_COLOR").is_none_or(|value| value.is_empty());
    if wanted && stdout().is_terminal() {
        let colour = if good { 32 } else { 31 };
        format!("\x1b[1;{colour}m{line}\x1b[0m")
    } else {
        line.to_string()
    }
}
