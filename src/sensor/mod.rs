//! Sensors: measurement functions y = h(x) + v.
//!
//! A sensor is written once, as a [`Formula`] generic over the [`Number`]; values, blocks of values, exact
//! Jacobians and exact Hessians come from that one formula through the blanket [`Sensor`] implementation.
//! A new sensor is one new file here and one line in [`KINDS`].

mod attitude_vector;
mod azimuth_elevation;
mod bearing_only;
mod bearing_rate;
mod derivatives;
mod dipole_field;
mod duals;
mod exact;
mod exponential_decay;
mod formula;
mod frequency_difference;
mod kinds;
mod line_feature;
mod line_offset;
mod linear;
mod lookout;
mod numbers;
mod output;
mod parameter;
mod phase_sine;
mod pinhole;
mod polar_to_cartesian;
mod position;
mod quadratic;
mod range_azimuth_elevation;
mod range_bearing;
mod real;
mod saturating;
mod single;
mod stereo_disparity;
mod written;

pub use attitude_vector::AttitudeVector;
mod range_doppler;
mod range_only;
mod received_strength;
mod time_difference;

pub use azimuth_elevation::AzimuthElevation;
pub use bearing_only::BearingOnly;
pub use bearing_rate::BearingRate;
pub use derivatives::Derivatives;
pub use dipole_field::DipoleField;
pub use exact::ExactMoments;
pub use exponential_decay::ExponentialDecay;
pub use formula::{Formula, Sensor};
pub use frequency_difference::{FrequencyDifference, Wave};
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
pub use range_azimuth_elevation::RangeAzimuthElevation;
pub use range_bearing::RangeBearing;
pub use range_doppler::RangeDoppler;
pub use range_only::RangeOnly;
pub use real::{Arithmetic, Real};
pub use received_strength::{PathLoss, ReceivedStrength};
pub use saturating::Saturating;
pub use stereo_disparity::StereoDisparity;
pub use time_difference::TimeDifference;
pub use written::Written;
