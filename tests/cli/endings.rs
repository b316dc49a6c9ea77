//! Runs that end before their time: interrupted, or left by whoever reads them.

use std::process::Stdio;
#[cfg(unix)]
use std::time::{Duration, Instant};

use crate::contract::Manifest;
#[cfg(unix)]
use crate::contract::{CaseRecord, MomentsRecord, Row};
use crate::desk::{Desk, FILES, names};

/// Eight readings that are done at once, and sixteen hundred that take four million samples each: minutes on
/// two threads, seconds on thirty.
#[cfg(unix)]
const LONG: &str = r#"
precision = 1e-9
cap = 4_194_304
[[family]]
name = "quick"
[family.sensor]
kind = "linear"
H = [[1]]
[family.prior]
mean = [{ from = 1, to = 8, steps = 8 }]
sd = [1]
[family.noise]
sd = 0.1
[[family]]
name = "slow"
draws = 1600
[family.sensor]
kind = "range-bearing"
station = [0, 0]
[family.prior]
range = { draw = "uniform", from = "1 km", to = "9 km" }
bearing = "20 deg"
along_sd = "50 m"
across_sd = "5 deg"
[family.noise]
sd = ["10 m", "1 deg"]
"#;

#[cfg(unix)]
#[test]
fn an_interrupted_survey_keeps_what_is_finished() {
    let desk = Desk::new();
    desk.write("long.toml", LONG);
    let mut command = desk.command(&["survey", "long.toml", "--out", "out"]);
    let child = command.stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    // The folder is made just before the work begins; a second later the quick ones are done.
    let patience = Instant::now();
    while !desk.path("out/long").exists() {
        assert!(patience.elapsed() < Duration::from_secs(60), "the survey did not begin");
        std::thread::sleep(Duration::from_millis(20));
    }
    std::thread::sleep(Duration::from_secs(1));
    let interrupted = std::process::Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
    assert!(interrupted.success(), "it had ended already");
    let output = child.wait_with_output().unwrap();
    let said = String::from_utf8(output.stderr).unwrap();
    assert_eq!(output.status.code(), Some(3), "{said}");

    let manifest: Manifest = serde_json::from_str(&desk.read("out/long/manifest.json")).unwrap();
    let finished = manifest.cases.finished;
    assert!(!manifest.cases.complete && manifest.cases.asked == 1608, "{:?}", manifest.cases);
    assert!((1..1608).contains(&finished), "{finished} finished in a second");
    let message =
        format!("gaussworthy: interrupted in suite `long`: {finished} of 1608 cases are finished and written");
    assert_eq!(said.lines().last(), Some(message.as_str()), "{said}");
    assert!(!said.contains("panicked"), "{said}");

    assert_eq!(names(&desk.path("out/long")), FILES, "no temporary file is left");
    assert_eq!(desk.lines::<CaseRecord>("out/long/cases.jsonl").len(), finished);
    assert_eq!(desk.lines::<MomentsRecord>("out/long/references.jsonl").len(), finished);
    let rows: Vec<Row> = desk.rows("out/long/scores.csv");
    assert_eq!(rows.len(), finished * manifest.settings.methods.len());
}

/// As `survey | head` does, only sooner: nobody reads at all. The files are what was asked for.
#[test]
fn a_reader_who_leaves_does_not_stop_the_survey() {
    let desk = Desk::new();
    // Few cases: a survey that takes longer has progress to tell on standard error.
    for suite in ["mine.toml", "yours.toml"] {
        desk.write(
            suite,
            "[sensor]\nkind = \"linear\"\nH = [[1]]\n[prior]\nmean = [1]\nsd = [1]\n[noise]\nsd = 1\n",
        );
    }
    let mut command = desk.command(&["survey", "mine.toml", "yours.toml", "--no-timing", "--out", "out"]);
    let mut child = command.stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    let said = String::from_utf8(output.stderr).unwrap();
    assert_eq!(output.status.code(), Some(0), "{said}");
    // Nothing but the lines of progress that a slow machine gets.
    assert!(said.lines().all(|line| line.contains(" cases, ") && line.ends_with(" s left")), "{said}");
    for suite in ["mine", "yours"] {
        assert_eq!(names(&desk.path(&format!("out/{suite}"))), FILES);
        let manifest: Manifest = serde_json::from_str(&desk.read(&format!("out/{suite}/manifest.json"))).unwrap();
        assert!(manifest.cases.complete, "{suite}");
    }
}

#[test]
fn a_reader_may_leave_the_catalogue() {
    let desk = Desk::new();
    let mut child = desk.command(&["catalogue"]).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0));
}

/// A full disk below standard output is no reader who left: the run could not finish.
#[cfg(target_os = "linux")]
#[test]
fn standard_output_that_cannot_be_written_is_said() {
    let desk = Desk::new();
    let full = std::fs::File::options().write(true).open("/dev/full").unwrap();
    let output = desk.command(&["catalogue"]).stdout(full).stderr(Stdio::piped()).spawn().unwrap();
    let output = output.wait_with_output().unwrap();
    let said = String::from_utf8(output.stderr).unwrap();
    assert_eq!(output.status.code(), Some(3), "{said}");
    assert!(said.starts_with("gaussworthy: standard output: ") && said.lines().count() == 1, "{said}");
    assert_eq!(said.matches("os error").count(), 1, "{said}");
}
