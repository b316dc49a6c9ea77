//! Exact on the polynomials of the degree that each source claims, and not beyond.

use std::collections::HashMap;

use gaussworthy::gaussian::{Gaussian, Moments};
use gaussworthy::method::MethodSpec;
use nalgebra::{DMatrix, DVector, dmatrix, dvector};

use crate::cases::{Dice, Polynomial, TIGHT, Terms, assert_close, methods, moments, tolerance};

/// E\[x^e\] of a Gaussian by Isserlis' theorem in the form E\[x_i g\] = m_i E\[g\] + sum_j P_ij E\[dg/dx_j\].
#[derive(Debug)]
pub struct Monomials<'a> {
    law: &'a Gaussian,
    known: HashMap<Vec<u32>, f64>,
}

impl<'a> Monomials<'a> {
    pub fn of(law: &'a Gaussian) -> Self {
        Self { law, known: HashMap::new() }
    }

    pub fn expectation(&mut self, exponents: &[u32]) -> f64 {
        let Some(i) = exponents.iter().position(|&e| e > 0) else { return 1.0 };
        if let Some(&value) = self.known.get(exponents) {
            return value;
        }
        let mut rest = exponents.to_vec();
        rest[i] -= 1;
        let mut value = self.law.mean()[i] * self.expectation(&rest);
        for j in 0..rest.len() {
            if rest[j] > 0 {
                let mut once_less = rest.clone();
                once_less[j] -= 1;
                value += self.law.covariance()[(i, j)] * f64::from(rest[j]) * self.expectation(&once_less);
            }
        }
        self.known.insert(exponents.to_vec(), value);
        value
    }

    fn of_product(&mut self, left: &Terms, right: &Terms) -> f64 {
        let mut sum = 0.0;
        for (c, e) in left {
            for (d, f) in right {
                let both: Vec<u32> = e.iter().zip(f).map(|(a, b)| a + b).collect();
                sum += c * d * self.expectation(&both);
            }
        }
        sum
    }

    /// Sum of |c| sqrt(E\[x^2e\]): the size of what is summed to y.
    fn size(&mut self, terms: &Terms) -> f64 {
        let squared = |e: &Vec<u32>| e.iter().map(|v| 2 * v).collect::<Vec<_>>();
        terms.iter().map(|(c, e)| c.abs() * self.expectation(&squared(e)).sqrt()).sum()
    }

    fn moments(&mut self, polynomial: &Polynomial) -> Moments {
        let (a, p) = (self.law.dimension(), polynomial.terms.len());
        let one: Terms = vec![(1.0, vec![0; a])];
        let mean = DVector::from_fn(p, |j, _| self.of_product(&polynomial.terms[j], &one));
        let covariance = DMatrix::from_fn(p, p, |j, l| {
            self.of_product(&polynomial.terms[j], &polynomial.terms[l]) - mean[j] * mean[l]
        });
        let cross_covariance = DMatrix::from_fn(a, p, |i, j| {
            let mut component = vec![0; a];
            component[i] = 1;
            self.of_product(&polynomial.terms[j], &vec![(1.0, component)]) - self.law.mean()[i] * mean[j]
        });
        Moments { mean, covariance, cross_covariance }
    }
}

#[test]
fn the_helper_knows_the_moments_of_a_gaussian() {
    // E[z^8] = 105; E[x1^2 x2^2] = P11 P22 + 2 P12^2 (Isserlis 1918); E[(m + z)^3] = m^3 + 3m.
    let law =
        Gaussian::new(dvector![0.0, 0.0, 2.0], dmatrix![1.0, 0.5, 0.0; 0.5, 3.0, 0.0; 0.0, 0.0, 1.0]).unwrap();
    let mut of = Monomials::of(&law);
    assert_eq!(of.expectation(&[8, 0, 0]), 105.0);
    assert_eq!(of.expectation(&[2, 2, 0]), 3.5);
    assert_eq!(of.expectation(&[0, 0, 3]), 14.0);
    assert_eq!(of.expectation(&[1, 2, 0]), 0.0);
}

/// Up to which total degree mean, cross-covariance and covariance are claimed exact.
struct Claim {
    mean: u32,
    cross: u32,
    covariance: u32,
}

