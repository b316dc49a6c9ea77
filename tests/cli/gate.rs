//! The gate as a check in CI: exit codes, the baseline's file, what is said and what is left for other programs.

use quick_junit::{Report, TestCaseStatus};
use quick_xml::events::Event;
use serde_json::{Value, json};

use crate::desk::{CAUTION, Desk, Outcome, assert_narrow, smoke_cases};

const ACCEPT: [&str; 5] = ["gate", "smoke", "--against", "accepted", "--accept"];
const GATE: [&str; 4] = ["gate", "smoke", "--against", "accepted"];
const FILE: &str = "accepted/smoke.jsonl";
/// Methods of the smoke suite.
const METHODS: usize = 7;

/// A desk with a baseline of the smoke suite.
fn accepted() -> Desk {
    let desk = Desk::new();
    let said = desk.succeed(&ACCEPT);
    assert!(
        said.contains("smoke: there was no baseline") && said.contains("Accepted: accepted/smoke.jsonl"),
        "{said}"
    );
    desk
}

/// Rewrites the lines of the baseline.
fn edit(desk: &Desk, mut change: impl FnMut(&mut Value) -> bool) {
    let mut lines: Vec<Value> = desk.lines(FILE);
    lines.retain_mut(|line| change(line));
    let text: String = lines.iter().map(|line| format!("{line}\n")).collect();
    desk.write(FILE, &text);
}

fn is(line: &Value, case: &str, method: Option<&str>) -> bool {
    line["case"] == case && line["method"].as_str() == method
}

/// Asserts that a report keeps to the schema of JUnit XML that build servers publish as `junit-10.xsd`: elements, what may stand in them,
/// and their attributes, those that must be there first (the version that packages of test runners carry; whole reports were also
/// validated against the file itself).
fn assert_keeps_to_the_schema(report: &str) {
    const TEXT: &[&str] = &[];
    let rules = |element: &str| -> Option<(&[&str], usize, &[&str])> {
        Some(match element {
            "testsuites" => (&["name", "time", "tests", "failures", "errors"], 0, &["testsuite"]),
            "testsuite" => (
                &["name", "tests", "failures", "errors", "group", "time", "skipped", "timestamp", "hostname", "id"],
                4,
                &["testsuite", "properties", "testcase", "system-out", "system-err"],
            ),
            "testcase" => (
                &["name", "time", "classname", "group"],
                1,
                &["skipped", "error", "failure", "system-out", "system-err"],
            ),
            "failure" => (&["type", "message"], 0, TEXT),
            "system-out" => (TEXT, 0, TEXT),
            _ => return None,
        })
    };
    let mut reader = quick_xml::Reader::from_str(report);
    let mut open: Vec<String> = Vec::new();
    let mut seen = 0;
    loop {
        let event = reader.read_event().unwrap();
        match &event {
            Event::Start(tag) | Event::Empty(tag) => {
                let name = String::from_utf8(tag.name().as_ref().to_vec()).unwrap();
                let (attributes, needed, _) = rules(&name).unwrap_or_else(|| panic!("<{name}> is unknown"));
                match open.last() {
                    Some(parent) => {
                        assert!(rules(parent).unwrap().2.contains(&name.as_str()), "<{name}> in <{parent}>")
                    }
                    None => assert!(name == "testsuites" && seen == 0, "<{name}> is the root"),
                }
                let given: Vec<String> = tag
                    .attributes()
                    .map(|a| String::from_utf8(a.unwrap().key.as_ref().to_vec()).unwrap())
                    .collect();
                assert!(given.iter().all(|a| attributes.contains(&a.as_str())), "<{name}>: {given:?}");
                assert!(attributes[..needed].iter().all(|a| given.iter().any(|g| g == a)), "<{name}>: {given:?}");
                seen += 1;
                if matches!(event, Event::Start(_)) {
                    open.push(name);
                }
            }
            Event::End(_) => drop(open.pop()),
            Event::Text(text) => {
                let holds_text = open.last().is_some_and(|name| rules(name).unwrap().2.is_empty());
                assert!(holds_text || text.iter().all(u8::is_ascii_whitespace), "text in {open:?}");
            }
            Event::Eof => break,
            _ => {}
        }
    }
    assert!(open.is_empty() && seen > 100, "{seen} elements");
}

fn in_one_line(text: &str) -> String {
    text.split_whitespace().collect::<Vec<_>>().join(" ")
}

