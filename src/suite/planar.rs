//! A planar position written as an observer sees it: range, bearing, and how far it may lie along and
//! across the line of sight.

use nalgebra::DMatrix;

use super::SuiteError;
use super::node::Node;
use super::prior::{law, position};
use super::quantity::{Dimension, Quantity, Wanted, checked_sd};
use crate::gaussian::Gaussian;
use crate::sensor::SensorSpec;

/// `range`, `bearing`, `along_sd`, `across_sd`, and what may go with them.
#[derive(Debug)]
pub(super) struct Planar<'a> {
    section: &'a Node,
    range: &'a Node,
    bearing: &'a Node,
    along: &'a Node,
    across: &'a Node,
    rest: Option<(&'a Node, &'a Node)>,
}

impl<'a> Planar<'a> {
    pub(super) fn read(section: &'a Node) -> Result<Self, SuiteError> {
        let need = |name, right| section.need(name, right);
        let rest = match (section.get("rest_mean"), section.get("rest_sd")) {
            (None, None) => None,
            (Some(mean), Some(sd)) => Some((mean, sd)),
            (Some(_), None) => return Err(section.error("`rest_sd` is missing; `rest_mean` stands without it")),
            (None, Some(_)) => return Err(section.error("`rest_mean` is missing; `rest_sd` stands without it")),
        };
        Ok(Self {
            section,
            range: need("range", "give a length, as \"2 km\"")?,
            bearing: need("bearing", "give an angle, counter-clockwise from the x axis, as \"30 deg\"")?,
            along: need("along_sd", "give a length, as \"25 m\", or a share of the range, as \"10 %\"")?,
            across: need("across_sd", "give a length, an angle, as \"3 deg\", or a share of the range")?,
            rest,
        })
    }

    /// Two for the position and one for every further component.
    pub(super) fn dimension(&self) -> Result<usize, SuiteError> {
        Ok(2 + self.rest.map_or(Ok(0), |(mean, _)| mean.list().map(<[Node]>::len))?)
    }

    /// mean = origin + r (cos b, sin b), covariance = T diag(along^2, across^2) T' with T the rotation by b.
    /// The position takes the components that the sensor reads, `rest_mean` and `rest_sd` the others in
    /// their order.
    pub(super) fn gaussian(&self, sensor: &SensorSpec) -> Result<Gaussian, SuiteError> {
        let n = self.dimension()?;
        let [px, py] = position(sensor).unwrap_or([0, 1]);
        let [x, y] = self.origin(sensor)?;
        let range = Wanted::Length.read(self.range)?;
        if range <= 0.0 {
            return Err(self.range.error(format!("{} is not above 0, as a range is", self.range.describe())));
        }
        let (sine, cosine) = Wanted::Angle.read(self.bearing)?.sin_cos();
        let along = spread(self.along, range, false)?;
        let across = spread(self.across, range, true)?;

        let mut mean = vec![0.0; n];
        let mut covariance = DMatrix::zeros(n, n);
        mean[px] = x + range * cosine;
        mean[py] = y + range * sine;
        let (a, b) = (along * along, across * across);
        covariance[(px, px)] = cosine * cosine * a + sine * sine * b;
        covariance[(py, py)] = sine * sine * a + cosine * cosine * b;
        covariance[(px, py)] = sine * cosine * (a - b);
        covariance[(py, px)] = covariance[(px, py)];

        if let Some((rest_mean, rest_sd)) = self.rest {
            let (means, sds) = (rest_mean.list()?, rest_sd.list()?);
            if means.len() != sds.len() {
                return Err(rest_sd.error(format!(
                    "has {} entries, but `rest_mean` has {}",
                    sds.len(),
                    means.len()
                )));
            }
            let others = (0..n).filter(|&i| i != px && i != py);
            for (i, (m, sd)) in others.zip(means.iter().zip(sds)) {
                mean[i] = Wanted::Any.read(m)?;
                covariance[(i, i)] = Wanted::Any.read_sd(sd)?.powi(2);
            }
        }
        law(self.section, mean, self.section, covariance)
    }

    /// `seen_from`, else the sensor's station, else the first of its stations.
    fn origin(&self, sensor: &SensorSpec) -> Result<[f64; 2], SuiteError> {
        if let Some(node) = self.section.get("seen_from") {
            let [x, y] = node.list()? else { return Err(node.error("give one point [x, y]")) };
            return Ok([Wanted::Length.read(x)?, Wanted::Length.read(y)?]);
        }
        let parameters = sensor.parameters();
        let station = parameters.get("station").or_else(|| parameters.get("stations")?.get(0));
        station.and_then(|s| serde_json::from_value(s.clone()).ok()).ok_or_else(|| {
            self.section.error(format!(
                "the sensor `{}` has no station to see range and bearing from; give `seen_from = [x, y]`, \
                 or the prior by `mean` and `sd`",
                sensor.kind()
            ))
        })
    }
}

/// A standard deviation of position: a length, a share of the range, or, across the line of sight, an angle.
fn spread(node: &Node, range: f64, across: bool) -> Result<f64, SuiteError> {
    let quantity = Quantity::of(node)?;
    let sd = match quantity.dimension {
        None | Some(Dimension::Length) => quantity.value,
        Some(Dimension::Share) => quantity.value * range,
        Some(Dimension::Angle) if across => quantity.value * range,
        Some(Dimension::Angle) => {
            let given = node.describe();
            return Err(
                node.error(format!("{given} is an angle; along the line of sight give a length or a share"))
            );
        }
    };
    checked_sd(node, sd)
}
