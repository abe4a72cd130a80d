//! The demo study: two invented species with a known answer.
//!
//! The two species descend from one invented ancestor whose regions are points in a smooth space:
//! the nearer two regions are, the stronger they connect. Each species inherits the regions with
//! some drift. The loamick's map has one parcel per region and holds directed counts; the
//! pellivane's map cuts some regions in two and holds symmetric fractions. On top of that come
//! parcels without any counterpart, names that mislead and one wrong landmark, all of them listed
//! in the files of the known answer. Nothing here is real.

mod surface;

use rand::seq::SliceRandom;
use rand::{Rng, SeedableRng};
use rand_distr::{Distribution, Poisson, StandardNormal};
use rand_xoshiro::Xoshiro256PlusPlus;

/// The seed of the study as it is stored.
pub const DEFAULT_SEED: u64 = 6;

/// Axes of the space the regions lie in.
const DIMENSIONS: usize = 5;
/// Functional systems, each a loose cluster of regions with two landmarks.
const SYSTEMS: usize = 7;
/// Regions of the common ancestor.
const REGIONS: usize = 85;
/// One in this many regions of a system is cut in two by the finer map.
const CUT_EVERY: usize = 3;
/// Parcels without a counterpart in each species.
const LONE: usize = 5;
/// Parcels whose namesake lies elsewhere.
const DISPLACED: usize = 5;
/// Regions whose parcels bear the same name in both species, landmarks apart.
const TRUE_NAMESAKES: usize = 14;
/// One in this many recurring names is spelt the second species' way.
const RESPELT_EVERY: usize = 3;
/// What the second species' spelling adds to a name.
const RESPELT_ENDING: &str = "n";
/// What the labels of the two halves of a cut region end in: anterior and posterior.
const HALF_ENDINGS: [&str; 2] = ["-a", "-p"];
/// One in this many landmarks bears the same name in both species, unless it is the wrong one.
const LANDMARK_NAMESAKE_EVERY: usize = 3;
/// A misleading parcel is drawn from this many of the farthest ones.
const FAR_CHOICE: usize = 6;

/// Spread of the centres of the systems, along each axis.
const CENTRE_SPREAD: f64 = 1.0;
/// Spread of the regions of a system about its centre, along each axis.
const SYSTEM_SPREAD: f64 = 1.0;
/// How far a region drifts from its place in the ancestor, along each axis and in each species.
const DRIFT: f64 = 0.15;
/// How far the halves of a cut region lie from its middle, along each axis.
const HALF_SHIFT: f64 = 0.2;
/// How strongly each half of a cut region connects, compared with the whole.
const HALF_STRENGTH: f64 = 0.7;
/// Spread of the log strength of the regions.
const STRENGTH_SPREAD: f64 = 0.5;
/// Spread of what each species adds to the log strength of a region.
const STRENGTH_DRIFT: f64 = 0.25;
/// Spread between what a parcel sends and what it receives, on the log scale (directed map only).
const DIRECTION_SPREAD: f64 = 0.3;
/// Fall of the log weight with each unit of distance.
const DECAY: f64 = 2.0;
/// Spread of the log weights about the smooth expectation.
const NOISE: f64 = 0.85;

/// Percentage of ordered pairs that connect in the loamick, before counting.
const DENSITY_A: usize = 38;
/// Percentage of pairs that connect in the pellivane.
const DENSITY_B: usize = 60;
/// Expected count of the weakest connection of the loamick.
const FAINTEST_COUNT: f64 = 2.0;

/// The study file.
const STUDY: &str = r#"title = "Loamick tracer map and pellivane imaging map"
landmarks = "landmarks.csv"

[species.a]
name = "Loamick"
matrix = "a.csv"
weights = "counts"
parcels = "a_parcels.csv"

[species.b]
name = "Pellivane"
matrix = "b.csv"
weights = "fractions"
parcels = "b_parcels.csv"
"#;

