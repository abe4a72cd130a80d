//! Studies with a planted answer, made in memory and written where the program can read them.

#![allow(dead_code)] // Each test program uses its own part.

pub mod trials;
pub mod world;

use std::fmt::Write as _;
use std::path::{Path, PathBuf};

use ndarray::Array2;
use rand::seq::SliceRandom;
use rand::{Rng, SeedableRng};
use rand_distr::{Distribution, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;

/// What a planted pair of species looks like.
#[derive(Debug, Clone, Copy)]
pub struct Plan {
    /// Parcels of each species; parcel i of a corresponds to parcel i of b.
    pub parcels: usize,
    /// Landmarks, drawn at random.
    pub landmarks: usize,
    /// How far corresponding parcels drift apart in the latent space of unit spread.
    pub drift: f64,
    /// Standard deviation of the noise on log weights.
    pub noise: f64,
    /// Whether the two species have anything to do with each other.
    pub related: bool,
}

/// Dimensions of the latent space.
const DIMENSIONS: usize = 4;
/// How fast weights fall off with latent distance.
const FALL_OFF: f64 = 1.5;

/// Two matrices and a landmark table.
pub struct Planted {
    /// Weights of a and of b.
    pub weights: [Array2<f64>; 2],
    /// Landmark pairs (parcel of a, parcel of b).
    pub landmarks: Vec<(usize, usize)>,
}

impl Plan {
    /// Draws a study.
    pub fn draw(&self, seed: u64) -> Planted {
        let mut rng = Xoshiro256PlusPlus::seed_from_u64(seed);
        let n = self.parcels;
        let normal = |rng: &mut Xoshiro256PlusPlus| -> f64 { StandardNormal.sample(rng) };
        let ancestor = Array2::from_shape_fn((n, DIMENSIONS), |_| normal(&mut rng));
        let weights = [0, 1].map(|_| {
            let points = Array2::from_shape_fn((n, DIMENSIONS), |at| {
                let own = normal(&mut rng);
                if self.related {
                    ancestor[at] + self.drift * own
                } else {
                    own
                }
            });
            Array2::from_shape_fn((n, n), |(i, j)| {
                if i == j {
                    return 0.0;
                }
                let gap = (&points.row(i) - &points.row(j))
                    .mapv(|x| x * x)
                    .sum()
                    .sqrt();
                1000.0 * (self.noise * normal(&mut rng) - FALL_OFF * gap).exp()
            })
        });
        let mut all: Vec<usize> = (0..n).collect();
        all.shuffle(&mut rng);
        let landmarks = all[..self.landmarks].iter().map(|&i| (i, i)).collect();
        Planted { weights, landmarks }
    }
}

impl Planted {
    /// Writes the study and returns its study file. Labels of b sort in another order than those of
    /// a, so that no answer hides in the order of labels.
    pub fn write(&self, folder: &Path) -> PathBuf {
        for (side, weights) in ["a", "b"].iter().zip(&self.weights) {
            let n = weights.nrows();
            let mut text = String::from("parcel");
            for i in 0..n {
                write!(text, ",{}", label(side, i)).unwrap();
            }
            for (i, row) in weights.rows().into_iter().enumerate() {
                write!(text, "\n{}", label(side, i)).unwrap();
                for w in row {
                    write!(text, ",{w}").unwrap();
                }
            }
            std::fs::write(folder.join(format!("{side}.csv")), text + "\n").unwrap();
        }
        let mut table = String::from("landmark,a,b\n");
        for (k, (i, j)) in self.landmarks.iter().enumerate() {
            writeln!(table, "L{k},{},{}", label("a", *i), label("b", *j)).unwrap();
        }
        std::fs::write(folder.join("landmarks.csv"), table).unwrap();
        let study = folder.join("study.toml");
        std::fs::write(
            &study,
            "title = \"Planted\"\nlandmarks = \"landmarks.csv\"\n\
             [species.a]\nname = \"A\"\nmatrix = \"a.csv\"\nweights = \"counts\"\ntransform = \"log1p\"\n\
             [species.b]\nname = \"B\"\nmatrix = \"b.csv\"\nweights = \"counts\"\ntransform = \"log1p\"\n",
        )
        .unwrap();
        study
    }
}

/// Label of parcel i; an order-scrambling multiplication keeps labels of both sides out of step.
pub fn label(side: &str, i: usize) -> String {
    let shown = if side == "a" {
        i
    } else {
        (i * 7919 + 13) % 10007
    };
    format!("{side}{shown:05}")
}

/// A generator for tests that need more draws of their own.
pub fn rng(seed: u64) -> impl Rng {
    Xoshiro256PlusPlus::seed_from_u64(seed)
}
