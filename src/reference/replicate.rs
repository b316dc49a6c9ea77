use nalgebra::DMatrix;

use super::block::Block;
use super::chart::Charts;
use super::pilot::{Pilot, Question, take_stream};
use super::state::{Look, ReplicateState};
use super::sums::Sums;
use crate::gaussian::Moments;
use crate::net::Net;

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
            centre: self.charts.centre.iter().copied().collect(),
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
    pub fn has_net(&self) -> bool {
        matches!(self.points, Points::Net(_))
    }

    /// This replicate's moments on the read components, noise added exactly. With B0 the fit, E\[z\] = 0 and
    /// E\[z z'\] = I: Gamma = B0' + E\[z e'\], C = F Gamma,
    /// S = B0 B0' + B0 E\[z e'\] + E\[e z'\] B0' + Cov(e) + R.
    fn moments(&self, question: &Question<'_>, pilot: &Pilot, noise: &DMatrix<f64>) -> Moments {
        let (a, p) = (question.inputs(), question.outputs());
        let means = pilot.controls.means(&self.sums);
        let slope = &pilot.slope;
        let mut ze = DMatrix::from_column_slice(a, p, &means.ze);
        // Independent points share their mean with their squares; a net's mean is known far better than that.
        let bessel = if self.has_net() { 1.0 } else { self.sums.count / (self.sums.count - 1.0) };
        if !self.has_net() {
            // An angle's chart follows its samples: their mean is not independent of z.
            let count = self.sums.count;
            ze = DMatrix::from_fn(a, p, |i, j| bessel * (ze[(i, j)] - self.sums.z[i] / count * means.e[j]));
        }
        let cross = slope * &ze;
        let residual =
            DMatrix::from_fn(p, p, |j, k| bessel * (means.ee[Sums::pair(j, k)] - means.e[j] * means.e[k]));
        Moments {
            mean: &self.charts.centre + nalgebra::DVector::from_column_slice(&means.e),
            covariance: slope * slope.transpose() + &cross + cross.transpose() + residual + noise,
            cross_covariance: &question.root * (slope.transpose() + ze),
        }
    }
}

/// The witness must see a fault of the nets' way. Each test plants one in the steps that lead from points to moments.
#[cfg(test)]
mod tests {
    use super::*;
    use crate::lanes::Level;
    use crate::net::{BLOCK, Directions};
    use crate::reference::basis::Basis;
    use crate::reference::control::Controls;
    use crate::reference::estimate::combine;
    use crate::reference::foresight::Foresight;
    use crate::reference::stream::Key;
    use crate::reference::witness::{Testimony, hear};
    use crate::suite::Case;

    #[derive(Debug, Clone, Copy, PartialEq)]
    enum Fault {
        None,
        /// Normals 10 % too large.
        Quantile,
        /// A block that is counted and not summed.
        DroppedBlock,
        /// The noise added twice.
        Noise,
        /// A wrong direction number in a net that nothing randomises.
        BareDirections,
        /// A wrong direction number in a randomised net.
        RandomisedDirections,
    }

    /// Directions of two dimensions, the second with columns that repeat its first ones.
    fn wrong_directions() -> Directions {
        let mut columns: Vec<[u64; 64]> = Directions::joe_kuo().columns()[..2].to_vec();
        for k in 1..64 {
            columns[1][k] = columns[1][0] >> (k % 2);
        }
        Directions::from_columns(columns)
    }

    /// What the witness says of 32 replicates of 2048 points of a radar case, made with a fault; and the largest
    /// standard error of a variance, as a share of it.
    fn testimony(fault: Fault) -> (Testimony, f64) {
        let case = Case::from_json(serde_json::json!({
            "case": "radar", "sensor": {"kind": "range-bearing", "station": [0, 0]},
            "prior": {"mean": [1000, 0], "covariance": [[900, 0], [0, 160000]]},
            "noise": {"covariance": [[400, 0], [0, 4e-2]]},
        }))
        .unwrap();
        let law = case.marginal().law();
        let question = Question {
            sensor: case.sensor(),
            prior: law,
            root: law.root(),
            angular: vec![false, true],
            key: Key::new(7, "planted faults"),
            level: Level::best(),
        };
        // Without control variates, which would themselves undo a part of a fault.
        let pilot = Pilot { controls: Controls::none(2, 2), ..Pilot::run(&question) };
        let basis = Basis::new(2, 0);
        let mut noise = case.noise_or_zero();
        let true_noise = noise.clone();
        if fault == Fault::Noise {
            noise *= 2.0;
        }
        let replicates: Vec<Moments> = (0..32)
            .map(|r| {
                let mut replicate = Replicate::new(r, 11, &question, &pilot);
                let net = match fault {
                    Fault::BareDirections => Net::unscrambled(&wrong_directions(), 2, 11).unwrap(),
                    Fault::RandomisedDirections => Net::over(&wrong_directions(), &question.key, r, 2, 11).unwrap(),
                    _ => Net::new(&question.key, r, 2, 11).unwrap(),
                };
                let mut block = Block::new(question.level, 2, 2, &basis);
                for b in 0..net.blocks() {
                    block.take_net(&net, b);
                    if fault == Fault::Quantile {
                        block.z.as_flattened_mut().iter_mut().for_each(|z| *z *= 1.1);
                    }
                    question.evaluate(&mut block);
                    block.subtract(&pilot.centre, &question.angular, &pilot.slope);
                    if fault == Fault::DroppedBlock && b == 2 {
                        replicate.sums.count += BLOCK as f64;
                    } else {
                        block.add_to(&mut replicate.sums, &basis);
                    }
                }
                replicate.moments(&question, &pilot, &noise)
            })
            .collect();
        let (moments, error) = combine(&replicates);
        let spread = (0..2).map(|j| error.covariance[(j, j)] / moments.covariance[(j, j)]).fold(0.0, f64::max);
        let foresight = Foresight::look(&question, &pilot);
        (hear(&question, &true_noise, &pilot.centre, &moments, (&error, 32), &foresight), spread)
    }

    #[test]
    fn the_witness_agrees_where_nothing_is_wrong() {
        assert_eq!(testimony(Fault::None).0, Testimony::Agrees);
    }

    /// The witness's 65,536 samples know a variance to about 1 %. What is linear in the normals is not sampled, so that a
    /// wrong quantile reaches only the rest.
    #[test]
    fn the_witness_sees_what_biases_an_estimate() {
        for fault in [Fault::Quantile, Fault::DroppedBlock, Fault::Noise, Fault::BareDirections] {
            let (said, _) = testimony(fault);
            assert!(matches!(said, Testimony::Disagrees(_)), "{fault:?}: {said:?}");
        }
    }

    /// Under a digital shift every point is uniform whatever the matrix, so a wrong direction number biases nothing: it
    /// costs precision, and the spread of the replicates says so.
    #[test]
    fn a_wrong_direction_number_in_a_randomised_net_is_seen_in_its_standard_error() {
        let (said, spread) = testimony(Fault::RandomisedDirections);
        let (_, sound) = testimony(Fault::None);
        assert_eq!(said, Testimony::Agrees);
        assert!(spread > 5.0 * sound, "{spread} against {sound}");
    }
}