/// What the systems are called in the tables of parcels.
const SYSTEM_NAMES: [&str; SYSTEMS] = [
    "sight",
    "hearing",
    "touch",
    "movement",
    "smell and taste",
    "memory",
    "body state",
];
/// Added to the seed for the draws of the tables of parcels, which came later and must not change the
/// others.
const ATTRIBUTE_SEED: u64 = 1 << 32;
/// How far the middle of the left hemisphere lies from the midline, in units of the space.
const LATERAL: f64 = 5.0;
/// Spread of the log area of a parcel.
const AREA_SPREAD: f64 = 0.35;
/// Millimetres to a unit of the space and square millimetres of a middling region, in each species.
const SIZES: [(f64, f64); 2] = [(3.0, 18.0), (7.5, 110.0)];

/// A landmark of the table before its parcels are drawn, its cells as they are printed.
struct Proposal {
    name: &'static str,
    /// Functional system its region is drawn from.
    system: usize,
    weight: &'static str,
    block: &'static str,
    basis: &'static str,
    /// Whether its region is one that the finer map cuts in two.
    group: bool,
}

impl Proposal {
    /// Whether nothing sets it apart from most others.
    fn is_plain(&self) -> bool {
        self.weight == "1" && self.block.is_empty() && !self.group
    }
}

/// Shorthand for a landmark of full weight, outside any block, with one parcel a side.
const fn plain(name: &'static str, system: usize, basis: &'static str) -> Proposal {
    Proposal {
        name,
        system,
        weight: "1",
        block: "",
        basis,
        group: false,
    }
}

/// The landmarks, two for every system.
const LANDMARKS: [Proposal; 2 * SYSTEMS] = [
    plain("first sight field", 0, "myeloarchitecture"),
    plain("moving sight field", 0, "sensory physiology"),
    plain("first hearing field", 1, "cytoarchitecture"),
    plain("call field", 1, "sensory physiology"),
    Proposal {
        block: "body map",
        ..plain("snout touch field", 2, "sensory physiology")
    },
    Proposal {
        block: "body map",
        ..plain("limb touch field", 2, "sensory physiology")
    },
    plain("limb movement field", 3, "cytoarchitecture"),
    plain("jaw movement field", 3, "microstimulation"),
    Proposal {
        group: true,
        ..plain("smell field", 4, "cytoarchitecture")
    },
    plain("taste field", 4, "receptor map"),
    plain("place memory gate", 5, "cytoarchitecture"),
    plain("old memory field", 5, "receptor map"),
    plain("alarm field", 6, "receptor map"),
    Proposal {
        weight: "0.5",
        ..plain("body state field", 6, "myeloarchitecture")
    },
];

/// Names of the loamick's parcels.
const NAMES_A: [&str; REGIONS + LONE] = [
    "Abelno", "Anguro", "Arvesi", "Aspemo", "Brelte", "Brerdi", "Breseo", "Brilvi", "Brista",
    "Brova", "Brulmo", "Bumbi", "Dimbe", "Drardo", "Drasi", "Drelmi", "Drerne", "Drilo", "Drolta",
    "Dromeo", "Dronde", "Druda", "Elfoma", "Enari", "Endelo", "Ertuli", "Evomba", "Felma",
    "Fulveo", "Furna", "Gende", "Gereo", "Gisi", "Glambe", "Glaneo", "Glerna", "Gliste", "Glivia",
    "Glulmi", "Glunda", "Gluso", "Ilsovo", "Imaru", "Imbasto", "Ipreda", "Lelvia", "Lilto",
    "Mombia", "Moseo", "Murde", "Nateo", "Nolmo", "Nulti", "Olami", "Orbeto", "Osquia", "Oveldi",
    "Pilve", "Plalo", "Plelme", "Plembi", "Plinde", "Plirni", "Pliseo", "Ploti", "Plulia",
    "Plurdo", "Rarni", "Relvo", "Rembeo", "Rindia", "Rirneo", "Serdia", "Siveo", "Trilma", "Trodo",
    "Trosti", "Trulve", "Trumia", "Trurno", "Tusto", "Ubaro", "Udolme", "Ustani", "Vati", "Veme",
    "Vilmeo", "Vondeo", "Vornia", "Vulmia",
];

