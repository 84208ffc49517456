//! What is typed, what is printed, and the exit status.

use super::run::{Desk, SMALL};

#[test]
fn help_and_version_name_the_commands() {
    let desk = Desk::new();
    let help = desk.good(&["--help"]).out;
    for word in ["assess", "check", "starter", "laser safety officer"] {
        assert!(help.contains(word), "{word}");
    }
    let version = format!("facula {}\n", env!("CARGO_PKG_VERSION"));
    assert_eq!(desk.good(&["--version"]).out, version);
    let help = desk.good(&["assess", "--help"]).out;
    for option in [
        "--out",
        "--seed",
        "--trials",
        "--threads",
        "--set",
        "--json",
        "--quiet",
        "--gate",
    ] {
        assert!(help.contains(option), "{option}");
    }
}

#[test]
fn wrong_usage_exits_2_and_says_what_is_meant() {
    let desk = Desk::new();
    for (words, parts) in [
        (&["asess"][..], &["asess", "assess"][..]),
        (&["assess", "--trails", "3"], &["--trails", "--trials"]),
        (&["assess", "small.toml", "--threads", "0"], &["--threads"]),
        (
            &["assess", "small.toml", "--threads", "many"],
            &["--threads"],
        ),
        (&[], &["Usage"]),
        (&["assess", "small.toml", "--out", ""], &["--out"]),
        (&["starter", "small.toml"], &["small.toml"]),
    ] {
        let done = desk.facula(words);
        assert_eq!(done.status, 2, "{words:?}");
        assert_eq!(done.out, "", "{words:?}");
        for part in parts {
            assert!(done.err.contains(part), "{words:?}: {}", done.err);
        }
    }
}

#[test]
fn a_wrong_scenario_exits_2_in_one_line_and_leaves_no_folder() {
    let desk = Desk::new();
    desk.put("wrong.toml", &SMALL.replace("1 cm", "1 furlong"));
    desk.put("empty.toml", "");
    desk.put("folder/x", "");
    for (words, parts) in [
        (
            &["wrong.toml"][..],
            &["wrong.toml:13: array.element.size", "1 furlong"][..],
        ),
        (&["none.toml"], &["none.toml", "cannot be read"]),
        (&["empty.toml"], &["an empty file"]),
        (&["folder"], &["folder: cannot be read"]),
        (
            &["small.toml", "--trials", "0"],
            &["--trials 0: run.trials: found 0"],
        ),
        (
            &["small.toml", "--seed", "many"],
            &["--seed many: run.seed: found \"many\""],
        ),
        (
            &["small.toml", "--set", "errors.pistn=40 nm"],
            &["--set errors.pistn=40 nm", "did you mean `piston`?"],
        ),
        (
            &["small.toml", "--set", "errors.piston"],
            &["--set errors.piston", "SECTION.KEY=VALUE"],
        ),
        (
            &["small.toml", "--set", "run.seed=2", "--set", "run.seed=-2"],
            &["--set run.seed=-2"],
        ),
        (
            &["small.toml", "--set", "array.hole=1 m"],
            &["--set array.hole=1 m: array.hole", "no element"],
        ),
        (
            &["small.toml", "--set", "errors.jitter=1e20 rad"],
            &["errors.jitter", "one element"],
        ),
        (
            &["small.toml", "--set", "run.window=1e20 m"],
            &["run.window", "pixels"],
        ),
    ] {
        for command in ["assess", "check"] {
            let words = [&[command], words].concat();
            desk.refused(2, &words, parts);
        }
    }
    assert!(!desk.at("outputs").exists());
    desk.refused(
        2,
        &["assess", "wrong.toml", "--out", "mine"],
        &["wrong.toml"],
    );
    assert!(!desk.at("mine").exists());
}

