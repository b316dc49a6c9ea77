//! Joins the parts of a shared survey to what one run would have written. Nothing is computed: lines are taken from the
//! parts in turn, so memory does not grow with the number of cases.

use std::collections::BTreeMap;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use super::folder::{FolderError, ResultsFolder};
use super::part::{Part, Records, Rows};
use crate::trust::Claim;
use crate::whole_file::WholeFile;
use serde::Deserialize;
use serde_json::{Value, json};

/// One suite whose parts were joined.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Merged {
    /// Name of the suite.
    pub suite: String,
    /// How many parts there were.
    pub parts: usize,
    /// Cases of all parts together.
    pub cases: usize,
    /// Where the whole is.
    pub folder: PathBuf,
}

/// Why parts cannot be joined.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum MergeError {
    /// The parts are not one survey's, each once and finished; the message names what is missing or foreign.
    #[error("{0}")]
    Parts(String),
    /// The whole could not be written.
    #[error(transparent)]
    Folder(#[from] FolderError),
}

impl MergeError {
    pub(super) fn at(path: &Path, message: impl std::fmt::Display) -> Self {
        Self::Parts(format!("{}: {message}", path.display()))
    }
}

/// Joins the parts of every suite in `outs`, the `--out` folders of the parts, to results folders below `out`.
///
/// # Errors
/// [`MergeError::Parts`] unless, for each suite, every part is there once, finished, and of the same version, seed, suite
/// and settings as the others; [`MergeError::Folder`] if the whole cannot be written. All suites are checked before
/// the first is written.
pub fn merge(outs: &[PathBuf], out: &Path) -> Result<Vec<Merged>, MergeError> {
    let mut suites: BTreeMap<String, Vec<Part>> = BTreeMap::new();
    for folder in outs {
        for part in Part::all_in(folder)? {
            suites.entry(part.suite().into()).or_default().push(part);
        }
    }
    for (suite, parts) in &mut suites {
        put_in_order(suite, parts)?;
        let whole = out.join(suite);
        if let Some(part) = parts.iter().find(|part| is_same_folder(&part.folder, &whole)) {
            return Err(MergeError::at(&part.folder, "is a part; give --out another folder than the parts'"));
        }
    }
    suites.into_iter().map(|(suite, parts)| join(suite, &parts, out)).collect()
}

fn is_same_folder(one: &Path, other: &Path) -> bool {
    matches!((one.canonicalize(), other.canonicalize()), (Ok(one), Ok(other)) if one == other)
}

/// Sorts the parts, having checked that they are those of one survey.
fn put_in_order(suite: &str, parts: &mut [Part]) -> Result<(), MergeError> {
    parts.sort_by_key(|part| part.shard.part);
    let Some((first, others)) = parts.split_first() else { return Ok(()) };
    for part in others {
        if let Some(difference) = first.difference(part) {
            return Err(MergeError::at(
                &part.folder,
                format!("is no part of the same survey as {}: {difference}", first.folder.display()),
            ));
        }
    }
    let of = first.shard.of;
    for pair in parts.windows(2) {
        if pair[0].shard.part == pair[1].shard.part {
            let message = format!("is part {} of {of}, and so is {}", pair[0].shard.part, pair[1].folder.display());
            return Err(MergeError::at(&pair[0].folder, message));
        }
    }
    if parts.len() < of {
        // Any number of parts may be missing; the first few tell what to do.
        let there: Vec<usize> = parts.iter().map(|part| part.shard.part).collect();
        let mut missing = (1..=of).filter(|k| there.binary_search(k).is_err()).map(|k| k.to_string());
        let few = missing.by_ref().take(10).collect::<Vec<_>>().join(", ");
        let more = if missing.next().is_some() { ", .." } else { "" };
        let message = format!("suite `{suite}`: {} of {of} parts are missing: {few}{more}", of - parts.len());
        return Err(MergeError::Parts(message));
    }
    parts.iter().try_for_each(Part::check_finished)
}