#[test]
fn unchanged_code_passes_under_the_same_and_under_another_seed() {
    let desk = accepted();
    for line in desk.read(FILE).lines() {
        assert!(line.len() < 4000 && serde_json::from_str::<Value>(line).unwrap().is_object(), "{line}");
    }
    let before = desk.read(FILE);
    let more = ["--junit", "gate.xml", "--markdown", "gate.md"];
    let said = desk.succeed(&[&GATE[..], &more].concat());
    let compared = smoke_cases() * (METHODS + 1);
    let sentence = format!("{compared} answers and references held against the baseline: nothing has changed");
    assert!(in_one_line(&said).contains(&sentence) && said.contains(CAUTION), "{said}");
    assert_narrow(&said);
    assert_keeps_to_the_schema(&desk.read("gate.xml"));
    let report = Report::deserialize_from_str(&desk.read("gate.xml")).unwrap();
    assert_eq!((report.tests, report.failures, report.errors), (compared, 0, 0));
    assert!(desk.read("gate.md").contains("# Numerical accuracy: nothing worse"));
    let said = desk.succeed(&[&GATE[..], &["--seed", "2"]].concat());
    assert!(in_one_line(&said).contains("made with another seed: 1; now 2."), "{said}");
    // Accepted once more, the file is the same to the byte.
    desk.succeed(&ACCEPT);
    assert_eq!(desk.read(FILE), before);
}

#[test]
fn every_kind_of_change_is_told_apart() {
    let desk = accepted();
    edit(&desk, |line| {
        if is(line, "buoy-001", Some("unscented")) {
            line["evaluations"][0] = json!(4);
        } else if is(line, "buoy-002", Some("taylor-1")) {
            // As if it had been right all along.
            line["verdict"] = json!("trusted");
        } else if is(line, "camera-000", Some("cubature-3")) {
            let entry = &mut line["moments"]["mean"][0];
            *entry = json!(entry.as_f64().unwrap() + 1e-3);
        } else if is(line, "camera-001", None) {
            let entry = &mut line["moments"]["mean"][0];
            *entry = json!(entry.as_f64().unwrap() * 1.05);
        } else if is(line, "current-000", None) {
            line["question"] = json!("0123456789abcdef");
        } else if is(line, "current-001", Some("taylor-2")) {
            *line = json!({"case": "current-001", "method": "taylor-2", "missing": "no answer"});
        } else if is(line, "light-000", Some("taylor-2")) {
            line["scores"]["excess"][0] = json!(1e-9);
        } else if is(line, "light-001", Some("taylor-2")) {
            return false;
        } else if line["case"] == "meter-000" {
            line["case"] = json!("meter-900");
        }
        true
    });
    let more = ["--junit", "gate.xml", "--markdown", "gate.md"];
    let Outcome { code, out, err } = desk.run(&[&GATE[..], &more].concat());
    assert_eq!(code, Some(1), "{out}{err}");
    assert!(err.starts_with("gaussworthy: regression in smoke; if it is meant, accept it by --accept"), "{err}");
    assert_narrow(&out);
    assert_keeps_to_the_schema(&desk.read("gate.xml"));
    let report = Report::deserialize_from_str(&desk.read("gate.xml")).unwrap();
    let failures: Vec<(String, String)> = report.test_suites[0]
        .test_cases
        .iter()
        .filter_map(|case| match &case.status {
            TestCaseStatus::NonSuccess { ty, .. } => {
                let class = case.classname.as_ref().unwrap().as_str();
                Some((format!("{} {class}", case.name.as_str()), ty.as_ref().unwrap().as_str().to_string()))
            }
            _ => None,
        })
        .collect();
    let kind = |name: &str| failures.iter().find(|(known, _)| known == name).map(|(_, kind)| kind.as_str());
    for (name, wanted) in [
        ("buoy-001 smoke.unscented", "worse.evaluations"),
        ("buoy-002 smoke.taylor-1", "worse.verdict"),
        ("camera-001 smoke.reference", "moved.reference"),
        ("current-000 smoke.reference", "moved.presence"),
        ("light-000 smoke.taylor-2", "worse.score"),
        ("meter-900 smoke.reference", "worse.presence"),
    ] {
        assert_eq!(kind(name), Some(wanted), "{name}: {failures:?}");
    }
    // Better or worse is for the numbers to say, but a mean that has moved by a thousandth of a pixel is never overlooked.
    assert!(kind("camera-000 smoke.cubature-3").is_some() || out.contains("camera-000"), "{out}");
    assert!(kind("current-001 smoke.taylor-2").is_none(), "an answer where there was none is no regression");
    assert!(out.contains("meter-000") && kind("meter-000 smoke.reference").is_none(), "{out}");
    assert_eq!(report.failures, failures.len());
    let page = desk.read("gate.md");
    assert!(
        page.contains("# Numerical accuracy: regression") && page.contains("| worse | buoy-002 | taylor-1 |"),
        "{page}"
    );

    // Shown, written, and then there is nothing more to say.
    let said = desk.succeed(&ACCEPT);
    assert!(said.contains("REGRESSION") && said.contains("buoy-002") && said.contains("Accepted:"), "{said}");
    assert!(in_one_line(&desk.succeed(&GATE)).contains("nothing has changed"));
}

