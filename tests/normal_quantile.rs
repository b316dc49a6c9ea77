//! The normal quantile against mpmath, and the laws that it must keep whatever the rounding.

use std::sync::LazyLock;

use gaussworthy::net::{BLOCK, normal, normal_quantile, normals};
use rand::{Rng, RngExt, SeedableRng};
use rand_pcg::Pcg64;
use serde::Deserialize;

/// Largest relative error allowed. The approximation itself is exact to 7.5e-17, the rest is rounding; the reference
/// values are rounded to doubles too (1.1e-16).
const RELATIVE: f64 = 1e-15;

#[derive(Deserialize)]
struct Outside {
    grid: Vec<String>,
    dyadics: Vec<String>,
}

/// mpmath 1.3.0 at 60 digits; the call stands in the file.
static MPMATH: LazyLock<Outside> = LazyLock::new(|| {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/data/normal_quantile.json");
    serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap()
});

fn split(line: &str) -> (&str, f64) {
    let (input, z) = line.split_once(' ').unwrap();
    (input, z.parse().unwrap())
}

fn relative_error(found: f64, exact: f64) -> f64 {
    if found == exact { 0.0 } else { (found / exact - 1.0).abs() }
}

/// Integer whose leading 53 bits lie `k` cells below the top.
fn from_top(k: u64) -> u64 {
    !(k << 11)
}

/// The file holds upper-tail points z > 0 of q <= 1/2: the quantile of p = q is -z.
#[test]
fn quantile_is_mpmaths_from_1e_300_to_one_half() {
    assert_eq!(MPMATH.grid.len(), 605);
    let mut worst = (0.0, 0.0);
    for line in &MPMATH.grid {
        let (bits, z) = split(line);
        let q = f64::from_bits(u64::from_str_radix(bits, 16).unwrap());
        let error = relative_error(normal_quantile(q), -z);
        assert!(error <= RELATIVE, "p = {q:e}: relative error {error:e}");
        worst = if error > worst.0 { (error, q) } else { worst };
    }
    println!("largest relative error {:.2e} at p = {:e}", worst.0, worst.1);
}

#[test]
fn normal_is_mpmaths_on_the_dyadics_of_nets() {
    assert!(MPMATH.dyadics.len() > 300);
    let mut worst = (0.0, 0);
    for line in &MPMATH.dyadics {
        let (k, z) = split(line);
        let k = k.parse().unwrap();
        let error = relative_error(normal(from_top(k)), z);
        assert!(error <= RELATIVE, "k = {k}: relative error {error:e}");
        worst = if error > worst.0 { (error, k) } else { worst };
    }
    println!("largest relative error {:.2e} at k = {}", worst.0, worst.1);
}

#[test]
fn complement_gives_the_negative_to_the_bit() {
    let mut rng = Pcg64::seed_from_u64(1);
    for _ in 0..100_000 {
        let bits = rng.next_u64() >> rng.random_range(0..53);
        assert_eq!(normal(!bits).to_bits(), (-normal(bits)).to_bits());
        // p and 1 - p both exact.
        let p = rng.random_range(1..1u64 << 53) as f64 / 2f64.powi(53);
        if p != 0.5 {
            assert_eq!(normal_quantile(1.0 - p).to_bits(), (-normal_quantile(p)).to_bits());
        }
    }
}

#[test]
fn normal_is_the_quantile_of_the_midpoint_of_its_cell() {
    let mut rng = Pcg64::seed_from_u64(2);
    for _ in 0..100_000 {
        // Below 1/2, where the midpoint is a double.
        let bits = rng.next_u64() >> rng.random_range(1..53);
        let p = ((bits >> 11) as f64 + 0.5) / 2f64.powi(53);
        assert_eq!(normal(bits).to_bits(), normal_quantile(p).to_bits());
    }
}

#[test]
fn ends_and_middle() {
    // mpmath 1.3.0: the upper quantile of 2^-54 is the dyadic k = 0 of the file; 2^-54 is the least tail.
    let least = split(&MPMATH.dyadics[0]);
    assert_eq!(least.0, "0");
    assert!(relative_error(normal(u64::MAX), least.1) <= RELATIVE && (8.2..8.3).contains(&least.1));
    assert_eq!(normal(0), -normal(u64::MAX));
    for middle in [1 << 63, (1 << 63) - 1] {
        assert!(normal(middle) != 0.0 && normal(middle).abs() < 2e-16);
    }
    assert_eq!(normal_quantile(0.5).to_bits(), 0.0f64.to_bits());
    assert_eq!(normal_quantile(0.0), f64::NEG_INFINITY);
    assert_eq!(normal_quantile(1.0), f64::INFINITY);
    for outside in [-1e-300, 1.0 + f64::EPSILON, f64::NAN, f64::INFINITY, f64::NEG_INFINITY] {
        assert!(normal_quantile(outside).is_nan(), "{outside}");
    }
}

/// Rising wherever the true values lie farther apart than the error of two of them.
#[test]
fn quantile_rises() {
    let mut rng = Pcg64::seed_from_u64(3);
    let check = |p: f64, next: f64| {
        let (z, above) = (normal_quantile(p), normal_quantile(next));
        assert!(z < above, "{p:e} gives {z:e}, {next:e} gives {above:e}");
    };
    // dz = dp / phi(z). A step of 2^-46 p is 2.6e-15 |z| at p = 0.015 and more of it above.
    for _ in 0..200_000 {
        let p: f64 = rng.random_range(0.015..0.5);
        check(p, p * (1.0 + 2f64.powi(-46)));
    }
    // Farther out |z| goes as sqrt(-2 ln p): a step of 1e-14 ln p is at least 5e-15 |z|.
    for _ in 0..200_000 {
        let ln: f64 = -rng.random_range(4.0..690.0);
        check(ln.exp(), (ln * (1.0 - 1e-14)).exp());
    }
    // Across the seams at 5/64 and e^-25.
    for seam in [0.078125, 1.388794386496402e-11] {
        for step in 1..1000 {
            let width = f64::from(step) * 1e-13;
            check(seam * (1.0 - width), seam);
            check(seam, seam * (1.0 + width));
        }
    }
}

#[test]
fn block_is_its_values_one_by_one_to_the_bit() {
    let mut rng = Pcg64::seed_from_u64(4);
    let mut out = [0.0; BLOCK];
    let mut check = |bits: &[u64; BLOCK]| {
        normals(bits, &mut out);
        for (z, &bits) in out.iter().zip(bits) {
            assert_eq!(z.to_bits(), normal(bits).to_bits(), "{bits:016x}");
        }
    };
    for _ in 0..2_000 {
        check(&std::array::from_fn(|_| rng.next_u64()));
    }
    // None in the tails, all in them, all in the far tails, and the far tails among the others.
    check(&std::array::from_fn(|i| (1 << 63) + i as u64 * 0x1234_5678));
    check(&std::array::from_fn(|i| if i % 2 == 0 { i as u64 } else { !(i as u64) << 40 }));
    check(&std::array::from_fn(|i| (i as u64) << 11));
    check(&std::array::from_fn(|i| if i % 37 == 0 { from_top(i as u64) } else { rng.next_u64() }));
    for _ in 0..2_000 {
        check(&std::array::from_fn(|_| rng.next_u64() >> rng.random_range(0..64)));
    }
}
