//! Writing to the terminal. A reader that has gone away (a closed pipe) is no failure.

use std::io::{IsTerminal, Write, stderr, stdout};

/// Write to standard output.
pub fn print(text: &str) {
    // Nobody is left to be told when this fails.
    let _ = stdout().write_all(text.as_bytes());
    let _ = stdout().flush();
}

/// Write a line to standard error.
pub fn remark(text: &str) {
    let _ = writeln!(stderr(), "{text}");
}

/// Write an error to standard error.
pub fn complain(text: &str) {
    remark(&format!("facula: {text}"));
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
