//! A state written as an observer sees it: range, bearing and perhaps elevation, how far the position may lie along
//! and across the line of sight, and perhaps speed and course.

use nalgebra::DMatrix;

use super::SuiteError;
use super::frame::{Direction, Frame};
use super::layout::{Layout, free};
use super::node::Node;
use super::numbers::{covariance_error, matrix};
use super::prior::law;
use super::quantity::{Quantity, Wanted, checked_sd};
use super::unit::Dimension;
use super::velocity::Velocity;
use crate::gaussian::{Gaussian, checked_covariance};

const LENGTH: Wanted<'_> = Wanted::Of(Dimension::Length);

/// `range`, `bearing`, a spread, and what may go with them.
#[derive(Debug)]
pub(super) struct Sighting<'a> {
    section: &'a Node,
    range: &'a Node,
    bearing: &'a Node,
    elevation: Option<&'a Node>,
    spread: Spread<'a>,
    velocity: Option<Velocity<'a>>,
    rest: Option<(&'a Node, &'a Node)>,
}

/// How far the position may lie from where it is seen.
#[derive(Debug)]
enum Spread<'a> {
    /// Standard deviations along, across and, in space, up.
    Axes(Vec<&'a Node>),
    /// `frame_covariance`, in the axes of the line of sight or of a frame of its own.
    Covariance(&'a Node, Option<Frame<'a>>),
}

impl<'a> Sighting<'a> {
    pub(super) fn read(section: &'a Node) -> Result<Self, SuiteError> {
        let rest = match (section.get("rest_mean"), section.get("rest_sd")) {
            (None, None) => None,
            (Some(mean), Some(sd)) => Some((mean, sd)),
            (Some(_), None) => return Err(section.error("`rest_sd` is missing; `rest_mean` stands without it")),
            (None, Some(_)) => return Err(section.error("`rest_mean` is missing; `rest_sd` stands without it")),
        };
        let sighting = Self {
            section,
            range: section.need("range", "give a length, as \"2 km\"")?,
            bearing: section.need("bearing", "give an angle, counter-clockwise from the x axis, as \"30 deg\"")?,
            elevation: section.get("elevation"),
            spread: Spread::read(section)?,
            velocity: Velocity::read(section)?,
            rest,
        };
        if let (None, Some(climb)) = (sighting.elevation, sighting.velocity.as_ref().and_then(Velocity::climb)) {
            return Err(climb.error("stands without `elevation`; a position in the plane has no climb"));
        }
        Ok(sighting)
    }

    /// Components of the position.
    fn places(&self) -> usize {
        2 + usize::from(self.elevation.is_some())
    }

    /// Components of the velocity.
    fn speeds(&self) -> usize {
        self.velocity.as_ref().map_or(0, Velocity::dimension)
    }

    /// Those of position and velocity, and one for every further component.
    pub(super) fn dimension(&self) -> Result<usize, SuiteError> {
        let rest = self.rest.map_or(Ok(0), |(mean, _)| mean.list().map(<[Node]>::len))?;
        Ok(self.places() + self.speeds() + rest)
    }

    /// mean = origin + r (cos e cos b, cos e sin b, sin e), covariance = T K T' with the columns of T the axes
    /// along, across and up. The position takes the components that the sensor reads, the velocity those that it
    /// reads or the first others, `rest_mean` and `rest_sd` what is left, in their order.
    pub(super) fn gaussian(&self, layout: Layout<'_>) -> Result<Gaussian, SuiteError> {
        let n = self.dimension()?;
        let position = self.position(layout)?;
        let velocity = self.velocity_components(layout, &position)?;
        let taken = [&position[..], &velocity[..]].concat();
        if let Some(flaw) = (0..taken.len()).find(|&i| taken[i] >= n || taken[..i].contains(&taken[i])) {
            return Err(self.section.error(format!(
                "the sensor `{}` reads position and velocity from the components {taken:?}; component {} is \
                 outside the state of {n} or stands twice",
                layout.sensor, taken[flaw]
            )));
        }
        let mut mean = vec![0.0; n];
        let mut covariance = DMatrix::zeros(n, n);
        let mut put = |at: &[usize], m: &[f64], p: &DMatrix<f64>| {
            for (i, &row) in at.iter().enumerate() {
                mean[row] = m[i];
                for (j, &column) in at.iter().enumerate() {
                    covariance[(row, column)] = p[(i, j)];
                }
            }
        };

        let (m, p) = self.placed(layout)?;
        put(&position, &m, &p);
        if let Some(given) = &self.velocity {
            let (m, p) = given.moments()?;
            put(&velocity, &m, &p);
        }
        if let Some((rest_mean, rest_sd)) = self.rest {
            let (means, sds) = (rest_mean.list()?, rest_sd.list()?);
            if means.len() != sds.len() {
                return Err(rest_sd.error(format!(
                    "has {} entries, but `rest_mean` has {}",
                    sds.len(),
                    means.len()
                )));
            }
            for (i, (m, sd)) in free(means.len(), &taken).into_iter().zip(means.iter().zip(sds)) {
                mean[i] = layout.wanted(i).read(m)?;
                covariance[(i, i)] = layout.wanted(i).read_sd(sd)?.powi(2);
            }
        }
        law(self.section, mean, self.section, covariance)
    }

