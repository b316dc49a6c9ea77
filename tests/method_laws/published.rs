//! Against values published elsewhere; each file in `tests/data` names its values' sources.

use gaussworthy::gaussian::{Gaussian, Marginal};
use gaussworthy::method::{Counted, GaussHermite, MethodSpec};
use gaussworthy::sensor::SensorSpec;
use nalgebra::{DMatrix, DVector, dmatrix};
use serde::Deserialize;
use serde_json::{Map, Value};

use crate::cases::{Polynomial, TIGHT, assert_close, methods_for, moments, standard, tolerance};
use crate::polynomial::Monomials;

#[derive(Deserialize)]
struct File<R> {
    records: Vec<R>,
}

#[derive(Deserialize)]
struct Rule {
    id: String,
    prob_nodes: Vec<f64>,
    prob_weights_sum1: Vec<f64>,
    phys_nodes: Vec<f64>,
    phys_weights_sum_sqrtpi: Vec<f64>,
}

/// A node is the root of a polynomial evaluated in doubles, and comes out to a few units in the last place
/// (2.2e-16); a weight carries x times its node's absolute error, x^2 times the relative one, x up to 4.9.
const NODE_TOLERANCE: f64 = 1e-15;
const WEIGHT_TOLERANCE: f64 = 4e-15;

#[test]
fn gauss_hermite_rules_are_the_table_s() {
    // Abramowitz & Stegun, table 25.10 (weight exp(-x^2): nodes times sqrt(2), weights over sqrt(pi) here).
    let file: File<Rule> = serde_json::from_str(include_str!("../data/f01_gauss_hermite_rules.json")).unwrap();
    assert_eq!(file.records.len(), 9);
    for record in file.records {
        let order = record.prob_nodes.len();
        let rule = GaussHermite::new(order, 100).unwrap();
        assert_eq!(rule.rule().len(), order);
        for (k, &(node, weight)) in rule.rule().iter().enumerate() {
            let what = format!("{} node {k}", record.id);
            let sqrt_pi = std::f64::consts::PI.sqrt();
            // Zero must be zero.
            assert_close(node, record.prob_nodes[k], NODE_TOLERANCE, record.prob_nodes[k].abs().max(1e-300), &what);
            let table = record.phys_nodes[k] * std::f64::consts::SQRT_2;
            assert_close(node, table, 2.0 * NODE_TOLERANCE, table.abs().max(1e-300), &what);
            let table = record.prob_weights_sum1[k];
            assert_close(weight, table, WEIGHT_TOLERANCE, table, &what);
            let table = record.phys_weights_sum_sqrtpi[k] / sqrt_pi;
            assert_close(weight, table, 2.0 * WEIGHT_TOLERANCE, table, &what);
        }
    }
}

#[derive(Deserialize)]
struct Exactness {
    #[serde(default)]
    numeric_evidence: Vec<Evidence>,
}

#[derive(Deserialize)]
struct Evidence {
    rule: String,
    n: usize,
    points: usize,
    all_monomials_exact_up_to_total_degree: u32,
    first_failing_monomial_exponents: Vec<u32>,
    rule_value: f64,
    true_value: f64,
}

/// The method that a rule of the file is, if it is one of ours.
fn method_of(rule: &str) -> Option<MethodSpec> {
    let label = match rule {
        "McNamee-Stenger degree 5" => "fully-symmetric-5".to_string(),
        "spherical-radial degree 5" => "cubature-5".to_string(),
        "spherical-radial degree 3" => "cubature-3".to_string(),
        "unscented kappa=3-n" => "unscented".to_string(),
        "unscented kappa=0 (n=3)" => "unscented:kappa=0".to_string(),
        rule if rule.starts_with("unscented kappa=") => rule.replace(' ', ":"),
        rule if rule.starts_with("GH ") => format!("gauss-hermite:order={}", rule.rsplit('=').next()?),
        _ => return None,
    };
    Some(MethodSpec::parse(&label).unwrap())
}

/// All exponents of `n` components with a total degree of at most `degree`.
pub fn up_to_degree(n: usize, degree: u32) -> Vec<Vec<u32>> {
    if n == 0 {
        return vec![vec![]];
    }
    (0..=degree)
        .flat_map(|first| {
            up_to_degree(n - 1, degree - first).into_iter().map(move |mut rest| {
                rest.insert(0, first);
                rest
            })
        })
        .collect()
}

