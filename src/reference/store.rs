use std::fmt::Write as _;
use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};
use serde_json::Value;
use sha2::{Digest, Sha256};
use tempfile::NamedTempFile;

use super::settings::SamplerSettings;
use super::state::{Look, Place, SamplerState};
use crate::suite::{Case, hex};
use crate::whole_file::WholeFile;

/// Version of the states in a store.
///
/// To be raised by every change that moves a bit of a sampled moment (points, quantile, sensors, pilot, control
/// variates, order of sums) or the layout of a state: states of before are then not found, and sampled anew.
pub const FORMAT: u32 = 1;

/// What a file of the store says that it is.
const WHAT: &str = "the state of a sampled reference: moments at every doubling, sums of every replicate";
/// Stands between what the checksum is of and the checksum.
const SEAL: &str = ",\n\"sha256\": \"";
/// Ends a file.
const END: &str = "\"\n}\n";

/// A folder of sampled references, one JSON file each, from which later surveys go on.
///
/// A file is named by a hash of what its bits depend on: the question, the seed, the number of replicates, the first
/// step of the doubling and [`FORMAT`]; neither the precision, which is only a time to stop, nor the case's name. It ends with
/// the SHA-256 of the rest. Files are written whole or not at all, so any number of processes may share a store: the last
/// one that finishes a file wins, and each of theirs is right.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Store {
    folder: PathBuf,
    fresh: bool,
}

/// What a store has of a case.
#[derive(Debug, Clone, PartialEq)]
pub enum Loaded {
    /// The deepest state that was saved.
    Found(Box<SamplerState>),
    /// Nothing.
    Missing,
    /// A file that cannot be used, and why.
    Damaged(String),
}

/// What became of a state that was to be saved.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Saved {
    /// It is in the store.
    Written,
    /// The store has as deep a one already.
    AsDeep,
    /// It holds a value that is no finite number, which JSON cannot say.
    NotFinite,
}

/// A store cannot be written.
#[derive(Debug, thiserror::Error)]
#[error("{}: cannot be written", path.display())]
pub struct StoreError {
    /// The folder or file.
    pub path: PathBuf,
    /// What the system says.
    pub source: io::Error,
}

/// A file of the store, as it is read.
#[derive(Deserialize)]
#[serde(deny_unknown_fields)]
struct Entry {
    #[serde(rename = "what")]
    _what: String,
    format: u32,
    seed: u64,
    replicates: usize,
    #[serde(rename = "points")]
    _points: u64,
    question: Value,
    looks: Vec<Look>,
    places: Vec<Place>,
    #[serde(rename = "sha256")]
    _sha256: String,
}

impl Store {
    /// The store in `folder`, which is made if it is not there and tried with a temporary file.
    ///
    /// # Errors
    /// [`StoreError`] if it cannot be made or written.
    pub fn open(folder: &Path) -> Result<Self, StoreError> {
        std::fs::create_dir_all(folder)
            .and_then(|()| NamedTempFile::new_in(folder).map(drop))
            .map_err(|source| StoreError { path: folder.into(), source })?;
        Ok(Self { folder: folder.into(), fresh: false })
    }

    /// The same store, but what is in it is ignored and written over.
    pub fn fresh(self) -> Self {
        Self { fresh: true, ..self }
    }

    /// The file of `case` under `settings`, whether or not it is there.
    pub fn path(&self, case: &Case, settings: &SamplerSettings) -> PathBuf {
        let mut hash = Sha256::new();
        hash.update(b"gaussworthy store\0");
        hash.update(FORMAT.to_le_bytes());
        hash.update(settings.seed.to_le_bytes());
        hash.update((settings.replicates as u64).to_le_bytes());
        hash.update(settings.blocks_after(0).unwrap_or(0).to_le_bytes());
        hash.update(case.question());
        self.folder.join(format!("{}.json", hex(&hash.finalize()[..16])))
    }

