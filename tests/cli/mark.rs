//! Cases handed out, and answers from elsewhere scored as a method's.

use std::io::Write;
use std::process::Stdio;

use serde_json::{Value, json};
use sha2::{Digest, Sha256};

use crate::contract::{Answers, CaseRecord, Manifest, Row, Verdict};
use crate::desk::{CAUTION, Desk, FILES_WITH_CHOICES, assert_narrow, assert_same, names, smoke_cases};

/// Four readings of one component: m = 1 to 4, P = 1, R = 1/4.
pub const READINGS: &str = "precision = 1e-1\n[sensor]\nkind = \"linear\"\nH = [[1]]\n[prior]\n\
    mean = [{ from = 1, to = 4, steps = 4 }]\nsd = [1]\n[noise]\nsd = 0.5\n[[method]]\nid = \"taylor-1\"\n";

/// What the Kalman filter predicts of reading `k`, from 0: mean m, covariance P + R, cross-covariance P.
pub fn reading(k: usize) -> Value {
    json!({"case": format!("readings-{k:03}"), "mean": [1 + k], "covariance": [[1.25]], "cross_covariance": [[1]]})
}

pub fn lines(records: impl IntoIterator<Item = Value>) -> String {
    records.into_iter().map(|record| format!("{record}\n")).collect()
}

pub fn manifest(desk: &Desk, folder: &str) -> Manifest {
    serde_json::from_str(&desk.read(&format!("{folder}/manifest.json"))).unwrap()
}

/// The rows of one method or implementation.
pub fn rows_of(desk: &Desk, folder: &str, name: &str) -> Vec<Row> {
    let rows: Vec<Row> = desk.rows(&format!("{folder}/scores.csv"));
    rows.into_iter().filter(|row| row.method == name).collect()
}

/// A report as one paragraph, for sentences that may be broken anywhere.
pub fn unbroken(report: &str) -> String {
    report.split_whitespace().collect::<Vec<_>>().join(" ")
}

#[test]
fn what_is_handed_out_is_read_back_as_the_same_cases() {
    let desk = Desk::new();
    // A draw, a state of which little is read, noise inside, no noise: everything a record can hold.
    let plain = "[sensor]\nkind = \"linear\"\nH = [[1, 0]]\n[prior]\nmean = [0.1, 2e-17]\nsd = [1e-9, 3]\n";
    desk.write("plain.toml", plain);
    for (suite, seed) in [("smoke", "1"), ("harbour-radar", "5"), ("plain.toml", "1")] {
        let shown = desk.succeed(&["hand-out", suite, "--seed", seed]);
        let said = desk.succeed(&["hand-out", suite, "--seed", seed, "--out", "cases.jsonl"]);
        assert_eq!((said.as_str(), &desk.read("cases.jsonl")), ("", &shown));
        let again = desk.succeed(&["hand-out", "--cases", "cases.jsonl"]);
        assert_eq!(again, shown, "read back and handed out once more");
        let cases: Vec<CaseRecord> = desk.lines("cases.jsonl");
        assert!(!cases.is_empty());
    }
    assert_ne!(
        desk.succeed(&["hand-out", "harbour-radar", "--seed", "6"]),
        desk.succeed(&["hand-out", "harbour-radar"])
    );
    assert_eq!(names(&desk.path("")), ["cases.jsonl", "plain.toml"], "no temporary file is left");
    // The bits that a survey starts from are those that it writes.
    desk.succeed(&["survey", "smoke", "--no-timing", "--methods", "taylor-1"]);
    assert_eq!(desk.read("results/smoke/cases.jsonl"), desk.succeed(&["hand-out", "smoke"]));
}