/// The claims of the methods' documentation, each from its source there.
fn claim(method: &MethodSpec) -> Claim {
    match method.kind().unwrap().id {
        "taylor-1" => Claim { mean: 1, cross: 2, covariance: 1 },
        "taylor-2" => Claim { mean: 3, cross: 2, covariance: 2 },
        "unscented" | "unscented-scaled" | "cubature-3" => Claim { mean: 3, cross: 2, covariance: 1 },
        "gauss-hermite" => {
            let order: u32 = method.label().rsplit('=').next().unwrap().parse().unwrap();
            Claim { mean: 2 * order - 1, cross: 2 * order - 2, covariance: order - 1 }
        }
        other => panic!("no claim is known of {other}: write its documentation's down here"),
    }
}

/// Six random terms of up to this total degree, one of it exactly.
fn random_terms(dice: &mut Dice, a: usize, degree: u32) -> Terms {
    (0..6)
        .map(|k| {
            let total = if k == 0 { degree } else { dice.below(degree as usize + 1) as u32 };
            let mut exponents = vec![0; a];
            for _ in 0..total {
                exponents[dice.below(a)] += 1;
            }
            (dice.normal(), exponents)
        })
        .collect()
}

#[test]
fn every_method_is_exact_up_to_the_degree_that_its_source_claims() {
    let mut dice = Dice::new(30_001);
    for a in 1..=5 {
        for _ in 0..4 {
            let prior = dice.law(a, a);
            for method in methods() {
                let claim = claim(&method);
                for degree in 1..=claim.mean.max(claim.cross) {
                    let terms = (0..2).map(|_| random_terms(&mut dice, a, degree)).collect();
                    let polynomial = Polynomial::new(a, terms);
                    let mut of = Monomials::of(&prior);
                    let exact = of.moments(&polynomial);
                    let size: Vec<f64> = polynomial.terms.iter().map(|t| of.size(t)).collect();
                    let got = moments(&method, &polynomial, &prior, &DMatrix::zeros(2, 2));
                    let what = format!("{} on degree {degree} in {a} components", method.label());
                    let tolerance = tolerance(&method);
                    for j in 0..2 {
                        if degree <= claim.mean {
                            assert_close(got.mean[j], exact.mean[j], tolerance, size[j], &what);
                        }
                        for i in (0..a).filter(|_| degree <= claim.cross) {
                            let scale = size[j] * prior.covariance()[(i, i)].sqrt();
                            let (got, exact) = (got.cross_covariance[(i, j)], exact.cross_covariance[(i, j)]);
                            assert_close(got, exact, tolerance, scale, &what);
                        }
                        for l in (0..2).filter(|_| degree <= claim.covariance) {
                            let (got, exact) = (got.covariance[(j, l)], exact.covariance[(j, l)]);
                            assert_close(got, exact, tolerance, size[j] * size[l], &what);
                        }
                    }
                }
            }
        }
    }
}

/// All exponents of this total degree in two components.
fn of_degree(degree: u32) -> impl Iterator<Item = Vec<u32>> {
    (0..=degree).map(move |i| vec![i, degree - i])
}

#[test]
fn no_method_is_exact_one_degree_beyond_its_claim() {
    let prior = Gaussian::new(dvector![0.3, -0.7], dmatrix![1.0, 0.4; 0.4, 2.0]).unwrap();
    let none = dmatrix![0.0];
    for method in methods() {
        let claim = claim(&method);
        // The greatest error over all monomials of a degree, relative to the monomial's size.
        let worst = |degree: u32, error: &dyn Fn(&Moments, &Moments) -> f64| {
            of_degree(degree)
                .map(|exponents| {
                    let polynomial = Polynomial::new(2, vec![vec![(1.0, exponents)]]);
                    let mut of = Monomials::of(&prior);
                    let got = moments(&method, &polynomial, &prior, &none);
                    error(&got, &of.moments(&polynomial)) / of.size(&polynomial.terms[0])
                })
                .fold(0.0, f64::max)
        };
        let mean = worst(claim.mean + 1, &|got, exact| (got.mean[0] - exact.mean[0]).abs());
        let cross = worst(claim.cross + 1, &|got, exact| (&got.cross_covariance - &exact.cross_covariance).amax());
        let covariance = worst(claim.covariance + 1, &|got, exact| {
            (got.covariance[(0, 0)] - exact.covariance[(0, 0)]).abs() / exact.covariance[(0, 0)].sqrt()
        });
        // The least true defect is m! / sqrt((4m - 1)!!), that of Gauss-Hermite of order 5: 5e-3 for N(0, 1).
        for (what, defect) in [("mean", mean), ("cross-covariance", cross), ("covariance", covariance)] {
            assert!(defect > 1e-4, "{}: {what} is exact beyond its claim ({defect:.1e})", method.label());
        }
    }
}

