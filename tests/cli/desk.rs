//! A fresh folder to work in, and the program run there.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Stdio};

use serde::de::DeserializeOwned;

/// The caution that every summary ends with.
pub const CAUTION: &str = "Results guide a choice, they certify nothing";
/// Columns that a report may take.
pub const WIDTH: usize = 100;
/// Files of a results folder.
pub const FILES: [&str; 4] = ["cases.jsonl", "manifest.json", "references.jsonl", "scores.csv"];
/// The same of a suite in which a family has two sweeps.
pub const FILES_WITH_CHOICES: [&str; 5] =
    ["cases.jsonl", "choices.csv", "manifest.json", "references.jsonl", "scores.csv"];

/// A folder that is removed in the end.
#[derive(Debug)]
pub struct Desk(tempfile::TempDir);

/// What a run of the program left.
#[derive(Debug)]
pub struct Outcome {
    pub code: Option<i32>,
    pub out: String,
    pub err: String,
}

/// How many cases the bundled suite `smoke` has.
pub fn smoke_cases() -> usize {
    gaussworthy::suite::Suite::load("smoke", None).unwrap().cases.len()
}

impl Desk {
    pub fn new() -> Self {
        Self(tempfile::tempdir().unwrap())
    }

    pub fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    pub fn write(&self, name: &str, text: &str) {
        fs::write(self.path(name), text).unwrap();
    }

    pub fn read(&self, name: &str) -> String {
        fs::read_to_string(self.path(name)).unwrap_or_else(|e| panic!("{name}: {e}"))
    }

    /// One JSON value a line.
    pub fn lines<T: DeserializeOwned>(&self, name: &str) -> Vec<T> {
        let text = self.read(name);
        text.lines().map(|line| serde_json::from_str(line).unwrap_or_else(|e| panic!("{e}: {line}"))).collect()
    }

    /// The rows of a CSV file.
    pub fn rows<T: DeserializeOwned>(&self, name: &str) -> Vec<T> {
        let text = self.read(name);
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        reader.deserialize().map(|row| row.unwrap_or_else(|e| panic!("{name}: {e}"))).collect()
    }

    /// The program, ready to run here.
    pub fn command(&self, arguments: &[&str]) -> Command {
        let mut command = Command::new(env!("CARGO_BIN_EXE_gaussworthy"));
        command.args(arguments).current_dir(self.0.path()).stdin(Stdio::null());
        command
    }

    pub fn run(&self, arguments: &[&str]) -> Outcome {
        let output = self.command(arguments).output().unwrap();
        let text = |bytes| String::from_utf8(bytes).unwrap();
        Outcome { code: output.status.code(), out: text(output.stdout), err: text(output.stderr) }
    }

    /// Runs what must succeed; gives what stood on standard output.
    pub fn succeed(&self, arguments: &[&str]) -> String {
        let outcome = self.run(arguments);
        assert_eq!(outcome.code, Some(0), "{arguments:?}: {}", outcome.err);
        outcome.out
    }

    /// Runs what must be refused: exit code 2, nothing on standard output, one line on standard error, which is
    /// given without the program's name.
    pub fn refuse(&self, arguments: &[&str]) -> String {
        let Outcome { code, out, err } = self.run(arguments);
        assert_eq!((code, out.as_str()), (Some(2), ""), "{arguments:?}: {err}");
        let message = err.strip_prefix("gaussworthy: ").and_then(|rest| rest.strip_suffix('\n'));
        let message = message.unwrap_or_else(|| panic!("{arguments:?}: {err}"));
        assert!(!message.contains('\n') && !message.contains("panicked"), "{arguments:?}: {err}");
        message.into()
    }
}

/// The names in a folder, sorted.
pub fn names(folder: &Path) -> Vec<String> {
    let entries = fs::read_dir(folder).unwrap_or_else(|e| panic!("{}: {e}", folder.display()));
    let mut names: Vec<_> = entries.map(|e| e.unwrap().file_name().into_string().unwrap()).collect();
    names.sort();
    names
}

/// Asserts that files which hold no time are the same to the byte in two results folders.
pub fn assert_same(desk: &Desk, one: &str, other: &str) {
    let all = ["cases.jsonl", "references.jsonl", "scores.csv", "choices.csv"];
    for name in all.into_iter().filter(|name| *name != "choices.csv" || desk.path(one).join(name).exists()) {
        // Not assert_eq: megabytes help nobody.
        let (left, right) = (desk.read(&format!("{one}/{name}")), desk.read(&format!("{other}/{name}")));
        let line = left.lines().zip(right.lines()).position(|(a, b)| a != b);
        assert!(left == right, "{one} and {other} differ in {name}, first in line {line:?}");
    }
}

/// Asserts that the columns of a table which stand in both are the same to the byte, but for the family: a case record has none.
pub fn assert_shared_columns_are_same(desk: &Desk, one: &str, other: &str) {
    let table = |name: &str| {
        let text = desk.read(name);
        let mut reader = csv::Reader::from_reader(text.as_bytes());
        let header = reader.headers().unwrap().clone();
        (header, reader.records().map(Result::unwrap).collect::<Vec<_>>())
    };
    let ((header, rows), (others, other_rows)) = (table(one), table(other));
    assert_eq!(rows.len(), other_rows.len());
    let shared = others.iter().enumerate().filter(|(_, name)| *name != "family");
    let mut compared = 0;
    for (place, name) in shared {
        let Some(here) = header.iter().position(|known| known == name) else { continue };
        compared += 1;
        for (row, other) in rows.iter().zip(&other_rows) {
            assert_eq!(row.get(here), other.get(place), "column {name} of {one} and {other:?}");
        }
    }
    assert!(compared > 40, "{compared} columns");
}

/// Asserts that no line is wider than a report may be; the path of the results is as long as it is.
pub fn assert_narrow(report: &str) {
    for line in report.lines().filter(|line| !line.trim_start().starts_with("Written to ")) {
        assert!(line.chars().count() <= WIDTH, "{} columns: {line}", line.chars().count());
    }
}