#[test]
fn without_a_scenario_the_demo_runs_and_says_so() {
    let desk = Desk::new();
    let done = desk.good(&["assess", "--trials", "2"]);
    assert!(done.err.contains("No scenario given"), "{}", done.err);
    assert!(desk.at("outputs/crater_relay/assess/summary.json").exists());
    let done = desk.good(&["check"]);
    assert!(done.err.contains("No scenario given"), "{}", done.err);
    // What is no result goes to standard error only.
    assert!(!done.out.contains("No scenario given"));
}

#[test]
fn a_dash_reads_standard_input() {
    let desk = Desk::new();
    let done = desk.piped(SMALL, &["assess", "-", "--trials", "2"]);
    assert_eq!(done.status, 0, "{done:?}");
    let summary = desk.json("outputs/stdin/assess/summary.json");
    assert_eq!(summary["scenario"]["file"], "standard input");
    let done = desk.piped("title = 3", &["check", "-"]);
    assert_eq!(done.status, 2);
    assert!(done.err.contains("standard input:1: title"), "{}", done.err);
}

#[test]
fn the_starter_is_a_scenario_that_runs() {
    let desk = Desk::new();
    let starter = desk.good(&["starter"]).out;
    for command in [&["check", "-"][..], &["assess", "-", "--trials", "2"]] {
        let done = desk.piped(&starter, command);
        assert_eq!(done.status, 0, "{done:?}");
    }
}

#[test]
fn the_answer_comes_first_within_100_columns_and_without_colour() {
    let desk = Desk::new();
    let long = "A title of many words ".repeat(20);
    let title = format!("title={long}");
    for words in [
        &["small.toml"][..],
        &["small.toml", "--set", &title],
        &["small.toml", "--set", "errors.power_spread=50"],
        &[
            "small.toml",
            "--set",
            "target.range=1e20 m",
            "--set",
            "run.window=auto",
        ],
        &["small.toml", "--set", "errors.dropout=1"],
    ] {
        let out = desk.good(&[&["assess"], words].concat()).out;
        for line in out.lines() {
            assert!(line.chars().count() <= 100, "{line}");
        }
        let at = |text: &str| out.find(text).unwrap_or_else(|| panic!("{text} in {out}"));
        assert!(at("Requirement ") < at("no errors"));
        assert!(at("no errors") < at("Results: "));
        for nonsense in ["\x1b", "NaN", "inf", "0.000000000", " -"] {
            assert!(!out.contains(nonsense), "{nonsense:?} in {out}");
        }
    }
}

#[test]
fn quiet_prints_the_answer_alone() {
    let desk = Desk::new();
    let full = desk.good(&["assess", "small.toml"]);
    let quiet = desk.good(&["assess", "small.toml", "--quiet"]);
    assert_eq!(quiet.out.lines().count(), 1, "{}", quiet.out);
    assert!(quiet.out.starts_with("Requirement met"), "{}", quiet.out);
    assert!(full.out.contains(&quiet.out));
    assert_eq!(quiet.err, "");
}

#[test]
fn json_prints_the_summary_and_nothing_else() {
    let desk = Desk::new();
    let done = desk.good(&["assess", "small.toml", "--json", "--out", "o"]);
    assert_eq!(done.out, desk.text("o/summary.json"));
    let checked = desk.good(&["check", "small.toml", "--json"]).out;
    let checked: serde_json::Value = serde_json::from_str(&checked).expect("JSON");
    assert_eq!(checked["elements"], 4);
}

#[test]
fn gate_exits_3_only_when_the_requirement_is_missed() {
    let desk = Desk::new();
    desk.put("free.toml", &SMALL.replace("strehl = \">= 0.2\"\n", ""));
    let high = "require.strehl=>= 0.9999";
    for (status, words) in [
        (0, &["small.toml"][..]),
        (0, &["small.toml", "--gate"]),
        (0, &["small.toml", "--set", high]),
        (3, &["small.toml", "--set", high, "--gate"]),
        (3, &["small.toml", "--set", high, "--gate", "--json"]),
        (0, &["free.toml", "--gate"]),
    ] {
        let words = [&["assess"], words, &["--trials", "3"]].concat();
        let done = desk.facula(&words);
        assert_eq!(done.status, status, "{words:?}: {}", done.err);
        assert_eq!(done.err, "", "{words:?}");
    }
}

