//! What a transform costs is what the table says, and it allocates nothing.

use gaussworthy::gaussian::Moments;
use gaussworthy::method::{Counted, Evaluations, MethodSpec, Problem};
use gaussworthy::sensor::{Number, Output, Sensor};
use nalgebra::DMatrix;

use crate::cases::{Dice, Shape, Shaped, methods, methods_for, moments, sensors, standard};

#[derive(Debug)]
struct Dial;

impl Shape for Dial {
    fn evaluate<T: Number>(x: &[T]) -> T {
        x.iter().fold(T::constant(0.0), |sum, &v| sum + v).atan2(T::constant(5.0))
    }
}

/// The evaluations that the catalogue's text claims; a text that is not known here fails.
fn claimed(method: &MethodSpec, a: usize, angular: bool) -> Evaluations {
    let given = |key: &str, default: usize| match method.label().split_once(&format!("{key}=")) {
        Some((_, rest)) => rest.split(':').next().unwrap().parse().unwrap(),
        None => default,
    };
    let has_centre = method.label().contains("w0=");
    let (order, iterations) = (given("order", 3), given("iterations", 10));
    let values = |count: usize| Evaluations { values: count as u64, ..Evaluations::default() };
    match method.kind().unwrap().evaluations {
        "1 Jacobian" => Evaluations { jacobians: 1, ..Evaluations::default() },
        "1 Hessian set" => Evaluations { hessians: 1, ..Evaluations::default() },
        "1 set of exact moments" => Evaluations { exact_moments: 1, ..Evaluations::default() },
        "2a + 1" => values(2 * a + 1),
        "2a^2 + 1" => values(2 * a * a + 1),
        "a + 1, and 1 where w0 is above 0 or an output is angular" => {
            values(a + 1 + usize::from(has_centre || angular))
        }
        "2a + 2^a, and 1 where w0 is above 0 or an output is angular" => {
            values(2 * a + 2usize.pow(a as u32) + usize::from(has_centre || angular))
        }
        "2a, and 1 where an output is angular" => values(2 * a + usize::from(angular)),
        "order^a, and 1 where an output is angular and the order even" => {
            values(order.pow(a as u32) + usize::from(angular && order.is_multiple_of(2)))
        }
        "2a + 1; gauss-hermite: order^a, and 1 where the order is even" => {
            if method.label().contains("gauss-hermite") {
                values(order.pow(a as u32) + usize::from(order.is_multiple_of(2)))
            } else {
                values(2 * a + 1)
            }
        }
        "level 2: 2a + 1; level 3: 2a^2 + 4a + 1; level 4: 4a(a - 1)(a - 2)/3 + 10a^2 + 2a + 1; at a = 1: 2 level - 1" =>
        {
            let level = given("level", 3);
            match (a, level) {
                (1, level) => values(2 * level - 1),
                (a, 2) => values(2 * a + 1),
                (a, 3) => values(2 * a * a + 4 * a + 1),
                (a, _) => values(4 * a * (a - 1) * (a - 2) / 3 + 10 * a * a + 2 * a + 1),
            }
        }
        "2a iterations + 1" => values(2 * a * iterations + 1),
        "2(a + 1)(a + 2) iterations + 1; at a = 1: 4 iterations + 1; at a = 2: 12 iterations + 1" => {
            let one = match a {
                1 => 4,
                2 => 12,
                _ => 2 * (a + 1) * (a + 2),
            };
            values(one * iterations + 1)
        }
        "points, and 1 where an output is angular" => {
            let default = if method.kind().unwrap().id == "monte-carlo" { 100 } else { 128 };
            values(given("points", default) + usize::from(angular))
        }
        other => panic!("`{other}` is not a claim that is counted here"),
    }
}

#[test]
fn evaluations_are_as_many_as_the_table_says() {
    for a in 1..=6 {
        for (output, angular) in [(Output::plain("y", "m"), false), (Output::angle("y"), true)] {
            let sensor = Shaped::<Dial>::new(a, output);
            for method in methods_for(&sensor) {
                let counted = Counted::new(&sensor);
                moments(&method, &counted, &standard(a), &DMatrix::zeros(1, 1));
                assert_eq!(counted.evaluations(), claimed(&method, a, angular), "{} at a = {a}", method.label());
            }
        }
        // What the catalogue shows, also of the method that a dial does not serve.
        for method in methods() {
            match Evaluations::of(method.method(), a) {
                Ok(evaluations) => {
                    assert_eq!(evaluations, claimed(&method, a, false), "{} at a = {a}", method.label())
                }
                Err(refusal) => assert_eq!(Err(refusal), method.plan(a, 1).map(drop)),
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
    for (sensor, prior) in sensors() {
        for method in methods_for(sensor.sensor()) {
            assert_eq!(allocations(&method, sensor.sensor(), &prior), 0, "{} on {}", method.label(), sensor.kind());
        }
    }
    for a in 1..=6 {
        let sensor = Shaped::<Dial>::new(a, Output::angle("y"));
        for method in methods_for(&sensor) {
            assert_eq!(allocations(&method, &sensor, &dice.law(a, a)), 0, "{} at a = {a}", method.label());
        }
    }
    // The counter does count: a singular prior needs its eigenvalues.
    let sensor = Shaped::<Dial>::new(2, Output::angle("y"));
    assert!(allocations(&MethodSpec::parse("cubature-3").unwrap(), &sensor, &dice.law(2, 1)) > 0);
}