/// Writes the whole of one suite.
fn join(suite: String, parts: &[Part], out: &Path) -> Result<Merged, MergeError> {
    let folder = ResultsFolder::open(out, &suite)?;
    let cases = parts[0].shard.suite_cases;
    let failed = |name: &str| {
        let path = folder.path().join(name);
        move |source: io::Error| MergeError::Folder(FolderError { path, source })
    };
    let create = |name: &str| WholeFile::create(&folder.path().join(name)).map_err(failed(name));
    let (mut case_file, mut reference_file) = (create("cases.jsonl")?, create("references.jsonl")?);
    let mut score_file = csv::Writer::from_writer(create("scores.csv")?);

    let mut records = parts.iter().map(Part::cases).collect::<Vec<_>>();
    let mut references = parts.iter().map(Part::references).collect::<Vec<_>>();
    let mut scores = parts.iter().map(Part::scores).collect::<Vec<_>>();
    let header = same_header(&mut scores)?;
    score_file.write_byte_record(&header).map_err(|e| failed("scores.csv")(e.into()))?;
    let rows = parts[0].rows();
    for index in 0..cases {
        let k = index % parts.len();
        let name = records[k].copy_next(None, &mut case_file).map_err(|e| e.or_in(failed("cases.jsonl")))?;
        references[k]
            .copy_next(Some(&name), &mut reference_file)
            .map_err(|e| e.or_in(failed("references.jsonl")))?;
        for _ in 0..rows {
            let row = scores[k].next(&name)?;
            score_file.write_byte_record(row).map_err(|e| failed("scores.csv")(e.into()))?;
        }
    }
    records.iter_mut().chain(&mut references).try_for_each(Records::check_end)?;
    scores.iter_mut().try_for_each(Rows::check_end)?;

    case_file.finish_on_disk().map_err(failed("cases.jsonl"))?;
    reference_file.finish_on_disk().map_err(failed("references.jsonl"))?;
    let score_file = score_file.into_inner().map_err(|e| failed("scores.csv")(e.into_error()))?;
    score_file.finish_on_disk().map_err(failed("scores.csv"))?;
    let seed = parts[0].manifest["seed"].as_u64();
    let claim = &parts[0].manifest["settings"]["envelope"];
    let claim = if claim.is_null() { None } else { Claim::deserialize(claim).ok() };
    let Some(seed) = seed else {
        return Err(MergeError::at(&parts[0].folder, "its manifest names no seed"));
    };
    folder.conclude(seed, claim)?;
    let write_manifest = || {
        let mut file = WholeFile::create(&folder.path().join("manifest.json"))?;
        serde_json::to_writer_pretty(&mut file, &manifest(parts))?;
        writeln!(file)?;
        file.finish_on_disk()
    };
    write_manifest().map_err(failed("manifest.json"))?;
    Ok(Merged { suite, parts: parts.len(), cases, folder: folder.path().into() })
}

fn same_header(scores: &mut [Rows]) -> Result<csv::ByteRecord, MergeError> {
    let mut headers = scores.iter_mut().map(Rows::header).collect::<Result<Vec<_>, _>>()?;
    match headers.iter().position(|header| *header != headers[0]) {
        Some(k) => Err(MergeError::at(scores[k].path(), "has other columns than the first part")),
        None => Ok(headers.swap_remove(0)),
    }
}

/// The manifest of the whole: sums of samples and times, the earliest beginning; machine and build only where all parts
/// share them.
fn manifest(parts: &[Part]) -> Value {
    let mut whole = parts[0].manifest.clone();
    let Some(fields) = whole.as_object_mut() else { return whole };
    fields.shift_remove("shard");
    for key in ["machine", "build"] {
        if parts.iter().any(|part| part.manifest[key] != parts[0].manifest[key]) {
            fields.shift_remove(key);
        }
    }
    let cases = parts[0].shard.suite_cases;
    let seconds = |key: &str| parts.iter().filter_map(|part| part.manifest["times"][key].as_f64()).sum::<f64>();
    fields["cases"] = json!({ "asked": cases, "finished": cases, "complete": true });
    fields["samples"] = json!(parts.iter().filter_map(|part| part.manifest["samples"].as_u64()).sum::<u64>());
    // RFC 3339 in UTC sorts as text.
    let started = parts.iter().filter_map(|part| part.manifest["times"]["started"].as_str()).min();
    fields["times"] = json!({
        "started": started,
        "sampling_seconds": seconds("sampling_seconds"),
        "timing_seconds": seconds("timing_seconds"),
    });
    if let Some(entries) = fields.get_mut("answers").and_then(Value::as_array_mut) {
        for (k, entry) in entries.iter_mut().enumerate() {
            join_answers(entry, k, parts);
        }
    }
    whole
}

/// The answers of the outside implementation number `k`, counted over all parts. Each part has read a file of answers whole,
/// so lines that belong to no case are the same ones in all; a command has run once a part.
fn join_answers(entry: &mut Value, k: usize, parts: &[Part]) {
    let of_file = parts[0].manifest["settings"]["outside"][k].get("file").is_some();
    let in_parts = |key: &'static str| parts.iter().map(move |part| &part.manifest["answers"][k][key]);
    let sum = |key: &'static str| in_parts(key).filter_map(Value::as_u64).sum::<u64>();
    for key in ["asked", "valid", "invalid", "missing"] {
        entry[key] = json!(sum(key));
    }
    if !of_file {
        for key in ["unknown", "unreadable"] {
            entry[key] = json!(sum(key));
        }
    }
    if let Some(failure) = in_parts("failure").find(|failure| failure.is_string()) {
        entry["failure"] = failure.clone();
    }
}
