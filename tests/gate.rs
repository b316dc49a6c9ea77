//! What the gate catches, and that it is silent where nothing has changed. Faults are planted in an unscented transform written here, as one's own
//! implementation would be, and in the second-order terms of Taylor; the baseline is made with the sound version under the same name.

use std::sync::Arc;

use gaussworthy::gate::{Baseline, Comparison, Effect, Rules, Topic, compare};
use gaussworthy::gaussian::{Moments, wrap};
use gaussworthy::method::{Method, MethodSpec, Problem, Refusal, Transform};
use gaussworthy::reference::Store;
use gaussworthy::sensor::Arithmetic;
use gaussworthy::suite::Suite;
use gaussworthy::survey::{SurveyPlan, SurveySettings, Unwatched, survey};
use nalgebra::{Cholesky, DMatrix, DVector};

/// What is wrong with an implementation.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Fault {
    /// Nothing.
    None,
    /// The weight of one point is off by this share.
    Weight(f64),
    /// Deviations of angles are taken as they come.
    NotWrapped,
    /// R is not added.
    NoNoise,
    /// The points lie along the rows of the Cholesky factor.
    TransposedRoot,
}

/// The unscented transform with kappa = 3 - a, with a fault.
#[derive(Debug)]
struct Own(Fault);

#[derive(Debug)]
struct OwnTransform(Fault);

impl Method for Own {
    fn plan(&self, _: usize, _: usize, _: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        Ok(Box::new(OwnTransform(self.0)))
    }
}

impl Transform for OwnTransform {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let Problem { sensor, prior, noise } = problem;
        let (a, p) = (prior.dimension(), sensor.outputs().len());
        let root = Cholesky::new(prior.covariance().clone()).unwrap().l();
        let root = if self.0 == Fault::TransposedRoot { root.transpose() } else { root };
        let mut points = vec![prior.mean().clone()];
        for i in 0..a {
            points.push(prior.mean() + root.column(i) * 3f64.sqrt());
            points.push(prior.mean() - root.column(i) * 3f64.sqrt());
        }
        let mut weights = vec![1.0 / 6.0; 2 * a + 1];
        weights[0] = 1.0 - a as f64 / 3.0;
        if let Fault::Weight(share) = self.0 {
            weights[1] *= 1.0 + share;
        }
        let mut values: Vec<DVector<f64>> = Vec::new();
        for point in &points {
            let mut y = DVector::zeros(p);
            sensor.value(point.as_slice(), y.as_mut_slice());
            values.push(y);
        }
        let centre = values[0].clone();
        let chart = |j: usize, d: f64| {
            if sensor.outputs()[j].angular && self.0 != Fault::NotWrapped { wrap(d) } else { d }
        };
        let mut shift = DVector::zeros(p);
        for (y, w) in values.iter_mut().zip(&weights) {
            *y = DVector::from_fn(p, |j, _| chart(j, y[j] - centre[j]));
            shift += &*y * *w;
        }
        moments.mean = DVector::from_fn(p, |j, _| {
            let mean: f64 = centre[j] + shift[j];
            if sensor.outputs()[j].angular { wrap(mean) } else { mean }
        });
        moments.covariance = if self.0 == Fault::NoNoise { DMatrix::zeros(p, p) } else { noise.clone() };
        moments.cross_covariance = DMatrix::zeros(a, p);
        for ((x, y), w) in points.iter().zip(&values).zip(&weights) {
            let d = y - &shift;
            moments.covariance += &d * d.transpose() * *w;
            moments.cross_covariance += (x - prior.mean()) * d.transpose() * *w;
        }
    }
}

/// Second-order Taylor with the sign of its Hessian term turned in mean or covariance: twice the first order less the second.
#[derive(Debug)]
struct Turned {
    mean: bool,
    covariance: bool,
}

#[derive(Debug)]
struct TurnedTransform {
    first: Box<dyn Transform>,
    second: Box<dyn Transform>,
    mean: bool,
    covariance: bool,
}

