use std::f64::consts::{PI, TAU};

use nalgebra::DVector;
use serde::{Deserialize, Serialize};
use smallvec::SmallVec;

use super::block::Block;
use super::columns::Column;
use super::sums::Sums;
use crate::lanes::{Lanes, Level, Simd, Task, dispatch};

/// How many standard errors of its centre a chart keeps ready to move: a step beyond has odds under 1e-14.
const READY: f64 = 8.0;

/// Samples on the far side that a chart keeps ready for, whatever its standard error says. An angle that is narrow
/// but for rare samples (a bearing whose station lies 4 sd away) has an error that its first samples do not know: one
/// far sample among n moves the mean by up to 1/n. Ten among the first 256, none of which the pilot foretold, have
/// odds under 1e-9.
const FAR_SAMPLES: f64 = 10.0;

/// Sums of cos and sin of an angle's deviations, and of sin^2, for its circular mean and how sure it is.
#[derive(Debug, Clone, Copy, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct CircularSum {
    count: f64,
    cos: f64,
    sin: f64,
    sin_squared: f64,
}

impl CircularSum {
    pub fn add(&mut self, angles: &[f64]) {
        self.count += angles.len() as f64;
        dispatch(Level::best(), Circle { angles, sum: self });
    }

    /// arg E[exp(i angle)] (rad).
    pub fn direction(&self) -> f64 {
        self.sin.atan2(self.cos)
    }

    /// Whether every sum is a number.
    pub fn is_finite(&self) -> bool {
        [self.count, self.cos, self.sin, self.sin_squared].into_iter().all(f64::is_finite)
    }

    /// Length of E[exp(i angle)], 0 to 1.
    pub fn resultant(&self) -> f64 {
        self.cos.hypot(self.sin) / self.count
    }

    /// Standard error of the direction (rad): sd of the sine component over resultant length.
    ///
    /// Source: K. V. Mardia, P. E. Jupp, Directional Statistics (Wiley, 2000), sec. 9.2 (delta method; section
    /// from memory).
    pub fn direction_error(&self) -> f64 {
        (self.sin_squared / self.count).sqrt() / (self.count.sqrt() * self.resultant())
    }

    /// The sums of these samples and of `other`'s, both seen from the same centre.
    pub fn merged(mut self, other: Self) -> Self {
        self.count += other.count;
        self.cos += other.cos;
        self.sin += other.sin;
        self.sin_squared += other.sin_squared;
        self
    }

    /// How far a chart centred here may have to move once `more` further samples are in.
    pub fn band(&self, more: f64) -> f64 {
        let error = self.direction_error();
        let band = READY * error * (1.0 + (self.count / more).sqrt());
        // A band without number (no direction at all) is the whole circle.
        if band < PI { band.max(FAR_SAMPLES / self.count.min(more)).min(PI) } else { PI }
    }

    /// The sums seen from a centre that moved by `step`.
    fn rotate(&mut self, step: f64) {
        let (s, c) = step.sin_cos();
        (self.cos, self.sin) = (self.cos * c + self.sin * s, self.sin * c - self.cos * s);
    }
}

/// Sums of sine and cosine, eight angles at a time.
struct Circle<'a> {
    angles: &'a [f64],
    sum: &'a mut CircularSum,
}

impl Task for Circle<'_> {
    type Output = ();

    #[inline(always)]
    fn run<S: Simd>(self) {
        let (eights, rest) = self.angles.as_chunks::<8>();
        let zero = Lanes::<S>::splat(0.0);
        let (mut cos, mut sin, mut squared) = (zero, zero, zero);
        for eight in eights {
            let angle = Lanes::<S>::from_array(eight);
            let sine = angle.sin();
            cos = cos + angle.cos();
            sin = sin + sine;
            squared = squared + sine * sine;
        }
        let fold = |lanes: Lanes<S>| lanes.to_array().iter().sum::<f64>();
        self.sum.cos += fold(cos) + rest.iter().map(|a| a.cos()).sum::<f64>();
        self.sum.sin += fold(sin) + rest.iter().map(|a| a.sin()).sum::<f64>();
        self.sum.sin_squared += fold(squared) + rest.iter().map(|a| a.sin() * a.sin()).sum::<f64>();
    }
}

type Few = SmallVec<[f64; 4]>;

/// A sample near the cut of some angle: it may change sides when the centre of that chart moves.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
struct NearCut {
    z: Few,
    /// Deviation less the linear fit (p), as summed.
    e: Few,
    /// Deviation (p).
    deviation: Few,
}

/// The charts of one replicate's angular outputs.
///
/// The moments of an angle are taken in the chart centred at its circular mean, which is itself estimated.
/// When the estimate moves, the samples between the old cut and the new one jump by a full turn. Those that
/// might are remembered: samples within eight standard errors of the cut, so their number grows as the square root
/// of the sample size, and every moment is exactly that of the final chart with nothing sampled twice.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub(super) struct Charts {
    /// Centre of each output (p); a plain output keeps the pilot's.
    #[serde(with = "plain_list")]
    pub centre: DVector<f64>,
    circles: Vec<Option<CircularSum>>,
    bands: Vec<f64>,
    near_cut: Vec<NearCut>,
    /// Set when a centre moved further than was kept ready.
    pub lost: bool,
}

