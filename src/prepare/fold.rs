//! Left and right copies of one area made one parcel, so that a brain of two hemispheres is compared
//! like one of which one hemisphere was mapped.

use std::collections::{BTreeMap, HashMap};

use ndarray::Array2;

use crate::domain::{Attributes, Connectivity, Extent, Geometry, Hemisphere, WeightKind};
use crate::input::{without_side, SideMark};

/// Both sides, in the order in which they are summed.
const SIDES: [Hemisphere; 2] = [Hemisphere::Left, Hemisphere::Right];

/// What a folded parcel is made of, as places among the labels of the file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum Members {
    /// Copies of one area.
    Copies { left: usize, right: usize },
    /// A parcel that lies on one side and has no copy.
    OneSide { at: usize, side: Hemisphere },
    /// A parcel of the midline, or of which no side is known.
    Whole { at: usize },
}

impl Members {
    /// The member on a side; what has no side is on both.
    fn on(self, side: Hemisphere) -> Option<usize> {
        match self {
            Members::Copies { left, right } => Some(if side == Hemisphere::Left {
                left
            } else {
                right
            }),
            Members::OneSide { at, side: own } => (own == side).then_some(at),
            Members::Whole { at } => Some(at),
        }
    }

    fn has_side(self) -> bool {
        !matches!(self, Members::Whole { .. })
    }

    /// Pairs of members on one side (or on opposite sides) of two parcels, left first.
    fn pairs(self, other: Members, same_side: bool) -> impl Iterator<Item = (usize, usize)> {
        let counts = same_side || (self.has_side() && other.has_side());
        SIDES
            .into_iter()
            .filter(move |_| counts)
            .filter_map(move |side| {
                let opposite = SIDES[usize::from(side == Hemisphere::Left)];
                Some((
                    self.on(side)?,
                    other.on(if same_side { side } else { opposite })?,
                ))
            })
    }
}

/// Which parcels of a species become one.
#[derive(Debug, Clone, PartialEq)]
pub struct Folding {
    /// Labels before.
    unfolded: Vec<String>,
    /// Labels and members after, in the order in which their first member came.
    parcels: Vec<(String, Members)>,
}

impl Folding {
    /// Finds the copies. Two parcels are copies if their labels are alike but for the side; failing
    /// that, if they alone have one long name and group but for the side. Hemispheres that are known
    /// must agree. `None` where there are no copies: a single hemisphere stays as it is.
    pub fn of(labels: &[String], attributes: &[Attributes]) -> Option<Folding> {
        let mut partner: Vec<Option<(usize, Hemisphere)>> = vec![None; labels.len()];
        let mut rests: HashMap<usize, String> = HashMap::new();
        let mut pair = |alike: Vec<Reading>| {
            let of_side = |side| {
                let mut members = alike.iter().filter(|(_, s, _)| *s == side);
                members.next().filter(|_| members.next().is_none())
            };
            if let (Some((left, _, rest)), Some((right, ..))) =
                (of_side(Hemisphere::Left), of_side(Hemisphere::Right))
            {
                if partner[*left].is_none() && partner[*right].is_none() {
                    partner[*left] = Some((*right, Hemisphere::Left));
                    partner[*right] = Some((*left, Hemisphere::Right));
                    if let Some(rest) = rest {
                        rests.insert(*left, rest.clone());
                    }
                }
            }
        };
        by_label(labels, attributes)
            .into_values()
            .for_each(&mut pair);
        by_name(attributes).into_values().for_each(&mut pair);
        if rests.is_empty() && partner.iter().all(Option::is_none) {
            return None;
        }

        // The label without its side, unless another parcel has it or would get it too.
        let mut wanted: HashMap<&str, usize> = HashMap::new();
        for label in labels.iter().chain(rests.values()) {
            *wanted.entry(label).or_default() += 1;
        }
        let mut parcels = Vec::new();
        for (at, label) in labels.iter().enumerate() {
            let (left, right) = match partner[at] {
                Some((other, Hemisphere::Left)) => (at, other),
                Some((other, _)) => (other, at),
                None => {
                    let members = match attributes[at].hemisphere {
                        Some(side) if side != Hemisphere::Midline => Members::OneSide { at, side },
                        _ => Members::Whole { at },
                    };
                    parcels.push((label.clone(), members));
                    continue;
                }
            };
            if at != left.min(right) {
                continue;
            }
            let label = match rests.get(&left) {
                Some(rest) if wanted[rest.as_str()] == 1 => rest.clone(),
                _ => labels[left].clone(),
            };
            parcels.push((label, Members::Copies { left, right }));
        }
        Some(Folding {
            unfolded: labels.to_vec(),
            parcels,
        })
    }

