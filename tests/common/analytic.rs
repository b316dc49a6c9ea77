//! Sensors that are analytic functions: where to try them, and how large they are in the complex plane around there,
//! which bounds all their derivatives.

use rand::RngExt;
use rand_pcg::Pcg64;
use serde_json::{Value, json};

use super::random;
use super::trials::Bend;

/// An analytic function near any of its points.
pub struct Analytic {
    /// A random point, read components only.
    pub point: fn(&mut Pcg64) -> Vec<f64>,
    /// Around a point: a radius and a bound on every |h_j| where each component is moved by at most that much in the
    /// complex plane.
    pub size: fn(&[f64]) -> (f64, f64),
}

impl Analytic {
    /// Cauchy's estimates: with |h| <= M where every component is within rho of the point, the k-th derivative is at
    /// most k! M / rho^k, a mixed one less. Halving rho leaves room for the ball of the finite differences.
    pub fn bend(&self, x: &[f64]) -> Bend {
        let (radius, value) = (self.size)(x);
        let rho = radius / 2.0;
        // About the cube root of 2^-52: truncation and rounding are then alike.
        let step = 6e-6 * rho;
        let [slope, third, fourth] = [(1.0, 1), (6.0, 3), (24.0, 4)].map(|(k, n)| k * value / rho.powi(n));
        Bend { step, value, slope, third, fourth }
    }
}

/// A sensor, its number of state components, and its size; numbers of order one throughout.
pub fn analytic() -> Vec<(Value, usize, Analytic)> {
    vec![
        (json!({"kind": "polar-to-cartesian"}), 2, POLAR),
        (json!({"kind": "polar-to-cartesian", "range": 3, "bearing": 1}), 5, POLAR),
        (json!({"kind": "line-feature"}), 4, LINE),
        (json!({"kind": "line-feature", "position": [4, 1], "line": [0, 2]}), 6, LINE),
        (json!({"kind": "pinhole", "focal_length": 2, "centre": [0.5, -1]}), 3, CAMERA),
        (json!({"kind": "pinhole", "focal_length": 2, "centre": [0.5, -1], "position": [5, 0, 3]}), 6, CAMERA),
        (json!({"kind": "stereo-disparity", "focal_length": 2, "baseline": 0.5, "centre": [0.5, -1]}), 3, CAMERA),
        (json!({"kind": "attitude-vector", "direction": [3, -1, 2]}), 3, ATTITUDE),
        (json!({"kind": "attitude-vector", "direction": [0, 0, -5], "attitude": [6, 4, 5]}), 7, ATTITUDE),
        (json!({"kind": "dipole-field", "moment": [30, -10, 40], "place": [1, 2, -3]}), 3, DIPOLE),
        (
            json!({"kind": "dipole-field", "moment": [30, -10, 40], "place": [1, 2, -3],
                "background": [18000, 2000, -45000], "position": [3, 1, 5]}),
            6,
            DIPOLE_OVER_BACKGROUND,
        ),
        (json!({"kind": "exponential-decay", "amplitude": 3, "scale": 2, "offset": 1}), 1, DECAY),
        (json!({"kind": "exponential-decay", "amplitude": 3, "scale": 2, "offset": 1, "component": 3}), 5, DECAY),
        (json!({"kind": "saturating", "limit": 2, "gain": 3, "offset": 0.5, "component": 1}), 2, SATURATING),
        (
            json!({"kind": "phase-sine", "amplitude": 3, "frequency": 2, "phase": 0.3, "offset": 1, "component": 2}),
            3,
            SINE,
        ),
    ]
}

fn normal(a: usize, size: f64, rng: &mut Pcg64) -> Vec<f64> {
    random::normal_vector(a, rng).iter().map(|z| size * z).collect()
}

/// cosh 1 = 1.5431: |sin| and |cos| of a number whose imaginary part is at most 1.
const COSH_ONE: f64 = 1.5431;

/// r cos(theta), r sin(theta).
const POLAR: Analytic =
    Analytic { point: |rng| normal(2, 5.0, rng), size: |x| (1.0, (x[0].abs() + 1.0) * COSH_ONE) };

