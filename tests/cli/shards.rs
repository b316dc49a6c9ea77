//! Surveys in parts, and what becomes of them when they are joined.

use std::fs;
#[cfg(unix)]
use std::process::Stdio;

use serde_json::Value;

use crate::contract::Manifest;
use crate::desk::{Desk, FILES_WITH_CHOICES, assert_same, names, smoke_cases};

fn part(desk: &Desk, shard: &str, out: &str, more: &[&str]) {
    desk.succeed(&[&["survey", "smoke", "--shard", shard, "--out", out], more].concat());
}

fn merge<'a>(parts: &[&'a str]) -> Vec<&'a str> {
    [&["merge", "--out", "merged"], parts].concat()
}

fn manifest(desk: &Desk, folder: &str) -> Value {
    serde_json::from_str(&desk.read(&format!("{folder}/manifest.json"))).unwrap()
}

#[test]
fn joined_parts_are_the_files_of_a_single_run() {
    let desk = Desk::new();
    desk.succeed(&["survey", "smoke", "--no-timing", "--out", "single"]);
    for of in [1, 3, 29] {
        let outs: Vec<String> = (1..=of).map(|k| format!("{k}-of-{of}")).collect();
        for (k, out) in outs.iter().enumerate() {
            // Timing is left out of parts unasked. A store may be shared.
            part(&desk, &format!("{}/{of}", k + 1), out, &["--store", "kept"]);
            let found: Manifest = serde_json::from_value(manifest(&desk, &format!("{out}/smoke"))).unwrap();
            let shard = found.shard.unwrap();
            assert_eq!((shard.part, shard.of, shard.suite_cases), (k + 1, of, smoke_cases()));
            let share = (k..smoke_cases()).step_by(of).count();
            assert_eq!((found.cases.asked, found.cases.finished, found.cases.complete), (share, share, true));
            assert_eq!(desk.read(&format!("{out}/smoke/cases.jsonl")).lines().count(), share);
        }
        // In any order.
        let parts: Vec<&str> = outs.iter().rev().map(String::as_str).collect();
        let said = desk.succeed(&merge(&parts));
        assert!(
            said.starts_with(&format!("smoke: {} cases of {of} parts, written to merged", smoke_cases())),
            "{said}"
        );
        assert_same(&desk, "single/smoke", "merged/smoke");
        assert_eq!(names(&desk.path("merged")), ["smoke"]);
        assert_eq!(names(&desk.path("merged/smoke")), FILES_WITH_CHOICES);

        let (mut single, mut merged) = (manifest(&desk, "single/smoke"), manifest(&desk, "merged/smoke"));
        let sum = |key: &str| -> f64 {
            outs.iter().map(|out| manifest(&desk, &format!("{out}/smoke"))["times"][key].as_f64().unwrap()).sum()
        };
        let total = merged["times"]["sampling_seconds"].as_f64().unwrap();
        assert!((total / sum("sampling_seconds") - 1.0).abs() < 1e-12, "sums in another order");
        for whole in [&mut single, &mut merged] {
            serde_json::from_value::<Manifest>(whole.clone()).unwrap();
            whole.as_object_mut().unwrap().remove("times");
        }
        assert_eq!(single, merged);
    }
}

#[test]
fn every_suite_of_the_parts_is_joined() {
    let desk = Desk::new();
    desk.write("mine.toml", include_str!("../../suites/smoke.toml"));
    let suites = ["survey", "smoke", "mine.toml", "--no-timing"];
    desk.succeed(&[&suites[..], &["--out", "single"]].concat());
    for (shard, out) in [("1/2", "a"), ("2/2", "b")] {
        desk.succeed(&[&suites[..], &["--shard", shard, "--out", out]].concat());
    }
    desk.succeed(&merge(&["a", "b"]));
    for suite in ["smoke", "mine"] {
        assert_same(&desk, &format!("single/{suite}"), &format!("merged/{suite}"));
    }
}