#[test]
fn handing_out_needs_one_suite_and_a_place() {
    let desk = Desk::new();
    std::fs::create_dir(desk.path("folder")).unwrap();
    for (arguments, start) in [
        (&["hand-out"][..], "0 suites are named; name one, or give --cases FILE"),
        (&["hand-out", "smoke", "power-meter"], "2 suites are named; name one"),
        (&["hand-out", "smok"], "smok: there is no bundled suite of this name; did you mean `smoke`?"),
        (&["hand-out", "smoke", "--out", "nowhere/x.jsonl"], "nowhere/x.jsonl: cannot be written: "),
        (&["hand-out", "smoke", "--out", "folder"], "folder: cannot be written: "),
    ] {
        let said = desk.refuse(arguments);
        assert!(said.starts_with(start), "{said}");
    }
    assert_eq!(names(&desk.path("")), ["folder"]);
}

/// The references themselves are the best answers there are.
#[test]
fn the_references_of_a_survey_pass_as_answers() {
    let desk = Desk::new();
    desk.succeed(&["survey", "smoke", "--no-timing", "--out", "first"]);
    let file = "first/smoke/references.jsonl";
    let mark = ["mark", "smoke", "--answers", file, "--as", "mine: v2", "--out", "marked"];
    let out = desk.succeed(&[&mark[..], &["--store", "first/.references"]].concat());
    assert_narrow(&out);
    assert!(out.contains(CAUTION), "{out}");
    let row = out.lines().find(|line| line.starts_with("mine: v2 ")).unwrap_or_else(|| panic!("{out}"));
    let fields: Vec<&str> = row["mine: v2 ".len()..].split_whitespace().collect();
    assert_eq!(fields, ["-", "-", "100", "%", "0", "%", "0", "%", "-"], "neither counted nor timed: {row}");

    assert_eq!(names(&desk.path("marked/smoke")), FILES_WITH_CHOICES);
    let rows = rows_of(&desk, "marked/smoke", "mine: v2");
    assert_eq!(rows.len(), smoke_cases());
    for row in rows {
        assert_eq!(row.verdict, Verdict::Trusted, "{row:?}");
        assert_eq!((row.values, row.jacobians, row.hessians), (None, None, None));
        assert!(row.times().iter().all(Option::is_none));
        // The same file was sampled anew or taken from the store: to the bit, and back out of JSON.
        assert!(row.scores().iter().all(|(value, error)| value.is_some() && error.is_some()), "{row:?}");
        assert_eq!(row.mean_error, Some(0.0), "{row:?}");
    }
    let found = manifest(&desk, "marked/smoke");
    let outside = &found.settings.outside.unwrap()[0];
    assert_eq!((outside.name.as_str(), outside.file.as_deref()), ("mine: v2", Some("references.jsonl")));
    let hash: String = Sha256::digest(desk.read(file)).iter().map(|byte| format!("{byte:02x}")).collect();
    assert_eq!(outside.sha256.as_ref(), Some(&hash));
    assert!(outside.command.is_none() && outside.timeout_seconds.is_none());
    let all = smoke_cases() as u64;
    let answers = &found.answers.unwrap()[0];
    assert_eq!((answers.asked, answers.valid, answers.invalid + answers.missing), (all, all, 0));
    assert!(answers.unknown + answers.unreadable == 0 && answers.failure.is_none());
    // Methods were timed all the same.
    assert!(found.cost.unwrap().iter().all(|c| c.time_ratio.is_some() && c.method != "mine: v2"));

    // Nothing else has moved.
    let without = |text: String| -> String {
        text.lines().filter(|line| !line.contains(",mine: v2,")).map(|line| format!("{line}\n")).collect()
    };
    desk.succeed(&[&mark[..], &["--no-timing"]].concat());
    assert_eq!(without(desk.read("marked/smoke/scores.csv")), desk.read("first/smoke/scores.csv"));
    assert_eq!(desk.read("marked/smoke/references.jsonl"), desk.read(file));
}

