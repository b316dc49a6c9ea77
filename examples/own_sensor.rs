//! A sensor of one's own, surveyed: `cargo run --release --example own_sensor`.
//!
//! The tide staff of Brackmoor Sound (invented): a camera h metres above the quay looks down on a float that the tide has
//! carried x metres away and z metres down, and reads its dip angle.

use std::sync::Arc;

use gaussworthy::gaussian::Gaussian;
use gaussworthy::report::write_summary;
use gaussworthy::sensor::{Formula, Number, Output, SensorSpec};
use gaussworthy::suite::{Case, Suite};
use gaussworthy::survey::{SurveyPlan, SurveySettings, Unwatched, summarise, survey};
use nalgebra::{dmatrix, dvector};
use serde_json::json;

#[derive(Debug)]
struct DipAngle {
    height: f64,
    outputs: [Output; 1],
}

impl Formula for DipAngle {
    fn reads(&self) -> &[usize] {
        &[0, 1]
    }

    fn outputs(&self) -> &[Output] {
        &self.outputs
    }

    #[inline(always)]
    fn evaluate<T: Number>(&self, x: &[T], y: &mut [T]) {
        y[0] = (x[1] + T::constant(self.height)).atan2(x[0]);
    }
}

fn main() -> Result<(), Box<dyn std::error::Error>> {
    let sensor = Arc::new(DipAngle { height: 4.0, outputs: [Output::plain("dip", "rad")] });
    let parameters = json!({"height": sensor.height}).as_object().cloned().unwrap_or_default();
    let spec = SensorSpec::own("dip-angle", parameters, 2, sensor)?;
    let cases = [2.0, 5.0, 10.0, 20.0, 40.0].map(|away| {
        let prior = Gaussian::new(dvector![away, 1.5], dmatrix![1.0, 0.0; 0.0, 0.25])?;
        Ok(Case::new(format!("float-{away}"), spec.clone(), prior, Some(dmatrix![1e-4]))?)
    });
    let cases = cases.into_iter().collect::<Result<_, Box<dyn std::error::Error>>>()?;
    let suite = Suite::of_cases("tide-staff", cases)?;
    let plan = SurveyPlan::new(&suite, &SurveySettings::default())?;
    let found = survey(&suite, &plan, true, &Unwatched);
    write_summary(&found, &summarise(&found), &mut std::io::stdout())?;
    Ok(())
}