/// Names of the pellivane's parcels, as far as they are not taken over from the loamick.
const NAMES_B: [&str; REGIONS + LONE] = [
    "Blidak", "Blizusk", "Blogus", "Blozin", "Clebim", "Clurkul", "Clyvath", "Dindok", "Dyvik",
    "Frivul", "Frothor", "Frovom", "Frundul", "Fruskos", "Grarkes", "Grillun", "Grizix", "Grugal",
    "Hidant", "Himmerd", "Hiskul", "Jillock", "Jimmol", "Jivom", "Jorkix", "Jovul", "Kerrord",
    "Kogisk", "Korrek", "Koskom", "Kraskim", "Kredun", "Krizath", "Krondur", "Krudel", "Kurroth",
    "Pandeck", "Pevask", "Pigord", "Pulluth", "Pybisk", "Pymmak", "Pyzek", "Quathus", "Quazuk",
    "Quisker", "Quizent", "Quodith", "Quogal", "Quotham", "Skoges", "Skyrkan", "Skyzis", "Snovon",
    "Stedesk", "Stundel", "Stuvord", "Stymmex", "Swathik", "Swavuck", "Swevos", "Swibith",
    "Swozuk", "Thubon", "Thuvock", "Thyzan", "Tubim", "Tybint", "Tyskar", "Vommont", "Vothan",
    "Vuboth", "Vyskird", "Warreck", "Wezent", "Widusk", "Wigont", "Wollul", "Wummer", "Wuthox",
    "Wyllosk", "Yathisk", "Yirkum", "Yommoth", "Yothock", "Yurkax", "Zaskox", "Zazurd", "Zethent",
    "Zurkath",
];

/// The one generator all draws come from.
type Draws = Xoshiro256PlusPlus;

/// A place in the space of the regions.
type Place = [f64; DIMENSIONS];

/// The middle of the space of the regions.
const ORIGIN: Place = [0.0; DIMENSIONS];

/// How a species was mapped.
#[derive(Clone, Copy, PartialEq)]
enum Map {
    /// One parcel per region; the directions of a connection are told apart.
    Coarse,
    /// Some regions cut in two; connections have no direction.
    Fine,
}

/// Square weights, row = source, column = target.
type Weights = Vec<Vec<f64>>;

/// A region of the common ancestor.
struct Region {
    place: Place,
    /// Log of how strongly it connects.
    strength: f64,
    /// Functional system it belongs to.
    system: usize,
    /// Whether the finer map has two parcels for it.
    cut: bool,
}

/// A parcel that one of the species inherited.
struct Parcel {
    place: Place,
    strength: f64,
}

/// Which regions play which part.
struct Parts {
    /// The region of each landmark, in the order of [`LANDMARKS`].
    landmarks: Vec<usize>,
    /// The place of the wrong landmark in [`LANDMARKS`].
    wrong: usize,
    /// The region whose parcel the wrong landmark names in the second species.
    mistaken: usize,
    /// The region of each displaced parcel, and the one that bears its name in the second species.
    displaced: Vec<(usize, usize)>,
    /// The regions that bear the same name in both species.
    namesakes: Vec<usize>,
}

/// Labels of both species' parcels: inherited ones in the order of their regions, then lone ones.
struct Labels {
    a: Vec<String>,
    b: Vec<String>,
    /// For every region the labels of its one or two parcels in the second species.
    heirs: Vec<Vec<String>>,
}

