use super::planar::{Lookout, Parameters};
use super::{Formula, Number, Output, ParameterError};

/// Range and bearing of a planar position from one or several stations.
///
/// r_j = sqrt((x - sx_j)^2 + (y - sy_j)^2) \[m\], theta_j = atan2(y - sy_j, x - sx_j) \[rad\],
/// counter-clockwise from the x axis, angular; range and bearing of the first station, then of the next.
/// Undefined derivatives at a station itself.
///
/// Source: Y. Bar-Shalom, X. R. Li, T. Kirubarajan, Estimation with Applications to Tracking and Navigation
/// (Wiley, 2001), sec. 10.4.3 (polar measurements of a Cartesian state; section number from memory).
#[derive(Debug, Clone, PartialEq)]
pub struct RangeBearing {
    lookout: Lookout,
    outputs: Vec<Output>,
}

impl RangeBearing {
    /// Stations \[m\] that read the position at the components `position` of a state of `n`.
    ///
    /// # Errors
    /// [`ParameterError`] if there is no station, a coordinate is not finite, or a component is outside the
    /// state or stands twice.
    pub fn new(stations: Vec<[f64; 2]>, position: [usize; 2], n: usize) -> Result<Self, ParameterError> {
        let lookout = Lookout::new(stations, position, n)?;
        let outputs =
            lookout.outputs(|called| vec![Output::plain(called("range"), "m"), Output::angle(called("bearing"))]);
        Ok(Self { lookout, outputs })
    }

    pub(super) fn from_parameters(p: Parameters, n: usize) -> Result<Self, ParameterError> {
        let (stations, position) = p.places()?;
        Self::new(stations, position, n)
    }
}

impl Formula for RangeBearing {
    fn reads(&self) -> &[usize] {
        &self.lookout.position
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        for ((east, north), pair) in self.lookout.seen(x).zip(y.chunks_exact_mut(2)) {
            pair[0] = east.hypot(north);
            pair[1] = north.atan2(east);
        }
    }
}
