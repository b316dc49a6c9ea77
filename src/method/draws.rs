use rand::{Rng, SeedableRng};
use rand_pcg::Pcg64Dxsm;
use sha2::{Digest, Sha256};

use crate::net::{Scrambles, normal};

/// Where the random numbers of a method come from: its name, its seed and the number of components, nothing else. The same
/// plan made twice draws the same points.
#[derive(Debug, Clone)]
pub(super) struct Seeded {
    hash: Sha256,
}

impl Seeded {
    /// For the method `id` on `a` components.
    pub fn new(id: &str, seed: usize, a: usize) -> Self {
        let mut hash = Sha256::new();
        hash.update(b"gaussworthy method\0");
        hash.update(id.as_bytes());
        hash.update((seed as u64).to_le_bytes());
        hash.update((a as u64).to_le_bytes());
        Self { hash }
    }

    /// The numbers of part `part`.
    pub fn part(&self, part: u64) -> Draws {
        Draws(self.stream(0, part))
    }

    fn stream(&self, replicate: u64, part: u64) -> Pcg64Dxsm {
        let mut hash = self.hash.clone();
        hash.update(replicate.to_le_bytes());
        hash.update(part.to_le_bytes());
        Pcg64Dxsm::from_seed(hash.finalize().into())
    }
}

impl Scrambles for Seeded {
    fn scramble(&self, replicate: u64, dimension: u64) -> impl Rng {
        self.stream(replicate, dimension)
    }
}

/// A stream of random numbers, the same bits on every machine.
#[derive(Debug)]
pub(super) struct Draws(Pcg64Dxsm);

impl Draws {
    /// A standard normal number.
    pub fn normal(&mut self) -> f64 {
        normal(self.0.next_u64())
    }

    /// A sum of `k` squared standard normal numbers.
    pub fn chi_squared(&mut self, k: usize) -> f64 {
        (0..k).map(|_| self.normal().powi(2)).sum()
    }

    /// A random orthogonal matrix (a rows), uniform on all of them: the columns of a matrix of standard normal numbers,
    /// orthonormalised in turn, each twice against rounding.
    ///
    /// Source: G. W. Stewart, "The efficient generation of random orthogonal matrices with an application to condition
    /// estimators", SIAM J. Numerical Analysis 17 (1980) 403-409, for the law; Gram-Schmidt is standard.
    pub fn orthogonal(&mut self, a: usize) -> nalgebra::DMatrix<f64> {
        let mut q = nalgebra::DMatrix::from_fn(a, a, |_, _| self.normal());
        for j in 0..a {
            for _ in 0..2 {
                for k in 0..j {
                    let along = q.column(k).dot(&q.column(j));
                    for i in 0..a {
                        q[(i, j)] -= along * q[(i, k)];
                    }
                }
            }
            let length = q.column(j).dot(&q.column(j)).sqrt();
            for i in 0..a {
                q[(i, j)] /= length;
            }
        }
        q
    }
}