/// All files of the study for a seed: name and content.
pub fn files(seed: u64) -> Vec<(&'static str, String)> {
    let rng = &mut Draws::seed_from_u64(seed);
    let regions = ancestor(rng);
    let parcels_a = inherit(&regions, Map::Coarse, rng);
    let parcels_b = inherit(&regions, Map::Fine, rng);
    let parts = cast(&regions, rng);
    let labels = christen(&regions, &parts, rng);

    let raw_a = with_lone_parcels(&expected_weights(&parcels_a, Map::Coarse, rng), rng);
    let raw_b = with_lone_parcels(&expected_weights(&parcels_b, Map::Fine, rng), rng);
    let attributes = &mut Draws::seed_from_u64(seed.wrapping_add(ATTRIBUTE_SEED));
    let of_region: Vec<Vec<usize>> = (0..REGIONS).map(|region| vec![region]).collect();
    let described_a = described(&regions, &of_region, &parcels_a, SIZES[0], attributes);
    let mut next = 0..parcels_b.len();
    let halves: Vec<Vec<usize>> = labels
        .heirs
        .iter()
        .map(|heirs| next.by_ref().take(heirs.len()).collect())
        .collect();
    let described_b = described(&regions, &halves, &parcels_b, SIZES[1], attributes);
    let counts = counted(&strongest(raw_a, DENSITY_A), rng);
    let fractions = shared_out(strongest(raw_b, DENSITY_B));

    let order_a = shuffled(counts.len(), rng);
    let order_b = shuffled(fractions.len(), rng);
    let surface = |described: &[Described], labels: &[String]| {
        let centres: Vec<[f64; 3]> = described.iter().map(|of| of.coordinates).collect();
        surface::label_file(&centres, labels)
    };
    vec![
        ("study.toml", STUDY.to_string()),
        ("a.csv", matrix(&counts, &labels.a, &order_a, count_cell)),
        (
            "b.csv",
            matrix(&fractions, &labels.b, &order_b, fraction_cell),
        ),
        ("landmarks.csv", landmark_table(&parts, &labels)),
        ("a.label.gii", surface(&described_a, &labels.a)),
        ("b.label.gii", surface(&described_b, &labels.b)),
        (
            "a_parcels.csv",
            parcel_table(&described_a, &labels.a, &order_a),
        ),
        (
            "b_parcels.csv",
            parcel_table(&described_b, &labels.b, &order_b),
        ),
        ("truth.csv", truth_table(&labels, &order_a)),
        ("displaced.csv", displaced_table(&parts, &labels)),
        (
            "no_counterpart.csv",
            no_counterpart_table(&labels, &order_a, &order_b),
        ),
        ("wrong_landmark.csv", wrong_landmark_table(&parts, &labels)),
    ]
}

/// One draw from the standard normal distribution.
fn normal(rng: &mut Draws) -> f64 {
    rng.sample(StandardNormal)
}

/// A place scattered about another one, with the same spread along every axis.
fn near(centre: &Place, spread: f64, rng: &mut Draws) -> Place {
    centre.map(|x| x + spread * normal(rng))
}

/// Euclidean distance.
fn distance(from: &Place, to: &Place) -> f64 {
    let squares = from.iter().zip(to).map(|(x, y)| (x - y).powi(2));
    squares.sum::<f64>().sqrt()
}

/// The numbers below `n` in random order.
fn shuffled(n: usize, rng: &mut Draws) -> Vec<usize> {
    let mut order: Vec<usize> = (0..n).collect();
    order.shuffle(rng);
    order
}

/// One of the choices, each as likely as any other.
///
/// # Panics
/// When there is nothing to choose from.
fn one_of(choices: &[usize], rng: &mut Draws) -> usize {
    *choices.choose(rng).expect("there is something to choose")
}

/// Draws the regions of the common ancestor, dealt out to the systems in turn.
fn ancestor(rng: &mut Draws) -> Vec<Region> {
    let centres: Vec<Place> = (0..SYSTEMS)
        .map(|_| near(&ORIGIN, CENTRE_SPREAD, rng))
        .collect();
    (0..REGIONS)
        .map(|region| {
            let system = region % SYSTEMS;
            Region {
                place: near(&centres[system], SYSTEM_SPREAD, rng),
                strength: STRENGTH_SPREAD * normal(rng),
                system,
                cut: (region / SYSTEMS) % CUT_EVERY == 1,
            }
        })
        .collect()
}

/// The parcels one species has for the regions, each region having drifted as a whole.
fn inherit(regions: &[Region], map: Map, rng: &mut Draws) -> Vec<Parcel> {
    let mut parcels = Vec::new();
    for origin in regions {
        let place = near(&origin.place, DRIFT, rng);
        let strength = origin.strength + STRENGTH_DRIFT * normal(rng);
        if origin.cut && map == Map::Fine {
            let shift = near(&ORIGIN, HALF_SHIFT, rng);
            for side in [-1.0, 1.0] {
                parcels.push(Parcel {
                    place: std::array::from_fn(|axis| place[axis] + side * shift[axis]),
                    strength: strength + HALF_STRENGTH.ln(),
                });
            }
        } else {
            parcels.push(Parcel { place, strength });
        }
    }
    parcels
}

