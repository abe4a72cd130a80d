//! Times what a bootstrap replicate is made of: both alignments and one ranking. Data are made
//! outside the timer from a fixed seed.

#![allow(missing_docs)] // Criterion's macros make functions of their own.

use std::hint::black_box;

use criterion::{criterion_group, criterion_main, Criterion};
use kinmark::align::{self, Alignment, Params};
use kinmark::domain::Pair;
use kinmark::linalg::squared_distances;
use kinmark::place;
use kinmark::transport::{Fused, Marginals, Masses, Structure, Structures};
use ndarray::Array2;
use rand::{Rng, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;

const AXES: usize = 8;

fn cloud(points: usize, seed: u64) -> Array2<f64> {
    let mut rng = Xoshiro256PlusPlus::seed_from_u64(seed);
    Array2::from_shape_fn((points, AXES), |_| rng.gen_range(-1.0..1.0))
}

fn replicates(c: &mut Criterion) {
    let anchors = Pair {
        a: cloud(16, 1),
        b: cloud(16, 2),
    };
    let weights = vec![1.0; 16];
    for alignment in Alignment::BOTH {
        let params = Params {
            alignment,
            axes: AXES,
            ridge: 0.4,
            embedding: 0,
        };
        c.bench_function(&format!("{alignment}, 16 landmarks, 8 axes"), |b| {
            b.iter(|| black_box(align::fit(params, anchors.as_ref(), &weights)));
        });
    }
    let (a, b_by_axis) = (cloud(400, 3), cloud(360, 4).reversed_axes());
    let others: Vec<f64> = b_by_axis.iter().copied().collect();
    let norms: Vec<f64> = b_by_axis.columns().into_iter().map(|y| y.dot(&y)).collect();
    let mut out = Array2::zeros((400, 360));
    c.bench_function("distances and nearest, 400 x 360 x 8", |b| {
        b.iter(|| {
            for (mut row, point) in out.rows_mut().into_iter().zip(a.rows()) {
                let row = row.as_slice_mut().expect("standard layout");
                let point = point.as_slice().expect("standard layout");
                squared_distances(point, &others, &norms, row);
            }
            black_box(place::nearest(&out))
        });
    });
}

/// One fit of transport between two sparse networks of the size of a nervous system.
fn transport(c: &mut Criterion) {
    let (n, m) = (161, 180);
    let mut rng = Xoshiro256PlusPlus::seed_from_u64(4);
    let mut network = |n: usize| {
        let links = Array2::from_shape_fn((n, n), |(i, j)| {
            if i != j && rng.gen_bool(0.1) {
                rng.gen_range(0.0..3.0)
            } else {
                0.0
            }
        });
        Structure::new(links, None)
    };
    let structures = Structures::new(&network(n), &network(m));
    let cost = Array2::from_shape_fn((n, m), |_| rng.gen_range(0.0..2.0));
    let marginals = Marginals::Fixed(Masses::uniform(n, m));
    c.bench_function("fused transport, 161 x 180, 15 steps", |b| {
        b.iter(|| {
            let problem = Fused {
                structures: &structures,
                cost: &cost,
                fused: 0.4,
                marginals: &marginals,
                steps: 15,
                tolerance: 1e-6,
            };
            black_box(problem.solve())
        });
    });
}

criterion_group!(benches, replicates, transport);
criterion_main!(benches);
