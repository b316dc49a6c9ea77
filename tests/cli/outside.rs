//! Commands outside of the program, well-behaved and not: asked for answers while the survey runs. Their scripts are run by `sh`.

use std::process::Stdio;
use std::time::{Duration, Instant};

use serde_json::{Value, json};

use crate::contract::{CaseRecord, Manifest, Row, Verdict};
use crate::desk::{Desk, FILES, Outcome, assert_narrow, assert_same, names};
use crate::mark::{READINGS, lines, manifest, reading, rows_of, unbroken};

/// A desk with four readings, their right answers, and a script to answer with.
fn desk(script: &str) -> Desk {
    let desk = Desk::new();
    desk.write("readings.toml", READINGS);
    desk.write("answers.jsonl", &lines((0..4).map(reading)));
    desk.write("script", script);
    desk
}

/// How many cases [`large`] has.
const LARGE: usize = 40;

/// Cases and answers of some 3,500 bytes each, more than a pipe holds on either way: thirty components, of which one is read.
fn large(script: &str) -> Desk {
    let desk = desk(script);
    let list = |first: &str, others: &str| [&[first], &[others; 29][..]].concat().join(", ");
    let suite = READINGS
        .replace("[[1]]", &format!("[[{}]]", list("1", "0")))
        .replace(
            "[{ from = 1, to = 4, steps = 4 }]",
            &format!("[{}]", list("{ from = 1, to = 40, steps = 40 }", "0")),
        )
        .replace("sd = [1]", &format!("sd = [{}]", list("1", "1")));
    desk.write("readings.toml", &suite);
    let answers = (0..LARGE).map(|k| {
        let mut answer = reading(k);
        let cross: Vec<[u8; 1]> = (0..30).map(|i| [u8::from(i == 0)]).collect();
        answer["cross_covariance"] = json!(cross);
        answer["for_its_own_use"] = json!("x".repeat(3000));
        answer
    });
    desk.write("answers.jsonl", &lines(answers));
    let handed_out = desk.succeed(&["hand-out", "readings.toml"]);
    assert!(handed_out.len() > 100_000 && desk.read("answers.jsonl").len() > 100_000);
    desk
}

const SURVEY: [&str; 5] = ["survey", "readings.toml", "--no-timing", "--outside", "mine=sh script"];

/// A survey that must come to its end, whatever the script does.
fn survey(desk: &Desk, more: &[&str]) -> Outcome {
    let outcome = desk.run(&[&SURVEY[..], more].concat());
    assert_eq!(outcome.code, Some(0), "{}", outcome.err);
    assert_narrow(&outcome.out);
    outcome
}

fn rows(desk: &Desk) -> Vec<Row> {
    rows_of(desk, "results/readings", "mine")
}

fn verdicts(desk: &Desk) -> Vec<Verdict> {
    rows(desk).iter().map(|row| row.verdict).collect()
}

fn all_trusted(desk: &Desk, count: usize) {
    let verdicts = verdicts(desk);
    assert!(verdicts.len() == count && verdicts.iter().all(|v| *v == Verdict::Trusted), "{verdicts:?}");
}

/// Whether a process with this number, written to a file by a script, is still there.
fn lives(desk: &Desk, file: &str) -> bool {
    let id = desk.read(file);
    let probe = std::process::Command::new("kill").args(["-0", id.trim()]).stderr(Stdio::null()).status();
    probe.unwrap().success()
}

/// Waits until a file holds something.
fn wait_for(desk: &Desk, file: &str) {
    let patience = Instant::now();
    while !std::fs::metadata(desk.path(file)).is_ok_and(|m| m.len() > 0) {
        assert!(patience.elapsed() < Duration::from_secs(60), "{file} did not come");
        std::thread::sleep(Duration::from_millis(10));
    }
}

/// Waits until the process of a file is gone: what was killed may take a moment to be taken away.
fn wait_for_end(desk: &Desk, file: &str) {
    let patience = Instant::now();
    while lives(desk, file) {
        assert!(patience.elapsed() < Duration::from_secs(60), "the process of {file} lives on");
        std::thread::sleep(Duration::from_millis(10));
    }
}

