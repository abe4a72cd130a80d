//! Times the stages before the replicates: affinity, diffusion map, components. Data are made outside
//! the timer from a fixed seed.

#![allow(missing_docs)] // Criterion's macros make functions of their own.

use std::hint::black_box;

use criterion::{criterion_group, criterion_main, BenchmarkId, Criterion};
use kinmark::affinity::{Likeness, Profiles};
use kinmark::domain::Share;
use kinmark::embed::{components, diffusion_map, DiffusionTime};
use ndarray::Array2;
use rand::{Rng, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

/// Directed strengths that fall off along a line, with noise.
fn strengths(parcels: usize) -> Array2<f64> {
    let mut rng = Xoshiro256PlusPlus::seed_from_u64(11);
    Array2::from_shape_fn((parcels, parcels), |(i, j)| {
        if i == j {
            return 0.0;
        }
        let gap = (i as f64 - j as f64).abs() / parcels as f64;
        (-5.0 * gap).exp() * rng.gen_range(0.5..1.5)
    })
}

fn stages(c: &mut Criterion) {
    let mut group = c.benchmark_group("stages");
    group.sample_size(10);
    for parcels in [100, 400, 1000] {
        let strengths = strengths(parcels);
        let profiles = Profiles::new(strengths.view(), Share::ALL);
        let affinity = profiles.affinity(Likeness::Cosine);
        let matrix = profiles.matrix();
        group.bench_function(BenchmarkId::new("affinity", parcels), |b| {
            b.iter(|| black_box(profiles.affinity(Likeness::Cosine)));
        });
        group.bench_function(BenchmarkId::new("diffusion map, 10 axes", parcels), |b| {
            b.iter(|| {
                let map = diffusion_map(affinity.clone(), 0.5, DiffusionTime::Steps(1.0), 10);
                black_box(map)
            });
        });
        group.bench_function(BenchmarkId::new("components, 10 axes", parcels), |b| {
            b.iter(|| black_box(components(&matrix, 10)));
        });
    }
    group.finish();
}

criterion_group!(benches, stages);
criterion_main!(benches);