#[test]
fn what_is_not_every_part_of_one_survey_once_is_refused_by_name() {
    let desk = Desk::new();
    for (shard, out) in [("1/3", "a"), ("2/3", "b"), ("3/3", "c")] {
        part(&desk, shard, out, &[]);
    }
    part(&desk, "2/3", "twice", &[]);
    part(&desk, "3/3", "seed", &["--seed", "2"]);
    part(&desk, "3/3", "precision", &["--precision", "1e-3"]);
    part(&desk, "3/3", "methods", &["--methods", "taylor-1"]);
    part(&desk, "3/4", "four", &[]);
    desk.succeed(&["survey", "smoke", "--no-timing", "--out", "whole"]);
    desk.write("smoke.toml", &include_str!("../../suites/smoke.toml").replace("179 deg", "178 deg"));
    desk.succeed(&["survey", "smoke.toml", "--shard", "3/3", "--out", "suite"]);
    fs::create_dir(desk.path("empty")).unwrap();

    for (parts, expected) in [
        (&["a", "c"][..], &["suite `smoke`: 1 of 3 parts are missing: 2"][..]),
        (&["b"], &["2 of 3 parts are missing: 1, 3"]),
        (&["a", "b", "twice", "c"], &["b/smoke", "is part 2 of 3, and so is ", "twice/smoke"]),
        (&["a", "b", "c", "c"], &["c/smoke", "is part 3 of 3, and so is "]),
        (&["a", "b", "seed"], &["seed/smoke", "no part of the same survey as ", "seed is 2 against 1"]),
        (&["a", "b", "precision"], &["precision/smoke", "settings.precision is 0.001 against 0.002"]),
        (&["a", "b", "methods"], &["methods/smoke", "settings.methods is [\"taylor-1\"] against "]),
        (&["a", "b", "suite"], &["suite/smoke", "suite.hash is "]),
        (&["a", "b", "four"], &["four/smoke", "the number of parts is 4 against 3"]),
        (&["a", "b", "whole"], &["whole/smoke", "is a whole survey"]),
        (&["a", "b", "empty"], &["empty: holds no results folder of a suite"]),
        (&["a", "b", "nowhere"], &["nowhere: cannot be read"]),
    ] {
        let message = desk.refuse(&merge(parts));
        assert!(expected.iter().all(|words| message.contains(words)), "{parts:?}: {message}");
        assert!(!desk.path("merged").exists(), "{parts:?}");
    }
    let message = desk.refuse(&["merge", "a", "b", "c", "--out", "a"]);
    assert!(message.contains("a/smoke: is a part; give --out another folder"), "{message}");
}

/// Files that do not hold what their manifest says.
#[test]
fn a_part_whose_files_were_changed_is_refused() {
    let desk = Desk::new();
    part(&desk, "1/2", "a", &[]);
    part(&desk, "2/2", "b", &[]);
    let pop = |lines: &mut Vec<&str>| {
        lines.pop();
    };
    for (file, change, expected) in [
        ("cases.jsonl", &pop as &dyn Fn(&mut Vec<&str>), "ends before"),
        ("cases.jsonl", &|lines| lines.push("{\"case\":\"more\"}"), "holds more cases"),
        ("cases.jsonl", &|lines| lines[1] = "no record", "holds a line that is no record"),
        ("references.jsonl", &|lines| lines.swap(0, 1), "belongs; run its part again"),
        ("references.jsonl", &|lines| lines.push("{\"case\":\"more\"}"), "holds more cases"),
        ("scores.csv", &pop, "lacks a row of case"),
        ("scores.csv", &|lines| lines.swap(7, 8), "lacks a row of case"),
        ("scores.csv", &|lines| lines.push(lines[1]), "holds more cases"),
        ("scores.csv", &|lines| lines[0] = "case,method", "columns"),
        ("scores.csv", &|lines| lines.clear(), "is empty"),
        ("manifest.json", &pop, "is no manifest"),
    ] {
        let path = format!("b/smoke/{file}");
        let whole = desk.read(&path);
        let mut lines: Vec<&str> = whole.lines().collect();
        change(&mut lines);
        let text: String = lines.iter().map(|line| format!("{line}\n")).collect();
        desk.write(&path, &text);
        let message = desk.refuse(&merge(&["a", "b"]));
        assert!(message.contains(expected) && message.contains(file), "{file}, {expected}: {message}");
        let left = if desk.path("merged/smoke").exists() { names(&desk.path("merged/smoke")) } else { Vec::new() };
        assert!(left.is_empty(), "{left:?}");
        desk.write(&path, &whole);
    }
    desk.succeed(&merge(&["a", "b"]));
}