#[test]
fn answers_in_any_order_are_scored_beside_the_methods() {
    let desk = desk("cat > asked; sed '1!G;h;$!d' answers.jsonl");
    let outcome = survey(&desk, &["--outside-timeout", "50"]);
    assert_eq!(outcome.err, "");
    all_trusted(&desk, 4);
    let cases: Vec<CaseRecord> = desk.lines("asked");
    assert_eq!(cases.len(), 4);
    assert_eq!(desk.read("asked"), desk.succeed(&["hand-out", "readings.toml"]), "asked as handed out");
    // As if its answers had come in a file.
    let mark = ["mark", "readings.toml", "--answers", "answers.jsonl", "--as", "mine", "--no-timing"];
    desk.succeed(&[&mark[..], &["--out", "marked"]].concat());
    assert_same(&desk, "results/readings", "marked/readings");
    let found = manifest(&desk, "results/readings");
    let outside = &found.settings.outside.unwrap()[0];
    assert_eq!(outside.command, Some(vec!["sh".to_string(), "script".into()]));
    assert_eq!((outside.timeout_seconds, outside.file.as_ref(), outside.sha256.as_ref()), (Some(50.0), None, None));
    assert_eq!(found.settings.methods, ["taylor-1"]);
    assert_eq!(found.answers, manifest(&desk, "marked/readings").answers);
}

#[test]
fn case_records_and_several_commands_do_too() {
    let desk = desk("cat \"$@\"");
    desk.succeed(&["hand-out", "readings.toml", "--out", "cases.jsonl"]);
    desk.write("with blanks", &lines((0..4).map(reading)));
    let out = desk.succeed(&[
        "survey",
        "--cases",
        "cases.jsonl",
        "--no-timing",
        "--precision",
        "1e-1",
        "--methods",
        "taylor-1",
        "--outside",
        "one=sh script 'with blanks'",
        "--outside",
        "two = sh script answers.jsonl",
    ]);
    for name in ["taylor-1", "one", "two"] {
        let rows = rows_of(&desk, "results/cases", name);
        assert!(rows.len() == 4 && rows.iter().all(|row| row.verdict == Verdict::Trusted), "{name}: {out}");
    }
}

#[test]
fn a_crash_keeps_what_was_answered() {
    let desk = desk("cat > asked; head -n 3 answers.jsonl; echo first >&2; echo 'the well is dry' >&2; exit 3");
    let outcome = survey(&desk, &[]);
    use Verdict::{Rejected, Trusted};
    assert_eq!(verdicts(&desk), [Trusted, Trusted, Trusted, Rejected]);
    let failure = "exit status 3 after 3 of 4 answers; its last words: first / the well is dry";
    assert_eq!(rows(&desk)[3].reason, format!("no answer: {failure}"));
    assert!(outcome.err.starts_with(&format!("readings: mine: {failure}\n")), "{}", outcome.err);
    assert!(outcome.err.contains("readings: mine: no answer for 1 of 4 cases: readings-003\n"), "{}", outcome.err);
    let report = unbroken(&outcome.out);
    assert!(report.contains(&format!("mine: {failure}.")), "{report}");
    assert!(report.contains("mine gave no valid answer to 1 of 4 cases (1 missing, 0 invalid)"), "{report}");
    let answers = &manifest(&desk, "results/readings").answers.unwrap()[0];
    assert_eq!(answers.failure.as_deref(), Some(failure));
}

#[test]
fn other_ends_are_told_apart() {
    for (script, failure) in [
        ("head -n 1 answers.jsonl", "exit status 0 after 1 of 4 answers"),
        ("head -n 1 answers.jsonl; kill -9 $$", "ended by signal 9 after 1 of 4 answers"),
        ("cat answers.jsonl; exit 5", "exit status 5 after 4 of 4 answers"),
        // What it leaves behind holds its output open, and is ended.
        ("cat answers.jsonl; sleep 300 & exit 6", "exit status 6 after 4 of 4 answers"),
    ] {
        let desk = desk(script);
        let outcome = survey(&desk, &[]);
        assert!(outcome.err.starts_with(&format!("readings: mine: {failure}\n")), "{}", outcome.err);
        assert_eq!(rows(&desk)[0].verdict, Verdict::Trusted, "what was answered counts: {failure}");
        let answers = &manifest(&desk, "results/readings").answers.unwrap()[0];
        assert_eq!(answers.failure.as_deref(), Some(failure));
    }
}

