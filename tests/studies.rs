//! The whole job on data with known answers: two real pairs (tests/data, with their sources) and the
//! demo. Facts of the trade are marked as such.

mod demo_study;

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

use kinmark::affinity::{Likeness, Profiles};
use kinmark::domain::{Share, Side, Transform, WeightKind};
use kinmark::embed::{components, diffusion_map, DiffusionTime, Embedding};
use kinmark::input::{read_matrix, Source};
use kinmark::locate::{locate, Located};
use kinmark::prepare::{prepare, Study};
use kinmark::settings::Request;
use kinmark::transform;
use kinmark::watch::Unwatched;

fn path(file: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).join(file)
}

fn run(study: &str, settings: &[(&str, &str)]) -> (Study, Located) {
    let mut asked = Request::default();
    for (key, value) in settings {
        asked.set(key, value).unwrap();
    }
    let study = prepare(&path(study), asked).unwrap();
    let located = locate(&study, &Unwatched).unwrap();
    (study, located)
}

/// Rows of a small table by column name; no cell of the tables read here is quoted.
fn table(file: &str) -> Vec<BTreeMap<String, String>> {
    let text = std::fs::read_to_string(path(file)).unwrap();
    let mut lines = text.lines();
    let header: Vec<&str> = lines.next().unwrap().split(',').collect();
    lines
        .map(|line| {
            header
                .iter()
                .zip(line.split(','))
                .map(|(column, cell)| ((*column).to_owned(), cell.to_owned()))
                .collect()
        })
        .collect()
}

/// Mean reciprocal rank and share among the first five of the best accepted counterpart, over the
/// parcels of a that are no landmark and have a counterpart that is none.
fn score(study: &Study, located: &Located, truth: &str) -> (f64, f64) {
    let mut accepted: BTreeMap<String, BTreeSet<String>> = BTreeMap::new();
    for row in table(truth) {
        accepted
            .entry(row["a"].clone())
            .or_default()
            .insert(row["b"].clone());
    }
    let (own, other) = (
        study.species.a.parcels.labels(),
        study.species.b.parcels.labels(),
    );
    let (mut reciprocal, mut five, mut asked) = (0.0, 0.0, 0.0);
    for placement in &located.placements.a {
        let Some(right) = accepted.get(&own[placement.parcel]) else {
            continue;
        };
        let Some(found) = placement
            .counterparts
            .iter()
            .find(|c| right.contains(&other[c.parcel]))
        else {
            continue;
        };
        asked += 1.0;
        reciprocal += 1.0 / found.rank as f64;
        five += f64::from(u8::from(found.rank <= 5));
    }
    (reciprocal / asked, five / asked)
}

/// Larva and adult of one worm, neurons known by name. Chance is .035. The joint embedding ranks
/// the same neuron at a mean reciprocal rank of .29 with the landmarks as given (measured); a fall
/// below .25 means that something broke.
#[test]
fn worm_neurons_find_themselves_far_above_chance() {
    let (study, located) = run(
        "tests/data/worm-stages/study.toml",
        &[("replicates", "20"), ("top", "all")],
    );
    assert_eq!(study.species.a.parcels.len(), 161);
    assert_eq!(study.species.b.parcels.len(), 180);
    let (reciprocal, five) = score(&study, &located, "tests/data/worm-stages/truth.csv");
    assert!(
        reciprocal > 0.25 && five > 0.40,
        "{reciprocal:.3} {five:.3}"
    );
    // What the landmarks promise when left out must agree with what the others then get: 32 ranks
    // with a standard error of about .06.
    let promised = located
        .left_out
        .iter()
        .flat_map(|l| [l.placed.a, l.placed.b])
        .map(|p| 1.0 / p.rank as f64)
        .sum::<f64>()
        / 32.0;
    assert!(
        (promised - reciprocal).abs() < 0.18,
        "{promised:.3} {reciprocal:.3}"
    );
}

/// Left and right hemisphere of the human brain; chance is .127.
#[test]
fn mirror_areas_find_each_other_above_chance() {
    let (study, located) = run(
        "tests/data/left-right-rest/study.toml",
        &[("replicates", "20"), ("top", "all")],
    );
    let (reciprocal, five) = score(&study, &located, "tests/data/left-right-rest/truth.csv");
    assert!(
        reciprocal > 0.35 && five > 0.55,
        "{reciprocal:.3} {five:.3}"
    );
}

/// Transformed correlations of one hemisphere, with labels.
fn hemisphere(side: Side) -> (Vec<String>, ndarray::Array2<f64>) {
    let file = path(&format!("tests/data/left-right-rest/{}.csv", side.letter()));
    let source = Source::read(&file).unwrap();
    let (network, _) = read_matrix(&source, WeightKind::Correlations, "x").unwrap();
    let network = transform::apply(network, WeightKind::Correlations, Transform::FisherZ);
    (network.row_labels().to_vec(), network.weights().clone())
}