#[test]
fn what_differs_in_the_making_is_said() {
    let desk = accepted();
    edit(&desk, |line| {
        if line["baseline"] == 1 {
            line["made"]["version"] = json!("0.0.9");
            line["made"]["hash"] = json!("0".repeat(64));
            line["made"]["limits"]["mean_error"] = json!(0.2);
        }
        true
    });
    let said = in_one_line(&desk.succeed(&GATE));
    for note in [
        "another version: 0.0.9;",
        "another text of the suite (SHA-256): 000",
        "another limit mean_error: 0.2; now 0.1",
    ] {
        assert!(said.contains(note), "{said}");
    }
}

#[test]
fn methods_that_come_are_noted_and_methods_that_go_fail() {
    let desk = accepted();
    let outcome = desk.run(&[&GATE[..], &["--methods", "taylor-1,cubature-5"]].concat());
    assert_eq!(outcome.code, Some(1));
    let said = in_one_line(&outcome.out);
    assert!(
        said.contains("6 worse, 1 noted") && said.contains("noted - cubature-5 method not there new"),
        "{said}"
    );
}

/// The references of a survey make a perfect implementation.
#[test]
fn answers_of_an_implementation_outside_are_held_against_the_baseline() {
    let desk = Desk::new();
    desk.succeed(&["survey", "smoke", "--no-timing", "--methods", "taylor-1"]);
    let answers = desk.read("results/smoke/references.jsonl");
    desk.write("answers.jsonl", &answers);
    let gate = [
        "gate",
        "smoke",
        "--against",
        "accepted",
        "--methods",
        "taylor-1",
        "--answers",
        "answers.jsonl",
        "--as",
        "tracker",
    ];
    desk.succeed(&[&gate[..], &["--accept"]].concat());
    desk.succeed(&gate);
    desk.write("answers.jsonl", &answers.lines().skip(1).map(|line| format!("{line}\n")).collect::<String>());
    let outcome = desk.run(&gate);
    assert_eq!(outcome.code, Some(1), "{outcome:?}");
    assert!(outcome.out.contains("tracker") && outcome.out.contains("no answer"), "{}", outcome.out);
}

#[test]
fn times_are_compared_only_when_asked() {
    let desk = accepted();
    let said = desk.refuse(&[&GATE[..], &["--time-margin", "3"]].concat());
    assert_eq!(said, "--time-margin: accepted/smoke.jsonl holds no times; write them with --accept --time-margin");
    desk.succeed(&[&ACCEPT[..], &["--time-margin", "3"]].concat());
    // A thousand times slower than accepted, and ten thousand times faster: no noise of a machine does that.
    edit(&desk, |line| {
        if line["time_ratio"].is_number() && line["method"] == "unscented" {
            line["time_ratio"] = json!(1e-3);
        } else if line["time_ratio"].is_number() && line["method"] == "taylor-2" {
            line["time_ratio"] = json!(1e4);
        }
        true
    });
    let outcome = desk.run(&[&GATE[..], &["--time-margin", "100"]].concat());
    assert_eq!(outcome.code, Some(1), "{outcome:?}");
    let said = in_one_line(&outcome.out);
    assert!(said.contains("worse - unscented time, as a ratio to taylor-1 0.00"), "{said}");
    assert!(said.contains("better - taylor-2 time, as a ratio to taylor-1 10000.00"), "{said}");
    desk.succeed(&GATE);
}

#[test]
fn what_cannot_be_meant_is_refused_before_anything_is_measured() {
    let desk = Desk::new();
    let refuse = |more: &[&str]| desk.refuse(&[&GATE[..], more].concat());
    assert_eq!(refuse(&[]), "accepted/smoke.jsonl: there is no baseline yet; write one with --accept");
    assert_eq!(refuse(&["--odds", "0"]), "odds 0 are not above 0 and below 1; give such as 1e-4");
    assert!(refuse(&["--rounding=-1"]).starts_with("rounding -1 is not 0 or above"));
    assert!(refuse(&["--time-margin", "0.5"]).starts_with("time margin 0.5 is not 1 or above"));
    let said = refuse(&["--junit", "nowhere/gate.xml"]);
    assert_eq!(said, "nowhere/gate.xml: cannot be written: give a file in a folder that is there");
    std::fs::create_dir(desk.path("accepted")).unwrap();
    desk.write(FILE, "{\"baseline\":9}\n");
    assert!(refuse(&[]).starts_with("accepted/smoke.jsonl:1: is a baseline of format 9"));
    assert!(desk.refuse(&ACCEPT).starts_with("accepted/smoke.jsonl:1: "), "a damaged baseline is not written over");
    assert!(!desk.path("results").join("smoke").exists());
}

/// The words of the parser of options are its own.
#[test]
fn answers_need_a_name_and_a_name_needs_answers() {
    let desk = Desk::new();
    for more in [["--answers", "answers.jsonl"], ["--as", "tracker"]] {
        assert_eq!(desk.run(&[&GATE[..], &more].concat()).code, Some(2));
    }
}
