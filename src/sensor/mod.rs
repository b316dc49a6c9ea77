//! Sensors: measurement functions y = h(x) + v.
//!
//! A sensor is written once, as a [`Formula`] generic over the [`Number`]; values, blocks of values, exact
//! Jacobians and exact Hessians come from that one formula through the blanket [`Sensor`] implementation.
//! A new sensor is one new file here and one line in [`KINDS`].

mod attitude_vector;
mod bearing_only;
mod derivatives;
mod dipole_field;
mod exponential_decay;
mod formula;
mod kinds;
mod line_feature;
mod line_offset;
mod linear;
mod numbers;
mod output;
mod parameter;
mod phase_sine;
mod pinhole;
mod planar;
mod polar_to_cartesian;
mod quadratic;
mod range_bearing;
mod saturating;
mod single;
mod space;
mod stereo_disparity;
mod written;

pub use attitude_vector::AttitudeVector;
pub use bearing_only::BearingOnly;
pub use derivatives::Derivatives;
pub use dipole_field::DipoleField;
pub use exponential_decay::ExponentialDecay;
pub use formula::{Formula, Sensor};
pub use kinds::{BuildError, KINDS, Kind, SensorSpec};
pub use line_feature::LineFeature;
pub use line_offset::LineOffset;
pub use linear::Linear;
pub use numbers::Number;
pub use output::{Output, chart_deviation};
pub use parameter::ParameterError;
pub use phase_sine::PhaseSine;
pub use pinhole::Pinhole;
pub use polar_to_cartesian::PolarToCartesian;
pub use quadratic::Quadratic;
pub use range_bearing::RangeBearing;
pub use saturating::Saturating;
pub use stereo_disparity::StereoDisparity;
pub use written::Written;
