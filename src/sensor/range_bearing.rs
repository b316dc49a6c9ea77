use serde::{Deserialize, Serialize};

use super::planar::{checked_position, checked_station, default_position, seen_from};
use super::{Formula, Number, Output, ParameterError};

/// Range and bearing of a planar position from one station.
///
/// r = sqrt((x - sx)^2 + (y - sy)^2) \[m\], theta = atan2(y - sy, x - sx) \[rad\], counter-clockwise from the
/// x axis, angular. Undefined derivatives at the station itself.
///
/// Source: Y. Bar-Shalom, X. R. Li, T. Kirubarajan, Estimation with Applications to Tracking and Navigation
/// (Wiley, 2001), sec. 10.4.3 (polar measurements of a Cartesian state; section number from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct RangeBearing {
    station: [f64; 2],
    position: [usize; 2],
    outputs: [Output; 2],
}

/// What a suite or a case record says of a [`RangeBearing`].
#[derive(Debug, Clone, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Parameters {
    station: [f64; 2],
    #[serde(default = "default_position")]
    position: [usize; 2],
}

impl RangeBearing {
    /// A station at `station` \[m\] that reads the position at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if a coordinate is not finite or a component is outside the state or stands twice.
    pub fn new(station: [f64; 2], position: [usize; 2], n: usize) -> Result<Self, ParameterError> {
        checked_station("station", station)?;
        checked_position(position, n)?;
        Ok(Self { station, position, outputs: [Output::plain("range", "m"), Output::angle("bearing")] })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        Self::new(p.station, p.position, n)
    }
}

impl Formula for RangeBearing {
    fn reads(&self) -> &[usize] {
        &self.position
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        let (east, north) = seen_from(x, self.station);
        y[0] = east.hypot(north);
        y[1] = north.atan2(east);
    }
}
