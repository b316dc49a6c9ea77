use std::f64::consts::{PI, TAU};

use nalgebra::{DMatrix, DVector};
use smallvec::SmallVec;

use super::basis::Basis;
use super::columns::Column;
use super::sums::Sums;
use crate::lanes::{Lanes, Level, Simd, Task, dispatch};
use crate::net::{BLOCK, Net};
use crate::sensor::Sensor;

/// A block of points on its way from the net to the sums, one array a coordinate.
#[derive(Debug, Clone)]
pub(super) struct Block {
    level: Level,
    /// Standard normals (a).
    pub z: Vec<Column>,
    x: Vec<Column>,
    /// Values of h, then deviations from the charts' centres (p).
    pub deviation: Vec<Column>,
    /// Deviations less the linear fit (p).
    pub e: Vec<Column>,
    /// One-dimensional Hermite polynomials of z.
    columns: Vec<Column>,
}

impl Block {
    /// Room for `a` inputs, `p` outputs and the columns of `basis`, worked with the instructions of `level`.
    pub fn new(level: Level, a: usize, p: usize, basis: &Basis) -> Self {
        let room = |n: usize| vec![[0.0; BLOCK]; n];
        Self { level, z: room(a), x: room(a), deviation: room(p), e: room(p), columns: room(basis.columns()) }
    }

    /// The normals of block `index` of a net.
    pub fn take_net(&mut self, net: &Net, index: u64) {
        dispatch(self.level, Normals { net, index, z: self.z.as_flattened_mut() });
    }

    /// x = m + F z and h(x).
    pub fn evaluate(&mut self, sensor: &dyn Sensor, mean: &DVector<f64>, root: &DMatrix<f64>) {
        dispatch(self.level, Place { z: &self.z, x: &mut self.x, mean: mean.as_slice(), root });
        sensor.sample(self.level, BLOCK, self.x.as_flattened(), self.deviation.as_flattened_mut());
    }

    /// Turns the values into deviations from `centre`, wrapped where `angular`, and e = deviation - slope z.
    pub fn subtract(&mut self, centre: &DVector<f64>, angular: &[bool], slope: &DMatrix<f64>) {
        dispatch(
            self.level,
            Subtract {
                z: &self.z,
                deviation: &mut self.deviation,
                e: &mut self.e,
                centre: centre.as_slice(),
                angular,
                slope,
            },
        );
    }

    /// Adds the block to `sums`.
    pub fn add_to(&mut self, sums: &mut Sums, basis: &Basis) {
        dispatch(self.level, Add { z: &self.z, e: &self.e, columns: &mut self.columns, basis, sums });
    }
}

struct Normals<'a> {
    net: &'a Net,
    index: u64,
    z: &'a mut [f64],
}

impl Task for Normals<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        self.net.normals(self.index, self.z);
    }
}

struct Place<'a> {
    z: &'a [Column],
    x: &'a mut [Column],
    mean: &'a [f64],
    root: &'a DMatrix<f64>,
}

impl Task for Place<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        for (i, x) in self.x.iter_mut().enumerate() {
            let terms = terms(self.root.row(i).iter().copied(), self.z);
            for (eight, x) in x.as_chunks_mut().0.iter_mut().enumerate() {
                *x = add_terms(Lanes::<S>::splat(self.mean[i]), &terms, eight).to_array();
            }
        }
    }
}

struct Subtract<'a> {
    z: &'a [Column],
    deviation: &'a mut [Column],
    e: &'a mut [Column],
    centre: &'a [f64],
    angular: &'a [bool],
    slope: &'a DMatrix<f64>,
}

impl Task for Subtract<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        for (j, (deviation, e)) in self.deviation.iter_mut().zip(self.e).enumerate() {
            let terms = terms(self.slope.row(j).iter().map(|slope| -slope), self.z);
            let eights = deviation.as_chunks_mut().0.iter_mut().zip(e.as_chunks_mut().0);
            for (eight, (deviation, e)) in eights.enumerate() {
                let mut d = Lanes::<S>::from_array(deviation) - self.centre[j];
                if self.angular[j] {
                    d = wrapped(d);
                }
                *deviation = d.to_array();
                *e = add_terms(d, &terms, eight).to_array();
            }
        }
    }
}

struct Add<'a> {
    z: &'a [Column],
    e: &'a [Column],
    columns: &'a mut [Column],
    basis: &'a Basis,
    sums: &'a mut Sums,
}

impl Task for Add<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        self.basis.write_columns(self.z, self.columns);
        self.sums.add_block::<S>(self.z, self.e, self.basis, self.columns);
    }
}

/// What a linear map's row makes of z: its factors that are not zero, each with its column.
type Terms<'a> = SmallVec<[(f64, &'a Column); 8]>;

#[inline(always)]
fn terms(factors: impl Iterator<Item = f64>, z: &[Column]) -> Terms<'_> {
    factors.zip(z).filter(|(factor, _)| *factor != 0.0).collect()
}

/// `start` and the terms' values of eight points, one after the other.
#[inline(always)]
fn add_terms<S: Simd>(start: Lanes<S>, terms: &Terms<'_>, eight: usize) -> Lanes<S> {
    let mut sum = start;
    for (factor, column) in terms {
        sum = sum + *factor * Lanes::from_array(&column.as_chunks().0[eight]);
    }
    sum
}

/// Angles wrapped to (-pi, pi] without a branch, as [`wrap`](crate::gaussian::wrap) does for all within many
/// turns: whole turns are counted by adding and subtracting 1.5 2^52, which rounds to a whole number.
#[inline(always)]
fn wrapped<S: Simd>(angle: Lanes<S>) -> Lanes<S> {
    const MAGIC: f64 = 6_755_399_441_055_744.0;
    let turns = (angle * (1.0 / TAU) + MAGIC) - MAGIC;
    let d = angle - turns * TAU;
    let d = d.greater(Lanes::splat(PI)).select(d - TAU, d);
    d.at_most(Lanes::splat(-PI)).select(d + TAU, d)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::gaussian::wrap;

    struct Wrap<'a>(&'a mut [f64; 8]);

    impl Task for Wrap<'_> {
        type Output = ();

        #[inline(always)]
        fn run<S: Simd>(self) {
            *self.0 = super::wrapped(Lanes::<S>::from_array(self.0)).to_array();
        }
    }

    fn wrapped(angle: f64) -> f64 {
        let mut angles = [angle; 8];
        dispatch(Level::best(), Wrap(&mut angles));
        angles[0]
    }

    #[test]
    fn wrapping_without_a_branch_is_wrapping() {
        let edges = [PI, -PI, PI.next_up(), (-PI).next_up(), (-PI).next_down(), 2.0 * PI, -2.0 * PI, 0.0];
        let grid = (-4000..4000).map(|k| f64::from(k) * 0.0157);
        for angle in edges.into_iter().chain(grid) {
            let (fast, exact) = (wrapped(angle), wrap(angle));
            assert!(fast > -PI && fast <= PI, "{angle}: {fast}");
            let apart = (fast - exact).abs();
            // Beside the cut itself rounding decides on the side.
            assert!(apart < 1e-14 || (TAU - apart).abs() < 1e-14, "{angle}: {fast} and {exact}");
        }
        assert!(wrapped(f64::NAN).is_nan() && wrapped(f64::INFINITY).is_nan());
    }
}