impl Charts {
    /// Charts at `centre` (p), ready to move by `bands` (p; `None` where an output is plain).
    pub fn new(centre: DVector<f64>, bands: &[Option<f64>]) -> Self {
        Self {
            circles: bands.iter().map(|b| b.map(|_| CircularSum::default())).collect(),
            bands: bands.iter().map(|b| b.unwrap_or(0.0)).collect(),
            near_cut: Vec::new(),
            lost: false,
            centre,
        }
    }

    /// Whether these are charts of outputs that are `angular` (p) or not, over `a` inputs.
    pub fn fit(&self, a: usize, angular: &[bool]) -> bool {
        let p = angular.len();
        let point = |n: &NearCut| n.z.len() == a && n.e.len() == p && n.deviation.len() == p;
        self.centre.len() == p
            && self.bands.len() == p
            && self.circles.iter().map(Option::is_some).eq(angular.iter().copied())
            && self.near_cut.iter().all(point)
    }

    /// Whether every value is a number.
    pub fn is_finite(&self) -> bool {
        let points = self.near_cut.iter().flat_map(|n| [&n.z, &n.e, &n.deviation]).flatten().copied();
        let places = self.centre.iter().chain(&self.bands).copied();
        places.chain(points).all(f64::is_finite) && self.circles.iter().flatten().all(CircularSum::is_finite)
    }

    /// Whether any output is an angle.
    pub fn any(&self) -> bool {
        self.circles.iter().any(Option::is_some)
    }

    /// The sums of angular output `j`, turned back from its chart to the output's own angles; `None` where plain.
    pub fn circle(&self, j: usize) -> Option<CircularSum> {
        self.circles[j].map(|mut circle| {
            circle.rotate(-self.centre[j]);
            circle
        })
    }

    /// Adds the deviations of output `j` to its circular mean.
    pub fn observe(&mut self, j: usize, deviations: &[f64]) {
        if let Some(circle) = &mut self.circles[j] {
            circle.add(deviations);
        }
    }

    /// Remembers the samples of a block that lie near a cut.
    pub fn remember_near_cut(&mut self, block: &Block) {
        let mut points = Vec::new();
        for (j, column) in block.deviation.iter().enumerate() {
            if self.circles[j].is_some() {
                let limit = PI - self.bands[j];
                // Most blocks have none: asked without a branch first.
                if !column.iter().fold(false, |any, d| any | (d.abs() > limit)) {
                    continue;
                }
                points.extend((0..column.len()).filter(|&k| column[k].abs() > limit));
            }
        }
        points.sort_unstable();
        points.dedup();
        let at = |columns: &[Column], k: usize| columns.iter().map(|c| c[k]).collect();
        self.near_cut.extend(points.into_iter().map(|k| NearCut {
            z: at(&block.z, k),
            e: at(&block.e, k),
            deviation: at(&block.deviation, k),
        }));
    }

    /// Moves every chart to the circular mean of what was observed, and the sums with it.
    pub fn recentre(&mut self, sums: &mut Sums) {
        for j in 0..self.circles.len() {
            let Some(circle) = &mut self.circles[j] else { continue };
            let step = circle.direction();
            if !(step.abs() < self.bands[j]) {
                self.lost = true;
                continue;
            }
            circle.rotate(step);
            // With twice the samples or more the next step is no longer than the present error.
            self.bands[j] = circle.band(f64::INFINITY);
            self.centre[j] += step;
            sums.move_origin(j, step);
            for point in &mut self.near_cut {
                point.deviation[j] -= step;
                point.e[j] -= step;
                let turn = if point.deviation[j] > PI {
                    -TAU
                } else if point.deviation[j] <= -PI {
                    TAU
                } else {
                    continue;
                };
                sums.move_point(&point.z, &point.e, j, turn);
                point.deviation[j] += turn;
                point.e[j] += turn;
            }
        }
        let (bands, circles) = (&self.bands, &self.circles);
        self.near_cut.retain(|point| {
            (0..bands.len()).any(|j| circles[j].is_some() && point.deviation[j].abs() > PI - bands[j])
        });
    }
}

/// A vector as a list of numbers.
mod plain_list {
    use nalgebra::DVector;
    use serde::{Deserialize, Deserializer, Serialize, Serializer};

    pub fn serialize<S: Serializer>(vector: &DVector<f64>, to: S) -> Result<S::Ok, S::Error> {
        vector.as_slice().serialize(to)
    }

