use std::io::{self, Write};
use std::path::{Path, PathBuf};

use tempfile::NamedTempFile;

use super::{manifest, records, scores_csv};
use crate::suite::Suite;
use crate::survey::SurveyResult;
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

    /// Writes what a survey found: `cases.jsonl`, `references.jsonl`, `scores.csv`, and last `manifest.json`,
    /// each whole or not at all.
    ///
    /// # Errors
    /// [`FolderError`] with the file that could not be written; files written before it stay.
    pub fn write(&self, survey: &SurveyResult<'_>) -> Result<(), FolderError> {
        self.file("cases.jsonl", |to| records::write_cases(survey, to))?;
        self.file("references.jsonl", |to| records::write_references(survey, to))?;
        self.file("scores.csv", |to| scores_csv::write(survey, to))?;
        self.file("manifest.json", |to| manifest::write(survey, to))
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
