//! A velocity written as a helmsman says it: speed, course, and how well both are known.

use nalgebra::DMatrix;

use super::SuiteError;
use super::frame::Direction;
use super::node::Node;
use super::quantity::{Quantity, Wanted, checked_sd};
use super::unit::Dimension;

const KEYS: [&str; 6] = ["speed", "speed_sd", "course", "course_sd", "climb", "climb_sd"];
const SPEED: Wanted<'_> = Wanted::Of(Dimension::Speed);
const ANGLE: Wanted<'_> = Wanted::Of(Dimension::Angle);

/// `speed`, `course`, their standard deviations, and perhaps a climb.
#[derive(Debug)]
pub(super) struct Velocity<'a> {
    speed: &'a Node,
    course: &'a Node,
    speed_sd: &'a Node,
    course_sd: &'a Node,
    climb: Option<(&'a Node, &'a Node)>,
}

impl<'a> Velocity<'a> {
    /// The velocity of the section, if it gives one.
    pub(super) fn read(section: &'a Node) -> Result<Option<Self>, SuiteError> {
        if KEYS.iter().all(|key| section.get(key).is_none()) {
            return Ok(None);
        }
        let need = |name, right| section.need(name, right);
        let speed = need("speed", "give a speed, as \"8 kn\"")?;
        let course = need("course", "give an angle, counter-clockwise from the x axis, as \"30 deg\"")?;
        let speed_sd = need("speed_sd", "give a speed, as \"0.5 m/s\", or a share of `speed`, as \"10 %\"")?;
        let course_sd = need("course_sd", "give an angle, as \"5 deg\"")?;
        let climb = match (section.get("climb"), section.get("climb_sd")) {
            (None, None) => None,
            _ => Some((
                need("climb", "give a speed upwards, as \"-2 m/s\"")?,
                need("climb_sd", "give a speed, as \"0.5 m/s\"")?,
            )),
        };
        Ok(Some(Self { speed, course, speed_sd, course_sd, climb }))
    }

    /// Where it stands.
    pub(super) fn place(&self) -> &'a Node {
        self.speed
    }

    /// Where the climb stands, if there is one.
    pub(super) fn climb(&self) -> Option<&'a Node> {
        self.climb.map(|(climb, _)| climb)
    }

    /// How many components it has: two, and one for a climb.
    pub(super) fn dimension(&self) -> usize {
        2 + usize::from(self.climb.is_some())
    }

    /// Mean v (cos c, sin c) and covariance T diag(speed_sd^2, (v course_sd)^2) T' with T the rotation by the
    /// course c: to first order in course_sd. A climb is independent of both.
    pub(super) fn moments(&self) -> Result<(Vec<f64>, DMatrix<f64>), SuiteError> {
        let speed = SPEED.read(self.speed)?;
        if speed <= 0.0 {
            return Err(self.speed.error(format!(
                "{} is not above 0, and without way there is no course; give the velocity by `rest_mean` and \
                 `rest_sd`",
                self.speed.describe()
            )));
        }
        let direction = Direction { bearing: ANGLE.read(self.course)?, elevation: 0.0 };
        let share = Quantity::of(self.speed_sd)?;
        let along = match share.dimension {
            Some(Dimension::Share) => checked_sd(self.speed_sd, share.value * speed)?,
            _ => SPEED.read_sd(self.speed_sd)?,
        };
        let across = speed * ANGLE.read_sd(self.course_sd)?;
        let [x, y, _] = direction.unit();
        let mut mean = vec![speed * x, speed * y];
        let mut covariance = direction.of_variances(&[along * along, across * across]);
        if let Some((climb, sd)) = self.climb {
            mean.push(SPEED.read(climb)?);
            covariance = covariance.resize(3, 3, 0.0);
            covariance[(2, 2)] = SPEED.read_sd(sd)?.powi(2);
        }
        Ok((mean, covariance))
    }
}