#[test]
fn rules_are_exact_as_far_as_published_and_fail_where_published() {
    let file: File<Exactness> = serde_json::from_str(include_str!("../data/f11_rule_exactness.json")).unwrap();
    let mut tried = 0;
    for evidence in file.records.into_iter().flat_map(|r| r.numeric_evidence) {
        let Some(method) = method_of(&evidence.rule) else { continue };
        tried += 1;
        let prior = standard(evidence.n);
        let mean_of = |exponents: Vec<u32>| {
            let monomial = Polynomial::new(evidence.n, vec![vec![(1.0, exponents)]]);
            moments(&method, &monomial, &prior, &dmatrix![0.0]).mean[0]
        };
        let mut of = Monomials::of(&prior);
        for exponents in up_to_degree(evidence.n, evidence.all_monomials_exact_up_to_total_degree) {
            let what = format!("{} on {exponents:?}", evidence.rule);
            let doubled: Vec<u32> = exponents.iter().map(|e| 2 * e).collect();
            let size = of.expectation(&doubled).sqrt();
            assert_close(mean_of(exponents.clone()), of.expectation(&exponents), TIGHT, size, &what);
        }
        let failing = evidence.first_failing_monomial_exponents;
        let what = format!("{} on {failing:?}", evidence.rule);
        assert_close(of.expectation(&failing), evidence.true_value, 1e-15, evidence.true_value, &what);
        assert_close(mean_of(failing), evidence.rule_value, TIGHT, evidence.true_value, &what);

        let monomial = Polynomial::new(evidence.n, vec![vec![(1.0, vec![1; evidence.n])]]);
        let counted = Counted::new(&monomial);
        moments(&method, &counted, &prior, &dmatrix![0.0]);
        assert_eq!(counted.evaluations().values as usize, evidence.points, "{}", evidence.rule);
    }
    assert_eq!(tried, 28, "rules of the file that are ours");
}

#[derive(Deserialize)]
struct Closed {
    id: String,
    inputs: Map<String, Value>,
    mu: Vec<f64>,
    #[serde(rename = "S")]
    covariance: Vec<Vec<f64>>,
    #[serde(rename = "C")]
    cross: Vec<Vec<f64>>,
}

fn numbers<T: serde::de::DeserializeOwned>(of: &Map<String, Value>, key: &str) -> T {
    serde_json::from_value(of[key].clone()).unwrap()
}

#[test]
fn quadratic_forms_have_their_published_moments() {
    // Mathai & Provost 1992, ch. 3. Each moment by every method that claims it exact for the second degree.
    let file: File<Closed> = serde_json::from_str(include_str!("../data/f02_quadratic_forms.json")).unwrap();
    assert_eq!(file.records.len(), 14);
    for record in file.records {
        let inputs = &record.inputs;
        let (mean, covariance): (Vec<f64>, Vec<Vec<f64>>) = (numbers(inputs, "m"), numbers(inputs, "P"));
        let n = mean.len();
        let mean = DVector::from_vec(mean);
        let prior = Gaussian::new(mean, DMatrix::from_fn(n, n, |i, k| covariance[i][k])).unwrap();
        let described = ["A", "b", "c"].map(|key| (key.to_string(), inputs[key].clone()));
        let kind = ("kind".to_string(), Value::from("quadratic"));
        let sensor = SensorSpec::from_json(described.into_iter().chain([kind]).collect(), n).unwrap();
        let reads = sensor.sensor().reads();
        let marginal = Marginal::new(&prior, reads);
        let p = record.mu.len();
        for method in methods_for(sensor.sensor()) {
            let (claim, label, tolerance) =
                (method.method().exactness().unwrap(), method.label(), tolerance(&method));
            let got = moments(&method, sensor.sensor(), marginal.law(), &DMatrix::zeros(p, p));
            let cross = marginal.lift(got.cross_covariance);
            let what = format!("{} by {label}", record.id);
            for j in 0..p {
                let sd = record.covariance[j][j].sqrt();
                let size = sd + record.mu[j].abs();
                if claim.mean.covers(2) {
                    assert_close(got.mean[j], record.mu[j], tolerance, size, &what);
                }
                for i in (0..n).filter(|_| claim.cross_covariance.covers(2)) {
                    let scale = covariance[i][i].sqrt() * size;
                    assert_close(cross[(i, j)], record.cross[i][j], tolerance, scale, &what);
                }
                for l in (0..p).filter(|_| claim.covariance.covers(2)) {
                    let scale = size * (record.covariance[l][l].sqrt() + record.mu[l].abs());
                    assert_close(got.covariance[(j, l)], record.covariance[j][l], tolerance, scale, &what);
                }
            }
        }
    }
}

/// A point and its weight.
type Weighted = (Vec<f64>, f64);

