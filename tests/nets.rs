//! Randomised nets: the points of an outside library, the quality that theory promises, and what scrambling must
//! keep and what it must change.

use std::collections::HashSet;
use std::sync::LazyLock;

use gaussworthy::net::{BLOCK, Directions, MOST_DIMENSIONS, MOST_LOG2, Net, NetError, normal};
use gaussworthy::reference::Key;
use serde::Deserialize;

#[derive(Deserialize)]
struct Outside {
    /// Dimensions of which `points` are kept.
    dimensions: Vec<usize>,
    /// 1024 points times 1024, in Gray code order: one list a dimension.
    points: Vec<String>,
    /// Column k of all generator matrices, hexadecimal: one word a dimension.
    columns: std::collections::BTreeMap<usize, String>,
}

/// SciPy 1.17.1, `scipy.stats.qmc.Sobol(128, scramble=False, bits=64)`; the calls stand in the file.
static SCIPY: LazyLock<Outside> = LazyLock::new(|| {
    let path = concat!(env!("CARGO_MANIFEST_DIR"), "/tests/data/sobol_points.json");
    let value: serde_json::Value = serde_json::from_str(&std::fs::read_to_string(path).unwrap()).unwrap();
    serde_json::from_value(value).unwrap()
});

fn key(seed: u64) -> Key {
    Key::new(seed, "nets of the tests")
}

fn scrambled(seed: u64, replicate: u64, dimensions: usize, log2: u32) -> Net {
    Net::new(&key(seed), replicate, dimensions, log2).unwrap()
}

fn block(net: &Net, index: u64) -> Vec<u64> {
    let mut out = vec![0; BLOCK * net.dimensions()];
    net.block(index, &mut out);
    out
}

/// Coordinates of all points in natural order, one array a dimension.
fn points(net: &Net) -> Vec<Vec<u64>> {
    let mut all = vec![Vec::new(); net.dimensions()];
    for index in 0..net.blocks() {
        for (all, part) in all.iter_mut().zip(block(net, index).chunks(BLOCK)) {
            all.extend_from_slice(part);
        }
    }
    all
}

#[test]
fn unscrambled_points_are_scipys() {
    let net = Net::unscrambled(Directions::joe_kuo(), MOST_DIMENSIONS, 10).unwrap();
    let ours = points(&net);
    assert_eq!(SCIPY.dimensions.len(), SCIPY.points.len());
    for (&d, theirs) in SCIPY.dimensions.iter().zip(&SCIPY.points) {
        let gray: Vec<u64> = (0..1024).map(|n| ours[d][n ^ (n >> 1)] >> 54).collect();
        let theirs: Vec<u64> = theirs.split(',').map(|v| v.parse().unwrap()).collect();
        assert_eq!(gray, theirs, "dimension {d}");
    }
}

#[test]
fn generator_matrices_are_scipys_in_every_dimension() {
    assert_eq!(SCIPY.columns.len(), 26);
    for (&k, theirs) in &SCIPY.columns {
        let theirs: Vec<u64> = theirs.split(' ').map(|v| u64::from_str_radix(v, 16).unwrap()).collect();
        let ours: Vec<u64> = Directions::joe_kuo().columns().iter().map(|c| c[k]).collect();
        assert_eq!(ours, theirs, "column {k}");
    }
}

/// The first ten points in three dimensions as the authors' page of the table shows them, in Gray code order (from
/// memory).
#[test]
fn first_points_are_the_published_ones() {
    let published = [
        [0.0, 0.0, 0.0],
        [0.5, 0.5, 0.5],
        [0.75, 0.25, 0.25],
        [0.25, 0.75, 0.75],
        [0.375, 0.375, 0.625],
        [0.875, 0.875, 0.125],
        [0.625, 0.125, 0.875],
        [0.125, 0.625, 0.375],
        [0.1875, 0.3125, 0.9375],
        [0.6875, 0.8125, 0.4375],
    ];
    let ours = points(&Net::unscrambled(Directions::joe_kuo(), 3, 8).unwrap());
    for (n, point) in published.iter().enumerate() {
        for d in 0..3 {
            assert_eq!(ours[d][n ^ (n >> 1)] as f64 / 2f64.powi(64), point[d], "point {n}, dimension {d}");
        }
    }
}

/// Whether the points are a (0, k, 1)-net: one in each interval of length 2^-k.
fn fills_every_interval(points: &[u64]) -> bool {
    let k = points.len().ilog2();
    points.iter().map(|x| x >> (64 - k)).collect::<HashSet<_>>().len() == points.len()
}

#[test]
fn every_coordinate_fills_every_interval_once() {
    for replicate in 0..4 {
        for (d, x) in points(&scrambled(1, replicate, MOST_DIMENSIONS, 12)).iter().enumerate() {
            // Any aligned run of 2^k points is a net of its own.
            for run in [1 << 12, 1 << 10, 1 << 8, 1 << 5, 2] {
                for part in x.chunks(run) {
                    assert!(fills_every_interval(part), "replicate {replicate}, dimension {d}, {run} points");
                }
            }
        }
    }
}

