use std::fs::File;
use std::io::{self, Write};
use std::path::{Path, PathBuf};

use tempfile::NamedTempFile;

use super::{choices, envelopes, manifest, records, scores_csv};
use crate::guidance::{Conclusions, Scores};
use crate::suite::Suite;
use crate::survey::SurveyResult;
use crate::trust::Claim;
use crate::whole_file::WholeFile;

/// The results folder of one suite, `<out>/<suite>/`.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct ResultsFolder(PathBuf);

/// A results folder could not be written.
#[derive(Debug, thiserror::Error)]
#[error("{}: cannot be written", path.display())]
pub struct FolderError {
    /// The folder or file.
    pub path: PathBuf,
    /// What the system says.
    pub source: io::Error,
}

impl ResultsFolder {
    /// The folder of suite `suite` below `out`, made if it is not there and tried with a temporary file, so
    /// that a long survey does not end before a closed door.
    ///
    /// # Errors
    /// [`FolderError`] if it cannot be made or written.
    pub fn open(out: &Path, suite: &str) -> Result<Self, FolderError> {
        let path = out.join(suite);
        let attempt = std::fs::create_dir_all(&path).and_then(|()| NamedTempFile::new_in(&path).map(drop));
        match attempt {
            Ok(()) => Ok(Self(path)),
            Err(source) => Err(FolderError { path, source }),
        }
    }

    /// Where it is.
    pub fn path(&self) -> &Path {
        &self.0
    }

    /// Whether it holds results of a suite with another text, which [`ResultsFolder::write`] will replace.
    pub fn holds_another(&self, suite: &Suite) -> bool {
        let manifest = std::fs::read(self.0.join("manifest.json")).ok();
        let manifest = manifest.and_then(|bytes| serde_json::from_slice::<serde_json::Value>(&bytes).ok());
        let hash = manifest.as_ref().and_then(|manifest| manifest["suite"]["hash"].as_str());
        hash.is_some_and(|hash| hash != suite.hash)
    }

    /// Writes what a survey found: `cases.jsonl`, `references.jsonl`, `scores.csv`, what follows from them
    /// (`envelopes.json`, `choices.csv`) if the survey is whole, and last `manifest.json`; each whole or not at all.
    ///
    /// # Errors
    /// [`FolderError`] with the file that could not be written; files written before it stay.
    pub fn write(&self, survey: &SurveyResult<'_>) -> Result<Conclusions, FolderError> {
        self.file("cases.jsonl", |to| records::write_cases(survey, to))?;
        self.file("references.jsonl", |to| records::write_references(survey, to))?;
        self.file("scores.csv", |to| scores_csv::write(survey, to))?;
        let conclusions = if survey.is_complete() && survey.plan.shard.is_none() {
            self.conclude(survey.plan.sampler.seed, survey.suite.envelope)?
        } else {
            // What an earlier survey concluded does not follow from these scores.
            self.without("envelopes.json")?;
            self.without("choices.csv")?;
            Conclusions::default()
        };
        self.file("manifest.json", |to| manifest::write(survey, to))?;
        Ok(conclusions)
    }

    /// Draws what follows from `scores.csv`: `envelopes.json` if `claim` is given, and `choices.csv` if a family has two
    /// sweeps. `seed` is the survey's.
    ///
    /// # Errors
    /// [`FolderError`] with the file that could not be read or written.
    pub(super) fn conclude(&self, seed: u64, claim: Option<Claim>) -> Result<Conclusions, FolderError> {
        let path = self.0.join("scores.csv");
        let read = || {
            let scores = Scores::new(File::open(&path)?).map_err(io::Error::other)?;
            Conclusions::of(scores, seed, claim).map_err(io::Error::other)
        };
        let conclusions = read().map_err(|source| FolderError { path: path.clone(), source })?;
        match &conclusions.envelopes {
            Some(found) => self.file("envelopes.json", |to| envelopes::write(found, to))?,
            None => self.without("envelopes.json")?,
        }
        if conclusions.choices.is_empty() {
            self.without("choices.csv")?;
        } else {
            self.file("choices.csv", |to| choices::write(&conclusions.choices, to))?;
        }
        Ok(conclusions)
    }

    /// Takes a file away that does not belong to these results.
    fn without(&self, name: &str) -> Result<(), FolderError> {
        let path = self.0.join(name);
        match std::fs::remove_file(&path) {
            Err(source) if source.kind() != io::ErrorKind::NotFound => Err(FolderError { path, source }),
            _ => Ok(()),
        }
    }

    fn file(&self, name: &str, fill: impl FnOnce(&mut dyn Write) -> io::Result<()>) -> Result<(), FolderError> {
        let path = self.0.join(name);
        let attempt = || {
            let mut file = WholeFile::create(&path)?;
            fill(&mut file)?;
            file.finish_on_disk()
        };
        attempt().map_err(|source| FolderError { path: path.clone(), source })
    }
}