/// Points and weights as the papers write them, worked by hand from their formulas (from memory); each point with its mean weight.
#[test]
fn small_sets_are_those_of_their_papers() {
    let (half, third, sixth) = (0.5f64.sqrt(), 1.0 / 3.0, 1.0 / 6.0);
    let root = f64::sqrt;
    let sets: [(&str, Vec<Weighted>); 6] = [
        // Julier 2003 with w = 1/3: -+1 / sqrt(2w), -1 / sqrt(6w) and 2 / sqrt(6w).
        (
            "simplex",
            vec![(vec![-root(1.5), -half], third), (vec![root(1.5), -half], third), (vec![0.0, 2.0 * half], third)],
        ),
        // Julier & Uhlmann 2002 with w0 = 0: weights 1/4, 1/4, 1/2; -+1 / sqrt(2/4), then -+1 / sqrt(2/2).
        (
            "minimal-skew-simplex",
            vec![(vec![-root(2.0), -1.0], 0.25), (vec![root(2.0), -1.0], 0.25), (vec![0.0, 1.0], 0.5)],
        ),
        // Jia, Xin & Cheng 2013 with n = 2: axes at 2, diagonals at sqrt(2), 1/16 each.
        (
            "cubature-5",
            [[0.0, 2.0], [0.0, -2.0], [2.0, 0.0], [-2.0, 0.0]]
                .into_iter()
                .chain(
                    [1.0, -1.0].into_iter().flat_map(|s| [[s * root(2.0), root(2.0)], [s * root(2.0), -root(2.0)]]),
                )
                .map(|z| (z.to_vec(), 0.0625))
                .chain([(vec![0.0, 0.0], 0.5)])
                .collect(),
        ),
        // McNamee & Stenger 1967 with n = 2: 4/9, 1/9, 1/36, which is Gauss-Hermite's product.
        (
            "fully-symmetric-5",
            [(0.0, 2.0 * third), (root(3.0), sixth), (-root(3.0), sixth)]
                .into_iter()
                .flat_map(|(x, v)| {
                    [(0.0, 2.0 * third), (root(3.0), sixth), (-root(3.0), sixth)].map(|(y, w)| (vec![x, y], v * w))
                })
                .collect(),
        ),
        // Jia, Xin & Cheng 2012, level 2 with n = 2: the unscented points at sqrt(3), 1/6 each.
        (
            "sparse-gauss-hermite:level=2",
            vec![
                (vec![0.0, 0.0], third),
                (vec![root(3.0), 0.0], sixth),
                (vec![-root(3.0), 0.0], sixth),
                (vec![0.0, root(3.0)], sixth),
                (vec![0.0, -root(3.0)], sixth),
            ],
        ),
        // Adurthi, Singla & Singh 2012 with n = 6: r1 = 2, r2 = sqrt(2), w1 = 1/16, w2 = 1/256.
        (
            "conjugate-4",
            (0..6)
                .flat_map(|i| [2.0, -2.0].map(|r| ((0..6).map(|k| if k == i { r } else { 0.0 }).collect(), 0.0625)))
                .chain((0..64).map(|c: u32| {
                    ((0..6).map(|k| if c >> k & 1 == 0 { root(2.0) } else { -root(2.0) }).collect(), 1.0 / 256.0)
                }))
                .collect(),
        ),
    ];
    for (label, published) in sets {
        let a = published[0].0.len();
        let set = MethodSpec::parse(label).unwrap().method().point_set(a).unwrap().unwrap();
        assert_eq!(set.points().nrows(), published.len(), "{label}");
        assert_eq!(set.mean_weights(), set.covariance_weights(), "{label}");
        for (point, weight) in published {
            let at = |k: &usize| (0..a).all(|i| (set.points()[(*k, i)] - point[i]).abs() < 1e-14);
            let found: Vec<usize> = (0..set.points().nrows()).filter(at).collect();
            assert_eq!(found.len(), 1, "{label}: {point:?}");
            assert_close(set.mean_weights()[found[0]], weight, 1e-14, 1.0, &format!("{label} at {point:?}"));
        }
    }
}

/// Norgaard, Poulsen & Ravn 2000, filter DD2, on y = z'A z of z ~ N(0, I): only the diagonal of A is seen, sum_i D_i D_i' = 0
/// and the covariance is (h^2 - 1) sum_i A_ii^2 (true: 2 sum_ij A_ij^2); the mean is the trace whatever the step.
#[test]
fn divided_differences_have_the_covariance_of_their_paper() {
    let form = vec![(2.0, vec![2, 0]), (-3.0, vec![0, 2]), (5.0, vec![1, 1])];
    let polynomial = Polynomial::new(2, vec![form]);
    for (label, square) in [("central-difference-2", 3.0), ("central-difference-2:step=1.2", 1.44)] {
        let got = moments(&MethodSpec::parse(label).unwrap(), &polynomial, &standard(2), &dmatrix![0.0]);
        assert_close(got.mean[0], -1.0, TIGHT, 1.0, label);
        assert_close(got.covariance[(0, 0)], (square - 1.0) * 13.0, TIGHT, 26.0, label);
    }
    let got =
        moments(&MethodSpec::parse("central-difference-1").unwrap(), &polynomial, &standard(2), &dmatrix![0.0]);
    assert_eq!((got.mean[0], got.covariance[(0, 0)]), (0.0, 0.0));
}
