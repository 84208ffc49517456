//! A temporary folder with a small scenario in it, and the program run there.

use serde_json::Value;
use std::io::Write;
use std::path::{Path, PathBuf};
use std::process::{Child, Command, Stdio};

/// A scenario that runs in a fraction of a second.
pub const SMALL: &str = r#"title = "Four small squares"

[beam]
wavelength = "1 um"

[array]
layout = "square"
rows = 2
columns = 2

[array.element]
shape = "square"
size = "1 cm"

[target]
range = "1 km"
bucket_diameter = "10 cm"

[errors]
piston = "40 nm"
dropout = 0.1

[require]
strehl = ">= 0.2"
confidence = 0.1

[run]
trials = 12
window = "40 cm"
"#;

/// A table of three elements that goes with [`on_table`].
pub const TABLE: &str = "# surveyed\nx_m,y_m,power\n0,0,1\n0.03,0,2\n0,0.05,1\n";

/// The small scenario, with the elements of `file` instead.
pub fn on_table(file: &str) -> String {
    let layout = format!("layout = \"table\"\ntable = \"{file}\"\n");
    SMALL.replace("layout = \"square\"\nrows = 2\ncolumns = 2\n", &layout)
}

/// How a command ended.
#[derive(Debug)]
pub struct Done {
    pub status: i32,
    pub out: String,
    pub err: String,
}

/// A folder to run in, removed at the end.
pub struct Desk(tempfile::TempDir);

impl Desk {
    /// A folder that holds `small.toml`.
    pub fn new() -> Desk {
        let desk = Desk(tempfile::tempdir().expect("a temporary folder"));
        desk.put("small.toml", SMALL);
        desk
    }

    pub fn at(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    /// Write a file, and the folders above it.
    pub fn put(&self, name: &str, text: &str) {
        let path = self.at(name);
        let parent = path.parent().expect("a parent");
        std::fs::create_dir_all(parent).expect("folders above");
        std::fs::write(path, text).expect("a written file");
    }

    pub fn read(&self, name: &str) -> Vec<u8> {
        std::fs::read(self.at(name)).unwrap_or_else(|error| panic!("{name}: {error}"))
    }

    pub fn text(&self, name: &str) -> String {
        String::from_utf8(self.read(name)).expect("UTF-8")
    }

    pub fn json(&self, name: &str) -> Value {
        serde_json::from_slice(&self.read(name)).expect("JSON")
    }

    /// Start the program here.
    pub fn start(&self, words: &[&str]) -> Child {
        Command::new(env!("CARGO_BIN_EXE_facula"))
            .args(words)
            .current_dir(self.0.path())
            .stdin(Stdio::piped())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .expect("a running program")
    }

    /// Run the program here.
    pub fn facula(&self, words: &[&str]) -> Done {
        self.piped("", words)
    }

    /// Run the program here with `input` on its standard input.
    pub fn piped(&self, input: &str, words: &[&str]) -> Done {
        let mut child = self.start(words);
        let mut stdin = child.stdin.take().expect("a pipe");
        // A command that reads nothing may be gone already.
        let _ = stdin.write_all(input.as_bytes());
        drop(stdin);
        ended(child)
    }

    /// Run the program, which must succeed.
    #[track_caller]
    pub fn good(&self, words: &[&str]) -> Done {
        let done = self.facula(words);
        assert_eq!(done.status, 0, "{words:?}: {done:?}");
        done
    }

    /// Run the program, which must fail with `status` and one line that holds all `parts`.
    #[track_caller]
    pub fn refused(&self, status: i32, words: &[&str], parts: &[&str]) {
        let done = self.facula(words);
        assert_eq!(done.status, status, "{words:?}: {done:?}");
        assert_eq!(done.out, "", "{words:?}");
        assert_eq!(done.err.lines().count(), 1, "{words:?}: {}", done.err);
        for part in parts {
            assert!(done.err.contains(part), "{part} in {}", done.err);
        }
    }
}

/// Wait for a command's end.
pub fn ended(child: Child) -> Done {
    let output = child.wait_with_output().expect("an end");
    let text = |bytes: Vec<u8>| String::from_utf8(bytes).expect("UTF-8");
    Done {
        status: output.status.code().expect("no signal ended it"),
        out: text(output.stdout),
        err: text(output.stderr),
    }
}

/// Names in a folder, sorted.
pub fn names(folder: &Path) -> Vec<String> {
    let mut names: Vec<String> = std::fs::read_dir(folder)
        .expect("a folder")
        .map(|entry| entry.expect("an entry").file_name())
        .map(|name| name.to_string_lossy().into_owned())
        .collect();
    names.sort();
    names
}
