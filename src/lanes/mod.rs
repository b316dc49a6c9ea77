//! Lanes: arithmetic and elementary functions on eight doubles at once, the same bits on every machine.
//!
//! [`Lanes`] is a vector of eight doubles with the operators of `f64`, [`Words`] its bits and [`Choice`] the
//! outcome of a comparison. Code over them is written once, generic over [`Simd`], and compiled for each
//! [`Level`] of vector instructions; [`dispatch`] picks one at run time, so a default build uses what the machine
//! has. [`Lanes`] is a [`Number`](crate::sensor::Number), so every sensor formula runs on it.
//!
//! **One answer everywhere.** Only operations that IEEE 754 rounds correctly are used (+, -, *, /, square root)
//! and none is fused: SSE2, AVX2, AVX-512 and the plain arrays of other architectures give the same bits, whatever
//! the number of doubles an instruction holds. The elementary functions are ours, down to the reduction of huge
//! angles, and do not ask the machine's mathematical library. Only the sign and payload of a NaN are left open.
//!
//! **Accuracy.** Every function is within 4 units in the last place (ulp) of the true value over its whole range,
//! subnormal numbers and huge arguments included, with the special values of IEEE 754 (ISO C annex F). Each function
//! says its bound and the greatest error seen in two million arguments against extended precision; `tests/lanes/`
//! holds the bounds.
//!
//! **No branches on data.** All lanes take the same path. Arguments that need more (huge angles, subnormal
//! logarithms, powers of negative numbers) are put right out of line, lane by lane, when any lane has one, at some ten
//! times the cost.
//!
//! Polynomials are our own minimax fits (`tests/oracle/lanes_coefficients.py`). The methods are published:
//! W. J. Cody, W. Waite, Software Manual for the Elementary Functions (Prentice-Hall, 1980) for the reductions;
//! M. H. Payne, R. N. Hanek, Radian reduction for trigonometric functions, ACM SIGNUM Newsletter 18 (1983) 19-24,
//! for huge angles; T. J. Dekker, A floating-point technique for extending the available precision, Numer. Math. 18
//! (1971) 224-242, for sums and products in two parts; J.-M. Muller, Elementary Functions, 3rd ed. (Birkhaeuser,
//! 2016), for all of them.

mod angles;
mod arcs;
mod backend;
mod choice;
mod exponential;
mod hyperbolic;
mod length;
mod level;
mod logarithm;
mod number;
mod polynomial;
mod power;
mod reduction;
#[cfg(test)]
mod tests;
mod values;
mod words;

pub use backend::Simd;
pub use choice::Choice;
pub use level::{Level, Task, dispatch};
pub use values::Lanes;
pub use words::Words;

/// 1.5 2^52: adding it rounds a double under 2^51 to a whole number (ties to even), which then stands in its low
/// bits in two's complement; subtracting it gives the whole number back.
const MAGIC: f64 = 6_755_399_441_055_744.0;

/// The least normal double.
const LEAST_NORMAL: f64 = f64::MIN_POSITIVE;
