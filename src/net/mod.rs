//! Randomised Sobol' nets in 64-bit integers, and their normal quantiles: the points of references and of
//! quasi-Monte Carlo methods.
//!
//! A net of one replicate holds 2^m points in their natural order, in blocks of [`BLOCK`]. Asked for more points, it
//! gives the same ones first: a reference that is doubled throws nothing away. Replicates are scrambled
//! independently, so that their spread measures the error.

mod directions;
mod joe_kuo;
mod normals;
mod quantile;
mod scramble;

pub use directions::Directions;
pub use normals::{normal, normals};
pub use quantile::normal_quantile;

use rand::Rng;
use scramble::Scramble;

/// Points of a block.
pub const BLOCK: usize = 1 << BLOCK_LOG2;
/// Dimensions that the table of direction numbers serves.
pub const MOST_DIMENSIONS: usize = joe_kuo::JOE_KUO.len() + 1;
/// A net has at most 2^53 points: as many as there are different normals ([`normal`]).
pub const MOST_LOG2: u32 = 53;

const BLOCK_LOG2: u32 = 8;

/// A net cannot be laid out.
#[derive(Debug, Clone, Copy, PartialEq, Eq, thiserror::Error)]
#[non_exhaustive]
pub enum NetError {
    /// More dimensions than the generator matrices serve: plain streams must do.
    #[error("a net in {asked} dimensions is asked for, there are direction numbers for {most}")]
    TooManyDimensions {
        /// Dimensions asked for.
        asked: usize,
        /// Dimensions served.
        most: usize,
    },
    /// More than 2^[`MOST_LOG2`] points.
    #[error("a net of 2^{log2} points is asked for, the largest has 2^{MOST_LOG2}")]
    TooManyPoints {
        /// Binary logarithm of the points asked for.
        log2: u32,
    },
}

/// Where nets get their random numbers: one stream a replicate and dimension, independent of all others.
pub trait Scrambles {
    /// The stream that scrambles dimension `dimension` of the net of replicate `replicate`.
    fn scramble(&self, replicate: u64, dimension: u64) -> impl Rng;
}

/// One replicate of a randomised digital net: linear matrix scrambling and a digital shift, both its own in each
/// dimension.
///
/// Each point is uniform on the unit cube; together, any 2^k consecutive points that start at a multiple of 2^k are
/// a net of the unscrambled one's quality: in every single coordinate, each interval \[j, j + 1) / 2^k holds exactly
/// one of them.
///
/// ```
/// use gaussworthy::reference::Key;
/// use gaussworthy::net::{BLOCK, Net, normal};
///
/// let net = Net::new(&Key::new(1, "a question"), 0, 2, 12)?;
/// let (mut bits, mut z) = (vec![0; 2 * BLOCK], vec![0.0; 2 * BLOCK]);
/// net.block(15, &mut bits);
/// net.normals(15, &mut z);
/// assert_eq!(net.blocks(), 16);
/// assert_eq!(z[BLOCK + 3], normal(bits[BLOCK + 3])); // coordinate 1 of point 3 of the block
/// # Ok::<(), gaussworthy::net::NetError>(())
/// ```
#[derive(Debug, Clone)]
pub struct Net {
    log2: u32,
    axes: Vec<Axis>,
}

/// One coordinate of the net.
#[derive(Debug, Clone)]
struct Axis {
    /// The first block's points, the shift among them: point i of block b is `first[i]` XOR the base of b.
    first: [u64; BLOCK],
    /// Scrambled columns from 2^8 on, which make the base of a block.
    higher: Vec<u64>,
}

impl Net {
    /// Replicate `replicate` of the Sobol' net of 2^`log2` points (one block at least) in `dimensions` dimensions.
    ///
    /// # Errors
    /// [`NetError::TooManyDimensions`] above [`MOST_DIMENSIONS`], [`NetError::TooManyPoints`] above 2^[`MOST_LOG2`].
    pub fn new(key: &impl Scrambles, replicate: u64, dimensions: usize, log2: u32) -> Result<Self, NetError> {
        Self::over(Directions::joe_kuo(), key, replicate, dimensions, log2)
    }

