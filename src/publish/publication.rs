use std::io::{self, Write};
use std::path::{Path, PathBuf};

use super::prepared::Prepared;
use super::{markdown, page};
use crate::guidance::{Study, StudyError};
use crate::whole_file::WholeFile;

/// Guidance out of the results of one or more suites.
#[derive(Debug)]
pub struct Publication {
    title: String,
    studies: Vec<Study>,
}

/// Guidance could not be published.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum PublishError {
    /// A results folder cannot be read.
    #[error(transparent)]
    Study(#[from] StudyError),
    /// Two results folders are of one suite.
    #[error("two of the folders hold results of the suite `{0}`; name each suite once")]
    SuiteTwice(String),
    /// What was to be published holds nothing.
    #[error("the results of suite `{0}` hold no case")]
    Empty(String),
    /// A template cannot be filled.
    #[error("cannot be rendered")]
    Rendering(#[source] Box<dyn std::error::Error + Send + Sync>),
    /// A file cannot be written.
    #[error("{}: cannot be written", path.display())]
    Write {
        /// The file or folder.
        path: PathBuf,
        /// What the system says.
        source: io::Error,
    },
}

impl PublishError {
    /// Whether what was given is at fault, and not the disk.
    pub fn is_input(&self) -> bool {
        matches!(self, Self::Study(_) | Self::SuiteTwice(_) | Self::Empty(_))
    }
}

impl Publication {
    /// Reads the results folders, in the order in which they are to be shown.
    ///
    /// # Errors
    /// [`PublishError`] if one cannot be read, is there twice or is empty.
    pub fn read(title: Option<&str>, folders: &[PathBuf]) -> Result<Self, PublishError> {
        let mut studies: Vec<Study> = Vec::new();
        for folder in folders {
            let study = Study::read(folder)?;
            let name = &study.provenance.suite.name;
            if studies.iter().any(|s| s.provenance.suite.name == *name) {
                return Err(PublishError::SuiteTwice(name.clone()));
            }
            if study.cases.is_empty() {
                return Err(PublishError::Empty(name.clone()));
            }
            studies.push(study);
        }
        let title = title.map_or_else(|| default_title(&studies), String::from);
        Ok(Self { title, studies })
    }

    /// Its studies.
    pub fn studies(&self) -> &[Study] {
        &self.studies
    }

    /// Writes `index.html` and `guidance.md` to a folder, which is made if it is not there; each file whole or not at all. Gives
    /// back what was written.
    ///
    /// # Errors
    /// [`PublishError`] with the file that could not be written.
    pub fn write(&self, to: &Path) -> Result<Vec<PathBuf>, PublishError> {
        let prepared = Prepared::all(&self.studies);
        let page = page::render(&self.title, &prepared, Vec::new()).map_err(PublishError::Rendering)?;
        let text =
            markdown::render(&self.title, &prepared, Vec::new()).map_err(|e| PublishError::Rendering(e.into()))?;
        std::fs::create_dir_all(to).map_err(|source| PublishError::Write { path: to.into(), source })?;
        [("index.html", page), ("guidance.md", text)]
            .into_iter()
            .map(|(name, text)| file(to, name, text.as_bytes()))
            .collect()
    }
}

fn file(folder: &Path, name: &str, bytes: &[u8]) -> Result<PathBuf, PublishError> {
    let path = folder.join(name);
    let attempt = || {
        let mut file = WholeFile::create(&path)?;
        file.write_all(bytes)?;
        file.finish()
    };
    attempt().map_err(|source| PublishError::Write { path: path.clone(), source })?;
    Ok(path)
}

fn default_title(studies: &[Study]) -> String {
    match studies {
        [study] if !study.provenance.suite.title.is_empty() => study.provenance.suite.title.clone(),
        _ => {
            let names: Vec<&str> = studies.iter().map(|study| study.provenance.suite.name.as_str()).collect();
            format!("Which Gaussian approximation to trust: {}", names.join(", "))
        }
    }
}
