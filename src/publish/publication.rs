use std::io::{self, Write};
use std::path::{Path, PathBuf};

use base64::Engine;
use base64::prelude::BASE64_STANDARD;
use serde::{Deserialize, Serialize};

use super::markdown::{self, Linked};
use super::page::{self, Shown};
use super::pictures::Picture;
use super::prepared::Prepared;
use crate::guidance::{Study, StudyError};
use crate::whole_file::WholeFile;

/// Guidance out of the results of one or more suites.
#[derive(Debug)]
pub struct Publication {
    title: String,
    studies: Vec<Study>,
    png: bool,
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
        Ok(Self { title, studies, png: false })
    }

    /// Its studies.
    pub fn studies(&self) -> &[Study] {
        &self.studies
    }

    /// Writes `index.html`, `guidance.md`, `verdicts.json` and `pictures/` to a folder, which is made if it is not there; each file whole or not at all. Gives
    /// back what was written.
    ///
    /// # Errors
    /// [`PublishError`] with the file that could not be written.
    pub fn write(&self, to: &Path) -> Result<Vec<PathBuf>, PublishError> {
        let failed = PublishError::Rendering;
        let prepared = Prepared::all(&self.studies);
        let pictures: Vec<Picture<'_>> = prepared.iter().flat_map(Picture::all).collect();
        let drawn = pictures.iter().map(Picture::svg).collect::<Result<Vec<_>, _>>().map_err(failed)?;
        let files: Vec<String> = pictures.iter().map(|picture| format!("pictures/{}.svg", picture.name)).collect();
        let shown = pictures.iter().zip(&drawn).map(|(picture, svg)| Shown {
            alt: &picture.alt,
            caption: &picture.caption,
            data: format!("data:image/svg+xml;base64,{}", BASE64_STANDARD.encode(svg)),
            width: picture.size.0,
            height: picture.size.1,
        });
        let linked = pictures.iter().zip(&files).map(|(picture, file)| Linked {
            alt: &picture.alt,
            caption: &picture.caption,
            file,
        });
        let page = page::render(&self.title, &prepared, shown.collect()).map_err(failed)?;
        let text = markdown::render(&self.title, &prepared, linked.collect()).map_err(|e| failed(e.into()))?;
        let folder = to.join("pictures");
        std::fs::create_dir_all(&folder).map_err(|source| PublishError::Write { path: folder, source })?;
        let verdicts =
            serde_json::to_string_pretty(&Verdicts::of(&self.studies)).map_err(|e| failed(e.into()))? + "\n";
        let mut written = Vec::new();
        for (name, content) in [("index.html", &page), ("guidance.md", &text), (VERDICTS, &verdicts)] {
            written.push(file(to, name, content.as_bytes())?);
        }
        for ((picture, svg), name) in pictures.iter().zip(&drawn).zip(&files) {
            written.push(file(to, name, svg.as_bytes())?);
            if self.png {
                let bytes = picture.png().map_err(failed)?;
                written.push(file(to, &format!("pictures/{}.png", picture.name), &bytes)?);
            }
        }
        Ok(written)
    }

    /// Suites of which guidance that was published before says other verdicts than these results; suites that it does not hold
    /// count as such.
    ///
    /// # Errors
    /// [`PublishError::Study`] if the folder holds no guidance.
    pub fn outdated(&self, guidance: &Path) -> Result<Vec<String>, PublishError> {
        let path = guidance.join(VERDICTS);
        let text = std::fs::read_to_string(&path)
            .map_err(|source| StudyError::Unreadable { path: path.clone(), source })?;
        let published: Verdicts = serde_json::from_str(&text)
            .map_err(|e| StudyError::Content { path, message: format!("is not what publish writes: {e}") })?;
        let now = Verdicts::of(&self.studies).suites.into_iter();
        Ok(now.filter(|suite| !published.suites.contains(suite)).map(|suite| suite.suite).collect())
    }

    /// The same, with every picture as PNG too.
    #[must_use]
    pub fn with_png(self, png: bool) -> Self {
        Self { png, ..self }
    }
}

/// The file that says what was published.
const VERDICTS: &str = "verdicts.json";

/// What guidance rests on, in few words: enough to tell whether other results say the same.
#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
struct Verdicts {
    suites: Vec<VerdictsOf>,
}

#[derive(Debug, Clone, PartialEq, Eq, Serialize, Deserialize)]
struct VerdictsOf {
    suite: String,
    seed: u64,
    /// SHA-256 of the suite's text.
    hash: String,
    cases: usize,
    /// SHA-256 of all verdicts, see [`Study::fingerprint`].
    verdicts: String,
}

impl Verdicts {
    fn of(studies: &[Study]) -> Self {
        let of = |study: &Study| VerdictsOf {
            suite: study.provenance.suite.name.clone(),
            seed: study.provenance.seed,
            hash: study.provenance.suite.hash.clone(),
            cases: study.cases.len(),
            verdicts: study.fingerprint(),
        };
        Self { suites: studies.iter().map(of).collect() }
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
