use std::f64::consts::{PI, TAU};

use nalgebra::DVector;

use super::tally::{Tally, sum};

/// How many standard errors of its centre a chart keeps ready to move: a step beyond has odds under 1e-14.
const READY: f64 = 8.0;

/// The least that a chart keeps ready to move (rad), whatever its standard error says. An angle that is narrow but
/// for rare samples on the far side (a bearing whose station lies 4 sd away) has an error that its first samples do
/// not know: a single far sample moves the mean of a block by up to 1/1024. Ten in one block, none of which the
/// pilot's sixteen blocks foretold, have odds under 1e-9.
const LEAST_BAND: f64 = 0.01;

/// Sums of cos and sin of an angle's deviations, and of sin^2, for its circular mean and how sure it is.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub(super) struct CircularSum {
    count: f64,
    cos: f64,
    sin: f64,
    sin_squared: f64,
}

impl CircularSum {
    pub fn add(&mut self, angles: &[f64]) {
        let (sines, cosines): (Vec<f64>, Vec<f64>) = angles.iter().map(|a| a.sin_cos()).unzip();
        self.count += angles.len() as f64;
        self.cos += sum(&cosines);
        self.sin += sum(&sines);
        self.sin_squared += sines.iter().map(|s| s * s).sum::<f64>();
    }

    /// arg E[exp(i angle)] (rad).
    pub fn direction(&self) -> f64 {
        self.sin.atan2(self.cos)
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
        if band < PI { band.max(LEAST_BAND) } else { PI }
    }

    /// The sums seen from a centre that moved by `step`.
    fn rotate(&mut self, step: f64) {
        let (s, c) = step.sin_cos();
        (self.cos, self.sin) = (self.cos * c + self.sin * s, self.sin * c - self.cos * s);
    }
}

/// A sample near the cut of some angle: it may change sides when the centre of that chart moves.
#[derive(Debug, Clone, PartialEq)]
struct NearCut {
    z: DVector<f64>,
    /// Deviation less the linear fit (p), as tallied.
    e: DVector<f64>,
    /// Deviation (p).
    deviation: DVector<f64>,
}

