//! The guidance that is committed in `results/guidance/` says what the program finds today.

use std::path::{Path, PathBuf};
use std::process::Command;

use gaussworthy::publish::Publication;
use gaussworthy::suite::{DEMONSTRATION, Suite};
use serde_json::Value;

fn published() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join("results/guidance")
}

const WAY_OUT: &str = "run results/guidance/make and commit what it writes";

/// The demonstration suites are surveyed again and every verdict compared; the larger suite by its text alone, for it takes
/// minutes.
#[test]
fn committed_guidance_is_current() {
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().to_str().unwrap();
    let done =
        Command::new(env!("CARGO_BIN_EXE_gaussworthy")).args(["survey", "--no-timing", "--out", out]).output();
    let done = done.unwrap();
    assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stderr));
    let results = DEMONSTRATION.map(|suite| folder.path().join(suite));
    let outdated = Publication::read(None, &results).unwrap().outdated(&published()).unwrap();
    assert!(outdated.is_empty(), "other verdicts than published: {outdated:?}; {WAY_OUT}");

    let text = std::fs::read_to_string(published().join("verdicts.json")).unwrap();
    let verdicts: Value = serde_json::from_str(&text).unwrap();
    for suite in verdicts["suites"].as_array().unwrap() {
        let name = suite["suite"].as_str().unwrap();
        assert_eq!(
            suite["hash"],
            Suite::load(name, None).unwrap().hash,
            "suite {name} has another text; {WAY_OUT}"
        );
    }
}

#[test]
fn another_verdict_is_noticed() {
    let folder = tempfile::tempdir().unwrap();
    let out = folder.path().to_str().unwrap();
    let survey = |seed: &str| {
        let arguments = ["survey", "smoke", "--no-timing", "--seed", seed, "--out", out];
        let done = Command::new(env!("CARGO_BIN_EXE_gaussworthy")).args(arguments).output().unwrap();
        assert!(done.status.success(), "{}", String::from_utf8_lossy(&done.stderr));
        Publication::read(None, &[folder.path().join("smoke")]).unwrap()
    };
    let guidance = folder.path().join("guidance");
    let first = survey("1");
    first.write(&guidance).unwrap();
    assert_eq!(first.outdated(&guidance).unwrap(), Vec::<String>::new());
    let scores = folder.path().join("smoke/scores.csv");
    let table = std::fs::read_to_string(&scores).unwrap();
    let other = table.replacen(",trusted,", ",undecided,", 1);
    assert_ne!(table, other);
    std::fs::write(&scores, other).unwrap();
    let second = Publication::read(None, &[folder.path().join("smoke")]).unwrap();
    assert_eq!(second.outdated(&guidance).unwrap(), ["smoke"]);
}

#[test]
fn the_showcase_stays_small_and_carries_the_caution() {
    let mut bytes = 0;
    for entry in [published(), published().join("pictures")].iter().flat_map(|f| std::fs::read_dir(f).unwrap()) {
        let meta = entry.unwrap().metadata().unwrap();
        bytes += if meta.is_file() { meta.len() } else { 0 };
    }
    assert!(bytes < 4 << 20, "{bytes} bytes");
    for name in ["index.html", "guidance.md"] {
        let text = std::fs::read_to_string(published().join(name)).unwrap();
        assert!(text.contains("certify nothing") && text.contains("nvented"), "{name}");
    }
}
