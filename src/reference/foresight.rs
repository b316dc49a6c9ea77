use super::basis::Basis;
use super::block::Block;
use super::columns::Column;
use super::net::{BLOCK, Net};
use super::pilot::{Pilot, Question};

/// Binary logarithm of the points of the look ahead.
const LOG2: u32 = 14;
/// A sample counts as out of sight when it lies this many times as far out as any that was seen.
const BEYOND: f64 = 2.0;

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
    /// By output: (|e|, weight) of every point, e the deviation less the linear fit.
    points: Vec<Vec<(f64, f64)>>,
}

impl Foresight {
    /// Looks ahead; sees nothing where nets do not reach.
    pub fn look(question: &Question<'_>, pilot: &Pilot) -> Self {
        let (a, p) = (question.inputs(), question.outputs());
        let Ok(net) = Net::new(&question.key.ahead(), 0, a, LOG2) else { return Self::default() };
        let mut block = Block::new(question.level, a, p, &Basis::new(a, 0));
        let mut points = vec![Vec::with_capacity(1 << LOG2); p];
        for b in 0..net.blocks() {
            block.take_net(&net, b);
            let weights = reach_out(&mut block.z);
            question.evaluate(&mut block);
            block.subtract(&pilot.centre, &question.angular, &pilot.slope);
            for k in 0..BLOCK {
                let weight = weights[k];
                for (points, e) in points.iter_mut().zip(&block.e) {
                    // Where h is undefined far out the samples themselves will say so, if they ever come there.
                    if (weight * e[k].powi(4)).is_finite() {
                        points.push((e[k].abs(), weight));
                    }
                }
            }
        }
        Self { points }
    }

    /// How wrong the variance of output `j` may be, in its own unit, when of `count` samples none had |e| above
    /// `farthest`: what lies out of sight, more than twice as far, adds E\[e^2\] on average with the spread
    /// sqrt( E\[e^4\] / count ).
    pub fn variance_error(&self, j: usize, farthest: f64, count: f64) -> f64 {
        let Some(points) = self.points.get(j) else { return 0.0 };
        let all = (1_u64 << LOG2) as f64;
        let (mut second, mut fourth) = (0.0, 0.0);
        for &(e, weight) in points.iter().filter(|(e, _)| *e > BEYOND * farthest) {
            second += weight * e * e;
            fourth += weight * e.powi(4);
        }
        second / all + (fourth / all / count).sqrt()
    }

    /// The share of E\[e_j^4\] that the weightiest point alone carries, `None` if there is none. Where the fourth moment
    /// exists and the reach is far enough no point dominates; where it does not, one always does.
    pub fn dominance(&self, j: usize) -> Option<f64> {
        let points = self.points.get(j).filter(|points| !points.is_empty())?;
        let (sum, largest) = points.iter().fold((0.0, 0.0_f64), |(sum, largest), &(e, weight)| {
            let share = weight * e.powi(4);
            (sum + share, largest.max(share))
        });
        Some(largest / sum)
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