/// The charts of one replicate's angular outputs.
///
/// The moments of an angle are taken in the chart centred at its circular mean, which is itself estimated.
/// When the estimate moves, the samples between the old cut and the new one jump by a full turn. Those that
/// might are remembered: samples within eight standard errors of the cut (0.01 rad at the least), so their number
/// grows as the square root of the sample size or is under a third of a percent of it, and every moment is exactly
/// that of the final chart with nothing sampled twice.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Charts {
    /// Centre of each output (p); a plain output keeps the pilot's.
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

    /// The points of a block (deviations, `length` an output) that lie near a cut.
    pub fn points_near_cut(&self, length: usize, deviations: &[f64]) -> Vec<usize> {
        let mut points = Vec::new();
        for (j, column) in deviations.chunks_exact(length).enumerate() {
            if self.circles[j].is_some() {
                let limit = PI - self.bands[j];
                points.extend((0..length).filter(|&k| column[k].abs() > limit));
            }
        }
        points.sort_unstable();
        points.dedup();
        points
    }

    /// Remembers a sample near a cut.
    pub fn remember(&mut self, z: DVector<f64>, e: DVector<f64>, deviation: DVector<f64>) {
        self.near_cut.push(NearCut { z, e, deviation });
    }

    /// Moves every chart to the circular mean of what was observed, and the tally with it.
    pub fn recentre(&mut self, tally: &mut Tally) {
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
            tally.mean_e[j] -= step;
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
                let mut jump = DVector::zeros(point.e.len());
                jump[j] = turn;
                tally.move_point(&point.z, &point.e, &jump);
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::gaussian::wrap;
    use rand::{RngExt, SeedableRng};
    use rand_distr::StandardNormal;
    use rand_pcg::Pcg64;

    /// Two wide angles of 4000 samples, tallied in charts that are off centre, and one plain output between
    /// them: after recentring the tally must be that of the final charts, computed afresh.
    #[test]
    fn recentred_sums_are_those_of_the_final_chart() {
        const N: usize = 4000;
        let mut rng = Pcg64::seed_from_u64(7);
        let mut normal = || -> f64 { rng.sample(StandardNormal) };
        let z: Vec<f64> = (0..N).map(|_| normal()).collect();
        let outputs: [Vec<f64>; 3] = [
            z.iter().map(|z| wrap(2.9 + 1.1 * z + 0.4 * normal())).collect(),
            z.iter().map(|z| 0.3 * z + normal()).collect(),
            (0..N).map(|_| wrap(-1.0 + 1.2 * normal())).collect(),
        ];
        let angular = [true, false, true];
        let start = DVector::from_vec(vec![2.75, 0.1, -1.2]);
        let mut charts = Charts::new(start.clone(), &[Some(0.5), None, Some(0.5)]);
        let deviate = |centre: &DVector<f64>| -> Vec<f64> {
            (0..3)
                .flat_map(|j| outputs[j].iter().map(move |v| (j, *v)))
                .map(|(j, v)| if angular[j] { wrap(v - centre[j]) } else { v - centre[j] })
                .collect()
        };
        let tally_of = |columns: &[f64]| {
            let mut tally = Tally::empty(1, 3);
            tally.of_block(N, &mut z.clone(), &mut columns.to_vec());
            tally
        };
        let columns = deviate(&start);
        for j in [0, 2] {
            charts.observe(j, &columns[j * N..(j + 1) * N]);
        }
        for k in charts.points_near_cut(N, &columns) {
            let point = DVector::from_fn(3, |j, _| columns[j * N + k]);
            charts.remember(DVector::from_element(1, z[k]), point.clone(), point);
        }
        let mut tally = tally_of(&columns);
        charts.recentre(&mut tally);
        assert!(!charts.lost);
        let moved = (0..3).map(|j| (charts.centre[j] - start[j]).abs()).collect::<Vec<_>>();
        assert!(moved[0] > 0.05 && moved[1] == 0.0 && moved[2] > 0.05, "nothing to see: {moved:?}");
        let final_columns = deviate(&charts.centre);
        let step = charts.centre[0] - start[0];
        let jumped = (0..N).filter(|&k| (final_columns[k] - columns[k] + step).abs() > 1.0).count();
        assert!(jumped >= 10, "only {jumped} samples crossed the cut");
        let fresh = tally_of(&final_columns);
        assert!((&tally.mean_e - &fresh.mean_e).amax() < 1e-12);
        assert!((&tally.ee - &fresh.ee).amax() < 1e-8, "{} {}", tally.ee, fresh.ee);
        assert!((&tally.ze - &fresh.ze).amax() < 1e-9);
    }

    #[test]
    fn angles_without_spread_stay_in_their_chart() {
        for angle in [0.0, 1e-16, -3e-16] {
            let mut circle = CircularSum::default();
            circle.add(&[angle; 4096]);
            let mut charts = Charts::new(DVector::from_element(1, 0.0), &[Some(circle.band(4096.0))]);
            charts.observe(0, &[angle; 4096]);
            charts.recentre(&mut Tally::empty(1, 1));
            assert!(!charts.lost, "{angle}");
        }
    }

    /// The pilot saw 16 384 samples of an angle with a spread of 1e-3 rad; among the 1024 of the first block one lies
    /// a radian off. The mean moves by sin 1 / 1024 = 8e-4, near four times the band of eight standard errors.
    #[test]
    fn a_rare_sample_far_off_does_not_lose_a_narrow_chart() {
        let narrow: Vec<f64> = (0..1024).map(|k| 1e-3 * (f64::from(k) * 0.7).sin()).collect();
        let mut pilot = CircularSum::default();
        (0..16).for_each(|_| pilot.add(&narrow));
        let mut charts = Charts::new(DVector::from_element(1, 0.0), &[Some(pilot.band(1024.0))]);
        let mut block = narrow;
        block[500] = 1.0;
        charts.observe(0, &block);
        charts.recentre(&mut Tally::empty(1, 1));
        assert!(!charts.lost);
        assert!((charts.centre[0] - 1f64.sin() / 1024.0).abs() < 1e-5, "{}", charts.centre[0]);
    }

    #[test]
    fn a_centre_that_moves_further_than_kept_ready_is_lost() {
        let mut charts = Charts::new(DVector::from_element(1, 0.0), &[Some(0.01)]);
        charts.observe(0, &[0.5, 0.6]);
        charts.recentre(&mut Tally::empty(1, 1));
        assert!(charts.lost);
    }
}