    /// What there is of `case` under `settings`.
    pub fn load(&self, case: &Case, settings: &SamplerSettings) -> Loaded {
        if self.fresh { Loaded::Missing } else { self.read(case, settings) }
    }

    fn read(&self, case: &Case, settings: &SamplerSettings) -> Loaded {
        let path = self.path(case, settings);
        let damaged = |why: String| Loaded::Damaged(format!("{}: {why}", path.display()));
        match std::fs::read(&path) {
            Err(e) if e.kind() == io::ErrorKind::NotFound => Loaded::Missing,
            Err(e) => damaged(format!("cannot be read: {e}")),
            Ok(bytes) => match unsealed(bytes, case, settings) {
                Ok(state) => Loaded::Found(Box::new(state)),
                Err(why) => damaged(why),
            },
        }
    }

    /// Saves `state`, unless the store has as deep a one already.
    ///
    /// # Errors
    /// [`StoreError`] if it cannot be written; what was there stays.
    pub fn save(&self, case: &Case, settings: &SamplerSettings, state: &SamplerState) -> Result<Saved, StoreError> {
        if !state.is_finite() {
            return Ok(Saved::NotFinite);
        }
        if let Loaded::Found(stored) = self.load(case, settings)
            && stored.points() >= state.points()
        {
            return Ok(Saved::AsDeep);
        }
        let path = self.path(case, settings);
        let attempt = || {
            let mut file = WholeFile::create(&path)?;
            file.write_all(sealed(case, settings, state)?.as_bytes())?;
            // Not forced to the disk, which would take longer than most cases: what a power cut leaves of it does not
            // have its checksum and is sampled again.
            file.finish()
        };
        attempt().map(|()| Saved::Written).map_err(|source| StoreError { path: path.clone(), source })
    }
}

/// The text of a file: a line for each fact, look and replicate, and the checksum of the lines before it.
fn sealed(case: &Case, settings: &SamplerSettings, state: &SamplerState) -> io::Result<String> {
    let mut text = format!(
        "{{\n\"what\": \"{WHAT}\",\n\"format\": {FORMAT},\n\"seed\": {},\n\"replicates\": {},\n\"points\": {},\n\"question\": {}",
        settings.seed,
        settings.replicates,
        state.points(),
        case.question()
    );
    list("looks", &state.looks, &mut text)?;
    list("places", &state.places, &mut text)?;
    let checksum = hex(&Sha256::digest(&text));
    text.push_str(SEAL);
    text.push_str(&checksum);
    text.push_str(END);
    Ok(text)
}

fn list(name: &str, items: &[impl Serialize], text: &mut String) -> io::Result<()> {
    // Writing to a text cannot fail.
    let _ = write!(text, ",\n\"{name}\": [");
    for (i, item) in items.iter().enumerate() {
        text.push_str(if i == 0 { "\n" } else { ",\n" });
        text.push_str(&serde_json::to_string(item)?);
    }
    text.push_str("\n]");
    Ok(())
}

/// The state in a file, or why it cannot be used.
fn unsealed(bytes: Vec<u8>, case: &Case, settings: &SamplerSettings) -> Result<SamplerState, String> {
    let text = String::from_utf8(bytes).map_err(|_| "is not text")?;
    let seal = text.strip_suffix(END).and_then(|rest| rest.rsplit_once(SEAL));
    let (body, checksum) = seal.ok_or("does not end with a checksum: it was cut short, or is no reference")?;
    if hex(&Sha256::digest(body)) != checksum {
        return Err("does not have its checksum: something in it was changed".into());
    }
    let entry: Entry = serde_json::from_str(&text).map_err(|e| format!("is not as references are: {e}"))?;
    let wanted = (FORMAT, settings.seed, settings.replicates, case.question());
    if (entry.format, entry.seed, entry.replicates, entry.question.to_string()) != wanted {
        return Err("holds another reference than its name says".into());
    }
    Ok(SamplerState { looks: entry.looks, places: entry.places })
}
