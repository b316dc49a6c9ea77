//! One part of a shared survey, read as it lies on the disk.

use std::fs::File;
use std::io::{self, BufRead, BufReader, Read, Seek, SeekFrom, Write};
use std::path::{Path, PathBuf};

use serde::Deserialize;
use serde_json::Value;

use super::merge::MergeError;

/// Bytes that are read of a file at a time.
const CHUNK: usize = 1 << 14;

/// A part: its folder and its manifest.
#[derive(Debug)]
pub(super) struct Part {
    pub folder: PathBuf,
    pub manifest: Value,
    pub shard: Shard,
}

/// What a manifest says of its part.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Deserialize)]
pub(super) struct Shard {
    pub part: usize,
    pub of: usize,
    pub suite_cases: usize,
}

/// What must be the same in all parts.
const SHARED: [&str; 4] = ["version", "seed", "suite", "settings"];

impl Part {
    /// The part of every suite in `out`, the `--out` folder of a part.
    pub fn all_in(out: &Path) -> Result<Vec<Self>, MergeError> {
        let unreadable = |e: io::Error| MergeError::at(out, format!("cannot be read: {e}"));
        let mut parts = Vec::new();
        for entry in std::fs::read_dir(out).map_err(unreadable)? {
            let folder = entry.map_err(unreadable)?.path();
            if folder.join("manifest.json").is_file() {
                parts.push(Self::open(folder)?);
            }
        }
        if parts.is_empty() {
            return Err(MergeError::at(
                out,
                "holds no results folder of a suite; give the --out folder of each part, which must have been run to \
                 its end",
            ));
        }
        Ok(parts)
    }

    fn open(folder: PathBuf) -> Result<Self, MergeError> {
        let path = folder.join("manifest.json");
        let text = std::fs::read(&path).map_err(|e| MergeError::at(&path, format!("cannot be read: {e}")))?;
        let manifest: Value =
            serde_json::from_slice(&text).map_err(|e| MergeError::at(&path, format!("is no manifest: {e}")))?;
        let shard = match manifest.get("shard") {
            None => {
                let message = "is a whole survey, or not of this program; merge joins parts made with --shard K/N";
                return Err(MergeError::at(&folder, message));
            }
            Some(shard) => Shard::deserialize(shard).ok().filter(|s| (1..=s.of).contains(&s.part)),
        };
        // The name becomes that of a folder: it must be the one that stands there already.
        let named = manifest["suite"]["name"].as_str().is_some_and(|name| folder.ends_with(name));
        match shard.filter(|_| named && manifest["cases"]["complete"].is_boolean()) {
            Some(shard) => Ok(Self { folder, manifest, shard }),
            None => Err(MergeError::at(&path, "is not the manifest of a part that was written here")),
        }
    }

    pub fn suite(&self) -> &str {
        self.manifest["suite"]["name"].as_str().unwrap_or_default()
    }

    /// Rows that each case has: one a method, one an outside implementation.
    pub fn rows(&self) -> usize {
        let count = |key: &str| self.manifest["settings"][key].as_array().map_or(0, Vec::len);
        count("methods") + count("outside")
    }

    /// In what `other` is of another survey, if it is.
    pub fn difference(&self, other: &Self) -> Option<String> {
        for key in SHARED {
            if let Some(difference) = difference(key, &self.manifest[key], &other.manifest[key]) {
                return Some(difference);
            }
        }
        let count = |what: &str, here: usize, there: usize| {
            (here != there).then(|| format!("{what} {there} against {here}"))
        };
        count("the number of parts is", self.shard.of, other.shard.of)
            .or_else(|| count("the number of cases is", self.shard.suite_cases, other.shard.suite_cases))
    }

    pub fn check_finished(&self) -> Result<(), MergeError> {
        let cases = &self.manifest["cases"];
        if cases["complete"] == true {
            return Ok(());
        }
        let Shard { part, of, .. } = self.shard;
        let message = format!(
            "part {part} of {of} is not finished: {} of {} cases are done. Run its command again, with --shard \
             {part}/{of} and the same --out: it goes on where it stopped",
            cases["finished"], cases["asked"]
        );
        Err(MergeError::at(&self.folder, message))
    }

    pub fn cases(&self) -> Records {
        Records::of(self.folder.join("cases.jsonl"))
    }

    pub fn references(&self) -> Records {
        Records::of(self.folder.join("references.jsonl"))
    }

    pub fn scores(&self) -> Rows {
        Rows::of(self.folder.join("scores.csv"))
    }
}