fn diffusion(strengths: &ndarray::Array2<f64>, strongest: f64, axes: usize) -> Embedding {
    let profiles = Profiles::new(strengths.view(), Share::new(strongest).unwrap());
    let affinity = profiles.affinity(Likeness::Cosine);
    diffusion_map(affinity, 0.5, DiffusionTime::Steps(1.0), axes).unwrap()
}

/// The leading axis of resting correlations, rows cut to their strongest tenth, has visual areas at
/// one end and medial and orbital frontal areas at the other (common practice, no source). Rank
/// statistic: share of (visual, frontal) pairs in one and the same order. 1.0 on both sides.
#[test]
fn the_leading_axis_runs_from_visual_to_frontal() {
    const VISUAL: [&str; 7] = [
        "Calcarine",
        "Cuneus",
        "Lingual",
        "Occipital_Sup",
        "Occipital_Mid",
        "Occipital_Inf",
        "Fusiform",
    ];
    const FRONTAL: [&str; 7] = [
        "Frontal_Sup_Medial",
        "Frontal_Med_Orb",
        "Rectus",
        "OFCmed",
        "OFCant",
        "OFCpost",
        "OFClat",
    ];
    for side in Side::BOTH {
        let (labels, strengths) = hemisphere(side);
        let axis = diffusion(&strengths, 0.1, 3)
            .coordinates
            .column(0)
            .to_owned();
        let at = |names: [&str; 7]| -> Vec<f64> {
            names
                .iter()
                .map(|name| {
                    let found = labels
                        .iter()
                        .position(|l| l[..l.len() - 2] == **name)
                        .unwrap_or_else(|| panic!("{name}"));
                    axis[found]
                })
                .collect()
        };
        let (visual, frontal) = (at(VISUAL), at(FRONTAL));
        let above: usize = visual
            .iter()
            .map(|v| frontal.iter().filter(|f| v > f).count())
            .sum();
        let share = above as f64 / 49.0;
        assert!(share == 1.0 || share == 0.0, "{side:?}: {share}");
    }
}

/// Like connects with like (common practice, no source): parcels close in the embedding are
/// connected more strongly than distant ones, here by a rank correlation of distance and strength.
#[test]
fn like_connects_with_like() {
    for side in Side::BOTH {
        let (_, strengths) = hemisphere(side);
        let coordinates = diffusion(&strengths, 0.1, 5).coordinates;
        let n = strengths.nrows();
        let (mut distances, mut links) = (Vec::new(), Vec::new());
        for i in 0..n {
            for j in 0..i {
                let gap = &coordinates.row(i) - &coordinates.row(j);
                distances.push(gap.dot(&gap));
                links.push(strengths[(i, j)]);
            }
        }
        let rho = spearman(&distances, &links);
        assert!(rho < -0.3, "{side:?}: {rho:.2}");
    }
}

fn spearman(x: &[f64], y: &[f64]) -> f64 {
    let ranks = |values: &[f64]| -> Vec<f64> {
        let mut order: Vec<usize> = (0..values.len()).collect();
        order.sort_by(|&i, &j| values[i].total_cmp(&values[j]));
        let mut ranks = vec![0.0; values.len()];
        for (rank, at) in order.into_iter().enumerate() {
            ranks[at] = rank as f64;
        }
        ranks
    };
    cosine(&centred(&ranks(x)), &centred(&ranks(y)))
}

fn centred(values: &[f64]) -> Vec<f64> {
    let mean = values.iter().sum::<f64>() / values.len() as f64;
    values.iter().map(|x| x - mean).collect()
}

fn cosine(x: &[f64], y: &[f64]) -> f64 {
    let dot = |u: &[f64], v: &[f64]| u.iter().zip(v).map(|(a, b)| a * b).sum::<f64>();
    dot(x, y) / (dot(x, x) * dot(y, y)).sqrt()
}

/// On the uncut matrix the first axes of components and of the diffusion map tell the same story
/// (common practice, no source): within 30 degrees.
#[test]
fn components_and_diffusion_agree_on_the_first_axis() {
    for side in Side::BOTH {
        let (_, strengths) = hemisphere(side);
        let map = diffusion(&strengths, 1.0, 2);
        let profiles = Profiles::new(strengths.view(), Share::ALL);
        let scores = components(&profiles.standardised(Likeness::Cosine), 2);
        let angle = cosine(
            &centred(&map.coordinates.column(0).to_vec()),
            &centred(&scores.coordinates.column(0).to_vec()),
        )
        .abs()
        .acos()
        .to_degrees();
        assert!(angle < 30.0, "{side:?}: {angle:.1} degrees");
    }
}

