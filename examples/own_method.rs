//! A method of one's own, beside the built-in ones: `cargo run --release --example own_method`.
//!
//! Central differences: first-order Taylor with the Jacobian taken by steps of one standard deviation.

use std::sync::Arc;

use gaussworthy::gaussian::Moments;
use gaussworthy::method::{Method, MethodSpec, Problem, Refusal, Transform, default_methods};
use gaussworthy::report::write_summary;
use gaussworthy::sensor::Arithmetic;
use gaussworthy::suite::Suite;
use gaussworthy::survey::{SurveyPlan, SurveySettings, Unwatched, summarise, survey};
use nalgebra::{DMatrix, DVector};

#[derive(Debug)]
struct Differences;

impl Method for Differences {
    fn plan(&self, a: usize, p: usize, _: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        let y = [(); 2].map(|()| DVector::zeros(p));
        Ok(Box::new(Workspace { y, slope: DMatrix::zeros(p, a) }))
    }
}

#[derive(Debug)]
struct Workspace {
    y: [DVector<f64>; 2],
    /// Differences along the columns of the square root (p x a).
    slope: DMatrix<f64>,
}

impl Transform for Workspace {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let Problem { sensor, prior, noise } = problem;
        let root = prior.root();
        let [above, below] = &mut self.y;
        for i in 0..root.ncols() {
            sensor.value((prior.mean() + root.column(i)).as_slice(), above.as_mut_slice());
            sensor.value((prior.mean() - root.column(i)).as_slice(), below.as_mut_slice());
            self.slope.set_column(i, &((&*above - &*below) * 0.5));
        }
        sensor.value(prior.mean().as_slice(), moments.mean.as_mut_slice());
        moments.covariance = &self.slope * self.slope.transpose() + noise;
        moments.cross_covariance = root * self.slope.transpose();
    }
}

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let suite = Suite::load("power-meter", None)?;
    let mut methods = default_methods();
    methods.push(MethodSpec::own("differences", Arc::new(Differences))?);
    let plan = SurveyPlan::new(&suite, &SurveySettings { methods: Some(methods), ..SurveySettings::default() })?;
    let found = survey(&suite, &plan, true, &Unwatched);
    write_summary(&found, &summarise(&found), &mut std::io::stdout())?;
    Ok(())
}
