//! Methods: published approximations of the moments of y = h(x) + v.
//!
//! One file a family. A [`Method`] is planned once for the dimensions of a problem and gives a [`Transform`]
//! with its workspace; the transform is what an estimator would run at every measurement. A new method is one
//! new file here and one line in [`KINDS`]. Nothing here knows references.

mod bayesian;
mod central_differences;
mod conjugate;
mod counted;
mod cubature;
mod draws;
mod exactness;
mod fifth_degree;
mod gauss_hermite;
mod kinds;
mod linearisation;
mod monte_carlo;
mod placed;
mod points;
mod rule;
mod simplex;
mod sparse_grid;
mod spec;
mod spread;
mod stochastic;
mod taylor;
mod transform;
mod unscented;

pub use bayesian::{BayesianQuadrature, Nodes};
pub use central_differences::{FirstOrderDifferences, SecondOrderDifferences};
pub use conjugate::FourthOrderConjugate;
pub use counted::{Counted, Evaluations};
pub use cubature::ThirdDegreeCubature;
pub use exactness::{Degree, Exactness};
pub use fifth_degree::{FifthDegreeCubature, FullySymmetricFifthDegree};
pub use gauss_hermite::GaussHermite;
pub use kinds::{BuildError, KINDS, Kind};
pub use linearisation::StatisticalLinearisation;
pub use monte_carlo::{MonteCarlo, QuasiMonteCarlo};
pub use points::{PointSet, PointTransform};
pub use rule::PointRule;
pub use simplex::{MinimalSkewSimplex, SphericalSimplex};
pub use sparse_grid::SparseGaussHermite;
pub(crate) use spec::check_own_label;
pub use spec::{MethodSpec, default_methods, every_method};
pub use stochastic::{FifthDegreeStochastic, ThirdDegreeStochastic};
pub use taylor::{FirstOrderTaylor, SecondOrderTaylor};
pub use transform::{Method, Problem, Refusal, Transform};
pub use unscented::{ScaledUnscented, Unscented};
