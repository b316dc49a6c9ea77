use nalgebra::{DMatrix, DVector};

use super::chart::Charts;
use super::pilot::{BLOCK, Block, Pilot};
use super::stream::Key;
use super::tally::Tally;
use crate::gaussian::{Gaussian, Moments};
use crate::sensor::Sensor;

/// Of a near angle's blocks, one in this many feeds its circular mean: its moments hardly depend on where the
/// cut lies, and sine and cosine cost as much as the sample.
const THINNED: u64 = 16;

/// What all replicates of a case share.
#[derive(Debug)]
pub(super) struct Ground<'a> {
    pub key: Key,
    pub sensor: &'a dyn Sensor,
    /// Prior of the read components (a) and its square root.
    pub prior: &'a Gaussian,
    pub root: DMatrix<f64>,
    pub angular: Vec<bool>,
    pub pilot: Pilot,
}

/// One independent estimate of the moments.
#[derive(Debug, Clone)]
pub(super) struct Replicate {
    index: u64,
    blocks: u64,
    tally: Tally,
    charts: Charts,
}

impl Replicate {
    pub fn new(index: u64, ground: &Ground<'_>) -> Self {
        let (a, p) = (ground.prior.dimension(), ground.angular.len());
        Self {
            index,
            blocks: 0,
            tally: Tally::empty(a, p),
            charts: Charts::new(ground.pilot.centre.clone(), &ground.pilot.bands),
        }
    }

    /// Samples until `blocks` blocks are in; what is in already stays.
    pub fn deepen(&mut self, blocks: u64, ground: &Ground<'_>) {
        let (a, p) = (ground.prior.dimension(), ground.angular.len());
        let mut block = Block::new(a, p);
        let mut part = Tally::empty(a, p);
        while self.blocks < blocks {
            let mut rng = ground.key.block(self.index, self.blocks);
            block.draw(&mut rng, ground.sensor, ground.prior.mean(), &ground.root);
            block.centre_on(&self.charts.centre, &ground.angular);
            if self.charts.any() {
                self.watch_angles(&mut block, ground);
            } else {
                block.subtract_fit(&ground.pilot.slope);
            }
            part.of_block(BLOCK, &mut block.z, &mut block.e);
            self.tally.merge(&part);
            self.blocks += 1;
        }
        self.charts.recentre(&mut self.tally);
    }

    /// Feeds the circular means, notes samples near a cut, then subtracts the fit.
    fn watch_angles(&mut self, block: &mut Block, ground: &Ground<'_>) {
        for (j, deviations) in block.e.chunks_exact(BLOCK).enumerate() {
            if ground.pilot.far[j] || self.blocks.is_multiple_of(THINNED) {
                self.charts.observe(j, deviations);
            }
        }
        let near = self.charts.points_near_cut(BLOCK, &block.e);
        let at = |columns: &[f64], k: usize| {
            DVector::from_iterator(columns.len() / BLOCK, columns.chunks_exact(BLOCK).map(|c| c[k]))
        };
        let deviations: Vec<DVector<f64>> = near.iter().map(|&k| at(&block.e, k)).collect();
        block.subtract_fit(&ground.pilot.slope);
        for (&k, deviation) in near.iter().zip(deviations) {
            self.charts.remember(at(&block.z, k), at(&block.e, k), deviation);
        }
    }

    pub fn points(&self) -> u64 {
        self.blocks * BLOCK as u64
    }

    pub fn charts(&self) -> &Charts {
        &self.charts
    }

    /// This replicate's moments on the read components, noise added exactly:
    /// Gamma = B0' + Cov(z, e), C = F Gamma, S = B0 B0' + B0 Cov(z, e) + Cov(e, z) B0' + Cov(e) + R.
    pub fn moments(&self, ground: &Ground<'_>, noise: &DMatrix<f64>) -> Moments {
        let slope = &ground.pilot.slope;
        let scale = 1.0 / (self.tally.count - 1.0);
        let ze = &self.tally.ze * scale;
        let cross = slope * &ze;
        Moments {
            mean: &self.charts.centre + &self.tally.mean_e,
            covariance: slope * slope.transpose() + &cross + cross.transpose() + &self.tally.ee * scale + noise,
            cross_covariance: &ground.root * (slope.transpose() + ze),
        }
    }
}