#[test]
fn answers_are_scored_by_what_they_say() {
    let desk = Desk::new();
    desk.write("readings.toml", READINGS);
    // A mean one standard deviation off, sqrt(1.25); twice the covariance; both within; a covariance below zero.
    let mut answers: Vec<Value> = (0..4).map(reading).collect();
    answers[1]["mean"] = json!([2.0 + 1.25_f64.sqrt()]);
    answers[2]["covariance"] = json!([[2.5]]);
    answers[3]["covariance"] = json!([[-1]]);
    answers.reverse();
    desk.write("answers.jsonl", &lines(answers));
    let out = desk.succeed(&["mark", "readings.toml", "--answers", "answers.jsonl", "--as", "mine", "--no-timing"]);
    let rows = rows_of(&desk, "results/readings", "mine");
    let verdicts: Vec<_> = rows.iter().map(|row| row.verdict).collect();
    assert_eq!(verdicts, [Verdict::Trusted, Verdict::Rejected, Verdict::Rejected, Verdict::Rejected]);
    // Rounding of a reference that is exact but for it.
    const ROUNDING: f64 = 1e-9;
    assert!((rows[1].mean_error.unwrap() - 1.0).abs() < ROUNDING, "{:?}", rows[1]);
    assert!((rows[2].variance_ratio_high.unwrap() - 2.0).abs() < ROUNDING, "{:?}", rows[2]);
    assert!(rows[1].reason.starts_with("mean biased: "), "{:?}", rows[1]);
    assert!(rows[3].reason.starts_with("no Gaussian: its covariance has the eigenvalue"), "{:?}", rows[3]);
    assert!(out.lines().any(|line| line.starts_with("mine ") && line.contains("75 %")), "{out}");
}

#[test]
fn a_mean_any_number_of_turns_off_is_the_same_mean() {
    let desk = Desk::new();
    desk.write(
        "west.toml",
        "precision = 1e-2\n[sensor]\nkind = \"bearing-only\"\nstation = [0, 0]\n[prior]\nrange = \"1 km\"\n\
         bearing = \"180 deg\"\nalong_sd = \"20 m\"\nacross_sd = \"20 m\"\n[noise]\nsd = \"1 deg\"\n",
    );
    desk.succeed(&["survey", "west.toml", "--no-timing"]);
    let reference: Vec<Value> = desk.lines("results/west/references.jsonl");
    let mean = reference[0]["mean"][0].as_f64().unwrap();
    let mut scores = Vec::new();
    for turns in [0.0, 1.0, -1.0, 3.0] {
        let mut turned = reference[0].clone();
        turned["mean"] = json!([mean + turns * std::f64::consts::TAU]);
        desk.write("answers.jsonl", &lines([turned]));
        desk.succeed(&["mark", "west.toml", "--answers", "answers.jsonl", "--as", "mine", "--no-timing"]);
        let rows = rows_of(&desk, "results/west", "mine");
        assert_eq!(rows[0].verdict, Verdict::Trusted, "{turns} turns: {rows:?}");
        scores.push(rows[0].mean_error.unwrap());
    }
    // Rounding of three turns, beside a standard deviation of a fiftieth.
    assert!(scores.iter().all(|score| *score < 1e-12), "{scores:?}");
}

