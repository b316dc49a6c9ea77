use super::pilot::FIRST_BLOCKS;
use crate::lanes::Level;
use crate::net::{BLOCK, MOST_LOG2};
use crate::shard::Shard;

/// Independent replicates of a reference unless told otherwise.
pub const DEFAULT_REPLICATES: usize = 32;

/// How a reference is to be sampled.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SamplerSettings {
    /// Seed of all random numbers.
    pub seed: u64,
    /// Independent replicates, at least 2.
    pub replicates: usize,
    /// Largest standardised standard error asked for.
    pub precision: f64,
    /// Most samples of h in all replicates together.
    pub cap: u64,
    /// Vector instructions to work with; the result is the same to the bit at every level.
    pub level: Level,
}

impl Default for SamplerSettings {
    /// Seed 1, 32 replicates, precision 1e-3, at most 2^24 samples, the best instructions of this machine.
    fn default() -> Self {
        Self { seed: 1, replicates: DEFAULT_REPLICATES, precision: 1e-3, cap: 1 << 24, level: Level::best() }
    }
}

impl SamplerSettings {
    /// Checks that there are at least two replicates and that the cap leaves one block for each.
    ///
    /// # Errors
    /// [`SamplerError`] with what would do.
    pub fn check(&self) -> Result<(), SamplerError> {
        if self.replicates < 2 {
            return Err(SamplerError::TooFewReplicates { replicates: self.replicates });
        }
        let least = BLOCK as u64 * self.replicates as u64;
        if self.cap < least {
            return Err(SamplerError::CapTooSmall { cap: self.cap, replicates: self.replicates, least });
        }
        Ok(())
    }

    /// Checks that a reference has as many replicates as there are shares of them.
    ///
    /// # Errors
    /// [`SamplerError::TooManyShares`] if not.
    pub fn check_share(&self, share: Shard) -> Result<(), SamplerError> {
        let (shares, replicates) = (share.of(), self.replicates);
        if shares > replicates { Err(SamplerError::TooManyShares { shares, replicates }) } else { Ok(()) }
    }

    /// Binary logarithm of the most points of a replicate: nets are filled by doubling, and have so many points at most.
    pub(super) fn log2(&self) -> u32 {
        (self.cap / self.replicates as u64).max(1).ilog2().min(MOST_LOG2)
    }

    /// Blocks a replicate after the next doubling of `blocks`; `None` where the cap leaves no room.
    pub(super) fn blocks_after(&self, blocks: u64) -> Option<u64> {
        let most = (1 << self.log2()) / BLOCK as u64;
        let next = if blocks == 0 { FIRST_BLOCKS.min(most) } else { 2 * blocks };
        (next > blocks && next <= most).then_some(next)
    }

    /// How often a reference can be looked at: once after each doubling that the cap leaves room for.
    pub fn looks(&self) -> usize {
        std::iter::successors(self.blocks_after(0), |&blocks| self.blocks_after(blocks)).count()
    }
}

/// Settings under which nothing can be sampled.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum SamplerError {
    /// Without two replicates there is no standard error.
    #[error("{replicates} replicates are too few: a standard error needs at least 2")]
    TooFewReplicates {
        /// Replicates asked for.
        replicates: usize,
    },
    /// There are more shares of the replicates than replicates.
    #[error("{shares} shares are too many: there are {replicates} replicates to share")]
    TooManyShares {
        /// Shares asked for.
        shares: usize,
        /// Replicates of a reference.
        replicates: usize,
    },
    /// The cap does not leave one block for each replicate.
    #[error("a cap of {cap} samples is too small: {replicates} replicates need at least {least}")]
    CapTooSmall {
        /// Cap asked for.
        cap: u64,
        /// Replicates asked for.
        replicates: usize,
        /// Least cap that would do.
        least: u64,
    },
}
