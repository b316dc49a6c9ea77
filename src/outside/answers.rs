use std::io::{self, BufReader, Read};
use std::sync::Arc;
use std::time::Duration;

use sha2::{Digest, Sha256};

use super::collector::Collector;
use super::lines::Lines;
use super::name::Name;
use crate::gaussian::Moments;
use crate::shard::Shard;
use crate::suite::{Suite, hex};

/// An implementation outside of this program, and its answer to every case of a suite.
#[derive(Debug, Clone)]
pub struct Outside {
    pub(super) name: Name,
    pub(super) origin: Origin,
    /// One a case, in the suite's order; of cases that were not asked, nothing.
    pub(super) answers: Arc<[Option<Result<Moments, Flaw>>]>,
    pub(super) tally: Tally,
    /// How its command failed.
    pub(super) failure: Option<String>,
    /// Whatever else there is to say, line by line.
    pub(super) notes: Vec<String>,
}

/// Where answers come from.
#[derive(Debug, Clone, PartialEq, Eq)]
pub enum Origin {
    /// A file.
    File {
        /// Its name, without its folder.
        name: String,
        /// SHA-256 of its bytes, in lower-case hexadecimals.
        sha256: String,
    },
    /// A command that was given the cases.
    Command {
        /// The program and its arguments.
        words: Vec<String>,
        /// How long it was waited for without an answer.
        timeout: Duration,
    },
}

/// Why an answer cannot be scored. Its case counts as rejected.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
pub enum Flaw {
    /// There is none.
    #[error("no answer{}", .0.as_ref().map_or(String::new(), |why| format!(": {why}")))]
    Missing(Option<Arc<str>>),
    /// It is there, and is wrong.
    #[error("invalid answer: {0}")]
    Unusable(String),
}

/// Answers counted.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub struct Tally {
    /// Cases asked.
    pub asked: usize,
    /// Cases with an answer that can be scored.
    pub usable: usize,
    /// Cases with an answer that cannot: wrong shape, not finite, not JSON, given twice and the like.
    pub unusable: usize,
    /// Cases without an answer.
    pub missing: usize,
    /// Answers for cases of other parts of the suite.
    pub elsewhere: u64,
    /// Answers for cases that are not in the suite.
    pub unknown: u64,
    /// Lines of which it cannot be told what case they are for.
    pub unreadable: u64,
}

impl Outside {
    /// Reads the answers of `name` to the cases of `suite` (of a part of it) from a file, called `file` in what is
    /// written.
    ///
    /// # Errors
    /// What the system says when it cannot be read.
    pub fn read(name: Name, suite: &Suite, shard: Option<Shard>, file: &str, from: impl Read) -> io::Result<Self> {
        let mut hashing = Hashing { from, hash: Sha256::new() };
        let mut collector = Collector::new(suite, shard);
        let mut lines = Lines::of(BufReader::new(&mut hashing));
        while let Some(line) = lines.next_line()? {
            collector.take(&line);
        }
        let sha256 = hex(&hashing.hash.finalize());
        Ok(collector.finish(name, Origin::File { name: file.into(), sha256 }, None))
    }

    /// What it is called.
    pub fn name(&self) -> &str {
        self.name.as_str()
    }

    /// Where its answers come from.
    pub fn origin(&self) -> &Origin {
        &self.origin
    }

    /// Its answer to the case at `index` in the suite.
    ///
    /// # Errors
    /// [`Flaw`] where there is none that can be scored.
    pub fn answer(&self, index: usize) -> Result<&Moments, Flaw> {
        match self.answers.get(index) {
            Some(Some(answer)) => answer.as_ref().map_err(Flaw::clone),
            _ => Err(Flaw::Missing(None)),
        }
    }

    /// Its answers counted.
    pub fn tally(&self) -> Tally {
        self.tally
    }

    /// How its command failed, such as `exit status 3 after 17 of 30 answers`.
    pub fn failure(&self) -> Option<&str> {
        self.failure.as_deref()
    }

    /// What a user should know, line by line: how the command failed, answers that cannot be used, missing ones, those
    /// that belong to no case.
    pub fn notes(&self) -> &[String] {
        &self.notes
    }
}

/// What is read, hashed on its way.
struct Hashing<R> {
    from: R,
    hash: Sha256,
}

impl<R: Read> Read for Hashing<R> {
    fn read(&mut self, to: &mut [u8]) -> io::Result<usize> {
        let count = self.from.read(to)?;
        self.hash.update(&to[..count]);
        Ok(count)
    }
}