/// Smallest t for which the points are a (t, m, 2)-net: every box of 2^-a by 2^-b with a + b = m - t holds 2^t.
fn quality(x: &[u64], y: &[u64]) -> u32 {
    let m = x.len().ilog2();
    let balanced = |t: u32| {
        (0..=m - t).all(|a| {
            let b = m - t - a;
            let mut boxes = vec![0u32; 1 << (m - t)];
            for (x, y) in x.iter().zip(y) {
                let (row, column) = (x.checked_shr(64 - a).unwrap_or(0), y.checked_shr(64 - b).unwrap_or(0));
                boxes[(row << b | column) as usize] += 1;
            }
            boxes.iter().all(|&n| n == 1 << t)
        })
    };
    (0..=m).find(|&t| balanced(t)).unwrap()
}

/// The first two dimensions of Sobol's sequence are a (0, m, 2)-net (Sobol' 1967); scrambling keeps t in all others.
#[test]
fn scrambling_keeps_the_quality_of_pairs() {
    let plain = points(&Net::unscrambled(Directions::joe_kuo(), 24, 10).unwrap());
    let nets: Vec<_> = (0..3).map(|r| points(&scrambled(2, r, 24, 10))).collect();
    assert_eq!(quality(&plain[0], &plain[1]), 0);
    let mut worst = 0;
    for i in 0..24 {
        for j in 0..i {
            let t = quality(&plain[j], &plain[i]);
            worst = worst.max(t);
            for net in &nets {
                assert_eq!(quality(&net[j], &net[i]), t, "dimensions {j} and {i}");
            }
        }
    }
    // The check can tell pairs apart.
    assert!(worst > 0);
}

/// What `quality` and the next test stand on: matrices that are no net in two dimensions are seen to be none.
#[test]
fn repeated_matrix_spoils_the_pair_and_no_single_coordinate() {
    let columns = Directions::joe_kuo().columns()[0];
    let net = Net::over(&Directions::from_columns(vec![columns; 2]), &key(3), 0, 2, 10).unwrap();
    let wrong = points(&net);
    assert!(fills_every_interval(&wrong[0]) && fills_every_interval(&wrong[1]));
    assert!(quality(&wrong[0], &wrong[1]) >= 9, "t = {}", quality(&wrong[0], &wrong[1]));
}

/// The quality of a pair tells of a single wrong direction number: m_2 of dimension 2 is 3, the only other odd number
/// below 4 is 1.
#[test]
fn one_wrong_direction_number_is_seen() {
    let mut columns = Directions::joe_kuo().columns()[..2].to_vec();
    columns[1][1] = 1 << 62;
    let wrong = points(&Net::over(&Directions::from_columns(columns), &key(3), 0, 2, 10).unwrap());
    assert!(quality(&wrong[0], &wrong[1]) > 0);
}

#[test]
fn larger_net_starts_with_the_smaller_ones_points() {
    let largest = scrambled(4, 7, 6, MOST_LOG2);
    for log2 in [8, 9, 13, 30] {
        let small = scrambled(4, 7, 6, log2);
        for index in [0, 1, 2, 31, small.blocks() / 2, small.blocks() - 1] {
            if index < small.blocks() {
                assert_eq!(block(&small, index), block(&largest, index), "2^{log2} points, block {index}");
            }
        }
    }
    // One block at least.
    assert_eq!(block(&scrambled(4, 7, 6, 0), 0), block(&largest, 0));
}

#[test]
fn fewer_dimensions_are_the_first_ones() {
    let (few, many) = (scrambled(5, 0, 2, 9), scrambled(5, 0, 5, 9));
    assert_eq!(block(&few, 1), block(&many, 1)[..2 * BLOCK]);
}

#[test]
fn replicates_keys_and_dimensions_differ() {
    let mut firsts = HashSet::new();
    for seed in 0..4 {
        for replicate in 0..32 {
            for x in points(&scrambled(seed, replicate, 8, 8)) {
                firsts.insert(x);
            }
        }
    }
    assert_eq!(firsts.len(), 4 * 32 * 8);
    assert_eq!(points(&scrambled(0, 3, 2, 8)), points(&scrambled(0, 3, 2, 8)));
}

const REPLICATES: u64 = 20_000;

/// Largest deviation of the empirical distribution from the uniform one times sqrt(n).
fn kolmogorov(mut sample: Vec<f64>) -> f64 {
    sample.sort_by(f64::total_cmp);
    let n = sample.len() as f64;
    let deviation = |(i, &u): (usize, &f64)| (u - i as f64 / n).max((i + 1) as f64 / n - u);
    sample.iter().enumerate().map(deviation).fold(0.0, f64::max) * n.sqrt()
}

