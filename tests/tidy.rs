//! Holds the proportions of the project: sizes, folders, floors and habits.

use std::collections::BTreeSet;
use std::fs;
use std::path::{Path, PathBuf};

/// What may stand at the top of the repository.
const TOP: [&str; 13] = [
    ".ci",
    ".git",
    ".gitignore",
    "Cargo.lock",
    "Cargo.toml",
    "DEVELOPERS.md",
    "README.md",
    "benches",
    "configs",
    "outputs",
    "src",
    "target",
    "tests",
];

/// Rooms of the library from the lowest floor up; rooms of one line are neighbours.
const FLOORS: [&[&str]; 9] = [
    &["constants", "quantity", "error"],
    &["scenario"],
    &["array"],
    &["perturb"],
    &["farfield"],
    &["figures"],
    &["trials"],
    &["study"],
    &["report"],
];

const MOST_LINES: usize = 600;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// Every Rust file below `folder`, relative to the repository, with its text.
fn rust_files(folder: &str) -> Vec<(PathBuf, String)> {
    let mut files = Vec::new();
    let mut folders = vec![root().join(folder)];
    while let Some(folder) = folders.pop() {
        for entry in fs::read_dir(folder).into_iter().flatten().flatten() {
            let path = entry.path();
            if path.is_dir() {
                folders.push(path);
            } else if path.extension().is_some_and(|end| end == "rs") {
                let text = fs::read_to_string(&path).expect("UTF-8");
                let short = path.strip_prefix(root()).expect("below the root");
                files.push((short.to_path_buf(), text));
            }
        }
    }
    files.sort();
    files
}

/// The code of a file without comments and texts in quotes, and without its tests.
fn code(text: &str) -> String {
    let code = text.split("#[cfg(test)]\nmod tests").next().unwrap_or("");
    code.lines()
        .map(|line| line.split("//").next().unwrap_or("").to_string() + "\n")
        .collect()
}

#[test]
fn every_file_says_what_it_is_and_is_of_one_size() {
    for folder in ["src", "tests", "benches"] {
        for (path, text) in rust_files(folder) {
            assert!(text.starts_with("//! "), "{}", path.display());
            let lines = text.lines().count();
            assert!(lines <= MOST_LINES, "{}: {lines} lines", path.display());
        }
    }
    for (file, most) in [("src/main.rs", 80), ("src/lib.rs", 150)] {
        let text = fs::read_to_string(root().join(file)).expect(file);
        assert!(text.lines().count() < most, "{file}");
    }
}

#[test]
fn folders_lie_at_most_two_deep() {
    for (path, _) in rust_files("src") {
        // src / room / corner / file
        assert!(path.components().count() <= 4, "{}", path.display());
    }
}

#[test]
fn the_top_level_holds_what_belongs_there() {
    let found: BTreeSet<String> = fs::read_dir(root())
        .expect("the repository")
        .map(|entry| entry.expect("an entry").file_name())
        .map(|name| name.to_string_lossy().into_owned())
        .collect();
    let allowed = TOP.map(String::from).into();
    let strange: Vec<_> = found.difference(&allowed).collect();
    assert!(strange.is_empty(), "{strange:?}");
}

#[test]
fn the_code_keeps_its_habits() {
    for (path, text) in rust_files("src") {
        let code = code(&text);
        let mut unwanted = vec!["unsafe ", "todo!", "unimplemented!", "dbg!", ".unwrap()"];
        if !path.starts_with("src/cli") {
            unwanted.extend(["println!", "eprintln!", "print!(", "std::env", "Instant"]);
        }
        for word in unwanted {
            let line = code.lines().position(|line| line.contains(word));
            assert!(
                line.is_none(),
                "{word} in {}: line {line:?}",
                path.display()
            );
        }
    }
}

/// The floor of a room, if it is one.
fn floor(room: &str) -> Option<usize> {
    FLOORS.iter().position(|rooms| rooms.contains(&room))
}

/// Rooms that a piece of code names after `crate::`.
fn rooms_named(code: &str) -> Vec<String> {
    let name = |text: &str| -> String {
        text.chars()
            .take_while(|c| c.is_alphanumeric() || *c == '_')
            .collect()
    };
    code.split("crate::")
        .skip(1)
        .flat_map(|rest| match rest.strip_prefix('{') {
            // use crate::{one::…, two::…}: names at the first level of braces.
            Some(list) => {
                let mut depth = 1;
                let mut names = vec![name(list.trim_start())];
                for (at, letter) in list.char_indices() {
                    match letter {
                        '{' => depth += 1,
                        '}' => depth -= 1,
                        ',' if depth == 1 => names.push(name(list[at + 1..].trim_start())),
                        _ => {}
                    }
                    if depth == 0 {
                        break;
                    }
                }
                names.retain(|name| !name.is_empty());
                names
            }
            None => vec![name(rest)],
        })
        .collect()
}

#[test]
fn rooms_named_are_found_in_every_spelling() {
    let code = "use crate::array::{Array, sites};\nuse crate::{error::Place, trials::{a, b}};\n\
                fn f() -> crate::farfield::Map {}";
    assert_eq!(rooms_named(code), ["array", "error", "trials", "farfield"]);
}

#[test]
fn rooms_use_only_the_floors_below() {
    for (path, text) in rust_files("src") {
        let mut parts = path.components().skip(1);
        let room = parts.next().expect("a room").as_os_str().to_string_lossy();
        let room = room.trim_end_matches(".rs");
        if ["lib", "main", "cli"].contains(&room) {
            continue;
        }
        let here = floor(room).unwrap_or_else(|| panic!("{room} has no floor"));
        for named in rooms_named(&code(&text)) {
            let Some(there) = floor(&named) else {
                panic!("{}: `crate::{named}` is no room", path.display());
            };
            assert!(
                there < here || named == room,
                "{}: {room} may not use {named}",
                path.display()
            );
        }
    }
}
