//! The store of references as a survey uses it: it saves time, and no file of results shows whether it was there.

use std::fs;
#[cfg(unix)]
use std::process::{Child, Stdio};
#[cfg(unix)]
use std::time::{Duration, Instant};

use sha2::{Digest, Sha256};

use crate::contract::Manifest;
use crate::desk::{Desk, assert_same, names, smoke_cases};

/// Thirty-two cases of up to a million samples: a second or two of work.
const FLEET: &str = r#"
precision = 1e-9
cap = 1_048_576
[sensor]
kind = "range-bearing"
station = [0, 0]
[prior]
range = { from = "1 km", to = "9 km", steps = 8 }
bearing = "178 deg"
along_sd = "50 m"
across_sd = { list = ["1 deg", "5 deg", "10 deg", "20 deg"] }
[noise]
sd = ["10 m", "1 deg"]
"#;

fn survey(desk: &Desk, out: &str, more: &[&str]) {
    desk.succeed(&[&["survey", "smoke", "--no-timing", "--out", out], more].concat());
}

fn samples(desk: &Desk, folder: &str) -> u64 {
    serde_json::from_str::<Manifest>(&desk.read(&format!("{folder}/manifest.json"))).unwrap().samples
}

#[test]
fn any_precision_gives_the_files_of_a_fresh_run_whatever_is_stored() {
    let desk = Desk::new();
    for precision in ["1e-3", "1e-5", "5e-3"] {
        let fresh = format!("fresh-{precision}");
        survey(&desk, &fresh, &["--precision", precision]);
        survey(&desk, "kept", &["--precision", precision]);
        assert_same(&desk, &format!("{fresh}/smoke"), "kept/smoke");
    }
    assert!(samples(&desk, "fresh-1e-5/smoke") > 2 * samples(&desk, "fresh-1e-3/smoke"), "nothing was deepened");
    assert_eq!(names(&desk.path("kept")), [".references", "smoke"]);
    assert_eq!(names(&desk.path("kept/.references")).len(), smoke_cases());
    // Other methods need other verdicts decided: another depth.
    let methods = ["--methods", "gauss-hermite:order=5", "--precision", "1e-2"];
    survey(&desk, "fresh-methods", &methods);
    survey(&desk, "kept", &methods);
    assert_same(&desk, "fresh-methods/smoke", "kept/smoke");
}

/// A sum that is altered under a right checksum shows in the results: so the store is what they rest on. `--fresh` does
/// not look, and puts it right.
#[test]
fn stored_references_are_used_and_fresh_ones_are_not() {
    let desk = Desk::new();
    survey(&desk, "one", &["--store", "kept"]);
    for name in names(&desk.path("kept")) {
        let path = desk.path(&format!("kept/{name}"));
        let text = fs::read_to_string(&path).unwrap();
        let (body, _) = text.rsplit_once(",\n\"sha256\": \"").unwrap();
        let (facts, states) = body.split_once("\"states\"").unwrap();
        let states = states.replace("\"covariance\":[[", "\"covariance\":[[7");
        let body = format!("{facts}\"states\"{states}");
        let checksum: String = Sha256::digest(&body).iter().map(|byte| format!("{byte:02x}")).collect();
        fs::write(path, format!("{body},\n\"sha256\": \"{checksum}\"\n}}\n")).unwrap();
    }
    let altered = desk.run(&["survey", "smoke", "--no-timing", "--out", "altered", "--store", "kept"]);
    assert_eq!((altered.code, without_progress(&altered.err)), (Some(0), vec![]));
    let references = |out: &str| desk.read(&format!("{out}/smoke/references.jsonl"));
    assert!(references("one").lines().zip(references("altered").lines()).all(|(a, b)| a != b));
    survey(&desk, "fresh", &["--store", "kept", "--fresh"]);
    assert_same(&desk, "one/smoke", "fresh/smoke");
    survey(&desk, "again", &["--store", "kept"]);
    assert_same(&desk, "one/smoke", "again/smoke");
    assert_eq!(names(&desk.path("again")), ["smoke"], "the store is where it was asked for");
}

/// What was said on standard error but for the progress of a survey that takes its time.
fn without_progress(said: &str) -> Vec<&str> {
    said.lines().filter(|line| !line.contains(" samples/s")).collect()
}

