//! Nanoseconds a uniform and a normal, one thread.
//!
//! The code is compiled for the vector unit of the build: `RUSTFLAGS="-C target-feature=+avx2" cargo bench --bench net`
//! shows another one.

use std::hint::black_box;

use criterion::{Criterion, Throughput, criterion_group, criterion_main};
use gaussworthy::net::{BLOCK, Net, normal, normals};
use gaussworthy::reference::Key;
use rand::{RngExt, SeedableRng};
use rand_distr::StandardNormal;
use rand_pcg::Pcg64Dxsm;

const DIMENSIONS: usize = 4;

fn values(criterion: &mut Criterion) {
    let net = Net::new(&Key::new(1, "bench"), 0, DIMENSIONS, 20).unwrap();
    let mut bits = vec![0; DIMENSIONS * BLOCK];
    let mut z = vec![0.0; DIMENSIONS * BLOCK];
    let mut next = (0..net.blocks()).cycle();
    let mut group = criterion.benchmark_group("net values");
    group.throughput(Throughput::Elements((DIMENSIONS * BLOCK) as u64));
    group.bench_function("uniforms", |b| b.iter(|| net.block(next.next().unwrap(), black_box(&mut bits))));
    group.bench_function("normals", |b| b.iter(|| net.normals(next.next().unwrap(), black_box(&mut z))));
    group.bench_function("normals, quantile alone", |b| {
        b.iter(|| {
            let (bits, _) = black_box(&bits).as_chunks();
            for (bits, z) in bits.iter().zip(z.as_chunks_mut().0) {
                normals(bits, z);
            }
            black_box(&mut z);
        });
    });
    group.bench_function("normals one by one", |b| {
        b.iter(|| {
            for (z, &bits) in z.iter_mut().zip(black_box(&bits)) {
                *z = normal(bits);
            }
            black_box(&mut z);
        });
    });
    let mut rng = Pcg64Dxsm::seed_from_u64(1);
    group.bench_function("normals by PCG and ziggurat", |b| {
        b.iter(|| {
            for z in &mut z {
                *z = rng.sample(StandardNormal);
            }
            black_box(&mut z);
        });
    });
}

fn layout(criterion: &mut Criterion) {
    let key = Key::new(1, "bench");
    let mut replicates = 0..;
    let mut group = criterion.benchmark_group("net layout");
    group.throughput(Throughput::Elements(DIMENSIONS as u64));
    for log2 in [13, 20, 40] {
        group.bench_function(format!("a dimension of 2^{log2} points"), |b| {
            b.iter(|| Net::new(&key, replicates.next().unwrap(), DIMENSIONS, black_box(log2)).unwrap());
        });
    }
}

criterion_group!(benches, values, layout);
criterion_main!(benches);
