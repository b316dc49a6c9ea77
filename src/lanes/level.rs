use std::fmt;

use super::Simd;
#[cfg(not(target_arch = "x86_64"))]
use super::backend::Plain;
#[cfg(target_arch = "x86_64")]
use super::backend::{Avx2, Avx512, Sse2};

/// A set of vector instructions, from the least to the best.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord, Hash)]
pub enum Level {
    /// What every machine of the architecture has: SSE2 on x86-64, plain arrays left to the compiler elsewhere.
    Baseline,
    /// AVX2: four doubles an instruction.
    Avx2,
    /// AVX-512 (F, DQ, VL and BW): eight doubles an instruction.
    Avx512,
}

impl Level {
    /// All levels, rising.
    pub const ALL: [Self; 3] = [Self::Baseline, Self::Avx2, Self::Avx512];

    /// Whether this machine has the instructions.
    #[inline]
    pub fn is_available(self) -> bool {
        #[cfg(target_arch = "x86_64")]
        return match self {
            Self::Baseline => true,
            Self::Avx2 => is_x86_feature_detected!("avx2"),
            Self::Avx512 => {
                is_x86_feature_detected!("avx512f")
                    && is_x86_feature_detected!("avx512dq")
                    && is_x86_feature_detected!("avx512vl")
                    && is_x86_feature_detected!("avx512bw")
            }
        };
        #[cfg(not(target_arch = "x86_64"))]
        return self == Self::Baseline;
    }

    /// The levels that this machine has, rising.
    pub fn available() -> impl Iterator<Item = Self> {
        Self::ALL.into_iter().filter(|level| level.is_available())
    }

    /// The best level that this machine has.
    #[inline]
    pub fn best() -> Self {
        Self::ALL.into_iter().rev().find(|level| level.is_available()).unwrap_or(Self::Baseline)
    }
}

impl fmt::Display for Level {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.pad(match self {
            Self::Baseline if cfg!(target_arch = "x86_64") => "SSE2",
            Self::Baseline => "baseline",
            Self::Avx2 => "AVX2",
            Self::Avx512 => "AVX-512",
        })
    }
}

/// Work that is compiled once for each level.
pub trait Task {
    /// What the work gives.
    type Output;

    /// Does the work with the instructions of `S`.
    ///
    /// Only what is inlined into this function has them as instructions; elsewhere each becomes a call. So mark
    /// the implementation and every function of yours on [`Lanes`](super::Lanes) `#[inline(always)]`, and write
    /// loops over blocks as loops, not as closures handed to code that may stay apart (`collect`, say).
    fn run<S: Simd>(self) -> Self::Output;
}

/// Runs `task` with the instructions of `level`; the results are the same bits on every level.
///
/// # Panics
/// If this machine does not have that level ([`Level::is_available`]).
///
/// # Example
/// ```
/// use gaussworthy::lanes::{Lanes, Level, Simd, Task, dispatch};
///
/// struct Ranges<'a> {
///     x: &'a [[f64; 8]],
///     y: &'a [[f64; 8]],
///     ranges: &'a mut [[f64; 8]],
/// }
///
/// impl Task for Ranges<'_> {
///     type Output = ();
///
///     #[inline(always)]
///     fn run<S: Simd>(self) {
///         for ((x, y), range) in self.x.iter().zip(self.y).zip(self.ranges) {
///             *range = Lanes::<S>::from_array(x).hypot(Lanes::from_array(y)).to_array();
///         }
///     }
/// }
///
/// let mut ranges = [[0.0; 8]];
/// dispatch(Level::best(), Ranges { x: &[[3.0; 8]], y: &[[4.0; 8]], ranges: &mut ranges });
/// assert_eq!(ranges, [[5.0; 8]]);
/// ```
#[inline]
#[track_caller]
pub fn dispatch<T: Task>(level: Level, task: T) -> T::Output {
    assert!(level.is_available(), "this machine does not have {level}");
    #[cfg(target_arch = "x86_64")]
    match level {
        Level::Baseline => task.run::<Sse2>(),
        #[allow(unsafe_code, reason = "the assertion above has found that the machine has AVX2")]
        // SAFETY: as the reason above says.
        Level::Avx2 => unsafe { with_avx2(task) },
        #[allow(unsafe_code, reason = "the assertion above has found that the machine has these AVX-512 sets")]
        // SAFETY: as the reason above says.
        Level::Avx512 => unsafe { with_avx512(task) },
    }
    #[cfg(not(target_arch = "x86_64"))]
    task.run::<Plain>()
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx2")]
fn with_avx2<T: Task>(task: T) -> T::Output {
    task.run::<Avx2>()
}

#[cfg(target_arch = "x86_64")]
#[target_feature(enable = "avx512f,avx512dq,avx512vl,avx512bw")]
fn with_avx512<T: Task>(task: T) -> T::Output {
    task.run::<Avx512>()
}
