//! Directions in the plane and in space, and covariances that are written along and across them.
//!
//! The axes of a direction with bearing b and elevation e are the columns of T = Rz(b) Ry(-e), elementary rotations
//! about the z and the y axis (D. Koks, Explorations in Mathematical Physics, Springer 2006, ch. 4; chapter from
//! memory):
//!
//! - along: (cos e cos b, cos e sin b, sin e);
//! - across, horizontal and to the left: (-sin b, cos b, 0);
//! - up, across both: (-sin e cos b, -sin e sin b, cos e).
//!
//! In the plane e = 0 and the third is left out.

use std::f64::consts::FRAC_PI_2;

use nalgebra::DMatrix;

use super::SuiteError;
use super::node::Node;
use super::quantity::Wanted;
use super::unit::Dimension;
use crate::gaussian::SquareRoot;

/// A direction: bearing from the x axis, elevation above the x-y plane, in radians.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Direction {
    pub bearing: f64,
    pub elevation: f64,
}

impl Direction {
    /// Reads a bearing and, in space, an elevation of at most 90 degrees up or down.
    pub(super) fn read(bearing: &Node, elevation: Option<&Node>) -> Result<Self, SuiteError> {
        let angle = Wanted::Of(Dimension::Angle);
        let bearing = angle.read(bearing)?;
        let Some(node) = elevation else { return Ok(Self { bearing, elevation: 0.0 }) };
        let elevation = angle.read(node)?;
        if elevation.abs() > FRAC_PI_2 {
            let given = node.describe();
            return Err(node.error(format!("{given} is beyond the vertical; give -90 deg to 90 deg")));
        }
        Ok(Self { bearing, elevation })
    }

    /// The unit vector of the direction.
    pub(super) fn unit(self) -> [f64; 3] {
        let ((sb, cb), (se, ce)) = (self.bearing.sin_cos(), self.elevation.sin_cos());
        [ce * cb, ce * sb, se]
    }

    /// T D T' with D the diagonal of `variances`: along, across and, in space, up.
    pub(super) fn of_variances(self, variances: &[f64]) -> DMatrix<f64> {
        let ((sb, cb), (se, ce)) = (self.bearing.sin_cos(), self.elevation.sin_cos());
        let (along, across, up) = (variances[0], variances[1], variances.get(2));
        // In the vertical plane of the direction first: towards the horizontal, upwards, and between the two.
        let (out, rise, between) = match up {
            Some(up) => (ce * ce * along + se * se * up, se * se * along + ce * ce * up, se * ce * (along - up)),
            None => (along, 0.0, 0.0),
        };
        let (xx, yy) = (cb * cb * out + sb * sb * across, sb * sb * out + cb * cb * across);
        let xy = sb * cb * (out - across);
        match up {
            None => DMatrix::from_row_slice(2, 2, &[xx, xy, xy, yy]),
            Some(_) => {
                let (xz, yz) = (cb * between, sb * between);
                DMatrix::from_row_slice(3, 3, &[xx, xy, xz, xy, yy, yz, xz, yz, rise])
            }
        }
    }

    /// T K T' where T turns the components `at` of a state (two or three) and leaves the others.
    ///
    /// By a square root of K, so that a covariance without variance in some direction stays one: turned as it
    /// stands, rounding would leave variances below zero.
    pub(super) fn of_covariance(self, k: &DMatrix<f64>, at: &[usize]) -> DMatrix<f64> {
        let mut root = SquareRoot::of(k).into_factor();
        if let Some(&z) = at.get(2) {
            turn_rows(&mut root, at[0], z, self.elevation);
        }
        turn_rows(&mut root, at[0], at[1], self.bearing);
        let turned = &root * root.transpose();
        DMatrix::from_fn(k.nrows(), k.ncols(), |i, j| {
            if at.contains(&i) || at.contains(&j) { turned[(i, j)] } else { k[(i, j)] }
        })
    }
}

/// Turns rows `i` and `j` by `angle`, from `i` towards `j`.
fn turn_rows(root: &mut DMatrix<f64>, i: usize, j: usize, angle: f64) {
    let (sine, cosine) = angle.sin_cos();
    for column in 0..root.ncols() {
        let (a, b) = (root[(i, column)], root[(j, column)]);
        root[(i, column)] = cosine * a - sine * b;
        root[(j, column)] = sine * a + cosine * b;
    }
}

/// `frame_bearing` and perhaps `frame_elevation`: the direction along which a covariance is written.
#[derive(Debug, Clone, Copy)]
pub(super) struct Frame<'a> {
    pub bearing: &'a Node,
    pub elevation: Option<&'a Node>,
}