#[test]
fn a_damaged_reference_is_said_once_and_sampled_anew() {
    let desk = Desk::new();
    survey(&desk, "one", &["--store", "kept"]);
    let name = &names(&desk.path("kept"))[4];
    let path = desk.path(&format!("kept/{name}"));
    let text = fs::read_to_string(&path).unwrap();
    fs::write(&path, &text[..text.len() / 2]).unwrap();
    let again = desk.run(&["survey", "smoke", "--no-timing", "--out", "again", "--store", "kept"]);
    assert_eq!(again.code, Some(0));
    let said = without_progress(&again.err);
    assert_eq!(said.len(), 1, "{}", again.err);
    let start = said[0].starts_with("smoke: a stored reference is sampled anew: ");
    assert!(start && said[0].contains(name.as_str()) && said[0].contains("cut short"), "{}", again.err);
    assert_same(&desk, "one/smoke", "again/smoke");
    assert_eq!(fs::read_to_string(&path).unwrap(), text);
    let silent = desk.run(&["survey", "smoke", "--no-timing", "--out", "again", "--store", "kept"]);
    assert_eq!((silent.code, without_progress(&silent.err)), (Some(0), vec![]));
}

#[test]
fn a_store_that_cannot_be_is_refused_before_the_work() {
    let desk = Desk::new();
    desk.write("file", "");
    let message = desk.refuse(&["survey", "smoke", "--no-timing", "--store", "file"]);
    assert!(message.starts_with("store of references: file: cannot be written: "), "{message}");
}

#[cfg(unix)]
fn begin(desk: &Desk, arguments: &[&str]) -> Child {
    desk.command(arguments).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap()
}

/// Waits until the store in `folder` has some references, and the survey is in the midst of its work.
#[cfg(unix)]
fn wait_for_some(desk: &Desk, folder: &str) {
    let patience = Instant::now();
    while !desk.path(folder).exists()
        || names(&desk.path(folder)).iter().filter(|n| !n.starts_with('.')).count() < 3
    {
        assert!(patience.elapsed() < Duration::from_secs(60), "nothing was stored");
        std::thread::sleep(Duration::from_millis(5));
    }
}

#[cfg(unix)]
#[test]
fn a_survey_that_was_stopped_goes_on_to_the_files_of_an_undisturbed_one() {
    let desk = Desk::new();
    desk.write("fleet.toml", FLEET);
    desk.succeed(&["survey", "fleet.toml", "--no-timing", "--out", "undisturbed"]);
    for signal in ["-INT", "-TERM", "-KILL"] {
        let out = format!("out{signal}");
        let arguments = ["survey", "fleet.toml", "--no-timing", "--threads", "1", "--out", &out];
        let child = begin(&desk, &arguments);
        wait_for_some(&desk, &format!("{out}/.references"));
        let kill = std::process::Command::new("kill").args([signal, &child.id().to_string()]).status().unwrap();
        assert!(kill.success(), "it had ended already");
        let output = child.wait_with_output().unwrap();
        let said = String::from_utf8(output.stderr).unwrap();
        if signal == "-KILL" {
            assert_eq!(output.status.code(), None, "{said}");
            assert!(!desk.path(&format!("{out}/fleet/manifest.json")).exists());
        } else {
            assert_eq!(output.status.code(), Some(3), "{said}");
            let manifest: Manifest =
                serde_json::from_str(&desk.read(&format!("{out}/fleet/manifest.json"))).unwrap();
            assert!(!manifest.cases.complete && manifest.cases.finished > 0, "{:?}", manifest.cases);
            let stored = names(&desk.path(&format!("{out}/.references"))).len();
            assert!(stored >= manifest.cases.finished, "{stored} stored, {:?}", manifest.cases);
        }
        desk.succeed(&arguments);
        assert_same(&desk, "undisturbed/fleet", &format!("{out}/fleet"));
    }
}

#[cfg(unix)]
#[test]
fn two_surveys_may_share_a_store_at_once() {
    let desk = Desk::new();
    desk.write("fleet.toml", FLEET);
    let arguments = |out| ["survey", "fleet.toml", "--no-timing", "--store", "kept", "--out", out];
    let both = ["one", "two"].map(|out| begin(&desk, &arguments(out)));
    for child in both {
        let output = child.wait_with_output().unwrap();
        assert_eq!((output.status.code(), output.stderr.len()), (Some(0), 0));
    }
    assert_same(&desk, "one/fleet", "two/fleet");
    desk.succeed(&["survey", "fleet.toml", "--no-timing", "--out", "alone"]);
    assert_same(&desk, "alone/fleet", "one/fleet");
    assert_eq!(names(&desk.path("kept")), names(&desk.path("alone/.references")));
}