/// Decides which regions become landmarks, which mislead and which share a name.
fn cast(regions: &[Region], rng: &mut Draws) -> Parts {
    let mut free = shuffled(REGIONS, rng);
    let landmarks: Vec<usize> = LANDMARKS
        .iter()
        .map(|proposal| {
            take(&mut free, |region| {
                regions[region].system == proposal.system && regions[region].cut == proposal.group
            })
        })
        .collect();

    let suspects: Vec<usize> = (0..LANDMARKS.len())
        .filter(|&place| LANDMARKS[place].is_plain())
        .collect();
    let wrong = one_of(&suspects, rng);
    let mistaken = take_far(&mut free, regions, landmarks[wrong], rng);

    let displaced = (0..DISPLACED)
        .map(|_| {
            let region = take(&mut free, |region| !regions[region].cut);
            (region, take_far(&mut free, regions, region, rng))
        })
        .collect();

    let mut namesakes: Vec<usize> = free.drain(..TRUE_NAMESAKES).collect();
    namesakes.extend(
        (0..LANDMARKS.len())
            .filter(|&place| place != wrong && place % LANDMARK_NAMESAKE_EVERY == 0)
            .map(|place| landmarks[place]),
    );
    Parts {
        landmarks,
        wrong,
        mistaken,
        displaced,
        namesakes,
    }
}

/// Takes the first free region that fits.
///
/// # Panics
/// When none fits, which the sizes of the systems rule out.
fn take(free: &mut Vec<usize>, fits: impl Fn(usize) -> bool) -> usize {
    let place = free.iter().position(|&region| fits(region));
    free.remove(place.expect("every system has regions to spare"))
}

/// Takes one of the free uncut regions that lie farthest from a region.
fn take_far(free: &mut Vec<usize>, regions: &[Region], from: usize, rng: &mut Draws) -> usize {
    let away = |region: usize| distance(&regions[region].place, &regions[from].place);
    let mut uncut: Vec<usize> = free
        .iter()
        .copied()
        .filter(|&region| !regions[region].cut)
        .collect();
    uncut.sort_by(|&x, &y| away(y).total_cmp(&away(x)));
    let chosen = one_of(&uncut[..FAR_CHOICE], rng);
    take(free, |region| region == chosen)
}

/// Gives every parcel its label.
fn christen(regions: &[Region], parts: &Parts, rng: &mut Draws) -> Labels {
    let order_a = shuffled(NAMES_A.len(), rng);
    let order_b = shuffled(NAMES_B.len(), rng);
    let a: Vec<String> = order_a.iter().map(|&i| NAMES_A[i].to_string()).collect();
    let mut stems: Vec<String> = order_b.iter().map(|&i| NAMES_B[i].to_string()).collect();

    let displaced = parts.displaced.iter().copied();
    let conserved = parts.namesakes.iter().map(|&region| (region, region));
    for (i, (giver, bearer)) in displaced.chain(conserved).enumerate() {
        let ending = if i % RESPELT_EVERY == RESPELT_EVERY - 1 {
            RESPELT_ENDING
        } else {
            ""
        };
        stems[bearer] = format!("{}{ending}", a[giver]);
    }

    let heirs: Vec<Vec<String>> = regions
        .iter()
        .zip(&stems)
        .map(|(region, stem)| {
            if region.cut {
                HALF_ENDINGS.map(|ending| format!("{stem}{ending}")).into()
            } else {
                vec![stem.clone()]
            }
        })
        .collect();
    let inherited = heirs.iter().flatten();
    let b = inherited.chain(&stems[REGIONS..]).cloned().collect();
    Labels { a, b, heirs }
}

/// Weights that fall with distance, with noise; the coarse map's differ between the directions.
fn expected_weights(parcels: &[Parcel], map: Map, rng: &mut Draws) -> Weights {
    let n = parcels.len();
    let lean: Vec<f64> = match map {
        Map::Coarse => (0..n).map(|_| DIRECTION_SPREAD * normal(rng)).collect(),
        Map::Fine => vec![0.0; n],
    };
    let mut weights = vec![vec![0.0; n]; n];
    for (i, source) in parcels.iter().enumerate() {
        for (j, target) in parcels.iter().enumerate().take(i) {
            let smooth =
                source.strength + target.strength - DECAY * distance(&source.place, &target.place);
            let noise = NOISE * normal(rng);
            let noise_back = match map {
                Map::Coarse => NOISE * normal(rng),
                Map::Fine => noise,
            };
            weights[i][j] = (smooth + lean[i] - lean[j] + noise).exp();
            weights[j][i] = (smooth + lean[j] - lean[i] + noise_back).exp();
        }
    }
    weights
}