impl Method for Turned {
    fn plan(&self, a: usize, p: usize, _: Arithmetic) -> Result<Box<dyn Transform>, Refusal> {
        let plan = |label| MethodSpec::parse(label).unwrap().plan(a, p);
        let (first, second) = (plan("taylor-1")?, plan("taylor-2")?);
        Ok(Box::new(TurnedTransform { first, second, mean: self.mean, covariance: self.covariance }))
    }
}

impl Transform for TurnedTransform {
    fn apply(&mut self, problem: Problem<'_>, moments: &mut Moments) {
        let mut first = moments.clone();
        self.first.apply(problem, &mut first);
        self.second.apply(problem, moments);
        if self.mean {
            for (j, output) in problem.sensor.outputs().iter().enumerate() {
                let step = moments.mean[j] - first.mean[j];
                let step = if output.angular { wrap(step) } else { step };
                moments.mean[j] = first.mean[j] - step;
            }
        }
        if self.covariance {
            moments.covariance = &first.covariance * 2.0 - &moments.covariance;
        }
    }
}

/// The baseline of `sound` on the smoke suite under seed 1, and `faulty` held against it under `seed`.
fn held(
    store: &Store,
    sound: impl Method + 'static,
    faulty: impl Method + 'static,
    seed: u64,
    rules: &Rules,
) -> Comparison {
    let suite = Suite::load("smoke", None).unwrap();
    let plan = |method: Arc<dyn Method>, seed| {
        let methods = Some(vec![MethodSpec::own("own", method).unwrap()]);
        let settings =
            SurveySettings { seed: Some(seed), methods, store: Some(store.clone()), ..Default::default() };
        SurveyPlan::new(&suite, &settings).unwrap()
    };
    let accepted = plan(Arc::new(sound), 1);
    let baseline = Baseline::of(&survey(&suite, &accepted, false, &Unwatched));
    let mut today = plan(Arc::new(faulty), seed);
    today.earlier = baseline.earlier(&suite);
    let found = survey(&suite, &today, false, &Unwatched);
    compare(&baseline, &found, rules, Baseline::of(&found).chances())
}

fn said(comparison: &Comparison) -> String {
    let count = |effect| comparison.count(effect);
    let scores = comparison.changes.iter().filter(|c| c.topic == Topic::Score && c.effect.fails()).count();
    let verdicts = comparison.changes.iter().filter(|c| c.topic == Topic::Verdict && c.effect.fails()).count();
    format!(
        "{} worse, {} moved, {} better; of these {scores} scores and {verdicts} verdicts fail",
        count(Effect::Worse),
        count(Effect::Moved),
        count(Effect::Better)
    )
}

#[test]
fn every_structural_fault_is_caught_whatever_the_seed() {
    let folder = tempfile::tempdir().unwrap();
    let store = Store::open(folder.path()).unwrap();
    let rules = Rules::default();
    for seed in [1, 2] {
        let silent = held(&store, Own(Fault::None), Own(Fault::None), seed, &rules);
        assert!(!silent.fails(), "{:?}", silent.changes);
        let caught = |name: &str, comparison: Comparison| {
            println!("seed {seed}, {name}: {}", said(&comparison));
            assert!(comparison.count(Effect::Worse) > 0, "{name}: {:?}", comparison.changes);
        };
        for fault in [Fault::NotWrapped, Fault::NoNoise, Fault::TransposedRoot] {
            caught(&format!("{fault:?}"), held(&store, Own(Fault::None), Own(fault), seed, &rules));
        }
        for (mean, covariance) in [(true, false), (false, true)] {
            let sound = Turned { mean: false, covariance: false };
            let name = format!("sign of the Hessian term, mean {mean}, covariance {covariance}");
            caught(&name, held(&store, sound, Turned { mean, covariance }, seed, &rules));
        }
    }
}

