//! What a transform costs is what the table says, and it allocates nothing.

use gaussworthy::gaussian::Moments;
use gaussworthy::method::{Counted, Evaluations, MethodSpec, Problem};
use gaussworthy::sensor::{Number, Output, Sensor};
use nalgebra::DMatrix;

use crate::cases::{Dice, Shape, Shaped, methods, moments, sensors, standard};

#[derive(Debug)]
struct Dial;

impl Shape for Dial {
    fn evaluate<T: Number>(x: &[T]) -> T {
        x.iter().fold(T::constant(0.0), |sum, &v| sum + v).atan2(T::constant(5.0))
    }
}

/// The evaluations that the catalogue's text claims; a text that is not known here fails.
fn claimed(method: &MethodSpec, a: usize, angular: bool) -> Evaluations {
    let order: usize = match method.label().split_once("order=") {
        Some((_, order)) => order.parse().unwrap(),
        None => 3,
    };
    let values = |count: usize| Evaluations { values: count as u64, ..Evaluations::default() };
    match method.kind().unwrap().evaluations {
        "1 Jacobian" => Evaluations { jacobians: 1, ..Evaluations::default() },
        "1 Hessian set" => Evaluations { hessians: 1, ..Evaluations::default() },
        "2a + 1" => values(2 * a + 1),
        "2a, and 1 where an output is angular" => values(2 * a + usize::from(angular)),
        "order^a, and 1 where an output is angular and the order even" => {
            values(order.pow(a as u32) + usize::from(angular && order.is_multiple_of(2)))
        }
        other => panic!("`{other}` is not a claim that is counted here"),
    }
}

#[test]
fn evaluations_are_as_many_as_the_table_says() {
    for a in 1..=6 {
        for (output, angular) in [(Output::plain("y", "m"), false), (Output::angle("y"), true)] {
            let sensor = Shaped::<Dial>::new(a, output);
            for method in methods() {
                let counted = Counted::new(&sensor);
                moments(&method, &counted, &standard(a), &DMatrix::zeros(1, 1));
                assert_eq!(counted.evaluations(), claimed(&method, a, angular), "{} at a = {a}", method.label());
            }
        }
    }
}

fn allocations(method: &MethodSpec, sensor: &dyn Sensor, prior: &gaussworthy::gaussian::Gaussian) -> u64 {
    let (a, p) = (sensor.reads().len(), sensor.outputs().len());
    let (noise, mut moments) = (DMatrix::identity(p, p), Moments::zeros(a, p));
    let mut transform = method.plan(a, p).unwrap();
    let problem = Problem { sensor, prior, noise: &noise };
    allocation_counter::measure(|| transform.apply(problem, &mut moments)).count_total
}

#[test]
fn a_transform_allocates_nothing() {
    let mut dice = Dice::new(40_001);
    for method in methods() {
        for (sensor, prior) in sensors() {
            assert_eq!(allocations(&method, sensor.sensor(), &prior), 0, "{} on {}", method.label(), sensor.kind());
        }
        for a in 1..=6 {
            let sensor = Shaped::<Dial>::new(a, Output::angle("y"));
            assert_eq!(allocations(&method, &sensor, &dice.law(a, a)), 0, "{} at a = {a}", method.label());
        }
    }
    // The counter does count: a singular prior needs its eigenvalues.
    let sensor = Shaped::<Dial>::new(2, Output::angle("y"));
    assert!(allocations(&MethodSpec::parse("cubature-3").unwrap(), &sensor, &dice.law(2, 1)) > 0);
}
