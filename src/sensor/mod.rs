//! Sensors: measurement functions y = h(x) + v.
//!
//! A sensor is written once, as a [`Formula`] generic over the [`Number`]; values, blocks of values, exact
//! Jacobians and exact Hessians come from that one formula through the blanket [`Sensor`] implementation.
//! A new sensor is one new file here and one line in [`KINDS`].

mod azimuth_elevation;
mod bearing_only;
mod bearing_rate;
mod derivatives;
mod formula;
mod frequency_difference;
mod kinds;
mod linear;
mod lookout;
mod numbers;
mod output;
mod parameter;
mod quadratic;
mod range_azimuth_elevation;
mod range_bearing;
mod range_doppler;
mod range_only;
mod received_strength;
mod time_difference;

pub use azimuth_elevation::AzimuthElevation;
pub use bearing_only::BearingOnly;
pub use bearing_rate::BearingRate;
pub use derivatives::Derivatives;
pub use formula::{Formula, Sensor};
pub use frequency_difference::{FrequencyDifference, Wave};
pub use kinds::{BuildError, KINDS, Kind, SensorSpec};
pub use linear::Linear;
pub use numbers::Number;
pub use output::{Output, chart_deviation};
pub use parameter::ParameterError;
pub use quadratic::Quadratic;
pub use range_azimuth_elevation::RangeAzimuthElevation;
pub use range_bearing::RangeBearing;
pub use range_doppler::RangeDoppler;
pub use range_only::RangeOnly;
pub use received_strength::{PathLoss, ReceivedStrength};
pub use time_difference::TimeDifference;