    /// Mean and covariance of the position.
    fn placed(&self, layout: Layout<'_>) -> Result<(Vec<f64>, DMatrix<f64>), SuiteError> {
        let origin = self.origin(layout)?;
        let range = LENGTH.read(self.range)?;
        if range <= 0.0 {
            return Err(self.range.error(format!("{} is not above 0, as a range is", self.range.describe())));
        }
        let sight = Direction::read(self.bearing, self.elevation)?;
        let mean = origin.iter().zip(sight.unit()).map(|(o, u)| o + range * u).collect();
        Ok((mean, self.spread.covariance(self.places(), range, sight)?))
    }

    /// The components that the sensor reads as the position, else the first ones.
    fn position(&self, layout: Layout<'_>) -> Result<Vec<usize>, SuiteError> {
        let (sensor, places) = (layout.sensor, self.places());
        match (layout.position(), self.elevation) {
            (None, _) => layout.unnamed_position(places, self.dimension()?, self.range),
            (Some(named), _) if named.len() == places => Ok(named),
            (Some(named), None) => Err(self.section.error(format!(
                "`elevation` is missing; the sensor `{sensor}` reads a position in space, components {named:?}"
            ))),
            (Some(named), Some(elevation)) => Err(elevation.error(format!(
                "the sensor `{sensor}` reads a position in the plane, components {named:?}; leave `elevation` out"
            ))),
        }
    }

    /// The components that the sensor reads as the velocity, else the first that are not of the position.
    fn velocity_components(&self, layout: Layout<'_>, position: &[usize]) -> Result<Vec<usize>, SuiteError> {
        let Some(velocity) = &self.velocity else { return Ok(Vec::new()) };
        let (sensor, speeds) = (layout.sensor, self.speeds());
        match (layout.velocity(), velocity.climb()) {
            (None, _) => layout.unnamed_velocity(speeds, position, velocity.place()),
            (Some(named), _) if named.len() == speeds => Ok(named),
            (Some(named), None) => Err(self.section.error(format!(
                "`climb` is missing; the sensor `{sensor}` reads a velocity in space, components {named:?}"
            ))),
            (Some(named), Some(climb)) => Err(climb.error(format!(
                "the sensor `{sensor}` reads a velocity in the plane, components {named:?}; leave `climb` out"
            ))),
        }
    }

    /// `seen_from`, else the sensor's station, else the first of its stations.
    fn origin(&self, layout: Layout<'_>) -> Result<Vec<f64>, SuiteError> {
        let (places, sensor) = (self.places(), layout.sensor);
        let point = if places == 2 { "[x, y]" } else { "[x, y, z]" };
        if let Some(node) = self.section.get("seen_from") {
            return match node.list()? {
                list if list.len() == places => list.iter().map(|c| LENGTH.read(c)).collect(),
                _ => Err(node.error(format!("give one point {point}"))),
            };
        }
        match layout.station() {
            Some(station) if station.len() == places => Ok(station),
            Some(station) => Err(self.section.error(format!(
                "the station of the sensor `{sensor}` has {} coordinates; give `seen_from = {point}`",
                station.len()
            ))),
            None => Err(self.section.error(format!(
                "the sensor `{sensor}` has no station to see range and bearing from; give `seen_from = {point}`, \
                 or the prior by `mean` and `sd`"
            ))),
        }
    }
}

impl<'a> Spread<'a> {
    fn read(section: &'a Node) -> Result<Self, SuiteError> {
        let frame = Frame::read(section)?;
        let in_space = section.get("elevation").is_some();
        if let Some(covariance) = section.get("frame_covariance") {
            return match ["along_sd", "across_sd", "up_sd"].iter().find(|axis| section.get(axis).is_some()) {
                Some(axis) => Err(covariance.error(format!("stands beside `{axis}`; give one of the two"))),
                None => Ok(Self::Covariance(covariance, frame)),
            };
        }
        if let Some(frame) = frame {
            return Err(frame.bearing.error(
                "turns a `frame_covariance`, or the spread about a `mean`; `along_sd` and `across_sd` go with the \
                 line of sight",
            ));
        }
        let mut axes = vec![
            section.need("along_sd", "give a length, as \"25 m\", or a share of the range, as \"10 %\"")?,
            section.need("across_sd", "give a length, an angle, as \"3 deg\", or a share of the range")?,
        ];
        match section.get("up_sd") {
            Some(up) if !in_space => {
                return Err(up.error("stands without `elevation`; a position in the plane has no spread upwards"));
            }
            None if in_space => {
                return Err(section.error(
                    "`up_sd` is missing; `elevation` stands without it: give a length, an angle, as \"3 deg\", or a \
                     share of the range",
                ));
            }
            up => axes.extend(up),
        }
        Ok(Self::Axes(axes))
    }