    /// The labels after.
    pub fn labels(&self) -> Vec<String> {
        self.parcels
            .iter()
            .map(|(label, _)| label.clone())
            .collect()
    }

    /// Each label that went into another parcel, and that parcel's.
    pub fn copies(&self) -> BTreeMap<String, String> {
        let mut copies = BTreeMap::new();
        for (label, members) in &self.parcels {
            if let Members::Copies { left, right } = *members {
                for at in [left, right] {
                    copies.insert(self.unfolded[at].clone(), label.clone());
                }
            }
        }
        copies
    }

    /// Parcels of one side without a copy on the other.
    pub fn without_copy(&self) -> Vec<String> {
        let alone = self
            .parcels
            .iter()
            .filter(|(_, m)| matches!(m, Members::OneSide { .. }));
        alone.map(|(label, _)| label.clone()).collect()
    }

    /// The network of the folded brain. Between two parcels it is the mean over both sides of the
    /// link within the side (ipsilateral) and the link to the other side (contralateral), added up:
    /// weights that are amounts by their sum, logarithms by that of what they stand for, classes by
    /// the larger. The midline is on both sides and has no contralateral links. Correlations become
    /// those of the sum of both copies' standardised signals (Spearman 1913). What links the copies
    /// of one area with each other becomes its link with itself, which is no data.
    pub fn network(&self, network: &Connectivity, kind: WeightKind) -> Connectivity {
        let places = |labels: &[String]| -> HashMap<String, usize> {
            labels.iter().cloned().zip(0..).collect()
        };
        let (rows, columns) = (
            places(network.row_labels()),
            places(network.column_labels()),
        );
        let entries = Entries {
            network,
            row: self.unfolded.iter().map(|l| rows.get(l).copied()).collect(),
            column: self
                .unfolded
                .iter()
                .map(|l| columns.get(l).copied())
                .collect(),
        };
        let within = |places: &[Option<usize>]| -> Vec<&(String, Members)> {
            let there = |m: Members| {
                SIDES
                    .into_iter()
                    .any(|s| m.on(s).is_some_and(|at| places[at].is_some()))
            };
            self.parcels.iter().filter(|(_, m)| there(*m)).collect()
        };
        let (sources, targets) = (within(&entries.row), within(&entries.column));
        let folded = Array2::from_shape_fn((sources.len(), targets.len()), |(i, j)| {
            let (from, to) = (sources[i].1, targets[j].1);
            if from == to {
                Some(0.0)
            } else if kind == WeightKind::Correlations {
                entries.correlation(from, to)
            } else {
                entries.link(from, to, kind)
            }
        });
        let labels = |of: &[&(String, Members)]| of.iter().map(|(l, _)| l.clone()).collect();
        let missing = network.has_missing().then(|| folded.map(Option::is_none));
        Connectivity::new(
            labels(&sources),
            labels(&targets),
            folded.map(|w| w.unwrap_or(0.0)),
            missing,
        )
        .expect("one label for each row and column")
    }

    /// The attributes of the folded parcels: copies lie on no one side, stand where the left one
    /// stands and have the mean of both extents.
    pub fn attributes(&self, of: &[Attributes]) -> Vec<Attributes> {
        let fold = |members: &Members| match *members {
            Members::OneSide { at, .. } | Members::Whole { at } => of[at].clone(),
            Members::Copies { left, right } => {
                let (left, right) = (&of[left], &of[right]);
                Attributes {
                    hemisphere: Some(Hemisphere::Midline),
                    coordinates: left.coordinates,
                    extent: match (left.extent, right.extent) {
                        (Some(Extent::Area(x)), Some(Extent::Area(y))) => {
                            Some(Extent::Area((x + y) / 2.0))
                        }
                        (Some(Extent::Volume(x)), Some(Extent::Volume(y))) => {
                            Some(Extent::Volume((x + y) / 2.0))
                        }
                        (one, other) => one.or(other),
                    },
                    group: left.group.clone().or_else(|| right.group.clone()),
                    long_name: match (&left.long_name, &right.long_name) {
                        (Some(one), Some(other)) if one != other => {
                            Some(shared_rest(one, other).unwrap_or_else(|| one.clone()))
                        }
                        (one, other) => one.clone().or_else(|| other.clone()),
                    },
                }
            }
        };
        self.parcels
            .iter()
            .map(|(_, members)| fold(members))
            .collect()
    }