/// Every way in which an answer can be of no use: it is said with its line, and the case counts as rejected.
#[test]
fn what_cannot_be_used_is_said_and_counts_as_rejected() {
    let desk = Desk::new();
    let suite = "precision = 1e-1\n[sensor]\nkind = \"range-bearing\"\nstation = [0, 0]\n[prior]\n\
        mean = [{ from = 900, to = 3000, steps = 16 }, 400, 0]\ncovariance = [[9, 0, 1], [0, 4, 0], [1, 0, 2]]\n\
        [noise]\nsd = [\"10 m\", \"0.3 deg\"]\n[[method]]\nid = \"taylor-1\"\n";
    desk.write("radar.toml", suite);
    let good = |k: usize| {
        let cross: Vec<[f64; 2]> = vec![[0.0; 2]; 3];
        json!({"case": format!("radar-{k:03}"), "mean": [1000, 0.1], "covariance": [[100, 0], [0, 1e-4]],
            "cross_covariance": cross})
    };
    let with = |k: usize, key: &str, value: Value| {
        let mut record = good(k);
        record[key] = value;
        record
    };
    let without = |k: usize, key: &str| {
        let mut record = good(k);
        record.as_object_mut().unwrap().remove(key);
        record
    };
    let renamed = |k: usize| {
        let mut record = with(k, "cross_covarience", json!([[0, 0], [0, 0], [0, 0]]));
        record.as_object_mut().unwrap().remove("cross_covariance");
        record
    };
    let flawed = [
        (with(0, "mean", json!([1])).to_string(), "mean has 1 numbers; give 2, one an output (range, bearing)"),
        (
            with(1, "covariance", json!([[100]])).to_string(),
            "covariance is 1 x 1; give 2 x 2, a row and a column an output",
        ),
        (
            with(2, "cross_covariance", json!([[0, 0, 0], [0, 0, 0]])).to_string(),
            "cross_covariance is 2 x 3; give 3 x 2, a row a state component, a column an output (range, bearing) (is it transposed?)",
        ),
        (
            with(3, "covariance", json!([[100, null], [0, 1]])).to_string(),
            "covariance[0][1] is null; give a finite number",
        ),
        (with(4, "mean", json!([1000, "east"])).to_string(), "mean[1] is \"east\"; give a finite number"),
        (
            with(5, "covariance", json!([[100, 0.5], [0.4, 1]])).to_string(),
            "covariance[0][1] is 0.5, but covariance[1][0] is 0.4; a covariance is symmetric",
        ),
        (with(6, "covariance", json!([100, 0, 0, 1])).to_string(), "covariance is no list of rows; give 2 x 2"),
        (
            with(7, "covariance", json!([[100, 0], [0]])).to_string(),
            "covariance has rows of 2 and of 1 numbers; give 2 x 2",
        ),
        (without(8, "covariance").to_string(), "`covariance` is missing"),
        (renamed(9).to_string(), "`cross_covariance` is missing; `cross_covarience` stands there, is it meant?"),
        (good(10).to_string().replace("1000", "NaN"), "is not JSON: "),
        (good(11).to_string().replace("1000", "1e999"), "is not JSON: number out of range"),
        (good(12).to_string()[..60].into(), "is not JSON: EOF while parsing"),
        (with(13, "mean", json!("none")).to_string(), "mean is no list; give 2 numbers"),
    ];
    let mut text: String = flawed.iter().map(|(line, _)| format!("{line}\n")).collect();
    let count = flawed.len();
    // Twice, here and below; one without an answer; then what belongs to no case.
    text.push_str(&format!("{}\n\n{}\n", good(14), good(14)));
    text.push_str(&with(0, "case", json!("radr-003")).to_string());
    text.push_str("\nhello\n[1, 2]\n{\"mean\":[1]}\n{\"case\":7}\n");
    desk.write("answers.jsonl", &text);
    let outcome = desk.run(&["mark", "radar.toml", "--answers", "answers.jsonl", "--as", "mine", "--no-timing"]);
    assert_eq!(outcome.code, Some(0), "{}", outcome.err);

    let rows = rows_of(&desk, "results/radar", "mine");
    assert!(rows.len() == 16 && rows.iter().all(|row| row.verdict == Verdict::Rejected), "{rows:?}");
    assert!(rows.iter().all(|row| row.scores().iter().all(|score| *score == (None, None))));
    let said = |note: &str| {
        let line = format!("radar: mine: {note}");
        assert!(outcome.err.lines().any(|l| l.starts_with(&line)), "wanted {line}\n{}", outcome.err);
    };
    for (k, (row, (_, flaw))) in rows.iter().zip(&flawed).enumerate() {
        let reason = format!("line {}: {flaw}", k + 1);
        assert!(row.reason.starts_with(&format!("invalid answer: {reason}")), "wanted {reason}\n{}", row.reason);
        said(&format!("case `radar-{k:03}`: {reason}"));
    }
    assert_eq!(rows[14].reason, "invalid answer: given twice, on lines 15 and 17; give one");
    assert_eq!(rows[15].reason, "no answer");
    said("case `radar-014`: given twice, on lines 15 and 17; give one");
    said("no answer for 1 of 16 cases: radar-015");
    said("line 18: there is no case `radr-003` in suite `radar`; did you mean `radar-003`? it is not scored");
    said("line 19: is not JSON: ");
    said("line 20: is no moments record; give {");
    said("line 21: `case` is missing; an answer names its case");
    said("line 22: `case` is no text; give the name of a case");

    let report = unbroken(&outcome.out);
    assert_narrow(&outcome.out);
    for sentence in [
        "mine gave no valid answer to 16 of 16 cases (1 missing, 15 invalid); they count as rejected, scores.csv says why.",
        "mine: 1 answers are for cases that are not in this suite, 4 lines name no case; none of them is scored.",
        "no valid answer (100 %)",
    ] {
        assert!(report.contains(sentence), "{sentence}\n{report}");
    }
    assert_eq!(
        manifest(&desk, "results/radar").answers.unwrap(),
        [Answers {
            name: "mine".into(),
            asked: 16,
            valid: 0,
            invalid: count as u64 + 1,
            missing: 1,
            unknown: 1,
            unreadable: 4,
            failure: None
        }]
    );
}