    /// Covariance of a position of `places` components, seen at `range` in the direction `sight`.
    fn covariance(&self, places: usize, range: f64, sight: Direction) -> Result<DMatrix<f64>, SuiteError> {
        match self {
            Self::Axes(axes) => {
                let variance = |(i, node): (usize, &&Node)| Ok(axis_sd(node, range, i > 0)?.powi(2));
                let variances = axes.iter().enumerate().map(variance).collect::<Result<Vec<_>, SuiteError>>()?;
                Ok(sight.of_variances(&variances))
            }
            Self::Covariance(node, frame) => {
                let direction = frame.map_or(Ok(sight), |frame| frame.direction(places))?;
                let k = checked_covariance(matrix(node)?, places).map_err(|e| covariance_error(node, &e))?;
                let all: Vec<usize> = (0..places).collect();
                Ok(direction.of_covariance(&k, &all))
            }
        }
    }
}

/// A standard deviation of position: a length, a share of the range, or, across the line of sight, an angle.
fn axis_sd(node: &Node, range: f64, across: bool) -> Result<f64, SuiteError> {
    let quantity = Quantity::of(node)?;
    let sd = match quantity.dimension {
        None | Some(Dimension::Length) => quantity.value,
        Some(Dimension::Share) => quantity.value * range,
        Some(Dimension::Angle) if across => quantity.value * range,
        Some(is) => {
            let (given, is) = (node.describe(), is.name());
            let right = if across {
                "across the line of sight give a length, an angle or a share"
            } else {
                "along the line of sight give a length or a share"
            };
            return Err(node.error(format!("{given} is {is}; {right}")));
        }
    };
    checked_sd(node, sd)
}

#[cfg(test)]
mod tests {
    use serde_json::{Value, json};

    use super::*;

    /// A position in space with a velocity, for a sensor with these parameters.
    fn seen(parameters: Value, more: &str) -> Result<Gaussian, String> {
        let Value::Object(parameters) = parameters else { panic!("no object") };
        let text = format!(
            "range = 10\nbearing = \"90 deg\"\nspeed = 4\ncourse = \"180 deg\"\nspeed_sd = 1\ncourse_sd = \"0.5 rad\"\n{more}"
        );
        let root = Node::parse(&text).unwrap();
        let layout = Layout { sensor: "invented", parameters: &parameters, outline: None };
        Sighting::read(&root).and_then(|sighting| sighting.gaussian(layout)).map_err(|e| e.to_string())
    }

    const SPACE: &str = "elevation = \"0 deg\"\nalong_sd = 1\nacross_sd = 2\nup_sd = 3\nclimb = 5\nclimb_sd = 6\n";
    const PLANE: &str = "along_sd = 1\nacross_sd = 2\n";

    #[test]
    fn components_and_station_are_the_sensors() {
        let parameters =
            json!({ "stations": [[1, 2, 3], [0, 0, 0]], "position": [4, 0, 2], "velocity": [6, 3, 1] });
        let law = seen(parameters, &format!("{SPACE}rest_mean = [7]\nrest_sd = [8]\n")).unwrap();
        // Rounding of the cosine of a right angle, times 10 m.
        const ROUNDING: f64 = 1e-14;
        let mean = [12.0, 5.0, 3.0, 0.0, 1.0, 7.0, -4.0];
        let variances = [1.0, 36.0, 9.0, 4.0, 4.0, 64.0, 1.0];
        for i in 0..7 {
            assert!((law.mean()[i] - mean[i]).abs() < ROUNDING, "{}", law.mean());
            assert!((law.covariance()[(i, i)] - variances[i]).abs() < ROUNDING, "{}", law.covariance());
        }
    }

    #[test]
    fn a_sensor_that_reads_something_else_is_named() {
        for (parameters, more, said) in [
            (
                json!({ "station": [0, 0, 0], "position": [0, 1, 2] }),
                PLANE,
                ":1: `elevation` is missing; the sensor `invented` reads a position in space, components [0, 1, 2]",
            ),
            (
                json!({ "station": [0, 0] }),
                SPACE,
                ":1: the station of the sensor `invented` has 2 coordinates; give `seen_from = [x, y, z]`",
            ),
            (
                json!({ "station": [0, 0], "velocity": [2, 3, 4] }),
                PLANE,
                ":1: `climb` is missing; the sensor `invented` reads a velocity in space, components [2, 3, 4]",
            ),
            (
                json!({ "station": [0, 0, 0], "velocity": [3, 4] }),
                SPACE,
                ":11: climb: the sensor `invented` reads a velocity in the plane, components [3, 4]; leave `climb` out",
            ),
            (
                json!({ "station": [0, 0], "velocity": [1, 2] }),
                PLANE,
                ":1: the sensor `invented` reads position and velocity from the components [0, 1, 1, 2]; component 1 \
                 is outside the state of 4 or stands twice",
            ),
            (
                json!({ "station": [0, 0], "position": [0, 9] }),
                PLANE,
                ":1: the sensor `invented` reads position and velocity from the components [0, 9, 1, 2]; component 9 \
                 is outside the state of 4 or stands twice",
            ),
        ] {
            assert_eq!(seen(parameters, more).unwrap_err(), said);
        }
    }
}
