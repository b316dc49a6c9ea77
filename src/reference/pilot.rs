use nalgebra::{Cholesky, DMatrix, DVector};
use rand::RngExt;
use rand_distr::StandardNormal;
use rand_pcg::Pcg64Dxsm;

use super::chart::CircularSum;
use super::stream::Key;
use super::tally::Tally;
use crate::gaussian::{Gaussian, wrap};
use crate::sensor::Sensor;

/// Points of a block: one stream each, small enough for the first-level cache.
pub(super) const BLOCK: usize = 1024;
/// Blocks that a replicate starts with.
pub(super) const FIRST_BLOCKS: u64 = 4;
/// Blocks of the pilot.
const PILOT_BLOCKS: u64 = 16;

/// Points laid out one array a coordinate: z (a), x (a), e (p).
#[derive(Debug, Clone)]
pub(super) struct Block {
    pub z: Vec<f64>,
    pub x: Vec<f64>,
    pub e: Vec<f64>,
}

impl Block {
    pub fn new(a: usize, p: usize) -> Self {
        Self { z: vec![0.0; a * BLOCK], x: vec![0.0; a * BLOCK], e: vec![0.0; p * BLOCK] }
    }

    /// Draws z ~ N(0, I), x = m + F z, and writes h(x) into e.
    pub fn draw(&mut self, rng: &mut Pcg64Dxsm, sensor: &dyn Sensor, mean: &DVector<f64>, root: &DMatrix<f64>) {
        for z in &mut self.z {
            *z = rng.sample(StandardNormal);
        }
        for (i, x) in self.x.chunks_exact_mut(BLOCK).enumerate() {
            x.fill(mean[i]);
            for (k, z) in self.z.chunks_exact(BLOCK).enumerate() {
                add_scaled(x, root[(i, k)], z);
            }
        }
        sensor.values(BLOCK, &self.x, &mut self.e);
    }

    /// Turns the values in e into deviations from `centre`, wrapped where `angular`.
    pub fn centre_on(&mut self, centre: &DVector<f64>, angular: &[bool]) {
        for (j, e) in self.e.chunks_exact_mut(BLOCK).enumerate() {
            for v in e.iter_mut() {
                *v -= centre[j];
            }
            if angular[j] {
                for v in e {
                    *v = wrap(*v);
                }
            }
        }
    }

    /// Subtracts the linear fit: e_j -= sum_k slope_jk z_k.
    pub fn subtract_fit(&mut self, slope: &DMatrix<f64>) {
        for (j, e) in self.e.chunks_exact_mut(BLOCK).enumerate() {
            for (k, z) in self.z.chunks_exact(BLOCK).enumerate() {
                add_scaled(e, -slope[(j, k)], z);
            }
        }
    }
}

#[inline]
fn add_scaled(to: &mut [f64], factor: f64, from: &[f64]) {
    if factor != 0.0 {
        for (t, f) in to.iter_mut().zip(from) {
            *t += factor * f;
        }
    }
}

/// What a first look at a case fixes for all replicates: where each output is centred, and the linear fit that
/// is subtracted from every sample. Its own streams; given the pilot, replicates are independent and unbiased.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Pilot {
    /// About where each output lies (p): the mean, the circular mean where angular.
    pub centre: DVector<f64>,
    /// Fit of the deviation on z (p x a).
    pub slope: DMatrix<f64>,
    /// Angular outputs whose samples come far from the centre, so that the place of the cut matters.
    pub far: Vec<bool>,
    /// How far each chart may have to move after the first blocks \[rad\]; `None` where an output is plain.
    pub bands: Vec<Option<f64>>,
}

/// A deviation beyond this [rad] in the pilot makes an angle a far one.
const FAR: f64 = 1.0;

impl Pilot {
    pub fn run(key: &Key, sensor: &dyn Sensor, prior: &Gaussian, root: &DMatrix<f64>) -> Self {
        let angular: Vec<bool> = sensor.outputs().iter().map(|o| o.angular).collect();
        let (a, p) = (prior.dimension(), angular.len());
        let mut block = Block::new(a, p);
        let mut centre = first_centre(key, sensor, prior, root, &angular, &mut block);
        let mut tally = Tally::empty(a, p);
        let mut part = Tally::empty(a, p);
        let mut squares = Tally::empty(a, a);
        let mut square_part = Tally::empty(a, a);
        let mut circles = vec![CircularSum::default(); p];
        let mut far = vec![false; p];
        for b in 0..PILOT_BLOCKS {
            block.draw(&mut key.pilot(b), sensor, prior.mean(), root);
            block.centre_on(&centre, &angular);
            for (j, e) in block.e.chunks_exact(BLOCK).enumerate() {
                if angular[j] {
                    circles[j].add(e);
                    far[j] |= e.iter().any(|d| d.abs() > FAR);
                }
            }
            square_part.of_block(BLOCK, &mut block.z.clone(), &mut block.z.clone());
            squares.merge(&square_part);
            part.of_block(BLOCK, &mut block.z, &mut block.e);
            tally.merge(&part);
        }
        for j in 0..p {
            let step = if angular[j] { circles[j].direction() } else { tally.mean_e[j] };
            if step.is_finite() {
                centre[j] += step;
            }
        }
        let bands = (0..p)
            .map(|j| {
                let first = if far[j] { FIRST_BLOCKS } else { 1 };
                angular[j].then(|| circles[j].band((first * BLOCK as u64) as f64))
            })
            .collect();
        // Least squares, not the covariance with z: on a linear sensor the fit is then exact and nothing is
        // left to chance, however small the noise is beside the spread.
        let slope = Cholesky::new(squares.ee)
            .map(|zz| zz.solve(&tally.ze).transpose())
            .filter(|slope| slope.iter().all(|v| v.is_finite()))
            .unwrap_or_else(|| DMatrix::zeros(p, a));
        Self { centre, slope, far, bands }
    }
}

/// A first centre from the first block: the value of its first point where plain (any value near enough keeps
/// the digits), the circular mean where angular.
fn first_centre(
    key: &Key,
    sensor: &dyn Sensor,
    prior: &Gaussian,
    root: &DMatrix<f64>,
    angular: &[bool],
    block: &mut Block,
) -> DVector<f64> {
    block.draw(&mut key.pilot(0), sensor, prior.mean(), root);
    DVector::from_fn(angular.len(), |j, _| {
        let values = &block.e[j * BLOCK..(j + 1) * BLOCK];
        let centre = if angular[j] {
            let mut circle = CircularSum::default();
            circle.add(values);
            circle.direction()
        } else {
            values[0]
        };
        if centre.is_finite() { centre } else { 0.0 }
    })
}