#[test]
fn a_silent_command_is_stopped_with_all_it_started() {
    let desk = desk("echo $$ > parent; sleep 300 & echo $! > child; echo tired >&2; wait");
    let outcome = survey(&desk, &["--outside-timeout", "1.5"]);
    let failure = "stopped after 0 of 4 answers and 1.5 s without a new one; its last words: tired";
    assert!(outcome.err.starts_with(&format!("readings: mine: {failure}\n")), "{}", outcome.err);
    for row in rows(&desk) {
        assert_eq!((row.verdict, row.reason), (Verdict::Rejected, format!("no answer: {failure}")));
    }
    wait_for_end(&desk, "parent");
    wait_for_end(&desk, "child");
}

/// Silence is what counts, not the whole: four answers, each in time.
#[test]
fn a_slow_command_may_take_its_time() {
    let desk = desk("while read -r line; do echo \"$line\"; sleep 1; done < answers.jsonl");
    let outcome = survey(&desk, &["--outside-timeout", "3.5"]);
    assert_eq!(outcome.err, "");
    all_trusted(&desk, 4);
}

#[test]
fn what_says_much_but_nothing_new_is_stopped() {
    for script in [
        // Without a line's end, with nothing but lines' ends, the same answer over and over.
        "yes | tr -d '\\n'",
        "yes ''",
        "read -r line < answers.jsonl; yes \"$line\"",
    ] {
        let desk = desk(script);
        let outcome = survey(&desk, &["--outside-timeout", "0.5"]);
        assert!(outcome.err.contains(" of 4 answers and 0.5 s without a new one"), "{script}: {}", outcome.err);
        assert!(verdicts(&desk).iter().all(|v| *v == Verdict::Rejected), "{script}");
    }
}

#[test]
fn an_answer_given_twice_counts_for_nothing() {
    let desk = desk("head -n 2 answers.jsonl; cat answers.jsonl");
    survey(&desk, &[]);
    use Verdict::{Rejected, Trusted};
    assert_eq!(verdicts(&desk), [Rejected, Rejected, Trusted, Trusted]);
    assert_eq!(rows(&desk)[1].reason, "invalid answer: given twice, on lines 2 and 4; give one");
}

#[test]
fn an_endless_line_takes_no_room_and_hides_nothing() {
    let desk = desk("head -c 20000000 /dev/zero | tr '\\0' x; echo; cat answers.jsonl");
    let outcome = survey(&desk, &[]);
    assert!(
        outcome.err.contains("mine: line 1: is longer than 8 MiB, the most for an answer\n"),
        "{}",
        outcome.err
    );
    all_trusted(&desk, 4);
    assert_eq!(manifest(&desk, "results/readings").answers.unwrap()[0].unreadable, 1);
}

/// All pipes are full at once, in any order: nobody waits for anybody.
#[test]
fn full_pipes_do_not_stop_anybody() {
    for script in [
        "head -c 5000000 /dev/zero | tr '\\0' x >&2; cat answers.jsonl; cat > /dev/null",
        "cat answers.jsonl; cat > asked",
        "cat > asked; cat answers.jsonl",
        // Neither reads its input; the second closes it.
        "cat answers.jsonl",
        "exec < /dev/null; sleep 0.2; cat answers.jsonl",
    ] {
        let desk = large(script);
        let outcome = survey(&desk, &[]);
        assert_eq!(
            outcome.err.lines().filter(|line| line.contains("mine")).count(),
            0,
            "{script}: {}",
            outcome.err
        );
        all_trusted(&desk, LARGE);
    }
}

