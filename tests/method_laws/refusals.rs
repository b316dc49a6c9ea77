//! What a method cannot serve it refuses when it is planned, and says why.

use gaussworthy::gaussian::Moments;
use gaussworthy::method::{MethodSpec, Problem};
use gaussworthy::sensor::{BearingOnly, Linear, Sensor};
use nalgebra::DMatrix;

use crate::cases::{methods, standard};

#[test]
fn dimensions_without_points_are_refused_with_the_reason() {
    let refuse = |label: &str, a| MethodSpec::parse(label).unwrap().plan(a, 1).unwrap_err().0;
    assert_eq!(
        refuse("conjugate-4", 2),
        "with w0 = 0 the conjugate points of 2 read components would have to lie infinitely far away; give w0 above 0 and \
         up to 0.5"
    );
    assert_eq!(
        refuse("conjugate-4", 1),
        "with w0 = 0 the conjugate points of 1 read component would have to lie infinitely far away; use gauss-hermite"
    );
    assert!(MethodSpec::parse("conjugate-4:w0=0.5").unwrap().plan(2, 1).is_ok());
    assert_eq!(
        refuse("conjugate-4:w0=0.5", 3),
        "with w0 = 0.5 the moments of 3 components have no real solution; give w0 up to 0.4000"
    );
    assert_eq!(
        refuse("conjugate-4", 17),
        "17 read components need 2^17 conjugate points; at most 16 components are served"
    );
    assert!(refuse("minimal-skew-simplex", 1100).contains("the least weight, (1 - w0) / 2^1100, vanishes"));
    assert_eq!(
        refuse("sparse-gauss-hermite:level=4", 60),
        "level 4 on 60 read components needs more than 100000 nodes; take a lower level"
    );
    assert!(refuse("stochastic-5:iterations=100000", 6).contains("are more than 1000000 points; take fewer"));
    assert!(refuse("quasi-monte-carlo", 129).contains("in 129 dimensions"));
}

/// Which methods of the laws are left out where: what is not listed here is served, in every number of components from 1 to 6.
#[test]
fn nothing_else_is_refused() {
    for a in 1..=6 {
        let refused: Vec<_> =
            methods().into_iter().filter(|m| m.plan(a, 2).is_err()).map(|m| m.label().to_string()).collect();
        let wanted: &[&str] = match a {
            1 => &["conjugate-4", "conjugate-4:w0=0.25"],
            2 => &["conjugate-4"],
            5 => &["bayesian-quadrature:nodes=gauss-hermite:order=4:length_scale=2"],
            6 => &["bayesian-quadrature:nodes=gauss-hermite:order=4:length_scale=2"],
            _ => &[],
        };
        assert_eq!(refused, wanted, "in {a} components");
    }
}

#[test]
fn a_sensor_without_closed_form_is_refused_by_the_method_that_needs_one() {
    let bearing = BearingOnly::new(vec![[0.0, 0.0]], [0, 1], 2).unwrap();
    let level = Linear::new(vec![vec![1.0, 2.0]], vec![0.0], 2).unwrap();
    for method in methods() {
        let needs = method.label() == "statistical-linearisation";
        assert!(method.method().serves(&level).is_ok());
        assert_eq!(method.method().serves(&bearing).is_err(), needs, "{}", method.label());
    }
    let method = MethodSpec::parse("statistical-linearisation").unwrap();
    let reason = method.method().serves(&bearing).unwrap_err().0;
    assert_eq!(reason, "this sensor's moments have no closed form here; statistical linearisation needs one");
    // Who does not ask beforehand gets no number, and no panic.
    let mut got = Moments::zeros(2, 1);
    let (prior, noise) = (standard(2), DMatrix::identity(1, 1));
    let problem = Problem { sensor: &bearing as &dyn Sensor, prior: &prior, noise: &noise };
    method.plan(2, 1).unwrap().apply(problem, &mut got);
    assert!(got.mean[0].is_nan() && got.covariance[(0, 0)].is_nan() && got.cross_covariance[(0, 0)].is_nan());
}
