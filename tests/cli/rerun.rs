//! The same scenario and seed give the same files, to the last bit.

use super::run::{Desk, TABLE, names, on_table};
use serde_json::Value;

/// A summary without the parts named.
fn without(mut summary: Value, keys: &[&str]) -> Value {
    for key in keys {
        summary.as_object_mut().expect("an object").remove(*key);
    }
    summary
}

/// Every file of two folders is the same, and the summaries are but for `keys`.
#[track_caller]
fn same(desk: &Desk, one: &str, other: &str, keys: &[&str]) {
    assert_eq!(names(&desk.at(one)), names(&desk.at(other)));
    for name in names(&desk.at(one)) {
        let (a, b) = (format!("{one}/{name}"), format!("{other}/{name}"));
        if name == "summary.json" {
            assert_eq!(without(desk.json(&a), keys), without(desk.json(&b), keys));
        } else {
            assert!(desk.read(&a) == desk.read(&b), "{name} differs");
        }
    }
}

#[test]
fn two_runs_differ_in_timing_alone_whatever_the_threads() {
    let desk = Desk::new();
    // More trials than one batch of work.
    let jitter = ["--trials", "20", "--set", "errors.jitter=5 urad"];
    for (folder, threads) in [("a", "2"), ("b", "2"), ("c", "1")] {
        let words = [
            "assess",
            "small.toml",
            "--out",
            folder,
            "--threads",
            threads,
        ];
        desk.good(&[&words[..], &jitter].concat());
    }
    same(&desk, "a", "b", &["timing"]);
    same(&desk, "a", "c", &["timing"]);
    desk.good(&["assess", "small.toml", "--out", "d", "--seed", "2"]);
    assert!(desk.read("a/trials.csv") != desk.read("d/trials.csv"));
}

#[test]
fn the_folder_runs_again_as_it_is() {
    let desk = Desk::new();
    desk.put("in/tables/three.csv", TABLE);
    desk.put("in/table.toml", &on_table("tables/three.csv"));
    for (scenario, settings) in [
        ("small.toml", &[][..]),
        (
            "small.toml",
            &["--set", "errors.piston=0.1 rad", "--seed", "4"],
        ),
        (
            "in/table.toml",
            &["--set", "target.range=0.9 km", "--trials", "5"],
        ),
    ] {
        let words = ["assess", scenario, "--out", "first"];
        desk.good(&[&words[..], settings].concat());
        desk.good(&["assess", "first/scenario.toml", "--out", "again"]);
        same(
            &desk,
            "first",
            "again",
            &["timing", "command_line", "scenario"],
        );
    }
    assert_eq!(desk.text("again/three.csv"), TABLE);
}

#[test]
fn a_table_that_bears_the_name_of_a_result_is_refused() {
    let desk = Desk::new();
    for name in ["trials.csv", "lobes.csv", "summary.json"] {
        desk.put(name, TABLE);
        desk.put("clash.toml", &on_table(name));
        let parts = ["clash.toml:8: array.table", name, "rename"];
        desk.refused(2, &["assess", "clash.toml"], &parts);
        desk.good(&["check", "clash.toml"]);
    }
    assert!(!desk.at("outputs").exists());
}
