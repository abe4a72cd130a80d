//! Is a named pair's position conserved? The tests of one pair, and the verdict they amount to.

use serde::Serialize;

use super::further::{further, Further};
use super::ground::Ground;
use super::nearer::{nearer, Nearer};
use super::selected::Selected;
use super::separation::{Separation, Usual};
use super::spot::{logarithm, strained};
use crate::bootstrap::{interval, interval_of};
use crate::domain::{choices, Pair, Side};
use crate::evidence::Material;
use crate::holdout::Placed;
use crate::locate::{gaps, strain, LeftOut};
use crate::settings::Settings;

/// Level of the test against a search, as a multiple of that of the others. What it lets through must
/// still lie as near as homologous pairs, so that both together let through less. At twice the level
/// 13 % of parcels without counterpart were called conserved at medium noise (docs/validity.md); at the
/// level itself sixteen landmarks could never do with a single one that happens to find something good.
const SEARCH: f64 = 1.5;
/// Room for rounding in the comparison of a p-value with a level.
const ROUNDING: f64 = 1e-9;

choices! {
    /// What is said of a named pair.
    pub enum Verdict {
        /// Its position is conserved.
        Conserved = "conserved",
        /// It lies further apart than homologous pairs do.
        Displaced = "displaced",
        /// Neither can be said.
        Undetermined = "undetermined",
        /// Conservation cannot be shown, whatever the pair.
        CannotShow = "these data cannot show it",
    }
}

impl Verdict {
    /// What remains if two accounts of one pair must both hold.
    #[must_use]
    pub fn and(self, other: Verdict) -> Verdict {
        match (self, other) {
            (x, y) if x == y => x,
            (Verdict::CannotShow, Verdict::Conserved)
            | (Verdict::Conserved, Verdict::CannotShow) => Verdict::CannotShow,
            _ => Verdict::Undetermined,
        }
    }
}

/// The grounds of a verdict that can fail.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Serialize)]
#[serde(rename_all = "kebab-case")]
pub struct Grounds {
    /// Further apart than homologous pairs, at the level.
    pub is_further: bool,
    /// Nearer than unrelated pairs, at the level.
    pub is_nearer: bool,
    /// Holds more strongly than the best of a search without counterpart, at the level.
    pub is_no_selection: bool,
    /// The upper end of its interval lies within the limit of homologous pairs.
    pub is_within: bool,
    /// That limit lies well below unrelated pairs.
    pub limit_tells: bool,
    /// There are landmarks enough for a p at the level.
    pub enough_landmarks: bool,
}

impl Grounds {
    /// From the p-values of the three tests and the separation, whose landmarks are those of the tests.
    #[must_use]
    pub fn of(
        settings: &Settings,
        p_further: f64,
        p_nearer: f64,
        p_search: f64,
        separation: &Separation,
    ) -> Grounds {
        let level = level_of(settings);
        let least = 1.0 / (1 + separation.left_out.len()) as f64;
        Grounds {
            is_further: reaches(p_further, level),
            is_nearer: reaches(p_nearer, level),
            is_no_selection: reaches(p_search, SEARCH * level),
            is_within: separation.is_within(),
            limit_tells: separation.limit_tells(),
            enough_landmarks: reaches(least, level),
        }
    }

    /// The verdict.
    #[must_use]
    pub fn verdict(self) -> Verdict {
        if self.is_further {
            Verdict::Displaced
        } else if !self.limit_tells || !self.enough_landmarks {
            Verdict::CannotShow
        } else if self.is_nearer && self.is_no_selection && self.is_within {
            Verdict::Conserved
        } else {
            Verdict::Undetermined
        }
    }
}

/// The tests of one pair with one set of landmarks.
#[derive(Debug, Clone, PartialEq)]
pub struct Ruling {
    /// What they amount to.
    pub verdict: Verdict,
    /// Why.
    pub grounds: Grounds,
    /// Blocks of landmarks.
    pub blocks: usize,
    /// Ranks both ways: of b's parcel from a's, and of a's from b's.
    pub placed: Pair<Placed>,
    /// 90 % intervals of these ranks over the replicates that rank.
    pub rank_intervals: Pair<(u32, u32)>,
    /// Shares of these replicates in which they are first.
    pub support: Pair<f64>,
    /// Distance in the joint space; 1 is that of random pairs.
    pub distance: f64,
    /// Logarithms of the distance in the joint space, divided by the strain of where the pair lies.
    pub separation: Separation,
    /// Its usual values.
    pub usual: Usual,
    /// Test against homologous pairs.
    pub further: Further,
    /// The t-prediction test beside it.
    pub p_by_t: Option<f64>,
    /// Test against unrelated pairs.
    pub nearer: Nearer,
    /// Test against the best of a search.
    pub selected: Selected,
}