    /// The same over generator matrices of the caller's own.
    ///
    /// # Errors
    /// As [`Net::new`], with the dimensions of `directions`.
    pub fn over(
        directions: &Directions,
        key: &impl Scrambles,
        replicate: u64,
        dimensions: usize,
        log2: u32,
    ) -> Result<Self, NetError> {
        Self::assemble(directions, dimensions, log2, |d| Scramble::draw(&mut key.scramble(replicate, d)))
    }

    /// The net without scramble and shift: point 0 is the origin.
    ///
    /// # Errors
    /// As [`Net::over`].
    pub fn unscrambled(directions: &Directions, dimensions: usize, log2: u32) -> Result<Self, NetError> {
        Self::assemble(directions, dimensions, log2, |_| Scramble::none())
    }

    fn assemble(
        directions: &Directions,
        dimensions: usize,
        log2: u32,
        scramble: impl Fn(u64) -> Scramble,
    ) -> Result<Self, NetError> {
        let most = directions.columns().len();
        if dimensions > most {
            return Err(NetError::TooManyDimensions { asked: dimensions, most });
        }
        if log2 > MOST_LOG2 {
            return Err(NetError::TooManyPoints { log2 });
        }
        let log2 = log2.max(BLOCK_LOG2);
        let matrices = directions.columns()[..dimensions].iter();
        let axes =
            matrices.zip(0..).map(|(columns, d)| Axis::new(&columns[..log2 as usize], &scramble(d))).collect();
        Ok(Self { log2, axes })
    }

    /// Coordinates of a point.
    pub fn dimensions(&self) -> usize {
        self.axes.len()
    }

    /// Blocks of the whole net.
    pub fn blocks(&self) -> u64 {
        1 << (self.log2 - BLOCK_LOG2)
    }

    /// Writes block `index`, one array of [`BLOCK`] integers a coordinate; an integer over 2^64 is the coordinate.
    ///
    /// # Panics
    /// If there is no such block, or `out` does not hold [`BLOCK`] values for each dimension.
    #[inline]
    #[track_caller]
    pub fn block(&self, index: u64, out: &mut [u64]) {
        for (axis, out) in self.axes.iter().zip(self.chunks(index, out)) {
            *out = axis.block(index);
        }
    }

    /// Writes the standard normals of block `index`, laid out as in [`Net::block`].
    ///
    /// # Panics
    /// As [`Net::block`].
    #[inline(always)]
    #[track_caller]
    pub fn normals(&self, index: u64, out: &mut [f64]) {
        for (axis, out) in self.axes.iter().zip(self.chunks(index, out)) {
            normals(&axis.block(index), out);
        }
    }

    #[inline]
    #[track_caller]
    fn chunks<'a, T>(&self, index: u64, out: &'a mut [T]) -> &'a mut [[T; BLOCK]] {
        assert!(index < self.blocks(), "block {index} of a net of {}", self.blocks());
        assert_eq!(out.len(), BLOCK * self.dimensions(), "values for a block in {} dimensions", self.dimensions());
        out.as_chunks_mut().0
    }
}

impl Axis {
    fn new(columns: &[u64], scramble: &Scramble) -> Self {
        let (low, high) = columns.split_at(BLOCK_LOG2 as usize);
        let mut first = [scramble.shift; BLOCK];
        for (k, &column) in low.iter().enumerate() {
            let column = scramble.apply(column);
            let (known, next) = first.split_at_mut(1 << k);
            for (next, known) in next.iter_mut().zip(known) {
                *next = *known ^ column;
            }
        }
        Self { first, higher: high.iter().map(|&v| scramble.apply(v)).collect() }
    }

    #[inline(always)]
    fn block(&self, index: u64) -> [u64; BLOCK] {
        let mut base = 0;
        for (k, column) in self.higher.iter().enumerate() {
            // Minus one is all ones: the column where bit k of the index is set.
            base ^= column & (index >> k & 1).wrapping_neg();
        }
        self.first.map(|point| point ^ base)
    }
}
