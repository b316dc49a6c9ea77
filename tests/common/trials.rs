//! One or more trials of every sensor kind: the sensor, random points, and how strongly it bends there.

use std::f64::consts::PI;

use gaussworthy::sensor::SensorSpec;
use nalgebra::DMatrix;
use rand::RngExt;
use rand_pcg::Pcg64;
use serde_json::{Value, json};

use super::analytic::{Analytic, analytic};
use super::random;
use super::sightings::{Sighting, sightings};

/// A sensor to try.
pub struct Trial {
    pub name: String,
    pub spec: SensorSpec,
    /// Number of state components.
    pub n: usize,
    shape: Shape,
}

/// What is known of a sensor's growth, from its formula.
enum Shape {
    /// Range (where not angular) and bearing from these stations, one an output.
    Planar(Vec<[f64; 2]>),
    /// Analytic around any position but a few.
    Sighting(Sighting),
    /// Second degree, coefficients of order one.
    Polynomial,
    /// Anything else, by its size in the complex plane.
    Analytic(Analytic),
}

/// Bounds on one output near a point, in a ball of radius `step`.
pub struct Bend {
    /// Step of the finite differences.
    pub step: f64,
    /// |h|.
    pub value: f64,
    /// |dh/dx_i|.
    pub slope: f64,
    /// |d3h/dx_i3|.
    pub third: f64,
    /// |d4h/dx_i dx_k3|.
    pub fourth: f64,
}

impl Trial {
    fn new(described: Value, n: usize, shape: Shape) -> Self {
        let name = format!("{} on {n} components", described["kind"]);
        let Value::Object(map) = described else { panic!("a sensor is an object") };
        let spec = SensorSpec::from_json(map, n).unwrap_or_else(|e| panic!("{name}: {e}"));
        Self { name, spec, n, shape }
    }

    /// A random point, read components only.
    pub fn point(&self, rng: &mut Pcg64) -> Vec<f64> {
        let a = self.spec.sensor().reads().len();
        match &self.shape {
            Shape::Planar(stations) => {
                let [sx, sy] = stations[rng.random_range(0..stations.len())];
                let range = 10f64.powf(rng.random_range(-0.5..5.0));
                let direction = rng.random_range(-PI..PI);
                vec![sx + range * direction.cos(), sy + range * direction.sin()]
            }
            Shape::Sighting(sighting) => sighting.point(rng),
            Shape::Polynomial => random::normal_vector(a, rng).iter().map(|z| 10.0 * z).collect(),
            Shape::Analytic(analytic) => (analytic.point)(rng),
        }
    }

    /// Bounds on output `j` near `x`.
    ///
    /// A bearing is the imaginary part of ln z: its k-th derivatives are at most (k-1)! / r^k. A range is
    /// homogeneous of degree one: its third and fourth derivatives are at most 3 / r^2 and 15 / r^3. A
    /// polynomial of second degree has none, and rounds once a term. Of an analytic function see [`Analytic::bend`].
    pub fn bend(&self, x: &[f64], j: usize) -> Bend {
        match &self.shape {
            Shape::Planar(stations) => {
                let [sx, sy] = stations[j.min(stations.len() - 1)];
                let r = (x[0] - sx).hypot(x[1] - sy);
                // About the cube root of 2^-52: truncation and rounding are then alike.
                let step = 6e-6 * r;
                let near = r - step;
                if self.spec.sensor().outputs()[j].angular {
                    let (third, fourth) = (2.0 / near.powi(3), 6.0 / near.powi(4));
                    Bend { step, value: PI, slope: 1.0 / near, third, fourth }
                } else {
                    Bend { step, value: r, slope: 1.0, third: 3.0 / near.powi(2), fourth: 15.0 / near.powi(3) }
                }
            }
            Shape::Sighting(sighting) => {
                let reach = sighting.reach(x, j);
                let (step, departure) = (6e-6 * reach.radius, reach.departure);
                // What is left around a point of the ball.
                let radius = reach.radius - step;
                Bend {
                    step,
                    value: reach.value,
                    slope: departure / radius,
                    third: 6.0 * departure / radius.powi(3),
                    fourth: 24.0 * departure / radius.powi(4),
                }
            }
            Shape::Polynomial => {
                let (a, step) = (x.len() as f64, 0.5);
                let reach = x.iter().fold(1.0, |m: f64, v| m.max(v.abs())) + step;
                // Coefficients are standard normal: under 6 all but once in 5e8 draws.
                let largest = 6.0;
                let value = largest * (a * a * reach * reach + a * reach + 1.0) * a;
                Bend { step, value, slope: largest * (2.0 * a * reach + 1.0) * a, third: 0.0, fourth: 0.0 }
            }
            Shape::Analytic(analytic) => analytic.bend(x),
        }
    }
}

