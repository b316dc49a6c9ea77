use super::basis::Basis;
use super::block::Block;
use super::columns::Column;
use super::outskirts::{Gathering, Outskirts};
use super::pilot::{Pilot, Question};
use crate::net::{BLOCK, Net};

/// Binary logarithm of the points of the look ahead.
const LOG2: u32 = 14;
/// What rare samples would add to the variance of each output, known before one of them is met.
///
/// Rare samples can carry a variance: a bearing whose station lies 5 sd away is half a turn off once in 3.5 million
/// samples, and with a spread of 1e-2 rad that adds to its variance by percents. Samples that have not met one have
/// a small standard error, and a wrong one. Here z ~ N(0, s^2 I), and each point counts with the ratio of the two
/// densities, w = s^a exp(-(1 - s^-2) |z|^2 / 2); s^2 = 1 + 3 / sqrt(a), so that the weights stay even in many
/// dimensions. With a = 1 a point 5 sd out comes once in 160, with a = 2 once in 600.
///
/// Source: importance sampling with an inflated covariance, A. B. Owen, Monte Carlo theory, methods and examples
/// (2013), ch. 9 (chapter from memory); the inflation is ours.
#[derive(Debug, Clone, Default)]
pub(super) struct Foresight {
    /// By output: E\[e^4\] and the largest part of it that one point carries, e the deviation less the linear fit.
    fourths: Vec<(f64, f64)>,
    /// What samples that are too rare to have been met add to the variances of the estimates.
    pub outskirts: Outskirts,
    /// Probability of the states at which an output is not a finite number.
    pub undefined: f64,
}

impl Foresight {
    /// Looks ahead; sees nothing where nets do not reach.
    pub fn look(question: &Question<'_>, pilot: &Pilot) -> Self {
        let (a, p) = (question.inputs(), question.outputs());
        let Ok(net) = Net::new(&question.key.ahead(), 0, a, LOG2) else { return Self::default() };
        let mut block = Block::new(question.level, a, p, &Basis::new(a, 0));
        let mut fourths = vec![(0.0, 0.0_f64); p];
        let mut undefined = 0.0;
        let mut gathering = Gathering::new(question, pilot, net.blocks() as usize);
        for b in 0..net.blocks() {
            block.take_net(&net, b);
            let weights = reach_out(&mut block.z);
            question.evaluate(&mut block);
            block.subtract(&pilot.centre, &question.angular, &pilot.slope);
            for (k, weight) in weights.iter().enumerate() {
                if block.e.iter().any(|e| !e[k].is_finite()) {
                    undefined += weight;
                }
            }
            for (e, (sum, largest)) in block.e.iter().zip(&mut fourths) {
                for share in e.iter().zip(&weights).map(|(e, w)| w * e.powi(4)).filter(|share| share.is_finite()) {
                    *sum += share;
                    *largest = largest.max(share);
                }
            }
            gathering.add(&block, &weights);
        }
        undefined /= (net.blocks() * BLOCK as u64) as f64;
        Self { fourths, outskirts: gathering.finish(), undefined }
    }

    /// The share of E\[e_j^4\] that the weightiest point alone carries, `None` if there is none. Where the fourth moment
    /// exists and the reach is far enough no point dominates; where it does not, one always does.
    pub fn dominance(&self, j: usize) -> Option<f64> {
        let &(sum, largest) = self.fourths.get(j)?;
        (sum > 0.0).then(|| largest / sum)
    }
}

/// Turns z ~ N(0, I) into z ~ N(0, s^2 I) and returns the weights that make up for it.
pub(super) fn reach_out(z: &mut [Column]) -> Column {
    let a = z.len() as f64;
    let inflation = 1.0 + 3.0 / a.max(1.0).sqrt();
    let scale = inflation.sqrt();
    let mut squared = [0.0; BLOCK];
    for column in z {
        for (z, squared) in column.iter_mut().zip(&mut squared) {
            *z *= scale;
            *squared += *z * *z;
        }
    }
    squared.map(|s| (0.5 * (a * inflation.ln() - (1.0 - 1.0 / inflation) * s)).exp())
}
