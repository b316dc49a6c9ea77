use std::fmt::Write as _;
use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

use serde::{Deserialize, Serialize};
use serde_json::Value;
use sha2::{Digest, Sha256};
use tempfile::NamedTempFile;

use super::settings::SamplerSettings;
use super::state::{ReplicateState, SamplerState};
use crate::shard::Shard;
use crate::suite::{Case, hex};
use crate::whole_file::WholeFile;

/// Version of the states in a store.
///
/// To be raised by every change that moves a bit of a sampled moment (points, quantile, sensors, pilot, control
/// variates, order of sums) or the layout of a state: states of before are then not found, and sampled anew.
pub const FORMAT: u32 = 2;

/// What a file of the store says that it is.
const WHAT: &str =
    "the state of a sampled reference: of every replicate the moments at every doubling, and the sums";
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
    share: String,
    #[serde(rename = "points")]
    _points: u64,
    question: Value,
    states: Vec<ReplicateState>,
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

    /// The folder of the shares of `case`, beside the file of the whole.
    fn shares(&self, case: &Case, settings: &SamplerSettings) -> PathBuf {
        self.path(case, settings).with_extension("shares")
    }

    fn share_path(&self, case: &Case, settings: &SamplerSettings, share: Shard) -> PathBuf {
        if share == Shard::WHOLE {
            return self.path(case, settings);
        }
        self.shares(case, settings).join(format!("{}-of-{}.json", share.part(), share.of()))
    }

    /// What there is of `case` under `settings`: the whole, or the shares of its replicates, whichever is deeper.
    pub fn load(&self, case: &Case, settings: &SamplerSettings) -> Loaded {
        let whole = self.load_share(case, settings, Shard::WHOLE);
        if self.fresh || !self.shares(case, settings).is_dir() {
            return whole;
        }
        let counts = 2..=settings.replicates;
        let joined = counts.map(|of| self.join(case, settings, of)).fold(Loaded::Missing, deeper);
        deeper(joined, whole)
    }

    /// The whole from `of` shares.
    fn join(&self, case: &Case, settings: &SamplerSettings, of: usize) -> Loaded {
        let shares: Vec<Shard> = (1..=of).filter_map(|part| Shard::new(part, of)).collect();
        let path = |&share: &Shard| self.share_path(case, settings, share);
        if !shares.iter().all(|share| path(share).is_file()) {
            return Loaded::Missing;
        }
        let mut states = Vec::new();
        for &share in &shares {
            match self.load_share(case, settings, share) {
                Loaded::Found(state) => states.push(*state),
                other => return other,
            }
        }
        match SamplerState::join(states) {
            Some(state) => Loaded::Found(Box::new(state)),
            None => {
                let shares = self.shares(case, settings);
                Loaded::Damaged(format!("{}: the {of} shares in it are not equally deep", shares.display()))
            }
        }
    }

    /// What there is of the replicates of `case` that `share` holds.
    pub fn load_share(&self, case: &Case, settings: &SamplerSettings, share: Shard) -> Loaded {
        if self.fresh {
            return Loaded::Missing;
        }
        let path = self.share_path(case, settings, share);
        let damaged = |why: String| Loaded::Damaged(format!("{}: {why}", path.display()));
        match std::fs::read(&path) {
            Err(e) if e.kind() == io::ErrorKind::NotFound => Loaded::Missing,
            Err(e) => damaged(format!("cannot be read: {e}")),
            Ok(bytes) => match unsealed(bytes, case, settings, share) {
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
        self.save_share(case, settings, Shard::WHOLE, state)
    }

    /// Saves the `state` of the replicates that `share` holds, as [`Store::save`] does the whole.
    ///
    /// # Errors
    /// As [`Store::save`].
    pub fn save_share(
        &self,
        case: &Case,
        settings: &SamplerSettings,
        share: Shard,
        state: &SamplerState,
    ) -> Result<Saved, StoreError> {
        if !state.is_finite() {
            return Ok(Saved::NotFinite);
        }
        if let Loaded::Found(stored) = self.load_share(case, settings, share)
            && stored.points() >= state.points()
        {
            return Ok(Saved::AsDeep);
        }
        let path = self.share_path(case, settings, share);
        let attempt = || {
            if share != Shard::WHOLE {
                std::fs::create_dir_all(self.shares(case, settings))?;
            }
            let mut file = WholeFile::create(&path)?;
            file.write_all(sealed(case, settings, share, state)?.as_bytes())?;
            // Not forced to the disk, which would take longer than most cases: what a power cut leaves of it does not
            // have its checksum and is sampled again.
            file.finish()
        };
        attempt().map(|()| Saved::Written).map_err(|source| StoreError { path: path.clone(), source })
    }
}

/// Of two answers the deeper state; else the word on what is damaged.
fn deeper(one: Loaded, other: Loaded) -> Loaded {
    match (one, other) {
        (Loaded::Found(one), Loaded::Found(other)) => {
            Loaded::Found(if one.points() > other.points() { one } else { other })
        }
        (found @ Loaded::Found(_), _) | (_, found @ Loaded::Found(_)) => found,
        (Loaded::Missing, other) => other,
        (damaged, _) => damaged,
    }
}

/// The text of a file: a line for each fact and replicate, and the checksum of the lines before it.
fn sealed(case: &Case, settings: &SamplerSettings, share: Shard, state: &SamplerState) -> io::Result<String> {
    let mut text = format!(
        "{{\n\"what\": \"{WHAT}\",\n\"format\": {FORMAT},\n\"seed\": {},\n\"replicates\": {},\n\"share\": \"{share}\",\n\"points\": {},\n\"question\": {}",
        settings.seed,
        settings.replicates,
        state.points(),
        case.question()
    );
    list("states", &state.replicates, &mut text)?;
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
fn unsealed(bytes: Vec<u8>, case: &Case, settings: &SamplerSettings, share: Shard) -> Result<SamplerState, String> {
    let text = String::from_utf8(bytes).map_err(|_| "is not text")?;
    let seal = text.strip_suffix(END).and_then(|rest| rest.rsplit_once(SEAL));
    let (body, checksum) = seal.ok_or("does not end with a checksum: it was cut short, or is no reference")?;
    if hex(&Sha256::digest(body)) != checksum {
        return Err("does not have its checksum: something in it was changed".into());
    }
    let entry: Entry = serde_json::from_str(&text).map_err(|e| format!("is not as references are: {e}"))?;
    let wanted = (FORMAT, settings.seed, settings.replicates, share.to_string(), case.question());
    if (entry.format, entry.seed, entry.replicates, entry.share, entry.question.to_string()) != wanted {
        return Err("holds another reference than its name says".into());
    }
    Ok(SamplerState { replicates: entry.states })
}