    pub fn deserialize<'de, D: Deserializer<'de>>(from: D) -> Result<DVector<f64>, D::Error> {
        Vec::deserialize(from).map(DVector::from_vec)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::gaussian::wrap;
    use crate::net::BLOCK;
    use crate::reference::basis::Basis;
    use nalgebra::DMatrix;
    use rand::{RngExt, SeedableRng};
    use rand_distr::StandardNormal;
    use rand_pcg::Pcg64;

    /// Two wide angles of 4096 samples, summed in charts that are off centre, and one plain output between them:
    /// after recentring the sums must be those of the final charts, computed afresh.
    #[test]
    fn recentred_sums_are_those_of_the_final_chart() {
        let mut rng = Pcg64::seed_from_u64(7);
        let mut normal = || -> f64 { rng.sample(StandardNormal) };
        let basis = Basis::new(1, 0);
        let blank = Block::new(Level::best(), 1, 3, &basis);
        let raw: Vec<Block> = (0..16)
            .map(|_| {
                let mut block = blank.clone();
                for k in 0..BLOCK {
                    let z = normal();
                    block.z[0][k] = z;
                    block.deviation[0][k] = wrap(2.9 + 1.1 * z + 0.4 * normal());
                    block.deviation[1][k] = 0.3 * z + normal();
                    block.deviation[2][k] = wrap(-1.0 + 1.2 * normal());
                }
                block
            })
            .collect();
        let angular = [true, false, true];
        let slope = DMatrix::from_column_slice(3, 1, &[0.2, 0.3, -0.1]);
        let seen_from = |centre: &DVector<f64>| -> (Vec<Block>, Sums) {
            let mut sums = Sums::empty(1, 3, 0);
            let blocks = raw.iter().cloned().map(|mut block| {
                block.subtract(centre, &angular, &slope);
                block.add_to(&mut sums, &basis);
                block
            });
            (blocks.collect(), sums)
        };
        let start = DVector::from_vec(vec![2.6, 0.1, -1.3]);
        let mut charts = Charts::new(start.clone(), &[Some(0.7), None, Some(0.7)]);
        let (blocks, mut sums) = seen_from(&start);
        for block in &blocks {
            for (j, deviations) in block.deviation.iter().enumerate() {
                charts.observe(j, deviations);
            }
            charts.remember_near_cut(block);
        }
        charts.recentre(&mut sums);
        assert!(!charts.lost);
        let moved = (0..3).map(|j| (charts.centre[j] - start[j]).abs()).collect::<Vec<_>>();
        assert!(moved[0] > 0.03 && moved[1] == 0.0 && moved[2] > 0.03, "nothing to see: {moved:?}");
        let (after, fresh) = seen_from(&charts.centre);
        let step = charts.centre[0] - start[0];
        let pairs = after.iter().zip(&blocks).flat_map(|(a, b)| a.deviation[0].iter().zip(&b.deviation[0]));
        let jumped = pairs.filter(|(a, b)| (*a - *b + step).abs() > 1.0).count();
        assert!(jumped >= 10, "only {jumped} samples crossed the cut");
        let close = |a: &[f64], b: &[f64]| a.iter().zip(b).all(|(a, b)| (a - b).abs() < 1e-8);
        assert!(close(&sums.e, &fresh.e) && close(&sums.ee, &fresh.ee) && close(&sums.ze, &fresh.ze));
    }

    #[test]
    fn angles_without_spread_stay_in_their_chart() {
        for angle in [0.0, 1e-16, -3e-16] {
            let mut circle = CircularSum::default();
            circle.add(&[angle; 4096]);
            let mut charts = Charts::new(DVector::from_element(1, 0.0), &[Some(circle.band(4096.0))]);
            charts.observe(0, &[angle; 4096]);
            charts.recentre(&mut Sums::empty(1, 1, 0));
            assert!(!charts.lost, "{angle}");
        }
    }

    /// The pilot saw 4096 samples of an angle with a spread of 1e-3 rad; among the 256 of the first block one lies a
    /// radian off. The mean moves by sin 1 / 256 = 3.3e-3, six times the band of eight standard errors.
    #[test]
    fn a_rare_sample_far_off_does_not_lose_a_narrow_chart() {
        let narrow: Vec<f64> = (0..256).map(|k| 1e-3 * (f64::from(k) * 0.7).sin()).collect();
        let mut pilot = CircularSum::default();
        (0..16).for_each(|_| pilot.add(&narrow));
        let mut charts = Charts::new(DVector::from_element(1, 0.0), &[Some(pilot.band(256.0))]);
        let mut block = narrow;
        block[100] = 1.0;
        charts.observe(0, &block);
        charts.recentre(&mut Sums::empty(1, 1, 0));
        assert!(!charts.lost);
        assert!((charts.centre[0] - 1f64.sin() / 256.0).abs() < 1e-4, "{}", charts.centre[0]);
    }

    #[test]
    fn a_centre_that_moves_further_than_kept_ready_is_lost() {
        let mut charts = Charts::new(DVector::from_element(1, 0.0), &[Some(0.01)]);
        charts.observe(0, &[0.5, 0.6]);
        charts.recentre(&mut Sums::empty(1, 1, 0));
        assert!(charts.lost);
    }
}