impl<'a> Frame<'a> {
    /// The frame of the section, if it gives one.
    pub(super) fn read(section: &'a Node) -> Result<Option<Self>, SuiteError> {
        match (section.get("frame_bearing"), section.get("frame_elevation")) {
            (Some(bearing), elevation) => Ok(Some(Self { bearing, elevation })),
            (None, Some(elevation)) => Err(elevation.error("stands without `frame_bearing`; give both")),
            (None, None) => Ok(None),
        }
    }

    /// Its direction, for a position of `dimension` components.
    pub(super) fn direction(self, dimension: usize) -> Result<Direction, SuiteError> {
        match self.elevation.filter(|_| dimension == 2) {
            Some(node) => Err(node.error("lifts the axes of a position in the plane; leave it out")),
            None => Direction::read(self.bearing, self.elevation),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// T written out as the product of the elementary rotations.
    fn rotation(d: Direction) -> DMatrix<f64> {
        let ((sb, cb), (se, ce)) = (d.bearing.sin_cos(), d.elevation.sin_cos());
        let about_z = DMatrix::from_row_slice(3, 3, &[cb, -sb, 0.0, sb, cb, 0.0, 0.0, 0.0, 1.0]);
        let lift = DMatrix::from_row_slice(3, 3, &[ce, 0.0, -se, 0.0, 1.0, 0.0, se, 0.0, ce]);
        about_z * lift
    }

    /// Rounding of a dozen products of numbers up to 100.
    const ROUNDING: f64 = 1e-12;

    fn directions() -> impl Iterator<Item = Direction> {
        let bearings = [0.0, 0.3, FRAC_PI_2, 2.5, -2.0, 7.0];
        let elevations = [0.0, 0.4, -1.1, FRAC_PI_2, -FRAC_PI_2];
        bearings.into_iter().flat_map(move |bearing| elevations.map(|elevation| Direction { bearing, elevation }))
    }

    #[test]
    fn covariances_are_turned_as_the_rotation_matrix_turns_them() {
        let k = DMatrix::from_row_slice(3, 3, &[100.0, 12.0, -3.0, 12.0, 9.0, 1.0, -3.0, 1.0, 4.0]);
        for d in directions() {
            let t = rotation(d);
            assert!((t.column(0) - nalgebra::DVector::from_row_slice(&d.unit())).amax() < ROUNDING, "{d:?}");
            let expected = &t * &k * t.transpose();
            assert!((d.of_covariance(&k, &[0, 1, 2]) - expected).amax() < ROUNDING, "{d:?}");
            let diagonal = DMatrix::from_diagonal(&k.diagonal());
            let expected = &t * diagonal * t.transpose();
            assert!((d.of_variances(k.diagonal().as_slice()) - expected).amax() < ROUNDING, "{d:?}");
        }
    }

    #[test]
    fn only_the_named_components_are_turned() {
        // Components 3 and 1 by a right angle: what was along the first comes to lie along the second.
        let root = DMatrix::from_fn(4, 4, |i, j| if j <= i { (1 + i + 2 * j) as f64 } else { 0.0 });
        let k = &root * root.transpose();
        let quarter = Direction { bearing: FRAC_PI_2, elevation: 0.0 };
        let turned = quarter.of_covariance(&k, &[3, 1]);
        let t = DMatrix::from_row_slice(
            4,
            4,
            &[1.0, 0.0, 0.0, 0.0, 0.0, 0.0, 0.0, 1.0, 0.0, 0.0, 1.0, 0.0, 0.0, -1.0, 0.0, 0.0],
        );
        let expected = &t * &k * t.transpose();
        assert!((&turned - expected).amax() < ROUNDING * k.amax(), "{turned}");
        assert_eq!((turned[(0, 0)], turned[(2, 0)]), (k[(0, 0)], k[(2, 0)]));
    }

    #[test]
    fn in_the_plane_nothing_but_the_third_row_is_left_out() {
        for d in directions().filter(|d| d.elevation == 0.0) {
            let (flat, space) = (d.of_variances(&[100.0, 9.0]), d.of_variances(&[100.0, 9.0, 4.0]));
            assert_eq!(space.view((0, 0), (2, 2)), flat.view((0, 0), (2, 2)));
            assert_eq!((space[(2, 2)], space[(0, 2)], space[(1, 2)]), (4.0, 0.0, 0.0));
        }
    }

    #[test]
    fn a_covariance_without_variance_in_a_direction_stays_one() {
        // All components equal: rank one, whose turned variances cancel but for rounding.
        let k = DMatrix::from_element(3, 3, 1.0);
        for i in 0..200 {
            let d = Direction { bearing: 0.1 * f64::from(i), elevation: (0.7 * f64::from(i)).sin() };
            let turned = d.of_covariance(&k, &[0, 1, 2]);
            let law = crate::gaussian::checked_covariance(turned.clone(), 3);
            assert!(law.is_ok(), "{d:?}: {}", law.unwrap_err());
            assert!((turned.trace() - 3.0).abs() < ROUNDING, "{turned}");
        }
    }
}