/// Level of the tests of a study: one minus that of its candidate sets.
#[must_use]
pub fn level_of(settings: &Settings) -> f64 {
    1.0 - settings.level
}

/// Whether a p-value reaches a level.
#[must_use]
pub fn reaches(p: f64, level: f64) -> bool {
    p <= level + ROUNDING
}

/// Rules on a pair that the ground has followed; it was asked for from species `from`.
///
/// # Panics
/// If it was not followed.
#[must_use]
pub fn rule(ground: &Ground, from: Side, pair: Pair<usize>) -> Ruling {
    let Ground {
        study,
        located,
        view,
        watched,
        asked,
        ..
    } = ground;
    let index = ground.index(pair);
    let space = located.spaces[located.choice.evidence].params;
    let material = Material::new(study.species.as_ref(), &study.landmarks);
    let nearer = nearer(view, pair, &located.beyond, &study.candidates);
    let separation = separation(ground, &material, pair, &nearer.pairs);
    let usual = separation.usual();
    let further = further(study, study.settings.evidence.alignment(), pair);
    let selected = Selected::of(view, &ground.lie, pair, &study.landmarks, asked);
    let blocks = study.landmarks.blocks();
    let p_search = selected.p(from, None);
    let grounds = Grounds::of(&study.settings, further.p, nearer.p, p_search, &separation);
    let ranks = |of: &dyn Fn(&Pair<u32>) -> u32| -> Vec<u32> {
        watched.ranks.iter().map(|all| of(&all[index])).collect()
    };
    let both = Pair {
        a: ranks(&|ranks| ranks.a),
        b: ranks(&|ranks| ranks.b),
    };
    Ruling {
        verdict: grounds.verdict(),
        grounds,
        blocks,
        placed: view.placed(pair),
        support: both.as_ref().map(|ranks| {
            let first = ranks.iter().filter(|rank| **rank == 1).count();
            first as f64 / ranks.len().max(1) as f64
        }),
        rank_intervals: both
            .map(|mut ranks| interval(&mut ranks).expect("at least one replicate ranks")),
        distance: gaps(space, &material, &material.weights(|_| 1.0), &[pair])[0],
        p_by_t: separation.p_by_t(),
        usual,
        separation,
        further,
        nearer,
        selected,
    }
}

/// How far a followed pair lies apart in the joint space that shows distances.
fn separation(
    ground: &Ground,
    material: &Material<'_>,
    pair: Pair<usize>,
    unrelated: &[Pair<usize>],
) -> Separation {
    let Ground {
        study,
        located,
        view,
        watched,
        ..
    } = ground;
    let index = ground.index(pair);
    let space = located.spaces[located.choice.evidence].params;
    let own = strained(material, space, &[], &[pair])[0];
    let strain = strain(material, space, &[], &[pair])[0];
    let over_replicates = watched.distances.iter();
    let over_replicates = over_replicates.map(|all| logarithm(all[index] / strain));
    Separation {
        own,
        interval: interval_of(over_replicates.collect()).unwrap_or((own, own)),
        left_out: view
            .without
            .iter()
            .map(|(at, _)| {
                let block = study.landmarks.list()[*at].block;
                let LeftOut { chosen, asked, .. } = located.left_out[*at];
                strained(material, chosen, &[block], &[asked])[0]
            })
            .collect(),
        unrelated: strained(material, space, &[], unrelated),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const SOUND: Grounds = Grounds {
        is_further: false,
        is_nearer: true,
        is_no_selection: true,
        is_within: true,
        limit_tells: true,
        enough_landmarks: true,
    };

    #[test]
    fn conserved_wants_everything() {
        assert_eq!(SOUND.verdict(), Verdict::Conserved);
        let lacking: [fn(&mut Grounds); 3] = [
            |g| g.is_nearer = false,
            |g| g.is_no_selection = false,
            |g| g.is_within = false,
        ];
        for lack in lacking {
            let mut grounds = SOUND;
            lack(&mut grounds);
            assert_eq!(grounds.verdict(), Verdict::Undetermined);
            grounds.limit_tells = false;
            assert_eq!(grounds.verdict(), Verdict::CannotShow);
            grounds.is_further = true;
            assert_eq!(grounds.verdict(), Verdict::Displaced);
        }
    }

    #[test]
    fn of_two_accounts_the_cautious_one_counts() {
        use Verdict::{CannotShow, Conserved, Displaced, Undetermined};
        for both in [Conserved, Displaced, Undetermined, CannotShow] {
            assert_eq!(both.and(both), both);
            assert_eq!(both.and(Undetermined), Undetermined);
            assert_eq!(Undetermined.and(both), Undetermined);
        }
        assert_eq!(Conserved.and(Displaced), Undetermined);
        assert_eq!(Conserved.and(CannotShow), CannotShow);
        assert_eq!(Displaced.and(CannotShow), Undetermined);
    }
}