#[test]
fn the_demo_is_what_its_generator_makes() {
    for (name, content) in demo_study::files(demo_study::DEFAULT_SEED) {
        let stored = std::fs::read_to_string(path("species-demo").join(name)).unwrap();
        assert!(
            stored == content,
            "species-demo/{name} differs from the generator"
        );
    }
    let toml = std::fs::read_dir(path("species-demo"))
        .unwrap()
        .filter(|entry| {
            let name = entry.as_ref().unwrap().file_name();
            name.to_string_lossy().ends_with(".toml")
        })
        .count();
    assert_eq!(toml, 1, "study.toml is the only TOML file of the demo");
}

/// What the demo's README promises: most parcels find their counterpart, displaced parcels lie nearer
/// to it than to their namesake, and the wrong landmark, and no other, is flagged.
#[test]
fn the_demo_gives_the_planted_answer() {
    let (study, located) = run(
        "species-demo/study.toml",
        &[("replicates", "100"), ("top", "all")],
    );
    let (reciprocal, five) = score(&study, &located, "species-demo/truth.csv");
    assert!(
        reciprocal > 0.45 && five > 0.75,
        "{reciprocal:.3} {five:.3}"
    );

    let rank = |parcel: &str, counterpart: &str| {
        let own = study.species.a.parcels.find(parcel).unwrap();
        let other = study.species.b.parcels.find(counterpart).unwrap();
        let placement = located
            .placements
            .a
            .iter()
            .find(|p| p.parcel == own)
            .unwrap();
        let found = placement.counterparts.iter().find(|c| c.parcel == other);
        found.unwrap().rank
    };
    for row in table("species-demo/displaced.csv") {
        let (truth, namesake) = (
            rank(&row["a"], &row["true_counterpart"]),
            rank(&row["a"], &row["named_candidate"]),
        );
        assert!(truth < namesake, "{}: {truth} against {namesake}", row["a"]);
    }

    let flagged: Vec<&str> = study
        .landmarks
        .list()
        .iter()
        .zip(&located.left_out)
        .filter(|(_, found)| found.contradicted.is_some())
        .map(|(landmark, _)| landmark.name.as_str())
        .collect();
    assert_eq!(
        flagged,
        [table("species-demo/wrong_landmark.csv")[0]["landmark"].as_str()]
    );
}

/// Which species is called a changes nothing about who corresponds to whom.
#[test]
fn exchanging_the_species_changes_nothing() {
    let folder = tempfile::tempdir().unwrap();
    let demo = path("species-demo");
    std::fs::copy(demo.join("a.csv"), folder.path().join("b.csv")).unwrap();
    std::fs::copy(demo.join("b.csv"), folder.path().join("a.csv")).unwrap();
    for table in ["a_parcels.csv", "b_parcels.csv"] {
        std::fs::copy(demo.join(table), folder.path().join(table)).unwrap();
    }
    let exchanged = |text: String| {
        text.replace("species.a]", "species.x]")
            .replace("species.b]", "species.a]")
            .replace("species.x]", "species.b]")
            .replace("\"a.csv\"", "\"x.csv\"")
            .replace("\"b.csv\"", "\"a.csv\"")
            .replace("\"x.csv\"", "\"b.csv\"")
    };
    let study = std::fs::read_to_string(demo.join("study.toml")).unwrap();
    std::fs::write(folder.path().join("study.toml"), exchanged(study)).unwrap();
    let landmarks = std::fs::read_to_string(demo.join("landmarks.csv")).unwrap();
    std::fs::write(
        folder.path().join("landmarks.csv"),
        landmarks.replacen("landmark,a,b,", "landmark,b,a,", 1),
    )
    .unwrap();
    for evidence in ["procrustes", "canonical"] {
        let settings = [("replicates", "20"), ("axes", "6"), ("evidence", evidence)];
        let (_, straight) = run("species-demo/study.toml", &settings);
        let mut asked = Request::default();
        for (key, value) in settings {
            asked.set(key, value).unwrap();
        }
        let turned = prepare(&folder.path().join("study.toml"), asked).unwrap();
        let turned = locate(&turned, &Unwatched).unwrap();
        for (side, other) in [(Side::A, Side::B), (Side::B, Side::A)] {
            for (x, y) in straight.placements[side]
                .iter()
                .zip(&turned.placements[other])
            {
                assert_eq!(x.parcel, y.parcel);
                for (x, y) in x.counterparts.iter().zip(&y.counterparts) {
                    assert_eq!((x.parcel, x.rank), (y.parcel, y.rank), "{evidence}");
                    assert!((x.distance - y.distance).abs() < 1e-9);
                }
            }
        }
    }
}
