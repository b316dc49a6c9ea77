use std::f64::consts::{PI, TAU};

use nalgebra::DVector;

use super::tally::{Tally, sum};

/// How many standard errors of its centre a chart keeps ready to move: a step beyond has odds under 1e-14.
const READY: f64 = 8.0;

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

    /// How far a chart centred here may have to move once `more` further samples are in.
    pub fn band(&self, more: f64) -> f64 {
        let error = self.direction_error();
        let band = READY * error * (1.0 + (self.count / more).sqrt());
        if band < PI { band } else { PI }
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
/// might are remembered: samples within eight standard errors of the cut, so their number grows as the square
/// root of the sample size, and every moment is exactly that of the final chart with nothing sampled twice.
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

    /// Shortest resultant length among the angular outputs with its output, `None` without angles.
    pub fn least_resultant(&self) -> Option<(usize, f64)> {
        self.circles
            .iter()
            .enumerate()
            .filter_map(|(j, c)| c.map(|c| (j, c.resultant())))
            .min_by(|a, b| a.1.total_cmp(&b.1))
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