/// A weight off by one part in 10^k.
#[test]
fn weights_are_caught_down_to_the_rounding_that_is_allowed() {
    let folder = tempfile::tempdir().unwrap();
    let store = Store::open(folder.path()).unwrap();
    for (rounding, smallest) in [(Rules::default().rounding, 9), (0.0, 15)] {
        let rules = Rules { rounding, ..Rules::default() };
        for k in 3..=16 {
            let fault = Own(Fault::Weight(10f64.powi(-k)));
            let comparison = held(&store, Own(Fault::None), fault, 2, &rules);
            println!("rounding {rounding:e}, weight off by 1e-{k}: {}", said(&comparison));
            assert!(comparison.fails() || k > smallest, "1e-{k}: {:?}", comparison.notes);
            // Half a unit in the last place of 1 is 1.1e-16: the weight is the same number.
            assert!(!comparison.fails() || k < 16, "1e-{k}: {:?}", comparison.changes);
        }
    }
}

/// How many of 200 gates under other seeds are shut, at each of some odds, on unchanged methods.
fn alarms(suite: &Suite, settings: &SurveySettings, odds: &[f64]) -> Vec<usize> {
    let plan = |seed| SurveyPlan::new(suite, &SurveySettings { seed: Some(seed), ..settings.clone() }).unwrap();
    let accepted = plan(1);
    let baseline = Baseline::of(&survey(suite, &accepted, false, &Unwatched));
    let mut shut = vec![0; odds.len()];
    for seed in 2..202 {
        let mut today = plan(seed);
        today.earlier = baseline.earlier(suite);
        let found = survey(suite, &today, false, &Unwatched);
        let chances = Baseline::of(&found).chances();
        for (count, &odds) in shut.iter_mut().zip(odds) {
            let comparison = compare(&baseline, &found, &Rules { odds, ..Rules::default() }, chances);
            if comparison.fails() {
                *count += 1;
                println!("seed {seed}, odds {odds}: {:?}", comparison.changes[0]);
            }
        }
    }
    shut
}

/// Two hundred gates at odds of 1e-4 raise an alarm with odds of 0.02; at odds of 0.2 they raise some, and no more than 0.2 and four
/// standard deviations of a count allow, were the gates independent, which by the shared baseline they are not quite.
fn assert_silent(shut: &[usize]) {
    println!("of 200 gates shut at odds 1e-4: {}; at 0.2: {}", shut[0], shut[1]);
    assert_eq!(shut[0], 0);
    assert!(shut[1] <= 40 + 23, "{shut:?}");
}

#[test]
fn another_seed_raises_no_alarm() {
    let text = "title = \"a few, coarse\"\nprecision = 5e-2\ncap = 16384\n\
        [[family]]\nname = \"radar\"\n[family.sensor]\nkind = \"range-bearing\"\nstation = [0, 0]\n\
        [family.prior]\nrange = \"3 km\"\nbearing = \"35 deg\"\nalong_sd = \"20 m\"\nacross_sd = \"5 deg\"\n\
        [family.noise]\nsd = [\"10 m\", \"0.3 deg\"]\n\
        [[family]]\nname = \"buoy\"\n[family.sensor]\nkind = \"bearing-only\"\nstation = [0, 0]\n\
        [family.prior]\nrange = \"1.5 km\"\nbearing = \"179 deg\"\nalong_sd = \"10 %\"\nacross_sd = \"18 deg\"\n\
        [family.noise]\nsd = \"1 deg\"\n\
        [[family]]\nname = \"gauge\"\n[family.sensor]\nkind = \"linear\"\nH = [[1, 0], [1, 0.5]]\n\
        [family.prior]\nmean = [2, -0.1]\nsd = [0.3, 0.05]\n[family.noise]\nsd = 0.1\n";
    let suite = Suite::from_text("few", "few.toml", text, None).unwrap();
    let methods = ["taylor-1", "unscented", "cubature-3"].map(|label| MethodSpec::parse(label).unwrap());
    let settings = SurveySettings { methods: Some(methods.to_vec()), ..Default::default() };
    assert_silent(&alarms(&suite, &settings, &[1e-4, 0.2]));
}

#[test]
#[ignore = "two hundred surveys of the whole smoke suite take minutes"]
fn another_seed_raises_no_alarm_on_the_whole_smoke_suite() {
    let suite = Suite::load("smoke", None).unwrap();
    assert_silent(&alarms(&suite, &SurveySettings::default(), &[1e-4, 0.2]));
}