/// The first key below `key` in which two values differ.
fn difference(key: &str, here: &Value, there: &Value) -> Option<String> {
    if here == there {
        return None;
    }
    if let (Some(here), Some(there)) = (here.as_object(), there.as_object()) {
        let keys = here.keys().chain(there.keys());
        let mut inner = keys.filter_map(|k| {
            let value = |of: &serde_json::Map<String, Value>| of.get(k).cloned().unwrap_or(Value::Null);
            difference(&format!("{key}.{k}"), &value(here), &value(there))
        });
        return inner.next();
    }
    Some(format!("{key} is {there} against {here}"))
}

/// A file that is open only while it is read from: there may be more parts than files that a process may hold open.
#[derive(Debug)]
struct Reopened {
    path: PathBuf,
    offset: u64,
}

impl Read for Reopened {
    fn read(&mut self, to: &mut [u8]) -> io::Result<usize> {
        let mut file = File::open(&self.path)?;
        file.seek(SeekFrom::Start(self.offset))?;
        let count = file.read(to)?;
        self.offset += count as u64;
        Ok(count)
    }
}

/// Lines of JSON, each of a case.
#[derive(Debug)]
pub(super) struct Records {
    from: BufReader<Reopened>,
    path: PathBuf,
    line: Vec<u8>,
}

/// Why a record could not be copied.
pub(super) enum CopyError {
    Part(MergeError),
    Write(io::Error),
}

impl CopyError {
    pub fn or_in(self, failed: impl FnOnce(io::Error) -> MergeError) -> MergeError {
        match self {
            Self::Part(e) => e,
            Self::Write(e) => failed(e),
        }
    }
}

/// The name of the case, whatever else a record holds.
#[derive(Deserialize)]
struct Named {
    case: String,
}

impl Records {
    fn of(path: PathBuf) -> Self {
        let from = BufReader::with_capacity(CHUNK, Reopened { path: path.clone(), offset: 0 });
        Self { from, path, line: Vec::new() }
    }

    fn advance(&mut self) -> Result<(), MergeError> {
        self.line.clear();
        let read = self.from.read_until(b'\n', &mut self.line);
        read.map(drop).map_err(|e| MergeError::at(&self.path, format!("cannot be read: {e}")))
    }

    /// Copies the next line, which must be of case `expected` where that is given; gives the case's name.
    pub fn copy_next(&mut self, expected: Option<&str>, to: &mut dyn Write) -> Result<String, CopyError> {
        self.advance().map_err(CopyError::Part)?;
        let bad = |message: String| CopyError::Part(MergeError::at(&self.path, message));
        if !self.line.ends_with(b"\n") {
            return Err(bad(
                "ends before its last case, though its part is said to be finished; run it again".into()
            ));
        }
        let Named { case } =
            serde_json::from_slice(&self.line).map_err(|e| bad(format!("holds a line that is no record: {e}")))?;
        if let Some(expected) = expected.filter(|&expected| expected != case) {
            return Err(bad(format!("holds case `{case}` where case `{expected}` belongs; run its part again")));
        }
        to.write_all(&self.line).map_err(CopyError::Write)?;
        Ok(case)
    }

    pub fn check_end(&mut self) -> Result<(), MergeError> {
        self.advance()?;
        if self.line.is_empty() { Ok(()) } else { Err(MergeError::at(&self.path, TOO_LONG)) }
    }
}

const TOO_LONG: &str = "holds more cases than its part has; run it again";

/// Rows of a table, several of a case.
#[derive(Debug)]
pub(super) struct Rows {
    from: csv::Reader<Reopened>,
    path: PathBuf,
    row: csv::ByteRecord,
}

impl Rows {
    fn of(path: PathBuf) -> Self {
        let from = csv::ReaderBuilder::new()
            .has_headers(false)
            .buffer_capacity(CHUNK)
            .from_reader(Reopened { path: path.clone(), offset: 0 });
        Self { from, path, row: csv::ByteRecord::new() }
    }

    pub fn path(&self) -> &Path {
        &self.path
    }

    fn advance(&mut self) -> Result<bool, MergeError> {
        self.from.read_byte_record(&mut self.row).map_err(|e| MergeError::at(&self.path, e))
    }

    pub fn header(&mut self) -> Result<csv::ByteRecord, MergeError> {
        if self.advance()? { Ok(self.row.clone()) } else { Err(MergeError::at(&self.path, "is empty")) }
    }

    /// The next row, which must be of case `expected`.
    pub fn next(&mut self, expected: &str) -> Result<&csv::ByteRecord, MergeError> {
        if !self.advance()? || self.row.get(0) != Some(expected.as_bytes()) {
            let message = format!("lacks a row of case `{expected}`; run its part again");
            return Err(MergeError::at(&self.path, message));
        }
        Ok(&self.row)
    }

    pub fn check_end(&mut self) -> Result<(), MergeError> {
        if self.advance()? { Err(MergeError::at(&self.path, TOO_LONG)) } else { Ok(()) }
    }
}
