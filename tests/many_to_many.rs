//! One parcel of a species that answers to three of the other, planted: they must be found although a
//! plan with equal masses can send no parcel's mass to three. No source outside the project but the
//! construction itself.

mod planted;

use std::fmt::Write as _;
use std::path::Path;

use kinmark::domain::{Pair, Side};
use kinmark::locate::{locate, Located};
use kinmark::prepare::{prepare, Study};
use kinmark::settings::Request;
use kinmark::watch::Unwatched;
use ndarray::Array2;
use planted::{label, Plan};
use rand_distr::{Distribution, StandardNormal};

/// Regions that both species have, of which some are landmarks.
const REGIONS: usize = 60;
const LANDMARKS: usize = 12;
/// Parts of a region that one species' map divides.
const PARTS: usize = 3;
/// Standard deviation of the noise on the logarithm of each connection of a part.
const NOISE: f64 = 0.25;
/// Standard deviation of the logarithm of the share of the region's connections that a part takes.
const UNEQUAL: f64 = 0.3;

/// A pair of species in which region `split` is one parcel of a and three of b, region `merged` three of
/// a and one of b, neither a landmark.
struct Divided {
    weights: [Array2<f64>; 2],
    /// Region of each parcel.
    regions: [Vec<usize>; 2],
    landmarks: Vec<usize>,
    split: usize,
    merged: usize,
}

/// Every part takes a share of each of its region's connections, sent and received, with noise of its own;
/// between the parts of one region connections are those of the region with itself, which are the
/// strongest there are, shared out likewise.
fn divided(seed: u64) -> Divided {
    let whole = Plan {
        parcels: REGIONS,
        landmarks: LANDMARKS + 2,
        drift: 0.1,
        noise: 0.25,
        related: true,
    }
    .draw(seed);
    let chosen: Vec<usize> = whole.landmarks.iter().map(|(a, _)| *a).collect();
    let (landmarks, lone) = chosen.split_at(LANDMARKS);
    let (split, merged) = (lone[0], lone[1]);
    let mut rng = planted::rng(seed + 1_000);
    let mut regions = [Vec::new(), Vec::new()];
    let mut weights = Vec::new();
    for (side, cut) in [merged, split].into_iter().enumerate() {
        let of: Vec<usize> = (0..REGIONS)
            .flat_map(|region| vec![region; if region == cut { PARTS } else { 1 }])
            .collect();
        let mut normal = || -> f64 { StandardNormal.sample(&mut rng) };
        let mut shares: Vec<f64> = of
            .iter()
            .map(|&region| match region == cut {
                true => (UNEQUAL * normal()).exp(),
                false => 1.0,
            })
            .collect();
        let parts = || (0..of.len()).filter(|&i| of[i] == cut);
        let sum: f64 = parts().map(|i| shares[i]).sum();
        parts()
            .collect::<Vec<_>>()
            .into_iter()
            .for_each(|i| shares[i] /= sum);
        weights.push(Array2::from_shape_fn((of.len(), of.len()), |(i, j)| {
            if i == j {
                return 0.0;
            }
            let whole = match of[i] == of[j] {
                true => 1000.0 * (0.25 * normal()).exp(),
                false => whole.weights[side][(of[i], of[j])],
            };
            let noise = match of[i] == cut || of[j] == cut {
                true => (NOISE * normal()).exp(),
                false => 1.0,
            };
            whole * shares[i] * shares[j] * noise
        }));
        regions[side] = of;
    }
    let [a, b] = <[Array2<f64>; 2]>::try_from(weights).expect("two species");
    Divided {
        weights: [a, b],
        regions,
        landmarks: landmarks.to_vec(),
        split,
        merged,
    }
}