#[test]
fn options_reach_the_run_and_the_last_one_wins() {
    let desk = Desk::new();
    let words = [
        "assess",
        "small.toml",
        "--out",
        "a b/o",
        "--seed",
        "9",
        "--trials",
        "3",
        "--set",
        "errors.piston=10 nm",
        "--set",
        "errors.piston=20 nm",
        "--set",
        "errors.jitter.wind=1 urad",
    ];
    desk.good(&words);
    let summary = desk.json("a b/o/summary.json");
    assert_eq!(summary["seed"], 9);
    assert_eq!(summary["trials"], 3);
    assert_eq!(
        summary["command_line"],
        "facula assess small.toml --seed 9 --trials 3 --set 'errors.piston=10 nm' \
         --set 'errors.piston=20 nm' --set 'errors.jitter.wind=1 urad'"
    );
    let written = desk.text("a b/o/scenario.toml");
    assert!(written.contains("piston = \"20 nm\""), "{written}");
    assert!(written.contains("wind = \"1 urad\""), "{written}");
}

#[test]
fn an_array_without_light_has_zeros_and_nulls_and_a_note_that_says_why() {
    let desk = Desk::new();
    for trials in ["1", "3"] {
        let words = [
            "assess",
            "small.toml",
            "--out",
            "o",
            "--trials",
            trials,
            "--set",
        ];
        desk.good(&[&words[..], &["errors.dropout=1"]].concat());
        let summary = desk.json("o/summary.json");
        let long = &summary["long_exposure"];
        for key in ["strehl", "aim_irradiance_w_m2", "radiated_power_w"] {
            assert_eq!(long[key], 0.0, "{key}");
        }
        for key in [
            "fwhm_m",
            "bucket_fraction",
            "combining_efficiency",
            "offset_m",
        ] {
            assert!(long[key].is_null(), "{key}");
            assert_eq!(summary["mean_of_trials"][key]["count"], 0, "{key}");
        }
        let notes = summary["notes"].to_string();
        assert!(notes.contains("fwhm_m is undefined"), "{notes}");
        assert!(notes.contains("there is no light"), "{notes}");
        assert!(!notes.contains("window's edge"), "{notes}");
    }
}

#[test]
fn odd_titles_and_values_stay_on_their_line() {
    let desk = Desk::new();
    let words = ["assess", "small.toml", "--trials", "2", "--set"];
    let title = format!("title=red\x1b[31m\nand {}", "x".repeat(10_000));
    let out = desk.good(&[&words[..], &[&title]].concat()).out;
    assert!(!out.contains('\x1b'));
    assert!(out.lines().all(|line| line.chars().count() <= 100));
    assert!(out.starts_with("red [31m and\n"), "{out}");
    let value = "errors.piston=two\nlines\x1b[31m";
    desk.refused(2, &[&words[..], &[value]].concat(), &["two lines"]);
}

#[cfg(target_os = "linux")]
#[test]
fn output_that_cannot_be_written_is_a_failure_and_a_closed_pipe_is_none() {
    let desk = Desk::new();
    for (words, status) in [("starter > /dev/full", 1), ("starter | true", 0)] {
        let line = format!("\"{}\" {words}", env!("CARGO_BIN_EXE_facula"));
        let shell = std::process::Command::new("sh")
            .args(["-c", &line])
            .current_dir(desk.at("."))
            .output()
            .expect("a shell");
        assert_eq!(shell.status.code(), Some(status), "{words}");
        let lines = String::from_utf8_lossy(&shell.stderr).lines().count();
        assert_eq!(lines, status as usize, "{words}");
    }
}