/// A bearing from the middle of its prior has no mean direction: nothing can be said of an answer there, but that there is
/// none needs no reference.
#[test]
fn on_a_refused_reference_only_what_is_missing_is_judged() {
    let desk = Desk::new();
    desk.write(
        "around.toml",
        "cap = 131072\nprecision = 1e-1\n[sensor]\nkind = \"bearing-only\"\nstation = [0, 0]\n[prior]\n\
         mean = [{ list = [0, 1000] }, 0]\nsd = [1, 1]\n[noise]\nsd = \"0.5 deg\"\n",
    );
    let answer = |k: usize| json!({"case": format!("around-{k:03}"), "mean": [0], "covariance": [[1e-3]], "cross_covariance": [[0], [0]]});
    for (answered, verdict, reason) in [
        (&[0, 1][..], Verdict::Undecided, "no verdict rests on this reference: "),
        (&[1], Verdict::Rejected, "no answer"),
    ] {
        desk.write("answers.jsonl", &lines(answered.iter().map(|&k| answer(k))));
        desk.succeed(&["mark", "around.toml", "--answers", "answers.jsonl", "--as", "mine", "--no-timing"]);
        let row = &rows_of(&desk, "results/around", "mine")[0];
        assert!(row.verdict == verdict && row.reason.starts_with(reason), "{row:?}");
    }
}

/// Single precision rounds mirrored entries apart; that is no flaw.
#[test]
fn rounding_in_single_precision_is_no_asymmetry() {
    let desk = Desk::new();
    let suite = READINGS.replace("H = [[1]]", "H = [[1], [0.5]]").replace("{ from = 1, to = 4, steps = 4 }", "1");
    desk.write("readings.toml", &suite);
    let mut answer = reading(0);
    answer["mean"] = json!([1, 0.5]);
    answer["covariance"] = json!([[1.25, 0.5 + 5e-8], [0.5 - 5e-8, 0.5]]);
    answer["cross_covariance"] = json!([[1, 0.5]]);
    desk.write("answers.jsonl", &lines([answer]));
    desk.succeed(&["mark", "readings.toml", "--answers", "answers.jsonl", "--as", "mine", "--no-timing"]);
    assert_eq!(rows_of(&desk, "results/readings", "mine")[0].verdict, Verdict::Trusted);
}

#[test]
fn answers_come_from_standard_input_too() {
    let desk = Desk::new();
    desk.write("readings.toml", READINGS);
    desk.write("answers.jsonl", &lines((0..4).map(reading)));
    desk.succeed(&[
        "mark",
        "readings.toml",
        "--answers",
        "answers.jsonl",
        "--as",
        "mine",
        "--no-timing",
        "--out",
        "file",
    ]);
    for (out, more) in [("left-out", &[][..]), ("dash", &["--answers", "-"])] {
        let arguments = [&["mark", "readings.toml", "--as", "mine", "--no-timing", "--out", out], more].concat();
        let mut child = desk
            .command(&arguments)
            .stdin(Stdio::piped())
            .stdout(Stdio::null())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        child.stdin.take().unwrap().write_all(desk.read("answers.jsonl").as_bytes()).unwrap();
        let output = child.wait_with_output().unwrap();
        assert_eq!(output.status.code(), Some(0), "{}", String::from_utf8_lossy(&output.stderr));
        assert_same(&desk, "file/readings", &format!("{out}/readings"));
        let outside = manifest(&desk, &format!("{out}/readings")).settings.outside.unwrap();
        assert_eq!(outside[0].file.as_deref(), Some("standard input"));
        let of_file = manifest(&desk, "file/readings").settings.outside.unwrap();
        assert_eq!(outside[0].sha256, of_file[0].sha256);
    }
}

