use std::f64::consts::{PI, TAU};

/// The angle `a` \[rad\] wrapped to (-pi, pi].
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
    // The remainder is exact, so that nothing near the cut slips out by rounding, however many turns.
    let rest = a % TAU;
    if rest > PI {
        rest - TAU
    } else if rest <= -PI {
        rest + TAU
    } else {
        rest
    }
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
    fn neighbours_of_the_cut_land_inside_and_stay() {
        for turns in (-20_001..20_000).step_by(2) {
            let cut = f64::from(turns) * PI;
            let mut a = cut;
            for _ in 0..8 {
                a = a.next_down();
            }
            for _ in 0..16 {
                let w = wrap(a);
                assert!(w > -PI && w <= PI, "wrap({a:e}) = {w:e}");
                assert_eq!(wrap(w), w);
                a = a.next_up();
            }
        }
    }

    #[test]
    fn infinities_are_not_an_angle() {
        assert!(wrap(f64::INFINITY).is_nan());
        assert!(wrap(f64::NAN).is_nan());
    }
}