/// x cos(alpha) + y sin(alpha) - d.
const LINE: Analytic = Analytic {
    point: |rng| normal(4, 5.0, rng),
    size: |x| (1.0, (x[0].abs() + x[1].abs() + 2.0) * COSH_ONE + x[2].abs() + 1.0),
};

/// f x/z + c and f b/z with f = 2, |c| <= 1, b < 1: a quarter of z is far enough from the plane of the lens, where z
/// keeps three quarters of its size. In front and behind.
const CAMERA: Analytic = Analytic {
    point: |rng| {
        let depth = rng.random_range(0.5..20.0) * if rng.random::<bool>() { 1.0 } else { -1.0 };
        let mut x = normal(2, depth, rng);
        x.push(depth);
        x
    },
    size: |x| {
        let radius = x[2].abs() / 4.0;
        let across = x[0].abs().max(x[1].abs()).max(1.0) + radius;
        (radius, 2.0 * across / (0.75 * x[2].abs()) + 1.0)
    },
};

/// R(phi) d with |d| = 1: the rotation by a real part is unitary, an imaginary part psi stretches by at most
/// exp |psi|, and |psi| <= sqrt(3). From no rotation to several turns; one point in ten is phi = 0.
const ATTITUDE: Analytic = Analytic {
    point: |rng| match rng.random_range(0..10) {
        0 => vec![0.0; 3],
        _ => {
            let size = 10f64.powf(rng.random_range(-9.0..1.0));
            normal(3, size, rng)
        }
    },
    size: |_| (1.0, 3f64.sqrt().exp()),
};

/// |B| of a moment |m| < 51 A m^2, in nT 100 |m| / |r|^3 to twice that. Each coordinate moved by |r| / 200 in the complex
/// plane moves r by 0.0087 |r|, and B, whose slope is at most 24 times 100 |m| / |r|^4 (product rule: 3 + 3 + 15 + 3), by
/// less than a quarter of its least size: B.B stays away from zero, its root is analytic, and |B| within twice its
/// greatest size.
const DIPOLE: Analytic = Analytic {
    point: |rng| around_the_dipole(0.5, 50.0, rng),
    size: |x| {
        let r = range_of_dipole(x);
        (r / 200.0, 4.0 * 5100.0 / r.powi(3))
    },
};

/// The same over a background of 48 507 nT, far enough that the dipole's 10 200 nT are small beside it.
const DIPOLE_OVER_BACKGROUND: Analytic = Analytic {
    point: |rng| around_the_dipole(1.0, 5.0, rng),
    size: |x| {
        let r = range_of_dipole(x);
        (r / 200.0, 4.0 * 5100.0 / r.powi(3) + 48_508.0)
    },
};

const PLACE: [f64; 3] = [1.0, 2.0, -3.0];

fn range_of_dipole(x: &[f64]) -> f64 {
    x.iter().zip(PLACE).map(|(x, place)| (x - place).powi(2)).sum::<f64>().sqrt()
}

fn around_the_dipole(near: f64, far: f64, rng: &mut Pcg64) -> Vec<f64> {
    let direction = random::normal_vector(3, rng).normalize();
    let range = near * (far / near).powf(rng.random::<f64>());
    (0..3).map(|i| PLACE[i] + range * direction[i]).collect()
}

/// 3 exp(-x / 2) + 1: within 2 of a point the power gains at most 1.
const DECAY: Analytic =
    Analytic { point: |rng| normal(1, 5.0, rng), size: |x| (2.0, 3.0 * (1.0 - x[0] / 2.0).exp() + 1.0) };

/// 2 tanh(3 (x - 1/2) / 2): |tanh| <= tan 1 = 1.5575 where the imaginary part is at most 1.
const SATURATING: Analytic = Analytic { point: |rng| normal(1, 2.0, rng), size: |_| (2.0 / 3.0, 2.0 * 1.5575) };

/// 3 sin(2 x + 0.3) + 1.
const SINE: Analytic = Analytic { point: |rng| normal(1, 5.0, rng), size: |_| (0.5, 3.0 * COSH_ONE + 1.0) };
