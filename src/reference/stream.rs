use rand::SeedableRng;
use rand_pcg::Pcg64Dxsm;
use sha2::{Digest, Sha256};

use crate::net::Scrambles;

/// What a case's random numbers depend on: its content and the seed, nothing else.
///
/// Not its name, not its place in a suite, not the machine or the number of threads: the same question asked
/// twice gets the same samples.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub struct Key([u8; 32]);

impl Key {
    /// The key of a question, given its canonical text, under a seed.
    pub fn new(seed: u64, question: &str) -> Self {
        let mut hash = Sha256::new();
        hash.update(b"gaussworthy reference\0");
        hash.update(seed.to_le_bytes());
        hash.update(question.as_bytes());
        Self(hash.finalize().into())
    }

    /// The stream of block `block` of replicate `replicate`.
    ///
    /// State and increment both come from the hash: PCG streams that share a state and differ in the increment
    /// alone are correlated (M. E. O'Neill, "PCG: A family of simple fast space-efficient statistically good
    /// algorithms for random number generation", HMC-CS-2014-0905, sec. 4.3.2, section from memory).
    pub(super) fn block(&self, replicate: u64, block: u64) -> Pcg64Dxsm {
        self.derived(b"block", replicate, block)
    }

    /// The stream of block `block` of the pilot, apart from every replicate's.
    pub(super) fn pilot(&self, block: u64) -> Pcg64Dxsm {
        self.derived(b"pilot", 0, block)
    }

    /// The stream of batch `batch` of the witness.
    pub(super) fn witness(&self, batch: u64) -> Pcg64Dxsm {
        self.derived(b"plain", 0, batch)
    }

    /// A key for nets that are tried and thrown away, apart from every replicate's.
    pub(super) fn trial(&self) -> Self {
        self.apart(b"trial")
    }

    /// A key for the net that measures how much the witness may err.
    pub(super) fn spread(&self) -> Self {
        self.apart(b"sprea")
    }

    /// A key for the net that looks ahead at rare samples.
    pub(super) fn ahead(&self) -> Self {
        self.apart(b"ahead")
    }

    fn apart(&self, purpose: &[u8; 5]) -> Self {
        let mut hash = Sha256::new();
        hash.update(self.0);
        hash.update(purpose);
        Self(hash.finalize().into())
    }

    fn derived(&self, purpose: &[u8; 5], replicate: u64, part: u64) -> Pcg64Dxsm {
        let mut hash = Sha256::new();
        hash.update(self.0);
        hash.update(purpose);
        hash.update(replicate.to_le_bytes());
        hash.update(part.to_le_bytes());
        Pcg64Dxsm::from_seed(hash.finalize().into())
    }
}

impl Scrambles for Key {
    fn scramble(&self, replicate: u64, dimension: u64) -> impl rand::Rng {
        self.derived(b"digit", replicate, dimension)
    }
}
