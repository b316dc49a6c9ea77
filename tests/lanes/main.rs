//! Elementary functions in lanes: accuracy, special values, and one answer on every level.

mod arguments;
#[macro_use]
mod functions;
mod values;

use functions::{Function, map};
use gaussworthy::lanes::Level;

/// How many representable numbers lie between; NaN equals NaN, and the zeros differ by none here.
fn distance(a: f64, b: f64) -> u64 {
    let ordered = |v: f64| {
        let bits = v.to_bits() as i64;
        i128::from(if bits < 0 { i64::MIN.wrapping_sub(bits) } else { bits })
    };
    if a.is_nan() && b.is_nan() { 0 } else { (ordered(a) - ordered(b)).unsigned_abs() as u64 }
}

fn check_accuracy<F: Function>(kind: &str, (x, y): (Vec<[f64; 8]>, Vec<[f64; 8]>)) {
    let ours = map::<F>(Level::best(), &x, &y);
    let mut worst = (0, 0.0, 0.0, 0.0, 0.0);
    let mut differing = 0;
    for ((x, y), ours) in x.iter().zip(&y).zip(&ours) {
        for i in 0..8 {
            let standard = F::standard(x[i], y[i]);
            let off = distance(ours[i], standard);
            differing += usize::from(off > 0);
            if off > worst.0 {
                worst = (off, x[i], y[i], ours[i], standard);
            }
            let alike = standard.is_nan() == ours[i].is_nan()
                && standard.is_infinite() == ours[i].is_infinite()
                && (standard.is_nan() || standard.is_sign_negative() == ours[i].is_sign_negative());
            assert!(alike, "{} of {:e}, {:e}: {:e} instead of {standard:e}", F::NAME, x[i], y[i], ours[i]);
        }
    }
    let share = differing as f64 / (8 * x.len()) as f64;
    println!("{} {kind}: at most {} off, {:.2} % differ", F::NAME, worst.0, 100.0 * share);
    assert!(worst.0 <= F::LIMIT, "{} is {} numbers off: x, y, ours, standard {:?}", F::NAME, worst.0, worst);
}

#[test]
fn edges_are_as_in_the_standard_library() {
    fn check<F: Function>() {
        check_accuracy::<F>("edges", arguments::edge_blocks(F::TWO));
    }
    for_every_function!(check);
}

#[test]
fn functions_are_close_to_the_standard_library() {
    fn check<F: Function>() {
        check_accuracy::<F>("many", arguments::many::<F>());
    }
    for_every_function!(check);
}

#[test]
fn all_levels_give_the_same_bits() {
    /// Of a NaN only that it is one.
    fn bits(values: &[[f64; 8]]) -> Vec<u64> {
        values.as_flattened().iter().map(|v| if v.is_nan() { f64::NAN.to_bits() } else { v.to_bits() }).collect()
    }
    fn check<F: Function>() {
        for (x, y) in [arguments::edge_blocks(F::TWO), arguments::many::<F>()] {
            let baseline = bits(&map::<F>(Level::Baseline, &x, &y));
            for level in Level::available() {
                let ours = bits(&map::<F>(level, &x, &y));
                if let Some(i) = (0..ours.len()).find(|&i| ours[i] != baseline[i]) {
                    panic!("{level} differs in {} of {:e}, {:e}", F::NAME, x[i / 8][i % 8], y[i / 8][i % 8]);
                }
            }
        }
    }
    for_every_function!(check);
}
