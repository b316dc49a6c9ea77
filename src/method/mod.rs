//! Methods: published approximations of the moments of y = h(x) + v.
//!
//! One file a family. A [`Method`] is planned once for the dimensions of a problem and gives a [`Transform`]
//! with its workspace; the transform is what an estimator would run at every measurement. A new method is one
//! new file here and one line in [`KINDS`]. Nothing here knows sampling.

mod kinds;
mod transform;

pub use kinds::{BuildError, KINDS, Kind, MethodSpec};
pub use transform::{Method, Problem, Refusal, Transform};
