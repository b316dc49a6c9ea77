//! One case as it is: samples of its true law beside the Gaussians that stand for it, and how its reference sharpens.

use nalgebra::{DMatrix, DVector, Matrix2, Vector2};
use rand::SeedableRng;
use rand_distr::{Distribution, StandardNormal};
use rand_pcg::Pcg64Dxsm;

use super::{Study, StudyCase};
use crate::gaussian::{Moments, SquareRoot};
use crate::method::MethodSpec;
use crate::reference::{Sampler, SamplerSettings};
use crate::sensor::chart_deviation;
use crate::suite::Case;
use crate::survey::transformed;

/// Samples of a scene.
const CLOUD: usize = 400;
/// Most samples of a reference whose sharpening is shown.
const DEEPEST: u64 = 1 << 22;

/// A case in two dimensions: its first two outputs, or its first read component beside its only output.
#[derive(Debug, Clone, PartialEq)]
pub struct Scene {
    /// Name and unit of both axes.
    pub axes: [(String, String); 2],
    /// Samples of the true law, noise included; angles unwrapped about the reference's mean.
    pub cloud: Vec<Vector2<f64>>,
    /// The reference's mean and covariance.
    pub reference: Law,
    /// Those of every method that answers, by its place among the labels.
    pub methods: Vec<(usize, Law)>,
}

/// A Gaussian in two dimensions.
#[derive(Debug, Clone, PartialEq)]
pub struct Law {
    /// Its mean.
    pub mean: Vector2<f64>,
    /// Its covariance.
    pub covariance: Matrix2<f64>,
}

impl Law {
    /// The points at `radius` standard deviations in `count` directions; `None` where the covariance is indefinite.
    pub fn ellipse(&self, radius: f64, count: usize) -> Option<Vec<Vector2<f64>>> {
        let root = self.covariance.cholesky()?.l();
        let at = |k: usize| {
            let angle = 2.0 * std::f64::consts::PI * k as f64 / count as f64;
            self.mean + root * Vector2::new(angle.cos(), angle.sin()) * radius
        };
        Some((0..count).map(at).collect())
    }
}

impl Scene {
    /// The scene of a case of a study; `None` where its reference bears no verdicts or its record cannot be read.
    pub fn of(study: &Study, of: &StudyCase) -> Option<Self> {
        if !of.reference.bears_verdicts() {
            return None;
        }
        let case = Case::from_json(of.record.clone()).ok()?;
        let truth = of.reference.moments()?;
        let outputs = case.sensor().outputs();
        let plane = outputs.len() >= 2;
        // The read component that the only output is drawn against.
        let component = *case.sensor().reads().first()?;
        let law = |moments: &Moments| {
            let near = &truth.mean + chart_deviation(outputs, &moments.mean, &truth.mean);
            let s = &moments.covariance;
            if plane {
                let covariance = Matrix2::new(s[(0, 0)], s[(0, 1)], s[(1, 0)], s[(1, 1)]);
                return Law { mean: Vector2::new(near[0], near[1]), covariance };
            }
            let (p, c) =
                (case.prior().covariance()[(component, component)], moments.cross_covariance[(component, 0)]);
            Law {
                mean: Vector2::new(case.prior().mean()[component], near[0]),
                covariance: Matrix2::new(p, c, c, s[(0, 0)]),
            }
        };
        if !plane && component >= case.prior().dimension() {
            return None;
        }
        let methods = study.labels.iter().enumerate().filter_map(|(k, label)| {
            let moments = transformed(&case, &MethodSpec::parse(label).ok()?).ok()?.moments.ok()?;
            moments.is_finite().then(|| (k, law(&moments)))
        });
        let axis = |j: usize| (outputs[j].name.clone(), outputs[j].unit.to_string());
        let axes =
            if plane { [axis(0), axis(1)] } else { [(format!("state {component}"), String::new()), axis(0)] };
        Some(Self {
            axes,
            cloud: cloud(&case, &truth, plane, study.provenance.seed),
            reference: law(&truth),
            methods: methods.collect(),
        })
    }
}

fn cloud(case: &Case, truth: &Moments, plane: bool, seed: u64) -> Vec<Vector2<f64>> {
    let law = case.marginal().law();
    let outputs = case.sensor().outputs();
    let (root, noise) = (law.root(), SquareRoot::of(&case.noise_or_zero()).into_factor());
    let mut random = Pcg64Dxsm::seed_from_u64(seed);
    let mut normals = |count: usize| DVector::from_fn(count, |_, _| StandardNormal.sample(&mut random));
    let mut y = vec![0.0; outputs.len()];
    let sample = |_| {
        let x = law.mean() + &root * normals(root.ncols());
        case.sensor().value(x.as_slice(), &mut y);
        let y = DVector::from_column_slice(&y) + &noise * normals(noise.ncols());
        let near = &truth.mean + chart_deviation(outputs, &y, &truth.mean);
        if plane { Vector2::new(near[0], near[1]) } else { Vector2::new(x[0], near[0]) }
    };
    (0..CLOUD).map(sample).collect()
}

/// Samples and largest standardised standard error of the reference of a case at every doubling.
pub fn sharpening(study: &Study, of: &StudyCase) -> Option<Vec<(u64, f64)>> {
    let case = Case::from_json(of.record.clone()).ok()?;
    let settings = &study.provenance.settings;
    let settings = SamplerSettings {
        seed: study.provenance.seed,
        replicates: settings.replicates,
        precision: settings.precision,
        cap: DEEPEST,
        ..SamplerSettings::default()
    };
    let mut sampler = Sampler::new(&case, settings).ok()?;
    let mut steps = Vec::new();
    loop {
        let more = sampler.deepen();
        let reference = sampler.reference();
        steps.push((reference.points, reference.worst_error));
        if !more {
            return Some(steps);
        }
    }
}

/// A matrix of rows that may hold what is not finite.
pub(super) fn matrix(rows: &[Vec<Option<f64>>]) -> DMatrix<f64> {
    let columns = rows.first().map_or(0, Vec::len);
    DMatrix::from_fn(rows.len(), columns, |i, j| rows[i].get(j).copied().flatten().unwrap_or(f64::NAN))
}
