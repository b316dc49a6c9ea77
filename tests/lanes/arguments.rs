//! Arguments to try: edges, grids, random sizes and random bits.

use rand::{Rng, RngExt, SeedableRng};
use rand_pcg::Pcg64;

use crate::functions::Function;

/// Blocks of eight of each kind; a build without optimisation tries fewer.
const BLOCKS: usize = if cfg!(debug_assertions) { 300 } else { 60_000 };

/// Values at which something changes, with their neighbours, of both signs.
pub fn edges() -> Vec<f64> {
    let mut edges = vec![0.0, f64::NAN, f64::INFINITY, f64::MAX, f64::MIN_POSITIVE, 5e-324, 1e-310, 1e-300, 1e300];
    edges.extend([0.25, 0.5, 1.0, 1.5, 2.0, 3.0, 4.0, 5.0, 7.0, 10.0, 22.0, 100.0, 1000.0, 1e5, 1e20, 1e22]);
    edges.extend([0.414_213_562_373_095_03, std::f64::consts::SQRT_2, std::f64::consts::FRAC_1_SQRT_2]);
    edges.extend([709.782_712_893_384, 708.396_418_532_264_1, 744.440_071_921_381_2, 745.133_219_101_941_2]);
    edges.extend((-60..=60).map(|k| f64::powi(2.0, 17 * k)));
    edges.extend([31, 51, 52, 53, 54, 63, 64].map(|k| f64::powi(2.0, k)));
    edges.extend((1..40).map(|k| f64::from(k) * std::f64::consts::FRAC_PI_4));
    edges.extend((17..1000).step_by(61).map(|k| f64::powi(2.0, k) * std::f64::consts::FRAC_PI_2));
    edges.extend([823_549.0, 823_550.0, 1_048_576.0 * std::f64::consts::FRAC_PI_2]);
    let neighbours: Vec<f64> =
        edges.iter().filter(|v| v.is_finite()).flat_map(|v| [v.next_up(), v.next_down()]).collect();
    edges.extend(neighbours);
    edges.iter().flat_map(|v| [*v, -*v]).collect()
}

/// Every pair of edges for two arguments.
pub fn edge_blocks(two: bool) -> (Vec<[f64; 8]>, Vec<[f64; 8]>) {
    let edges = edges();
    if !two {
        return (blocks(&edges), vec![[0.0; 8]; edges.len().div_ceil(8)]);
    }
    let pairs = || edges.iter().flat_map(|x| edges.iter().map(move |y| (*x, *y)));
    let (x, y): (Vec<f64>, Vec<f64>) = pairs().unzip();
    (blocks(&x), blocks(&y))
}

/// A grid with its own rounding, and random arguments: uniform, of random size, of random bits.
pub fn many<F: Function>() -> (Vec<[f64; 8]>, Vec<[f64; 8]>) {
    let mut random = Pcg64::seed_from_u64(20_260_307);
    let (low, high) = F::GRID;
    let count = 8 * BLOCKS;
    let mut x = Vec::with_capacity(4 * count);
    let mut y = Vec::with_capacity(4 * count);
    for i in 0..count {
        x.push(low + (high - low) * i as f64 / count as f64);
        y.push(random.random_range(low..high));
    }
    for _ in 0..count {
        x.push(random.random_range(low..high));
        y.push(random.random_range(low..high));
    }
    for _ in 0..count {
        x.push(of_random_size(&mut random, 40.0));
        y.push(of_random_size(&mut random, 40.0));
    }
    for _ in 0..count {
        x.push(of_random_bits(&mut random));
        y.push(of_random_bits(&mut random));
    }
    (blocks(&x), blocks(&y))
}

fn of_random_bits(random: &mut Pcg64) -> f64 {
    let value = f64::from_bits(random.next_u64());
    // The one quiet NaN: of a signalling one the C library's power with exponent 0 is NaN instead of 1.
    if value.is_nan() { f64::NAN } else { value }
}

fn of_random_size(random: &mut Pcg64, powers: f64) -> f64 {
    let size = random.random_range(-powers..powers).exp2();
    if random.next_u64() & 1 == 0 { size } else { -size }
}

fn blocks(values: &[f64]) -> Vec<[f64; 8]> {
    values
        .chunks(8)
        .map(|chunk| {
            let mut block = [chunk[0]; 8];
            block[..chunk.len()].copy_from_slice(chunk);
            block
        })
        .collect()
}
