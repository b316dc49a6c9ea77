use nalgebra::{DMatrix, DVector};

use super::pilot::{BLOCK, Block, Pilot};
use super::stream::Key;
use crate::sensor::Sensor;

/// Blocks of the look ahead.
const BLOCKS: u64 = 16;

/// Var(e_j^2) of every output (p), e the deviation less the linear fit, by samples that reach further out than the
/// prior: what the variance's standard error will be once everything that matters has been seen.
///
/// Rare samples can carry a variance: a bearing whose station lies 5 sd away is half a turn off once in 3.5 million
/// samples, and with a spread of 1e-2 rad that adds to its variance by percents. A sample that has not met one has
/// a small standard error, and a wrong one. Here z ~ N(0, s^2 I), and each point counts with the ratio of the two
/// densities, w = s^a exp(-(1 - s^-2) |z|^2 / 2); s^2 = 1 + 3 / sqrt(a), so that the weights stay even in many
/// dimensions. With a = 1 a point 5 sd out comes once in 160, with a = 2 once in 600.
///
/// Source: importance sampling with an inflated covariance, A. B. Owen, Monte Carlo theory, methods and examples
/// (2013), ch. 9 (chapter from memory); the inflation is ours.
pub(super) fn variance_of_squares(
    key: &Key,
    sensor: &dyn Sensor,
    mean: &DVector<f64>,
    root: &DMatrix<f64>,
    angular: &[bool],
    pilot: &Pilot,
) -> Vec<f64> {
    let (a, p) = (mean.len(), angular.len());
    let inflation = 1.0 + 3.0 / (a.max(1) as f64).sqrt();
    let scale = inflation.sqrt();
    let wide = root * scale;
    let mut block = Block::new(a, p);
    let mut second = vec![0.0; p];
    let mut fourth = vec![0.0; p];
    for b in 0..BLOCKS {
        block.draw(&mut key.ahead(b), sensor, mean, &wide);
        block.z.iter_mut().for_each(|z| *z *= scale);
        block.centre_on(&pilot.centre, angular);
        block.subtract_fit(&pilot.slope);
        for k in 0..BLOCK {
            let squared: f64 = (0..a).map(|i| block.z[i * BLOCK + k].powi(2)).sum();
            let weight = (0.5 * (a as f64 * inflation.ln() - (1.0 - 1.0 / inflation) * squared)).exp();
            for j in 0..p {
                let e = block.e[j * BLOCK + k].powi(2);
                // Where h is undefined far out the samples themselves will say so, if they ever come there.
                if (weight * e * e).is_finite() {
                    second[j] += weight * e;
                    fourth[j] += weight * e * e;
                }
            }
        }
    }
    let count = (BLOCKS as usize * BLOCK) as f64;
    second.iter().zip(&fourth).map(|(m2, m4)| (m4 / count - (m2 / count).powi(2)).max(0.0)).collect()
}