    /// Distances of the folded parcels: the mean over both sides of those within a side; between
    /// parcels that share no side, of those across.
    pub fn geometry(&self, geometry: &Geometry, attributes: &[Attributes]) -> Geometry {
        let coordinates = attributes.iter().map(|a| a.coordinates).collect();
        geometry.regrouped(coordinates, |i, j| {
            let (from, to) = (self.parcels[i].1, self.parcels[j].1);
            [true, false].into_iter().find_map(|same_side| {
                let pairs = from.pairs(to, same_side);
                let known: Vec<f64> = pairs.filter_map(|(p, q)| geometry.distance(p, q)).collect();
                mean(&known)
            })
        })
    }
}

/// A parcel that may be one side of an area, the side, and what its label says without it.
type Reading = (usize, Hemisphere, Option<String>);

/// Labels by what they say without their side, in an order that does not depend on that of the file.
fn by_label(
    labels: &[String],
    attributes: &[Attributes],
) -> BTreeMap<(SideMark, String), Vec<Reading>> {
    let mut found: BTreeMap<_, Vec<_>> = BTreeMap::new();
    for (at, label) in labels.iter().enumerate() {
        for (mark, side, rest) in without_side(label) {
            if attributes[at].hemisphere.is_none_or(|known| known == side) {
                // Words are compared without regard to capitals, letters are capitals.
                let key = match mark {
                    SideMark::Word(_) => rest.to_lowercase(),
                    SideMark::End | SideMark::Start => rest.clone(),
                };
                found
                    .entry((mark, key))
                    .or_default()
                    .push((at, side, Some(rest)));
            }
        }
    }
    found
}

/// Parcels of a known side by their long name without it, and their group.
fn by_name(attributes: &[Attributes]) -> BTreeMap<(String, Option<&str>), Vec<Reading>> {
    let mut found: BTreeMap<_, Vec<_>> = BTreeMap::new();
    for (at, known) in attributes.iter().enumerate() {
        if let (Some(side), Some(name)) = (known.hemisphere, &known.long_name) {
            let without = without_side(name)
                .into_iter()
                .find(|(mark, s, _)| *s == side && matches!(mark, SideMark::Word(_)));
            let name = without.map_or_else(|| name.clone(), |(.., rest)| rest);
            found
                .entry((name.to_lowercase(), known.group.as_deref()))
                .or_default()
                .push((at, side, None));
        }
    }
    found
}

/// What two names share when each loses its side.
fn shared_rest(one: &str, other: &str) -> Option<String> {
    let others = without_side(other);
    without_side(one)
        .into_iter()
        .find_map(|(mark, side, rest)| {
            let same =
                |(m, s, r): &(SideMark, Hemisphere, String)| *m == mark && *s != side && *r == rest;
            others.iter().any(same).then_some(rest.clone())
        })
}

/// The entries of a network by places among the labels before folding.
struct Entries<'n> {
    network: &'n Connectivity,
    row: Vec<Option<usize>>,
    column: Vec<Option<usize>>,
}

