use nalgebra::DMatrix;

use super::block::Block;
use super::chart::Charts;
use super::net::Net;
use super::pilot::{Pilot, Question, take_stream};
use super::state::{Look, ReplicateState};
use super::sums::Sums;
use crate::gaussian::Moments;

/// Of a near angle's blocks, one in this many feeds its circular mean: its moments hardly depend on where the
/// cut lies, and sine and cosine cost as much as the sample.
const THINNED: u64 = 16;

/// Where a replicate's points come from.
#[derive(Debug, Clone)]
enum Points {
    /// A randomised net.
    Net(Net),
    /// A plain stream a block: the net's table does not reach so many dimensions.
    Streams,
}

/// One independent estimate of the moments.
#[derive(Debug, Clone)]
pub(super) struct Replicate {
    index: u64,
    points: Points,
    blocks: u64,
    sums: Sums,
    charts: Charts,
    /// What it said after every doubling.
    looks: Vec<Look>,
}

impl Replicate {
    /// Nothing sampled yet; room for at most 2^`log2` points.
    pub fn new(index: u64, log2: u32, question: &Question<'_>, pilot: &Pilot) -> Self {
        let (a, p) = (question.inputs(), question.outputs());
        Self {
            index,
            points: Net::new(&question.key, index, a, log2).map_or(Points::Streams, Points::Net),
            blocks: 0,
            sums: Sums::empty(a, p, pilot.controls.basis.len()),
            charts: Charts::new(pilot.centre.clone(), &pilot.bands),
            looks: Vec::new(),
        }
    }

    /// Samples until `blocks` blocks are in, and looks at what they say; what is in already stays.
    pub fn deepen(&mut self, blocks: u64, question: &Question<'_>, pilot: &Pilot, noise: &DMatrix<f64>) {
        let basis = &pilot.controls.basis;
        let mut block = Block::new(question.level, question.inputs(), question.outputs(), basis);
        while self.blocks < blocks {
            match &self.points {
                Points::Net(net) => block.take_net(net, self.blocks),
                Points::Streams => take_stream(&mut block, &mut question.key.block(self.index, self.blocks)),
            }
            question.evaluate(&mut block);
            block.subtract(&self.charts.centre, &question.angular, &pilot.slope);
            if self.charts.any() {
                self.watch_angles(&block, pilot);
            }
            block.add_to(&mut self.sums, basis);
            self.blocks += 1;
        }
        self.charts.recentre(&mut self.sums);
        self.looks.push(Look {
            blocks,
            lost: self.charts.lost,
            circles: (0..question.outputs()).map(|j| self.charts.circle(j)).collect(),
            moments: (&self.moments(question, pilot, noise)).into(),
        });
    }

    /// Feeds the circular means and notes samples near a cut.
    fn watch_angles(&mut self, block: &Block, pilot: &Pilot) {
        for (j, deviations) in block.deviation.iter().enumerate() {
            if pilot.far[j] || self.blocks.is_multiple_of(THINNED) {
                self.charts.observe(j, deviations);
            }
        }
        self.charts.remember_near_cut(block);
    }

    /// Takes up what another found.
    pub fn take_up(&mut self, state: ReplicateState) {
        let ReplicateState { looks, sums, charts } = state;
        self.blocks = looks.last().map_or(0, |look| look.blocks);
        (self.sums, self.charts, self.looks) = (sums, charts, looks);
    }

    /// What it found.
    pub fn state(&self) -> ReplicateState {
        ReplicateState { looks: self.looks.clone(), sums: self.sums.clone(), charts: self.charts.clone() }
    }

    /// What it said after every doubling.
    pub fn looks(&self) -> &[Look] {
        &self.looks
    }

    /// Whether the points are a net's.
    fn has_net(&self) -> bool {
        matches!(self.points, Points::Net(_))
    }

    /// This replicate's moments on the read components, noise added exactly. With B0 the fit, E\[z\] = 0 and
    /// E\[z z'\] = I: Gamma = B0' + E\[z e'\], C = F Gamma,
    /// S = B0 B0' + B0 E\[z e'\] + E\[e z'\] B0' + Cov(e) + R.
    fn moments(&self, question: &Question<'_>, pilot: &Pilot, noise: &DMatrix<f64>) -> Moments {
        let (a, p) = (question.inputs(), question.outputs());
        let means = pilot.controls.means(&self.sums);
        let slope = &pilot.slope;
        let ze = DMatrix::from_column_slice(a, p, &means.ze);
        let cross = slope * &ze;
        // Independent points share their mean with their squares; a net's mean is known far better than that.
        let bessel = if self.has_net() { 1.0 } else { self.sums.count / (self.sums.count - 1.0) };
        let residual =
            DMatrix::from_fn(p, p, |j, k| bessel * (means.ee[Sums::pair(j, k)] - means.e[j] * means.e[k]));
        Moments {
            mean: &self.charts.centre + nalgebra::DVector::from_column_slice(&means.e),
            covariance: slope * slope.transpose() + &cross + cross.transpose() + residual + noise,
            cross_covariance: &question.root * (slope.transpose() + ze),
        }
    }
}