#[cfg(unix)]
#[test]
fn an_unfinished_part_is_refused_and_told_how_to_go_on() {
    let desk = Desk::new();
    let slow = "precision = 1e-9\ncap = 4_194_304\n[sensor]\nkind = \"range-bearing\"\nstation = [0, 0]\n[prior]\n\
        range = { from = \"1 km\", to = \"9 km\", steps = 12 }\nbearing = \"20 deg\"\nalong_sd = \"50 m\"\n\
        across_sd = \"5 deg\"\n[noise]\nsd = [\"10 m\", \"1 deg\"]\n";
    desk.write("slow.toml", slow);
    let run = |shard, out| ["survey", "slow.toml", "--shard", shard, "--out", out, "--threads", "1"];
    desk.succeed(&run("1/2", "a"));
    let mut command = desk.command(&run("2/2", "b"));
    let child = command.stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    while !desk.path("b/.references").exists() || names(&desk.path("b/.references")).len() < 2 {
        std::thread::sleep(std::time::Duration::from_millis(5));
    }
    let stopped = std::process::Command::new("kill").args(["-TERM", &child.id().to_string()]).status().unwrap();
    assert!(stopped.success(), "it had ended already");
    let output = child.wait_with_output().unwrap();
    assert_eq!(output.status.code(), Some(3));
    let message = desk.refuse(&merge(&["a", "b"]));
    for words in ["b/slow: part 2 of 2 is not finished: ", " of 6 cases are done", "--shard 2/2 and the same --out"]
    {
        assert!(message.contains(words), "{message}");
    }
    desk.succeed(&run("2/2", "b"));
    desk.succeed(&merge(&["a", "b"]));
    desk.succeed(&["survey", "slow.toml", "--no-timing", "--out", "single"]);
    assert_same(&desk, "single/slow", "merged/slow");
}

#[test]
fn shared_replicates_give_the_files_of_a_single_run() {
    let desk = Desk::new();
    let deep = ["smoke", "--no-timing", "--precision", "1e-9", "--cap", "500000"];
    desk.succeed(&[&["survey", "--out", "single"], &deep[..]].concat());
    for k in 1..=3 {
        let share = format!("{k}/3");
        let said = desk.succeed(&[&["survey", "--replicates", &share, "--store", "kept"], &deep[..]].concat());
        let all = smoke_cases();
        assert_eq!(said, format!("smoke: part {k}/3 of the replicates is sampled in {all} of {all} cases\n"));
        assert_eq!(names(&desk.path("")), ["kept", "single"], "nothing is judged, no results are written");
    }
    assert!(names(&desk.path("kept")).iter().all(|name| name.ends_with(".shares")));
    desk.succeed(&[&["survey", "--store", "kept", "--out", "joined"], &deep[..]].concat());
    assert_same(&desk, "single/smoke", "joined/smoke");
    assert!(names(&desk.path("kept")).iter().all(|name| name.ends_with(".shares")), "nothing was sampled anew");
    let message = desk.refuse(&["survey", "smoke", "--replicates", "1/33"]);
    assert_eq!(message, "--replicates: 33 shares are too many: there are 32 replicates to share");
}

#[test]
fn no_part_is_refused_with_what_would_be_one() {
    let desk = Desk::new();
    for text in ["0/3", "4/3", "3", "a/b"] {
        let outcome = desk.run(&["survey", "smoke", "--shard", text]);
        assert_eq!(outcome.code, Some(2));
        assert!(outcome.err.contains("give K/N with K from 1 to N, such as 3/8"), "{}", outcome.err);
    }
}