impl Entries<'_> {
    /// Whether there is such an entry, and its weight where it was observed.
    fn get(&self, from: usize, to: usize) -> Option<Option<f64>> {
        let (row, column) = (self.row[from]?, self.column[to]?);
        let observed = !self.network.is_missing(row, column);
        Some(observed.then(|| self.network.weights()[(row, column)]))
    }

    /// `None` where nothing of a part that there is was observed.
    fn link(&self, from: Members, to: Members, kind: WeightKind) -> Option<f64> {
        let pairs = |same_side| {
            from.pairs(to, same_side)
                .filter_map(|(p, q)| self.get(p, q))
        };
        // Logarithms are taken relative to the largest, so that none overflows.
        let all = || pairs(true).chain(pairs(false)).flatten();
        let largest = all().reduce(f64::max).unwrap_or(0.0);
        let amount = |w: f64| match kind {
            WeightKind::Log10 => 10.0_f64.powf(w - largest),
            _ => w,
        };
        let mut parts = Vec::new();
        for same_side in [true, false] {
            let entries: Vec<Option<f64>> = pairs(same_side).collect();
            let observed: Vec<f64> = entries.iter().flatten().map(|w| amount(*w)).collect();
            match mean(&observed) {
                Some(mean) => parts.push(mean),
                None if entries.is_empty() => {}
                None => return None,
            }
        }
        let total = match kind {
            WeightKind::Ordinal => parts.into_iter().reduce(f64::max),
            _ => parts.into_iter().reduce(|ipsi, contra| ipsi + contra),
        }?;
        Some(match kind {
            WeightKind::Log10 => largest + total.log10(),
            _ => total,
        })
    }

    /// Correlation between the sums of the members' standardised signals.
    fn correlation(&self, one: Members, other: Members) -> Option<f64> {
        let members = |of: Members| -> Vec<usize> {
            let mut members: Vec<usize> = SIDES.into_iter().filter_map(|s| of.on(s)).collect();
            members.dedup();
            members
        };
        let sum = |some: &[usize], others: &[usize]| -> Option<f64> {
            let mut total = 0.0;
            for &p in some {
                for &q in others {
                    total += if p == q { 1.0 } else { self.get(p, q)?? };
                }
            }
            Some(total)
        };
        let (one, other) = (members(one), members(other));
        let variances = sum(&one, &one)? * sum(&other, &other)?;
        let covariance = sum(&one, &other)?;
        // Copies that move in opposition cancel: nothing is left to correlate.
        let settled = if variances > 0.0 {
            covariance / variances.sqrt()
        } else {
            0.0
        };
        Some(settled.clamp(-1.0, 1.0))
    }
}

fn mean(values: &[f64]) -> Option<f64> {
    (!values.is_empty()).then(|| values.iter().sum::<f64>() / values.len() as f64)
}

#[cfg(test)]
mod tests {
    use super::*;
    use ndarray::array;

    fn labels(all: &[&str]) -> Vec<String> {
        all.iter().map(|l| (*l).to_owned()).collect()
    }

    fn side(hemisphere: Hemisphere) -> Attributes {
        Attributes {
            hemisphere: Some(hemisphere),
            ..Attributes::default()
        }
    }

    /// Two areas on both sides and one on the midline.
    fn five() -> (Folding, Connectivity) {
        let labels = labels(&["A-L", "B-L", "M", "A-R", "B-R"]);
        let folding = Folding::of(&labels, &vec![Attributes::default(); 5]).unwrap();
        let weights = array![
            [9.0, 1.0, 2.0, 3.0, 4.0],
            [5.0, 9.0, 6.0, 7.0, 8.0],
            [10.0, 11.0, 9.0, 12.0, 13.0],
            [14.0, 15.0, 16.0, 9.0, 17.0],
            [18.0, 19.0, 20.0, 21.0, 9.0],
        ];
        let network = Connectivity::new(labels.clone(), labels, weights, None).unwrap();
        (folding, network)
    }

    #[test]
    fn links_within_and_across_are_added_and_averaged_over_sides() {
        let (folding, network) = five();
        assert_eq!(folding.labels(), ["A", "B", "M"]);
        let folded = folding.network(&network, WeightKind::Counts);
        // A to B: within (1 + 17) / 2, across (4 + 15) / 2. B to A: (5 + 21) / 2 + (7 + 18) / 2.
        // A to M: (2 + 16) / 2. M to A: (10 + 12) / 2.
        let by_hand = array![[0.0, 18.5, 9.0], [25.5, 0.0, 13.0], [11.0, 12.0, 0.0]];
        assert_eq!(folded.weights(), by_hand);
        // Classes take the larger of within and across.
        let classes = folding.network(&network, WeightKind::Ordinal);
        assert_eq!(classes.weights()[(0, 1)], 9.5);
        let logs = folding.network(&network, WeightKind::Log10);
        let by_hand = ((10.0 + 1e17) / 2.0 + (1e4 + 1e15) / 2.0_f64).log10();
        approx::assert_relative_eq!(logs.weights()[(0, 1)], by_hand, epsilon = 1e-12);
    }

