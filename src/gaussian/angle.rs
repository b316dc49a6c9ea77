use std::f64::consts::{PI, TAU};

/// The angle `a` [rad] wrapped to (-pi, pi].
///
/// A value already inside is returned with its own bits, so wrapping twice is wrapping once. A value that
/// is not finite comes back as NaN.
///
/// ```
/// use std::f64::consts::PI;
/// assert_eq!(gaussworthy::gaussian::wrap(-PI), PI);
/// assert_eq!(gaussworthy::gaussian::wrap(0.25), 0.25);
/// assert!((gaussworthy::gaussian::wrap(2.0 * PI + 0.25) - 0.25).abs() < 1e-15);
/// ```
#[inline]
pub fn wrap(a: f64) -> f64 {
    if a > -PI && a <= PI {
        return a;
    }
    let turned = a - TAU * (a / TAU).round();
    if turned <= -PI { turned + TAU } else { turned }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_angle_lands_inside_and_keeps_its_direction() {
        for k in -2000..2000 {
            let a = f64::from(k) * 0.037;
            let w = wrap(a);
            assert!(w > -PI && w <= PI, "wrap({a}) = {w}");
            assert!((w.sin() - a.sin()).abs() < 1e-13 && (w.cos() - a.cos()).abs() < 1e-13);
        }
    }

    #[test]
    fn infinities_are_not_an_angle() {
        assert!(wrap(f64::INFINITY).is_nan());
        assert!(wrap(f64::NAN).is_nan());
    }
}