impl Divided {
    fn study(&self, folder: &Path, settings: &[(&str, &str)]) -> Study {
        for (side, weights) in ["a", "b"].into_iter().zip(&self.weights) {
            let mut text = String::from("parcel");
            for i in 0..weights.nrows() {
                write!(text, ",{}", label(side, i)).unwrap();
            }
            for (i, row) in weights.rows().into_iter().enumerate() {
                write!(text, "\n{}", label(side, i)).unwrap();
                row.iter().for_each(|w| write!(text, ",{w}").unwrap());
            }
            std::fs::write(folder.join(format!("{side}.csv")), text + "\n").unwrap();
        }
        let mut table = String::from("landmark,a,b\n");
        for (k, &region) in self.landmarks.iter().enumerate() {
            let [a, b] = [0, 1].map(|side| {
                let at = self.regions[side].iter().position(|&r| r == region);
                label(["a", "b"][side], at.unwrap())
            });
            writeln!(table, "L{k},{a},{b}").unwrap();
        }
        std::fs::write(folder.join("landmarks.csv"), table).unwrap();
        let species = |side: &str, name: &str| {
            format!("[species.{side}]\nname = \"{name}\"\nmatrix = \"{side}.csv\"\nweights = \"counts\"\n")
        };
        let path = folder.join("study.toml");
        let text = format!(
            "title = \"Divided\"\nlandmarks = \"landmarks.csv\"\n{}{}",
            species("a", "A"),
            species("b", "B")
        );
        std::fs::write(&path, text).unwrap();
        let mut asked = Request::default();
        for (key, value) in [("replicates", "2"), ("top", "all")].iter().chain(settings) {
            asked.set(key, value).unwrap();
        }
        prepare(&path, asked).unwrap()
    }

    /// Labels of a region's parcels.
    fn parcels(&self, side: usize, region: usize) -> Vec<String> {
        let of = &self.regions[side];
        let parts = (0..of.len()).filter(|&i| of[i] == region);
        parts.map(|i| label(["a", "b"][side], i)).collect()
    }
}

/// Rank of one parcel among the candidates of another.
fn rank(study: &Study, found: &Located, from: Side, parcel: &str, candidate: &str) -> usize {
    let labels = study.species.as_ref().map(|s| s.parcels.labels());
    let placement = found.placements[from]
        .iter()
        .find(|p| labels[from][p.parcel] == parcel)
        .expect("the parcel is open");
    let candidate = placement
        .counterparts
        .iter()
        .find(|c| labels[from.opposite()][c.parcel] == candidate);
    candidate.expect("all are listed").rank
}

/// What came of the divided regions over several studies.
#[derive(Default)]
struct Score {
    /// Of the three parts seen from the whole, how many are among the first three and five.
    within: Pair<Vec<f64>>,
    /// Of the three parts, how many have the whole first.
    whole_first: Vec<f64>,
}

fn mean(values: &[f64]) -> f64 {
    values.iter().sum::<f64>() / values.len() as f64
}

fn score(seeds: std::ops::Range<u64>, settings: &[(&str, &str)]) -> Score {
    let mut all = Score::default();
    for seed in seeds {
        let planted = divided(seed);
        let folder = tempfile::tempdir().unwrap();
        let study = planted.study(folder.path(), settings);
        let found = locate(&study, &Unwatched).unwrap();
        for (whole_side, region) in [(Side::A, planted.split), (Side::B, planted.merged)] {
            let at = |side: Side| usize::from(side == Side::B);
            let whole = &planted.parcels(at(whole_side), region)[0];
            let parts = planted.parcels(at(whole_side.opposite()), region);
            assert_eq!(parts.len(), PARTS);
            let share = |holds: &dyn Fn(&String) -> bool| {
                parts.iter().filter(|part| holds(part)).count() as f64 / PARTS as f64
            };
            let from_whole = |part: &String| rank(&study, &found, whole_side, whole, part);
            all.within.a.push(share(&|part| from_whole(part) <= 3));
            all.within.b.push(share(&|part| from_whole(part) <= 5));
            all.whole_first.push(share(&|part| {
                rank(&study, &found, whole_side.opposite(), part, whole) == 1
            }));
        }
    }
    all
}

/// Eight studies, a split and a merger in each, means over both. With equal masses three counterparts take
/// at least two thirds of the first three places and 90 % of them are among the first five of about fifty
/// candidates; at least half of the parts have the whole first. With free masses, where a parcel may
/// receive from three: 70 %, 95 % and 60 %. By the plan alone it is .40, .50 and .25 (twelve studies like
/// these).
#[test]
fn three_parts_of_one_parcel_are_found_either_way() {
    for (mass, in_three, in_five, whole_first) in
        [("uniform", 0.66, 0.9, 0.5), ("free", 0.7, 0.95, 0.6)]
    {
        let found = score(0..8, &[("mass", mass)]);
        let shares = [
            mean(&found.within.a),
            mean(&found.within.b),
            mean(&found.whole_first),
        ];
        assert!(shares[0] >= in_three, "{mass}: {shares:?}");
        assert!(shares[1] >= in_five, "{mass}: {shares:?}");
        assert!(shares[2] >= whole_first, "{mass}: {shares:?}");
    }
}