#[test]
fn what_cannot_be_started_or_meant_is_refused_before_anything_is_sampled() {
    let desk = desk("cat answers.jsonl");
    let refuse = |outside: &[&str]| desk.refuse(&[&["survey", "readings.toml", "--no-timing"], outside].concat());
    for (outside, start) in [
        (
            &["--outside", "mine=./nowhere --fast"][..],
            "--outside mine: `./nowhere` cannot be started; give a program",
        ),
        (&["--outside", "mine"], "--outside mine: is not of the form NAME=COMMAND ARG.."),
        (&["--outside", "mine="], "--outside mine=: is not of the form NAME=COMMAND ARG.."),
        (
            &["--outside", "mine=sh 'script"],
            "--outside mine=sh 'script: cannot be split into words as a shell does",
        ),
        (&["--outside", "taylor-1=sh script"], "--outside taylor-1=sh script: `taylor-1` is a built-in method"),
        (&["--outside", "=sh script"], "--outside =sh script: the name is empty"),
        (
            &["--outside", "mine=sh script", "--outside", "mine=sh other"],
            "--outside mine=sh other: the name `mine` is taken; give another",
        ),
    ] {
        let said = refuse(outside);
        assert!(said.starts_with(start), "{said}");
    }
    assert!(refuse(&["--outside", "mine=./nowhere"]).contains("os error"));
    for timeout in ["0", "-1", "nan", "inf", "soon"] {
        let outcome = desk.run(&[&SURVEY[..], &[&format!("--outside-timeout={timeout}")]].concat());
        assert!(
            outcome.code == Some(2) && outcome.err.contains("give a number of seconds above 0"),
            "{}",
            outcome.err
        );
    }
    assert!(!desk.path("results/readings/manifest.json").exists());
    let kept = desk.path("results/.references");
    assert!(!kept.exists() || names(&kept).is_empty(), "nothing was sampled");
}

#[test]
fn an_interrupt_ends_the_command_too() {
    let desk = desk("echo $$ > parent; sleep 300 & echo $! > child; wait");
    let child = desk.command(&SURVEY).stdout(Stdio::piped()).stderr(Stdio::piped()).spawn().unwrap();
    wait_for(&desk, "child");
    let interrupted = std::process::Command::new("kill").args(["-INT", &child.id().to_string()]).status().unwrap();
    assert!(interrupted.success(), "it had ended already");
    let output = child.wait_with_output().unwrap();
    let said = String::from_utf8(output.stderr).unwrap();
    assert_eq!((output.status.code(), output.stdout.len()), (Some(3), 0), "{said}");
    let last = "gaussworthy: mine: interrupted while it was asked; nothing was measured";
    assert_eq!(said.lines().last(), Some(last), "{said}");
    wait_for_end(&desk, "parent");
    wait_for_end(&desk, "child");
}

#[test]
fn a_part_is_asked_for_its_own_cases_and_joined_to_the_whole() {
    let desk = desk("cat > asked-$$; cat answers.jsonl");
    desk.succeed(&[&SURVEY[..], &["--out", "single"]].concat());
    let fed = |before: &[String]| {
        let all = names(&desk.path("")).into_iter().filter(|name| name.starts_with("asked-"));
        all.filter(|name| !before.contains(name)).collect::<Vec<_>>()
    };
    let mut seen = fed(&[]);
    for k in 1..=6 {
        let (shard, out) = (format!("{k}/6"), format!("part-{k}"));
        desk.succeed(&[&SURVEY[..], &["--shard", &shard, "--out", &out]].concat());
        // Of four cases, the parts 5 and 6 of 6 have none: there is nobody to ask.
        let asked = fed(&seen);
        assert_eq!(asked.len(), usize::from(k <= 4), "part {k}");
        for file in &asked {
            let cases: Vec<Value> = desk.lines(file);
            assert_eq!(
                cases.iter().map(|c| c["case"].as_str().unwrap()).collect::<Vec<_>>(),
                [format!("readings-{:03}", k - 1)]
            );
        }
        seen.extend(asked);
    }
    let parts: Vec<String> = (1..=6).rev().map(|k| format!("part-{k}")).collect();
    let parts: Vec<&str> = parts.iter().map(String::as_str).collect();
    desk.succeed(&[&["merge", "--out", "merged"], &parts[..]].concat());
    assert_same(&desk, "single/readings", "merged/readings");
    assert_eq!(names(&desk.path("merged/readings")), FILES);
    let found = |folder: &str| -> Manifest { manifest(&desk, folder) };
    assert_eq!(found("single/readings").answers, found("merged/readings").answers);
    // Another command makes another survey.
    desk.write("other", "cat > /dev/null; cat answers.jsonl");
    let other = ["survey", "readings.toml", "--no-timing", "--outside", "mine=sh other"];
    desk.succeed(&[&other[..], &["--shard", "1/6", "--out", "foreign"]].concat());
    let message = desk.refuse(&[&["merge", "--out", "never", "foreign"], &parts[..5]].concat());
    assert!(message.contains("settings.outside"), "{message}");
}
