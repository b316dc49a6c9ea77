//! Whatever cannot be meant gets one line that says where and what would be right, and leaves no results.

use std::fs::File;

use crate::desk::Desk;

const SUITE: &str = "\
[sensor]
kind = \"range-bearing\"
station = [0, 0]
[prior]
mean = [3000, 400]
covariance = [[900, 0], [0, 400]]
[noise]
sd = [\"10 m\", \"0.3 deg\"]
";

const RECORD: &str = r#"{"case":"k-1","sensor":{"kind":"range-bearing","station":[0,0]},"prior":{"mean":[30,10],"covariance":[[9,2],[2,4]]},"noise":{"covariance":[[0.01,0],[0,1e-4]]}}"#;

fn with(text: &str, from: &str, to: &str) -> String {
    assert!(text.contains(from), "{from}");
    text.replacen(from, to, 1)
}

fn assert_said(said: &str, start: &str, word: &str) {
    assert!(said.starts_with(start) && said.contains(word), "wanted {start}…{word}…\n   got {said}");
}

#[test]
fn a_suite_that_cannot_be_meant_is_refused_with_its_line() {
    let desk = Desk::new();
    const COVARIANCE: &str = "[[900, 0], [0, 400]]";
    let swept = |sweep: &str| with(SUITE, "3000", sweep);
    for (text, start, word) in [
        (String::new(), "bad.toml:1: ", "is empty"),
        ("a = [1,".into(), "bad.toml:1: ", "is not TOML"),
        (
            with(SUITE, "range-bearing", "range-baering"),
            "bad.toml:2: sensor.kind: ",
            "did you mean `range-bearing`?",
        ),
        (with(SUITE, "station", "statoin"), "bad.toml:3: sensor.statoin: ", "did you mean `station`?"),
        (with(SUITE, "[noise]", "[nosie]"), "bad.toml:7: nosie: ", "did you mean `noise`?"),
        (with(SUITE, COVARIANCE, "[[900]]"), "bad.toml:6: prior.covariance: ", "1 x 1, but 2 x 2 is needed"),
        (with(SUITE, COVARIANCE, "[[900, 1], [2, 400]]"), "bad.toml:6: prior.covariance", "symmetric"),
        (with(SUITE, COVARIANCE, "[[900, 900], [900, 400]]"), "bad.toml:6: prior.covariance: ", "indefinite"),
        (with(SUITE, COVARIANCE, "[[1e-300, 1e300], [1e300, 1e-300]]"), "bad.toml:6: prior.cov", "indefinite"),
        (
            with(SUITE, &format!("covariance = {COVARIANCE}"), "sd = [30, -20]"),
            "bad.toml:6: prior.sd[1]: ",
            "below 0",
        ),
        (with(SUITE, "\"10 m\"", "\"-10 m\""), "bad.toml:8: noise.sd[0]: ", "below 0"),
        (with(SUITE, "[3000, 400]", "[3000, nan]"), "bad.toml:5: prior.mean[1]: ", "is nan; give a finite number"),
        (swept("{ list = [] }"), "bad.toml:5: prior.mean[0].list: ", "the sweep is empty"),
        (swept("{ from = 1, to = 2, steps = 0 }"), "bad.toml:5: prior.mean[0].steps: ", "the sweep is empty"),
        (swept("{ from = 2, to = 1, steps = 3 }"), "bad.toml:5: prior.mean[0].from: ", "2 is above `to` = 1"),
        (format!("{SUITE}[[method]]\nid = \"tailor-1\"\n"), "bad.toml:10: method[0].id: ", "taylor-1"),
        (format!("precision = 2\n{SUITE}"), "bad.toml:1: precision: ", "below 1"),
    ] {
        desk.write("bad.toml", &text);
        assert_said(&desk.refuse(&["survey", "bad.toml", "--out", "out"]), start, word);
    }
    assert!(!desk.path("out").exists());
}

#[test]
fn a_case_record_that_cannot_be_meant_is_refused_with_its_line() {
    let desk = Desk::new();
    let second = |from: &str, to: &str| format!("{RECORD}\n{}\n", with(&with(RECORD, "k-1", "k-2"), from, to));
    for (text, start, word) in [
        (String::new(), "bad.jsonl:1: ", "holds no case"),
        (format!("{RECORD}\n\n{RECORD}\n"), "bad.jsonl:3: case: ", "stands on line 1 already"),
        (format!("{RECORD}\n{{\"case\""), "bad.jsonl:2: ", "is not JSON"),
        (second("\"noise\"", "\"nosie\""), "bad.jsonl:2: nosie: ", "did you mean `noise`?"),
        (second("range-bearing", "radar"), "bad.jsonl:2: sensor.kind: ", "there is no sensor `radar`"),
        (second("[30,10]", "[30]"), "bad.jsonl:2: prior.covariance: ", "1 x 1 is needed"),
        (second("[[9,2],[2,4]]", "[[9,2],[3,4]]"), "bad.jsonl:2: prior.covariance: ", "symmetric"),
        (second("[[9,2],[2,4]]", "[[9,9],[9,4]]"), "bad.jsonl:2: prior.covariance: ", "indefinite"),
        (second("[[9,2],[2,4]]", "[[-9,2],[2,4]]"), "bad.jsonl:2: prior.covariance: ", "cannot be negative"),
        (second("1e-4", "-1e-4"), "bad.jsonl:2: noise.covariance: ", "cannot be negative"),
        (second("[30,10]", "[30,NaN]"), "bad.jsonl:2: ", "is not JSON"),
        (second("[30,10]", "[30,1e999]"), "bad.jsonl:2: ", "is not JSON"),
    ] {
        desk.write("bad.jsonl", &text);
        assert_said(&desk.refuse(&["survey", "--cases", "bad.jsonl", "--out", "out"]), start, word);
    }
    assert!(!desk.path("out").exists());
}

#[test]
fn suites_and_files_that_are_not_there_are_named() {
    let desk = Desk::new();
    std::fs::create_dir_all(desk.path("folder.toml")).unwrap();
    desk.write("smoke.toml", SUITE);
    for (arguments, start, word) in [
        (&["harbor-radar"][..], "harbor-radar: ", "did you mean `harbour-radar`?"),
        (&["nowhere"], "nowhere: ", "smoke, a suite of regimes"),
        (&["missing.toml"], "missing.toml: ", "cannot be read: "),
        (&["folder.toml"], "folder.toml: ", "is a folder; give a file"),
        (&["--cases", "missing.jsonl"], "missing.jsonl: ", "cannot be read: "),
        (&["--cases", "folder.toml"], "folder.toml: ", "is a folder; give a file"),
        (&["smoke", "smoke.toml"], "two suites are called `smoke`", "would share a folder"),
        (&["bro\nken.toml"], "bro\\nken.toml: ", ""),
    ] {
        assert_said(&desk.refuse(&[&["survey", "--out", "out"], arguments].concat()), start, word);
    }
    assert!(!desk.path("out").exists());
}

#[test]
fn options_that_cannot_be_meant_are_refused() {
    let desk = Desk::new();
    for (option, value, start, word) in [
        ("--precision", "0", "--precision: precision 0 ", "above 0 and below 1"),
        ("--precision", "-1", "--precision: precision -1 ", "above 0 and below 1"),
        ("--precision", "nan", "--precision: precision NaN ", "above 0 and below 1"),
        ("--precision", "1", "--precision: precision 1 ", "above 0 and below 1"),
        ("--cap", "1000", "--cap: a cap of 1000 samples ", "at least 8192"),
        (
            "--methods",
            "tailor-1",
            "--methods tailor-1: ",
            "there is no method `tailor-1`; did you mean `taylor-1`? give one of taylor-1",
        ),
        ("--methods", "unscented:kapa=1", "--methods unscented:kapa=1: kapa: ", "`kappa`"),
        ("--methods", "gauss-hermite:order=21", "--methods gauss-hermite:order=21: order: ", "2 to 20"),
        ("--methods", "taylor-1,taylor-1", "--methods: method `taylor-1` stands twice", ""),
    ] {
        let option = format!("{option}={value}");
        assert_said(&desk.refuse(&["survey", "smoke", "--out", "out", &option]), start, word);
    }
    // These do not reach us: the parser of the command line answers, at more length.
    for arguments in [
        &["survey", "smoke", "--precision", "fine"][..],
        &["survey", "smoke", "--cap", "1.5"],
        &["survey", "smoke", "--threads", "0"],
        &["survey", "smoke", "--threads", "2000"],
        &["survey", "smoke", "--seed", "-1"],
        &["survey", "smoke", "--cases", "k.jsonl"],
        &["survey", "--nosuch"],
        &["catalogue", "suites"],
        &["nosuch"],
        &[],
    ] {
        let outcome = desk.run(arguments);
        assert_eq!(outcome.code, Some(2), "{arguments:?}: {}", outcome.err);
        assert!(!outcome.err.is_empty() && !outcome.err.contains("panicked"), "{arguments:?}: {}", outcome.err);
    }
    assert!(!desk.path("out").exists());
}

/// Refused before anything is measured, with the system's reason once.
#[test]
fn an_unwritable_results_folder_is_refused_at_once() {
    let desk = Desk::new();
    desk.write("plain", "a file, no folder");
    let mut places = vec!["plain", "plain/below"];
    if cfg!(target_os = "linux") {
        places.push("/proc/gaussworthy");
    }
    for place in places {
        let said = desk.refuse(&["survey", "smoke", "--out", place]);
        assert_said(&said, &format!("results folder: {place}"), "cannot be written: ");
        assert_eq!(said.matches("os error").count(), 1, "{said}");
    }
}

/// A hundred million bytes without a line end, which take no room on the disk.
#[test]
fn huge_files_are_refused_unread() {
    let desk = Desk::new();
    for name in ["huge.toml", "huge.jsonl"] {
        File::create(desk.path(name)).unwrap().set_len(100_000_000).unwrap();
    }
    assert_said(&desk.refuse(&["survey", "huge.toml"]), "huge.toml: has 100000000 bytes", "at most 8 MiB");
    assert_said(&desk.refuse(&["survey", "--cases", "huge.jsonl"]), "huge.jsonl:1: ", "longer than 8 MiB");
    assert!(!desk.path("results").exists());
}

/// A suite's name is a folder's below `--out`, and no way out of it.
#[cfg(unix)]
#[test]
fn no_suite_name_leads_out_of_the_results() {
    let desk = Desk::new();
    std::fs::create_dir(desk.path("in")).unwrap();
    for name in ["..", "...", ".hidden", "..\\up", "a:b"] {
        for (ending, text, option) in [("toml", SUITE, &[][..]), ("jsonl", RECORD, &["--cases"])] {
            let file = format!("in/{name}.{ending}");
            desk.write(&file, text);
            let arguments = [&["survey", "--out", "out/deep"], option, &[file.as_str()]].concat();
            assert_said(&desk.refuse(&arguments), &format!("{file}: the name "), "cannot be the name of a folder");
        }
    }
    assert!(!desk.path("out").exists());
    // A path to a suite is not part of its name.
    desk.write("in/fine.toml", SUITE);
    desk.succeed(&["survey", "in/../in/fine.toml", "--out", "out", "--no-timing", "--precision", "1e-1"]);
    assert_eq!(crate::desk::names(&desk.path("out")), [".references", "fine"]);
}