/// Adds parcels that fit nowhere: each connects as strongly as some inherited parcel does, but
/// with that one's partners exchanged at random.
fn with_lone_parcels(weights: &Weights, rng: &mut Draws) -> Weights {
    let n = weights.len();
    // The sum of roots goes up with the number of connections as well as with their strength.
    let total = |parcel: usize| -> f64 {
        (0..n)
            .map(|i| weights[parcel][i].sqrt() + weights[i][parcel].sqrt())
            .sum()
    };
    let mut by_strength: Vec<usize> = (0..n).collect();
    by_strength.sort_by(|&x, &y| total(x).total_cmp(&total(y)));

    let mut grown = vec![vec![0.0; n + LONE]; n + LONE];
    for (row, old) in grown.iter_mut().zip(weights) {
        row[..n].copy_from_slice(old);
    }
    for lone in 0..LONE {
        // Models spread evenly over the strengths, so that strength gives no lone parcel away.
        let model = by_strength[n * (2 * lone + 1) / (2 * LONE)];
        for (partner, &stand_in) in shuffled(n, rng).iter().enumerate() {
            grown[n + lone][partner] = weights[model][stand_in];
            grown[partner][n + lone] = weights[stand_in][model];
        }
    }
    grown
}

/// Sets all but the strongest connections to zero, so that the given percentage of pairs is left.
fn strongest(mut weights: Weights, density: usize) -> Weights {
    let n = weights.len();
    let mut values: Vec<f64> = weights.concat();
    values.sort_by(|x, y| y.total_cmp(x));
    let least = values[n * (n - 1) * density / 100];
    for weight in weights.iter_mut().flatten() {
        if *weight < least {
            *weight = 0.0;
        }
    }
    weights
}

/// What counting labelled cells gives for these weights.
fn counted(weights: &Weights, rng: &mut Draws) -> Weights {
    let positive = weights.iter().flatten().copied().filter(|&w| w > 0.0);
    let scale = FAINTEST_COUNT / positive.fold(f64::INFINITY, f64::min);
    let mut count = |&weight: &f64| match Poisson::new(weight * scale) {
        Ok(distribution) => distribution.sample(rng),
        Err(_) => 0.0,
    };
    weights
        .iter()
        .map(|row| row.iter().map(&mut count).collect())
        .collect()
}

/// The weights as fractions of their sum.
fn shared_out(mut weights: Weights) -> Weights {
    let sum: f64 = weights.iter().flatten().sum();
    for weight in weights.iter_mut().flatten() {
        *weight /= sum;
    }
    weights
}

/// A count as it is printed.
fn count_cell(count: f64) -> String {
    format!("{count:.0}")
}

/// A fraction as it is printed: few digits, so that the last bits of the sums do not matter.
fn fraction_cell(fraction: f64) -> String {
    if fraction > 0.0 {
        format!("{fraction:.4e}")
    } else {
        "0".to_string()
    }
}

/// A labelled matrix, its parcels in the given order.
fn matrix(
    weights: &Weights,
    labels: &[String],
    order: &[usize],
    cell: impl Fn(f64) -> String,
) -> String {
    let header = order.iter().map(|&column| labels[column].clone());
    let mut rows = vec![std::iter::once("parcel".to_string())
        .chain(header)
        .collect()];
    rows.extend(order.iter().map(|&row| {
        let cells = order.iter().map(|&column| cell(weights[row][column]));
        std::iter::once(labels[row].clone()).chain(cells).collect()
    }));
    table(&rows)
}

/// What a table of parcels says of one.
struct Described {
    coordinates: [f64; 3],
    area: f64,
    system: usize,
}

