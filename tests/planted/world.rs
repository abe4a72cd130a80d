//! Species in which some parcels are displaced, have no counterpart, or are named as landmarks wrongly.

use ndarray::Array2;
use rand::seq::SliceRandom;
use rand_distr::{Distribution, StandardNormal};

use super::{rng, Planted, DIMENSIONS, FALL_OFF};

/// What a pair of species looks like. Displaced parcels lie in b away from where they lie in a, by so many
/// units; parcels without counterpart lie in b where they happen to.
#[derive(Debug, Clone, Copy)]
pub struct World {
    /// Parcels of each species; parcel i of a is called parcel i of b.
    pub parcels: usize,
    /// Landmarks, drawn at random.
    pub landmarks: usize,
    /// How many of them are paired with a parcel that is not their counterpart.
    pub wrong: usize,
    /// Drift of corresponding parcels in the latent space of unit spread.
    pub drift: f64,
    /// Standard deviation of the noise on log weights.
    pub noise: f64,
    /// One unit of displacement in the latent space.
    pub unit: f64,
}

/// Parcels of each sort.
pub const EACH: usize = 4;

/// A pair of species and which of its parcels are what.
pub struct Drawn {
    /// Matrices and landmarks.
    pub planted: Planted,
    /// Parcels that correspond.
    pub plain: Vec<usize>,
    /// Parcels that are displaced by one unit and by two.
    pub displaced: [Vec<usize>; 2],
    /// Parcels without counterpart.
    pub lone: Vec<usize>,
}

impl World {
    /// Root mean square distance of two points of the latent space.
    pub fn random_distance() -> f64 {
        (2.0 * DIMENSIONS as f64).sqrt()
    }

    /// Draws a pair.
    pub fn draw(&self, seed: u64) -> Drawn {
        let n = self.parcels;
        let mut order: Vec<usize> = (0..n).collect();
        order.shuffle(&mut rng(seed));
        let mut rest = order.split_off(self.landmarks);
        let mut take = || rest.split_off(rest.len() - EACH);
        let (displaced, lone) = ([take(), take()], take());
        let mut chance = rng(seed ^ 0x5eed);
        let mut normal = || -> f64 { StandardNormal.sample(&mut chance) };
        let mut points = || Array2::from_shape_fn((n, DIMENSIONS), |_| normal());
        let ancestor = points();
        let a = &ancestor + &(points() * self.drift);
        let mut b = &ancestor + &(points() * self.drift);
        let (directions, anywhere) = (points(), points());
        for (units, parcels) in displaced.iter().enumerate() {
            for &parcel in parcels {
                let direction = directions.row(parcel);
                let length = direction.dot(&direction).sqrt();
                let shift = &direction * ((units + 1) as f64 * self.unit / length);
                let mut point = b.row_mut(parcel);
                point += &shift;
            }
        }
        for &parcel in &lone {
            b.row_mut(parcel).assign(&anywhere.row(parcel));
        }
        let mut landmarks: Vec<(usize, usize)> = order.iter().map(|&i| (i, i)).collect();
        for landmark in landmarks.iter_mut().take(self.wrong) {
            landmark.1 = rest.pop().expect("parcels enough");
        }
        let weights = [a, b].map(|points| {
            Array2::from_shape_fn((n, n), |(i, j)| {
                let gap = &points.row(i) - &points.row(j);
                match i == j {
                    true => 0.0,
                    false => {
                        let fall = FALL_OFF * gap.dot(&gap).sqrt();
                        1000.0 * (self.noise * normal() - fall).exp()
                    }
                }
            })
        });
        Drawn {
            planted: Planted { weights, landmarks },
            plain: rest,
            displaced,
            lone,
        }
    }
}
