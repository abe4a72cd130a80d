//! Verdicts on planted pairs, and how often each test errs.

use kinmark::domain::{Pair, Side};
use kinmark::linalg::median;
use kinmark::locate::locate;
use kinmark::prepare::{prepare, Study};
use kinmark::questions::{rule, Ground, Ruling, Verdict};
use kinmark::settings::Request;
use kinmark::watch::Unwatched;
use rand::Rng;

use super::world::{Drawn, World, EACH};
use super::{label, rng, Planted};

/// What a judged pair is in truth.
pub const TRUTHS: [&str; 5] = [
    "homologous",
    "displaced by 1",
    "displaced by 2",
    "no counterpart, best candidate",
    "unrelated",
];

/// Counts over judged pairs of one sort.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Count {
    /// Pairs.
    pub pairs: f64,
    /// Verdicts, in the order conserved, displaced, undetermined, cannot show.
    pub verdicts: [f64; 4],
    /// How often p of the test against homologous pairs is at most .05 and at most .1.
    pub further: [f64; 2],
    /// The same of the test against unrelated pairs.
    pub nearer: [f64; 2],
}

impl Count {
    fn add(&mut self, ruling: &Ruling) {
        let at = match ruling.verdict {
            Verdict::Conserved => 0,
            Verdict::Displaced => 1,
            Verdict::Undetermined => 2,
            Verdict::CannotShow => 3,
        };
        self.pairs += 1.0;
        self.verdicts[at] += 1.0;
        for (k, level) in [0.05, 0.1].into_iter().enumerate() {
            self.further[k] += f64::from(u8::from(ruling.further.p <= level + 1e-9));
            self.nearer[k] += f64::from(u8::from(ruling.nearer.p <= level + 1e-9));
        }
    }

    /// Adds other counts.
    pub fn plus(&mut self, other: &Count) {
        self.pairs += other.pairs;
        for (x, y) in self.verdicts.iter_mut().zip(other.verdicts) {
            *x += y;
        }
        for k in 0..2 {
            self.further[k] += other.further[k];
            self.nearer[k] += other.nearer[k];
        }
    }
}

/// A planted study, prepared under some settings.
pub fn study(planted: &Planted, settings: &[(&str, &str)]) -> Study {
    let folder = tempfile::tempdir().unwrap();
    let mut asked = Request::default();
    for (key, value) in settings {
        asked.set(key, value).unwrap();
    }
    prepare(&planted.write(folder.path()), asked).unwrap()
}

/// One unit of displacement in the latent space: the usual distance of left-out landmarks, as a share of
/// that of random pairs, mean of ten draws.
pub fn unit(world: &World) -> f64 {
    let draws = 10;
    let sum: f64 = (0..draws)
        .map(|t| {
            let drawn = world.draw(500_000 + t);
            let settings = [
                ("evidence", "canonical"),
                ("replicates", "2"),
                ("threads", "1"),
            ];
            let located = locate(&study(&drawn.planted, &settings), &Unwatched).unwrap();
            median(located.left_out.iter().map(|l| l.distance).collect()).unwrap()
        })
        .sum();
    sum / draws as f64 * World::random_distance()
}

/// Judges four pairs of each sort in one draw: 200 replicates, one thread.
pub fn judge(world: &World, seed: u64, evidence: &str) -> [Count; TRUTHS.len()] {
    let Drawn {
        planted,
        plain,
        displaced,
        lone,
    } = world.draw(seed);
    let settings = [
        ("evidence", evidence),
        ("replicates", "200"),
        ("threads", "1"),
    ];
    let study = study(&planted, &settings);
    let sought = study.species.as_ref().map(|s| s.parcels.labels().to_vec());
    let find = |side: Side, letter: &str, i: usize| {
        let wanted = label(letter, i);
        sought[side].iter().position(|l| *l == wanted).unwrap()
    };
    let pair = |i: usize, j: usize| Pair {
        a: find(Side::A, "a", i),
        b: find(Side::B, "b", j),
    };
    let mut chance = rng(seed + 3_000_000);
    let mut named: Vec<(usize, Pair<usize>)> = Vec::new();
    named.extend(plain.iter().take(EACH).map(|&i| (0, pair(i, i))));
    for (k, parcels) in displaced.iter().enumerate() {
        named.extend(parcels.iter().map(|&i| (1 + k, pair(i, i))));
    }
    for &i in plain.iter().take(EACH) {
        let j = plain[chance.gen_range(EACH..plain.len())];
        named.push((4, pair(i, j)));
    }
    let is_landmark = |j: usize| planted.landmarks.iter().any(|l| l.1 == j);
    let mut followed: Vec<Pair<usize>> = named.iter().map(|(_, pair)| *pair).collect();
    for &i in &lone {
        let open = (0..world.parcels).filter(|&j| !is_landmark(j));
        followed.extend(open.map(|j| pair(i, j)));
    }
    let ground = Ground::new(study, followed, &Unwatched).unwrap();
    for &i in &lone {
        let a = find(Side::A, "a", i);
        let mut placements = ground.located.placements.a.iter();
        let placement = placements.find(|p| p.parcel == a).unwrap();
        let b = placement.counterparts[0].parcel;
        named.push((3, Pair { a, b }));
    }
    let mut counts = [Count::default(); TRUTHS.len()];
    for (sort, pair) in named {
        counts[sort].add(&rule(&ground, Side::A, pair));
    }
    counts
}