/// Places the parcels in the left hemisphere by three of the axes of the space, and gives them sizes;
/// lone parcels get any place and any system.
fn described(
    regions: &[Region],
    members: &[Vec<usize>],
    parcels: &[Parcel],
    (unit, middling): (f64, f64),
    rng: &mut Draws,
) -> Vec<Described> {
    let mut all = Vec::new();
    let mut describe = |place: &Place, system: usize, share: f64| {
        let lateral = (LATERAL + place[0]).max(0.2);
        all.push(Described {
            coordinates: [-lateral * unit, place[1] * unit, place[2] * unit],
            area: share * middling * (AREA_SPREAD * normal(rng)).exp(),
            system,
        });
    };
    for (region, members) in regions.iter().zip(members) {
        for &parcel in members {
            let share = 1.0 / members.len() as f64;
            describe(&parcels[parcel].place, region.system, share);
        }
    }
    for lone in 0..LONE {
        let model = &regions[REGIONS * (2 * lone + 1) / (2 * LONE)];
        describe(&model.place.map(|x| -x), model.system, 1.0);
    }
    all
}

/// A table of parcels, in the order of the matrix.
fn parcel_table(described: &[Described], labels: &[String], order: &[usize]) -> String {
    let mut rows = vec![row(["label", "hemisphere", "x", "y", "z", "area", "group"])];
    rows.extend(order.iter().map(|&parcel| {
        let of = &described[parcel];
        // A zero has no sign.
        let [x, y, z] = of
            .coordinates
            .map(|c| format!("{:.1}", (10.0 * c).round() / 10.0 + 0.0));
        let (area, group) = (format!("{:.1}", of.area), SYSTEM_NAMES[of.system]);
        row([&labels[parcel], "left", &x, &y, &z, &area, group])
    }));
    table(&rows)
}

/// The landmark table, as a user would write it.
fn landmark_table(parts: &Parts, labels: &Labels) -> String {
    let mut rows = vec![row(["landmark", "a", "b", "weight", "block", "basis"])];
    for (place, (proposal, &region)) in LANDMARKS.iter().zip(&parts.landmarks).enumerate() {
        let named = if place == parts.wrong {
            parts.mistaken
        } else {
            region
        };
        rows.push(row([
            proposal.name,
            &labels.a[region],
            &labels.heirs[named].join(";"),
            proposal.weight,
            proposal.block,
            proposal.basis,
        ]));
    }
    table(&rows)
}

/// Every pair of true counterparts, in the order of the first matrix.
fn truth_table(labels: &Labels, order: &[usize]) -> String {
    let mut rows = vec![row(["a", "b", "kind"])];
    for &region in order.iter().filter(|&&parcel| parcel < REGIONS) {
        let heirs = &labels.heirs[region];
        let kind = if heirs.len() > 1 { "split" } else { "single" };
        rows.extend(
            heirs
                .iter()
                .map(|heir| row([&labels.a[region], heir, kind])),
        );
    }
    table(&rows)
}

/// The displaced parcels, their namesakes and their true counterparts.
fn displaced_table(parts: &Parts, labels: &Labels) -> String {
    let mut rows = vec![row(["a", "named_candidate", "true_counterpart"])];
    rows.extend(parts.displaced.iter().map(|&(region, bearer)| {
        row([
            &labels.a[region],
            &labels.heirs[bearer][0],
            &labels.heirs[region][0],
        ])
    }));
    table(&rows)
}

/// The parcels without a counterpart, in the order of the matrices.
fn no_counterpart_table(labels: &Labels, order_a: &[usize], order_b: &[usize]) -> String {
    let mut rows = vec![row(["species", "parcel"])];
    for (species, labels, order) in [("a", &labels.a, order_a), ("b", &labels.b, order_b)] {
        let inherited = labels.len() - LONE;
        let lone = order.iter().filter(|&&parcel| parcel >= inherited);
        rows.extend(lone.map(|&parcel| row([species, &labels[parcel]])));
    }
    table(&rows)
}

/// The wrong landmark and what it should say.
fn wrong_landmark_table(parts: &Parts, labels: &Labels) -> String {
    let region = parts.landmarks[parts.wrong];
    table(&[
        row(["landmark", "a", "b", "true_b"]),
        row([
            LANDMARKS[parts.wrong].name,
            &labels.a[region],
            &labels.heirs[parts.mistaken][0],
            &labels.heirs[region][0],
        ]),
    ])
}

/// One row of a table.
fn row<const N: usize>(cells: [&str; N]) -> Vec<String> {
    cells.map(str::to_string).into()
}

/// Rows as comma-separated lines; no cell of the study needs quoting.
fn table(rows: &[Vec<String>]) -> String {
    rows.iter().map(|cells| cells.join(",") + "\n").collect()
}