#[test]
fn the_product_rule_is_exact_to_its_degree_in_each_coordinate() {
    // Of total degree a (2m - 1), far beyond 2m - 1; independent components, so each is its own coordinate.
    let mut dice = Dice::new(30_002);
    for order in 2..=6 {
        let method = MethodSpec::parse(&format!("gauss-hermite:order={order}")).unwrap();
        for a in 1..=4 {
            let variances = dice.matrix(a, 1).column(0).map(|v| v * v);
            let prior =
                Gaussian::new(dice.matrix(a, 1).column(0).into(), DMatrix::from_diagonal(&variances)).unwrap();
            for below in [0, 1] {
                // The full degree in every coordinate, and one less in every other.
                let exponents = (0..a).map(|i| 2 * order - 1 - (i as u32 % 2) * below).collect();
                let polynomial = Polynomial::new(a, vec![vec![(1.0, exponents)]]);
                let mut of = Monomials::of(&prior);
                let exact = of.moments(&polynomial).mean[0];
                let size = of.size(&polynomial.terms[0]);
                let got = moments(&method, &polynomial, &prior, &dmatrix![0.0]);
                assert_close(got.mean[0], exact, TIGHT, size, &format!("order {order} in {a} components"));
            }
        }
    }
}

#[test]
fn methods_that_are_the_same_rule_agree() {
    // kappa = 0 is the cubature rule; in one component kappa = 2 is Gauss-Hermite of order 3; alpha = 1 with
    // beta = 0 is the unscaled transform.
    let pairs = [
        (1..=5, "unscented:kappa=0", "cubature-3"),
        (1..=1, "unscented", "gauss-hermite:order=3"),
        (1..=5, "unscented-scaled:alpha=1:beta=0:kappa=0.5", "unscented:kappa=0.5"),
    ];
    let mut dice = Dice::new(30_003);
    for (components, left, right) in pairs {
        let (left, right) = (MethodSpec::parse(left).unwrap(), MethodSpec::parse(right).unwrap());
        for a in components {
            let prior = dice.law(a, a);
            let polynomial = Polynomial::new(a, vec![random_terms(&mut dice, a, 5), random_terms(&mut dice, a, 4)]);
            let size: Vec<f64> = polynomial.terms.iter().map(|t| Monomials::of(&prior).size(t)).collect();
            let noise = dice.covariance(2);
            let (l, r) =
                (moments(&left, &polynomial, &prior, &noise), moments(&right, &polynomial, &prior, &noise));
            for (j, &size) in size.iter().enumerate() {
                assert_close(l.mean[j], r.mean[j], TIGHT, size, left.label());
                assert_close(l.covariance[(j, j)], r.covariance[(j, j)], TIGHT, size * size, left.label());
                let difference = (l.cross_covariance.column(j) - r.cross_covariance.column(j)).amax();
                assert_close(difference, 0.0, TIGHT, size * prior.covariance().amax().sqrt(), left.label());
            }
        }
    }
}

#[test]
fn beta_two_gives_the_variance_of_a_square_in_one_component() {
    // y = z^2 of N(0, 1) has variance 2. The points give s - 1 and the centre's own covariance weight adds
    // 1 - alpha^2 + beta, with s = alpha^2 in one component: beta = 2 whatever alpha is, the value that Wan &
    // van der Merwe 2000 name as best for Gaussians. Another beta is off by the difference.
    let square = Polynomial::new(1, vec![vec![(1.0, vec![2])]]);
    let law = Gaussian::new(dvector![0.0], dmatrix![1.0]).unwrap();
    for (label, variance) in [
        ("unscented-scaled", 2.0),
        ("unscented-scaled:alpha=0.1", 2.0),
        ("unscented-scaled:alpha=1", 2.0),
        ("unscented-scaled:alpha=0.5:beta=0", 0.0),
        ("unscented-scaled:alpha=0.5:beta=-1.5", -1.5),
    ] {
        let method = MethodSpec::parse(label).unwrap();
        let got = moments(&method, &square, &law, &dmatrix![0.0]);
        assert_close(got.covariance[(0, 0)], variance, tolerance(&method), 2.0, label);
    }
}