#[test]
fn what_cannot_be_meant_is_refused_before_anything_is_measured() {
    let desk = Desk::new();
    desk.write("readings.toml", READINGS);
    desk.write("empty.jsonl", "\n");
    let mut other = reading(0);
    other["case"] = json!("reading-000");
    desk.write("other.jsonl", &lines([other]));
    desk.write("answers.jsonl", &lines((0..4).map(reading)));
    std::fs::create_dir(desk.path("folder")).unwrap();
    let mark =
        |answers: &'static str, name: &'static str| ["mark", "readings.toml", "--answers", answers, "--as", name];
    for (arguments, start, word) in [
        (
            &mark("empty.jsonl", "mine")[..],
            "empty.jsonl: holds no answer to any case of suite `readings`; it is empty",
            "one moments record a line",
        ),
        (
            &mark("other.jsonl", "mine"),
            "other.jsonl: holds no answer to any case of suite `readings`; the first: line 1: ",
            "did you mean `readings-000`?",
        ),
        (&mark("missing.jsonl", "mine"), "missing.jsonl: cannot be read: ", "os error"),
        (&mark("folder", "mine"), "folder: cannot be read: ", "directory"),
        (
            &mark("answers.jsonl", "taylor-1"),
            "--as taylor-1: `taylor-1` is a built-in method; give another label",
            "",
        ),
        (&mark("answers.jsonl", "unscented:mine"), "--as unscented:mine: `unscented` is a built-in method", ""),
        (&mark("answers.jsonl", "a,b"), "--as a,b: the name holds `,`", ""),
        (&mark("answers.jsonl", ""), "--as : the name is empty", ""),
        (&["mark", "--answers", "answers.jsonl", "--as", "mine"], "0 suites are named; name one", ""),
    ] {
        let said = desk.refuse(arguments);
        assert!(said.starts_with(start) && said.contains(word), "wanted {start}…{word}\n   got {said}");
    }
    let outcome = desk.run(&["mark", "readings.toml", "--answers", "answers.jsonl"]);
    assert!(outcome.code == Some(2) && outcome.err.contains("--as <NAME>"), "{}", outcome.err);
    assert!(!desk.path("results").exists());
}

#[test]
fn parts_with_answers_are_joined_to_the_files_of_a_single_run() {
    let desk = Desk::new();
    desk.write("readings.toml", READINGS);
    // One missing, one invalid, one unknown.
    let mut answers: Vec<Value> = (0..4).map(reading).collect();
    answers[1]["mean"] = json!([]);
    answers[2]["case"] = json!("readings-999");
    desk.write("answers.jsonl", &lines(answers));
    let mark = ["mark", "readings.toml", "--answers", "answers.jsonl", "--as", "mine", "--no-timing"];
    desk.succeed(&[&mark[..], &["--out", "single"]].concat());
    for k in 1..=3 {
        let (shard, out) = (format!("{k}/3"), format!("part-{k}"));
        desk.succeed(&[&mark[..], &["--shard", &shard, "--out", &out]].concat());
    }
    desk.succeed(&["merge", "part-1", "part-2", "part-3", "--out", "merged"]);
    assert_same(&desk, "single/readings", "merged/readings");
    let (single, merged) = (manifest(&desk, "single/readings"), manifest(&desk, "merged/readings"));
    assert_eq!(single.answers, merged.answers);
    let answers = &merged.answers.unwrap()[0];
    assert_eq!((answers.asked, answers.valid, answers.invalid, answers.missing, answers.unknown), (4, 2, 1, 1, 1));
}
