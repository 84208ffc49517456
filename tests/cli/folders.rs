//! The results' folder: it appears whole or not at all, and replaces only its like.

use super::run::{Desk, names};
use std::fs::{self, File};

#[test]
fn an_empty_folder_and_earlier_results_are_replaced_whole() {
    let desk = Desk::new();
    fs::create_dir(desk.at("o")).expect("a folder");
    desk.good(&["assess", "small.toml", "--out", "o"]);
    desk.put("o/left_over.txt", "from before");
    let first = desk.read("o/trials.csv");
    desk.good(&["assess", "small.toml", "--out", "o/", "--seed", "2"]);
    assert!(!desk.at("o/left_over.txt").exists());
    assert!(first != desk.read("o/trials.csv"));
    assert_eq!(names(&desk.at(".")), ["o", "small.toml"]);
    assert!(
        names(&desk.at("o"))
            .iter()
            .all(|name| !name.starts_with('.'))
    );
}

#[test]
fn a_folder_that_facula_did_not_write_is_never_replaced() {
    let desk = Desk::new();
    for (name, text) in [
        ("photos/summer.jpg", "x"),
        ("other/summary.json", "{\"tool\": 1}"),
        ("broken/summary.json", "{"),
    ] {
        desk.put(name, text);
        let folder = name.split('/').next().expect("a folder");
        let words = ["assess", "small.toml", "--out", folder];
        desk.refused(1, &words, &[folder, "did not write", "--out"]);
        assert_eq!(desk.text(name), text);
    }
    assert_eq!(
        names(&desk.at(".")),
        ["broken", "other", "photos", "small.toml"]
    );
}

#[test]
fn places_that_take_no_results_are_refused_in_one_line() {
    let desk = Desk::new();
    desk.put("file", "x");
    for (out, parts) in [
        ("file", &["is a file"][..]),
        ("file/below", &["file"]),
        ("..", &["no place for results"]),
        (".", &["no place for results"]),
        ("/", &["no place for results"]),
    ] {
        desk.refused(1, &["assess", "small.toml", "--out", out], parts);
    }
    assert_eq!(names(&desk.at(".")), ["file", "small.toml"]);
}

#[cfg(unix)]
#[test]
fn a_folder_that_cannot_be_written_is_refused() {
    use std::os::unix::fs::PermissionsExt;
    let desk = Desk::new();
    let locked = desk.at("locked");
    fs::create_dir(&locked).expect("a folder");
    let mode = |bits| fs::set_permissions(&locked, fs::Permissions::from_mode(bits));
    mode(0o555).expect("permissions");
    // The superuser may write anywhere: nothing to see then.
    if File::create(locked.join("probe")).is_err() {
        let words = ["assess", "small.toml", "--out", "locked/o"];
        desk.refused(1, &words, &["cannot be written", "locked"]);
        assert!(names(&locked).is_empty());
    }
    mode(0o755).expect("permissions");
}

#[test]
fn a_dead_run_is_swept_and_a_live_one_is_not() {
    let desk = Desk::new();
    for folder in [".o.partial-1", ".o.partial-2", ".other.partial-3"] {
        desk.put(&format!("{folder}/.lock"), "");
        desk.put(&format!("{folder}/trials.csv"), "half");
    }
    let live = File::open(desk.at(".o.partial-2/.lock")).expect("a lock");
    live.lock().expect("locked");
    desk.good(&["assess", "small.toml", "--out", "o"]);
    assert_eq!(
        names(&desk.at(".")),
        [".o.partial-2", ".other.partial-3", "o", "small.toml"]
    );
    drop(live);
}

#[cfg(unix)]
#[test]
fn results_that_stepped_aside_are_put_back_by_the_next_run() {
    let desk = Desk::new();
    desk.good(&["assess", "small.toml", "--out", "o"]);
    let earlier = desk.read("o/trials.csv");
    fs::rename(desk.at("o"), desk.at(".o.previous")).expect("a rename");
    // This run fails before it has anything to put in place.
    let done = interrupted(&desk, "INT");
    assert_eq!(done.status, 1);
    assert!(earlier == desk.read("o/trials.csv"));
}

#[cfg(unix)]
#[test]
fn an_interrupted_run_leaves_the_earlier_results_untouched() {
    let desk = Desk::new();
    desk.good(&["assess", "small.toml", "--out", "o"]);
    let earlier = desk.read("o/summary.json");
    for signal in ["INT", "TERM"] {
        let done = interrupted(&desk, signal);
        assert_eq!(done.status, 1, "{signal}: {done:?}");
        assert_eq!(done.out, "", "{signal}");
        assert_eq!(done.err.lines().count(), 1, "{signal}: {}", done.err);
        assert!(done.err.contains("interrupted"), "{signal}: {}", done.err);
        assert_eq!(names(&desk.at(".")), ["o", "small.toml"], "{signal}");
        assert!(earlier == desk.read("o/summary.json"), "{signal}");
    }
}

/// Start a long run into `o`, send it a signal once it is under way, and expect its end within a second.
#[cfg(unix)]
fn interrupted(desk: &Desk, signal: &str) -> super::run::Done {
    use std::time::{Duration, Instant};
    let child = desk.start(&["assess", "small.toml", "--out", "o", "--trials", "1000000"]);
    let partial = desk.at(&format!(".o.partial-{}", child.id()));
    let begun = Instant::now();
    while !partial.join(".lock").exists() {
        assert!(begun.elapsed() < Duration::from_secs(20), "never began");
        std::thread::sleep(Duration::from_millis(20));
    }
    std::thread::sleep(Duration::from_millis(200));
    let kill = std::process::Command::new("kill")
        .args([&format!("-{signal}"), &child.id().to_string()])
        .status();
    assert!(kill.expect("kill").success());
    let sent = Instant::now();
    let done = super::run::ended(child);
    assert!(sent.elapsed() < Duration::from_secs(1));
    done
}

#[cfg(unix)]
#[test]
fn a_link_is_followed_and_stays() {
    let desk = Desk::new();
    fs::create_dir(desk.at("real")).expect("a folder");
    let link =
        |to: &str, name: &str| std::os::unix::fs::symlink(to, desk.at(name)).expect("a link");
    link("real", "link");
    link("nowhere", "astray");
    for _ in 0..2 {
        desk.good(&["assess", "small.toml", "--out", "link"]);
        assert!(desk.at("link").is_symlink());
        assert!(desk.at("real/summary.json").exists());
    }
    desk.refused(
        1,
        &["assess", "small.toml", "--out", "astray"],
        &["no place for results"],
    );
}
