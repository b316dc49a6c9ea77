//! Gaussians: mean and covariance, square roots, the joint of state and measurement, its conditional,
//! divergence. Nothing here knows a sensor.

mod angle;
mod divergence;
mod error;
mod joint;
mod law;
mod marginal;
mod root;

pub use angle::wrap;
pub use divergence::{divergence, joint_divergence};
pub use error::GaussianError;
pub use joint::{Conditional, Moments, Regression};
pub use law::{Gaussian, checked_covariance};
pub use marginal::Marginal;
pub(crate) use root::cholesky_in_place;
pub use root::{SquareRoot, Support};