/// Every sensor kind, in several sizes. A new kind is one line here.
pub fn trials() -> Vec<Trial> {
    let mut rng = random::stream(41);
    let stations = vec![[3.0, -2.0], [-40.0, 15.0], [0.5, 800.0]];
    let mut trials = vec![
        range_bearing(&[[0.0, 0.0]], [0, 1], 2),
        range_bearing(&[[3.0, -2.0]], [3, 1], 4),
        range_bearing(&[[-120.0, 45.0]], [4, 2], 6),
        range_bearing(&stations, [1, 2], 4),
        bearing_only(&stations[..1], [0, 1], 2),
        bearing_only(&stations, [0, 2], 4),
        bearing_only(&stations, [5, 0], 6),
        written_range_bearing([3.0, -2.0]),
        written_polynomial(),
    ];
    trials.extend(sightings().into_iter().map(|s| Trial::new(s.described(), 6, Shape::Sighting(s))));
    for n in 1..=9 {
        for p in 1..=3 {
            trials.push(quadratic(n, p, &mut rng));
            trials.push(linear(n, p, &mut rng));
        }
    }
    let line = json!({"kind": "line-offset", "through": [[1, 2], [4, -2]], "position": [2, 0]});
    trials.push(Trial::new(line, 3, Shape::Polynomial));
    let others = analytic().into_iter();
    trials.extend(others.map(|(described, n, shape)| Trial::new(described, n, Shape::Analytic(shape))));
    trials
}

fn range_bearing(stations: &[[f64; 2]], position: [usize; 2], n: usize) -> Trial {
    // A range and a bearing each.
    let shape = Shape::Planar(stations.iter().flat_map(|&s| [s, s]).collect());
    Trial::new(planar("range-bearing", stations, position), n, shape)
}

fn bearing_only(stations: &[[f64; 2]], position: [usize; 2], n: usize) -> Trial {
    Trial::new(planar("bearing-only", stations, position), n, Shape::Planar(stations.to_vec()))
}

fn planar(kind: &str, stations: &[[f64; 2]], position: [usize; 2]) -> serde_json::Value {
    match stations {
        [one] => json!({"kind": kind, "station": one, "position": position}),
        several => json!({"kind": kind, "stations": several, "position": position}),
    }
}

/// Range and bearing as formulas, the second component first.
fn written_range_bearing(station: [f64; 2]) -> Trial {
    let described = json!({
        "state": ["speed", "y", "x"], "parameters": {"sx": station[1], "sy": station[0]},
        "definitions": {"north": "y - sy", "range": "hypot(x - sx, north)"},
        "outputs": [
            {"name": "range", "formula": "range"},
            {"name": "bearing", "formula": "atan2(x - sx, north)", "angular": true}
        ]
    });
    Trial::new(described, 3, Shape::Planar(vec![station; 2]))
}

/// Polynomials of second degree whose noise inside is read as a component.
fn written_polynomial() -> Trial {
    let described = json!({
        "state": ["a", "b"], "noise": ["v"],
        "outputs": [
            {"name": "square", "formula": "a^2 - 2 * a * v + b"},
            {"name": "branch", "formula": "if(a < 1e9, (a + b)^2, 0) + min(v, 1e9) - max(b, -1e9)"}
        ]
    });
    Trial::new(described, 2, Shape::Polynomial)
}

/// A of order one and not symmetric.
fn quadratic(n: usize, p: usize, rng: &mut Pcg64) -> Trial {
    let a: Vec<_> = (0..p).map(|_| rows(&random::normal_matrix(n, n, rng))).collect();
    let b = rows(&random::normal_matrix(p, n, rng));
    let c: Vec<f64> = random::normal_vector(p, rng).iter().copied().collect();
    Trial::new(json!({"kind": "quadratic", "A": a, "b": b, "c": c}), n, Shape::Polynomial)
}

fn linear(n: usize, p: usize, rng: &mut Pcg64) -> Trial {
    let h = rows(&random::normal_matrix(p, n, rng));
    let offset: Vec<f64> = random::normal_vector(p, rng).iter().copied().collect();
    Trial::new(json!({"kind": "linear", "H": h, "offset": offset}), n, Shape::Polynomial)
}

fn rows(m: &DMatrix<f64>) -> Vec<Vec<f64>> {
    m.row_iter().map(|r| r.iter().copied().collect()).collect()
}