    #[test]
    fn correlations_become_those_of_summed_signals() {
        let labels = labels(&["A_L", "A_R", "B_L", "B_R"]);
        let folding = Folding::of(&labels, &vec![Attributes::default(); 4]).unwrap();
        let weights = array![
            [1.0, 0.5, 0.6, 0.2],
            [0.5, 1.0, 0.3, 0.4],
            [0.6, 0.3, 1.0, 0.1],
            [0.2, 0.4, 0.1, 1.0],
        ];
        let network = Connectivity::new(labels.clone(), labels, weights, None).unwrap();
        let folded = folding.network(&network, WeightKind::Correlations);
        // 1.5 / sqrt(3 * 2.2)
        approx::assert_relative_eq!(folded.weights()[(0, 1)], 1.5 / 6.6_f64.sqrt());
    }

    #[test]
    fn what_was_not_observed_stays_so() {
        let (folding, network) = five();
        let mut missing = Array2::from_elem((5, 5), false);
        missing[(0, 1)] = true;
        missing[(0, 2)] = true;
        missing[(3, 2)] = true;
        let labels = network.row_labels().to_vec();
        let weights = network.weights().clone();
        let network = Connectivity::new(labels.clone(), labels, weights, Some(missing)).unwrap();
        let folded = folding.network(&network, WeightKind::Counts);
        // The other side speaks for A to B; of A to M neither side was observed.
        assert_eq!(folded.weights()[(0, 1)], 17.0 + 9.5);
        assert!(!folded.is_missing(0, 1) && folded.is_missing(0, 2));
    }

    #[test]
    fn a_parcel_on_one_side_only_counts_on_that_side() {
        let labels = labels(&["A-L", "A-R", "B"]);
        let attributes = [
            Attributes::default(),
            Attributes::default(),
            side(Hemisphere::Left),
        ];
        let folding = Folding::of(&labels, &attributes).unwrap();
        let weights = array![[0.0, 1.0, 2.0], [3.0, 0.0, 4.0], [5.0, 6.0, 0.0]];
        let network = Connectivity::new(labels.clone(), labels, weights, None).unwrap();
        let folded = folding.network(&network, WeightKind::Counts);
        assert_eq!(folded.weights(), array![[0.0, 6.0], [11.0, 0.0]]);
        assert_eq!(folding.without_copy(), ["B"]);
    }

    #[test]
    fn known_sides_and_long_names_decide_about_copies() {
        let all = labels(&["POL", "POR", "11", "12"]);
        let no = Attributes::default();
        let alike = Folding::of(&all, &[no.clone(), no.clone(), no.clone(), no.clone()]).unwrap();
        assert_eq!(alike.labels(), ["PO", "11", "12"]);
        let left = side(Hemisphere::Left);
        let named = |hemisphere, name: &str| Attributes {
            long_name: Some(name.to_owned()),
            ..side(hemisphere)
        };
        let described = [
            left.clone(),
            left,
            named(Hemisphere::Right, "right band"),
            named(Hemisphere::Left, "Left band"),
        ];
        let told = Folding::of(&all, &described).unwrap();
        assert_eq!(told.labels(), ["POL", "POR", "12"]);
        assert_eq!(
            told.attributes(&described)[2].long_name.as_deref(),
            Some("band")
        );
        assert_eq!(told.copies().len(), 2);
        assert_eq!(Folding::of(&all[2..], &[no.clone(), no]), None);
    }

    #[test]
    fn a_label_that_is_taken_is_not_given_twice() {
        let all = labels(&["V1", "V1-L", "V1-R"]);
        let folding = Folding::of(&all, &vec![Attributes::default(); 3]).unwrap();
        assert_eq!(folding.labels(), ["V1", "V1-L"]);
        let all = labels(&["lh-V1", "V1-L", "V1-R", "rh-V1"]);
        let folding = Folding::of(&all, &vec![Attributes::default(); 4]).unwrap();
        assert_eq!(folding.labels(), ["lh-V1", "V1-L"]);
    }

    #[test]
    fn logarithms_beyond_the_range_of_numbers_are_added() {
        let labels = labels(&["A-L", "A-R", "B-L", "B-R"]);
        let folding = Folding::of(&labels, &vec![Attributes::default(); 4]).unwrap();
        let weights = Array2::from_elem((4, 4), 400.0);
        let network = Connectivity::new(labels.clone(), labels, weights, None).unwrap();
        let folded = folding.network(&network, WeightKind::Log10);
        approx::assert_relative_eq!(folded.weights()[(0, 1)], 400.0 + 2.0_f64.log10());
    }
}
