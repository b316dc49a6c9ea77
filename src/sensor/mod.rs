//! Sensors: measurement functions y = h(x) + v.
//!
//! A sensor is written once, as a [`Formula`] generic over the [`Number`]; values, blocks of values, exact
//! Jacobians and exact Hessians come from that one formula through the blanket [`Sensor`] implementation.
//! A new sensor is one new file here and one line in [`KINDS`].

mod bearing_only;
mod derivatives;
mod formula;
mod kinds;
mod linear;
mod numbers;
mod output;
mod parameter;
mod planar;
mod quadratic;
mod range_bearing;
mod written;

pub use bearing_only::BearingOnly;
pub use derivatives::Derivatives;
pub use formula::{Formula, Sensor};
pub use kinds::{BuildError, KINDS, Kind, SensorSpec};
pub use linear::Linear;
pub use numbers::Number;
pub use output::{Output, chart_deviation};
pub use parameter::ParameterError;
pub use quadratic::Quadratic;
pub use range_bearing::RangeBearing;
pub use written::Written;
