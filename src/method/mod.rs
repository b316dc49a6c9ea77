//! Methods: published approximations of the moments of y = h(x) + v.
//!
//! One file a family. A [`Method`] is planned once for the dimensions of a problem and gives a [`Transform`]
//! with its workspace; the transform is what an estimator would run at every measurement. A new method is one
//! new file here and one line in [`KINDS`]. Nothing here knows sampling.

mod counted;
mod cubature;
mod gauss_hermite;
mod kinds;
mod points;
mod spec;
mod taylor;
mod transform;
mod unscented;

pub use counted::{Counted, Evaluations};
pub use cubature::ThirdDegreeCubature;
pub use gauss_hermite::GaussHermite;
pub use kinds::{BuildError, KINDS, Kind};
pub use points::{PointSet, PointTransform};
pub(crate) use spec::check_own_label;
pub use spec::{MethodSpec, default_methods};
pub use taylor::{FirstOrderTaylor, SecondOrderTaylor};
pub use transform::{Method, Problem, Refusal, Transform};
pub use unscented::{ScaledUnscented, Unscented};