/// Over replicates, every single point is uniform in the square, and any two points are independent but for the net
/// that they share.
#[test]
fn every_single_point_is_uniform_over_replicates() {
    // P(K > 3.0) = 2 exp(-2 * 3.0^2) = 3.0e-8 (Kolmogorov's law); 24 tests: false alarm 7e-7.
    const LIMIT: f64 = 3.0;
    // Chi-square of 64 cells, 63 degrees of freedom: P(X > 145) = 2.0e-8; 12 tests: false alarm 2e-7
    // (scipy.stats.chi2.sf, SciPy 1.17.1).
    const CHI_SQUARE: f64 = 145.0;
    let net_points = [0, 1, 2, 100, 255, 256, 257, 300, 511, 512, 800, 1023];
    let mut samples = vec![vec![[0u64; 2]; 0]; net_points.len()];
    for replicate in 0..REPLICATES {
        let all = points(&scrambled(6, replicate, 2, 10));
        for (sample, &i) in samples.iter_mut().zip(&net_points) {
            sample.push([all[0][i], all[1][i]]);
        }
    }
    for (sample, i) in samples.iter().zip(net_points) {
        for d in 0..2 {
            let k = kolmogorov(sample.iter().map(|x| x[d] as f64 / 2f64.powi(64)).collect());
            assert!(k < LIMIT, "point {i}, dimension {d}: {k}");
        }
        let mut cells = [0.0; 64];
        for x in sample {
            cells[(x[0] >> 61 << 3 | x[1] >> 61) as usize] += 1.0;
        }
        let expected = REPLICATES as f64 / 64.0;
        let chi_square: f64 = cells.iter().map(|n: &f64| (n - expected).powi(2) / expected).sum();
        assert!(chi_square < CHI_SQUARE, "point {i}: {chi_square}");
    }
}

/// |t| with 199 degrees of freedom above 5.6: 7.1e-8 (`scipy.stats.t.sf`, SciPy 1.17.1).
const LIMIT: f64 = 5.6;
const NETS: u64 = 200;

/// Estimates E[exp(a'z)] = exp(a'a / 2), z ~ N(0, I), a = (0.5, -0.3, 0.2), by nets of 2^12 points over `directions`:
/// the bias in standard errors, and the standard error of one net over that of as many independent points,
/// Var exp(a'z) = exp(a'a) (exp(a'a) - 1).
fn lognormal(directions: &Directions) -> (f64, f64) {
    let a = [0.5, -0.3, 0.2];
    let exact = (a.iter().map(|a| a * a).sum::<f64>() / 2.0).exp();
    let estimate = |replicate| {
        let net = Net::over(directions, &key(8), replicate, 3, 12).unwrap();
        let mut z = vec![0.0; 3 * BLOCK];
        let mut sum = 0.0;
        for index in 0..net.blocks() {
            net.normals(index, &mut z);
            for i in 0..BLOCK {
                sum += (0..3).map(|d| a[d] * z[d * BLOCK + i]).sum::<f64>().exp();
            }
        }
        sum / 4096.0
    };
    let estimates: Vec<f64> = (0..NETS).map(estimate).collect();
    let mean = estimates.iter().sum::<f64>() / NETS as f64;
    let variance = estimates.iter().map(|e| (e - mean).powi(2)).sum::<f64>() / (NETS - 1) as f64;
    let plain = exact * exact * (exact * exact - 1.0) / 4096.0;
    ((mean - exact) / (variance / NETS as f64).sqrt(), (variance / plain).sqrt())
}

/// A gain of 20 at 2^12 points is what any net of this quality must give a smooth function; the standard error is
/// itself known to 5 %.
#[test]
fn smooth_mean_is_unbiased_and_far_more_precise_than_by_independent_points() {
    let (t, gain) = lognormal(Directions::joe_kuo());
    assert!(t.abs() < LIMIT, "t = {t}");
    assert!(gain < 1.0 / 20.0, "{gain}");
}

/// Whatever the matrices, the shift makes each point uniform: a wrong one costs precision, which the spread of the
/// replicates shows, and no bias.
#[test]
fn wrong_matrices_cost_precision_and_no_bias() {
    let columns = Directions::joe_kuo().columns()[0];
    let (t, gain) = lognormal(&Directions::from_columns(vec![columns; 3]));
    assert!(t.abs() < LIMIT, "t = {t}");
    assert!(gain > 1.0 / 10.0, "{gain}");
}

#[test]
fn normals_of_a_block_are_the_normals_of_its_integers() {
    let net = scrambled(9, 1, 4, 16);
    let mut z = vec![0.0; 4 * BLOCK];
    for index in 0..net.blocks() {
        net.normals(index, &mut z);
        for (z, bits) in z.iter().zip(block(&net, index)) {
            assert_eq!(z.to_bits(), normal(bits).to_bits());
        }
    }
}

#[test]
fn too_many_dimensions_or_points_are_refused() {
    let refused = Net::new(&key(0), 0, MOST_DIMENSIONS + 1, 10).unwrap_err();
    assert_eq!(refused, NetError::TooManyDimensions { asked: MOST_DIMENSIONS + 1, most: 128 });
    assert_eq!(refused.to_string(), "a net in 129 dimensions is asked for, there are direction numbers for 128");
    assert_eq!(Net::new(&key(0), 0, 2, 54).unwrap_err(), NetError::TooManyPoints { log2: 54 });
    let none = scrambled(0, 0, 0, 10);
    none.block(3, &mut []);
}
