//! Transport: against POT and scipy, and what must hold for any input.
//!
//! The values come from POT (Python Optimal Transport; Flamary et al. 2021, JMLR 22:78) and scipy's
//! linear programmes through `tests/data/reference/make_transport.py`; versions stand in
//! `transport.json`. Agreement of carried links comes from numpy's weighted covariance through
//! `tests/data/reference/make_agreement.py`. No reference value was made by this crate.

use std::fs::File;
use std::io::BufReader;

use kinmark::domain::Pair;
use kinmark::transport::{
    agreement, shares_of, Fused, Marginals, Masses, Structure, Structures, Transportation,
};
use ndarray::{Array2, Axis};
use rand::{Rng, SeedableRng};
use rand_xoshiro::Xoshiro256PlusPlus;
use serde_json::Value;

/// Plans, costs and objectives: sums of a few hundred products of numbers near 1. Masses that are
/// not equal are rounded to whole units of 2^-32 of the whole, which is the larger part.
const TOLERANCE: f64 = 1e-7;

fn reference() -> Value {
    read("transport.json")
}

fn read(name: &str) -> Value {
    let path = format!("{}/tests/data/reference/{name}", env!("CARGO_MANIFEST_DIR"));
    let file = File::open(path).expect("the reference values are there");
    serde_json::from_reader(BufReader::new(file)).expect("they are JSON")
}

fn numbers(value: &Value) -> Vec<f64> {
    let list = value.as_array().expect("a list");
    list.iter().map(|x| x.as_f64().expect("a number")).collect()
}

fn matrix(value: &Value) -> Array2<f64> {
    let rows: Vec<Vec<f64>> = value
        .as_array()
        .expect("rows")
        .iter()
        .map(numbers)
        .collect();
    Array2::from_shape_fn((rows.len(), rows[0].len()), |(i, j)| rows[i][j])
}

fn masses(inputs: &Value) -> Masses {
    let (p, q) = (numbers(&inputs["p"]), numbers(&inputs["q"]));
    if inputs["uniform"].as_bool().expect("a truth value") {
        Masses::uniform(p.len(), q.len())
    } else {
        Masses::proportional(&p, &q)
    }
}

fn assert_close(found: &Array2<f64>, expected: &Array2<f64>, what: &str) {
    let worst = (found - expected).fold(0.0, |m: f64, x| m.max(x.abs()));
    assert!(worst < TOLERANCE, "{what}: plans differ by {worst:e}");
}

#[test]
fn linear_transport_agrees_with_pot() {
    let all = reference();
    let cases = all["linear"].as_array().expect("cases");
    assert_eq!(cases.len(), 8);
    for (at, case) in cases.iter().enumerate() {
        let cost = matrix(&case["inputs"]["cost"]);
        let mut problem = Transportation::new(masses(&case["inputs"]));
        let mut plan = Array2::zeros(cost.dim());
        for flow in problem.solve(&cost) {
            plan[(flow.source, flow.sink)] += flow.mass;
        }
        let what = format!("case {at}, {}", all["versions"]);
        assert_close(&plan, &matrix(&case["expected"]["plan"]), &what);
        // A second solution from the basis of the first one, after another problem in between.
        problem.solve(&cost.mapv(|c| (c * 7.0).cos()));
        let mut again = Array2::zeros(cost.dim());
        for flow in problem.solve(&cost) {
            again[(flow.source, flow.sink)] += flow.mass;
        }
        assert_close(&again, &plan, &what);
    }
}

fn solve(inputs: &Value, marginals: &Marginals, alpha: f64) -> (Array2<f64>, f64) {
    let whole = |key: &str| Structure::new(matrix(&inputs[key]), None);
    let structures = Structures::new(&whole("a"), &whole("b"));
    let found = Fused {
        structures: &structures,
        cost: &matrix(&inputs["cost"]),
        fused: alpha,
        marginals,
        steps: 2000,
        tolerance: 1e-14,
    }
    .solve();
    (found.plan, found.objective)
}

#[test]
fn fused_transport_agrees_with_pot() {
    let all = reference();
    let cases = all["fused"].as_array().expect("cases");
    assert_eq!(cases.len(), 24);
    for (at, case) in cases.iter().enumerate() {
        let (inputs, expected) = (&case["inputs"], &case["expected"]);
        let alpha = inputs["alpha"].as_f64().expect("a number");
        let marginals = Marginals::Fixed(masses(inputs));
        let (plan, objective) = solve(inputs, &marginals, alpha);
        let what = format!("case {at}, {}", all["versions"]);
        let gap = objective - expected["objective"].as_f64().expect("a number");
        assert!(gap.abs() < TOLERANCE, "{what}: objective off by {gap:e}");
        assert_close(&plan, &matrix(&expected["plan"]), &what);
    }
}

#[test]
fn semirelaxed_transport_agrees_with_pot_from_either_side() {
    let all = reference();
    let cases = all["semirelaxed"].as_array().expect("cases");
    assert_eq!(cases.len(), 4);
    for (at, case) in cases.iter().enumerate() {
        let (inputs, expected) = (&case["inputs"], &case["expected"]);
        let alpha = inputs["alpha"].as_f64().expect("a number");
        let what = format!("case {at}, {}", all["versions"]);
        let (plan, objective) = solve(inputs, &Marginals::Rows, alpha);
        let gap = objective - expected["objective"].as_f64().expect("a number");
        assert!(gap.abs() < TOLERANCE, "{what}: objective off by {gap:e}");
        assert_close(&plan, &matrix(&expected["plan"]), &what);
        // The same problem with the sides exchanged keeps the columns.
        let whole = |key: &str| Structure::new(matrix(&inputs[key]), None);
        let exchanged = Fused {
            structures: &Structures::new(&whole("b"), &whole("a")),
            cost: &matrix(&inputs["cost"])
                .t()
                .as_standard_layout()
                .into_owned(),
            fused: alpha,
            marginals: &Marginals::Columns,
            steps: 2000,
            tolerance: 1e-14,
        }
        .solve();
        assert_close(&exchanged.plan.t().to_owned(), &plan, &what);
    }
}

/// Random costs with many ties, of many sizes: marginals hold exactly, and no pair of flows can be
/// exchanged at a gain.
#[test]
fn plans_keep_their_marginals_and_cannot_be_improved_by_exchange() {
    let mut rng = Xoshiro256PlusPlus::seed_from_u64(9);
    for (n, m) in [(1, 1), (1, 7), (5, 1), (6, 6), (20, 33), (40, 17)] {
        for levels in [2, 50] {
            let cost = Array2::from_shape_fn((n, m), |_| f64::from(rng.gen_range(0..levels)));
            let drawn = |count: usize, rng: &mut Xoshiro256PlusPlus| -> Vec<f64> {
                (0..count).map(|_| rng.gen_range(0.1..3.0)).collect()
            };
            let (p, q) = (drawn(n, &mut rng), drawn(m, &mut rng));
            for masses in [Masses::uniform(n, m), Masses::proportional(&p, &q)] {
                let flows = Transportation::new(masses.clone()).solve(&cost);
                let mut plan = Array2::<f64>::zeros((n, m));
                for flow in &flows {
                    assert!(flow.mass > 0.0);
                    plan[(flow.source, flow.sink)] += flow.mass;
                }
                let rows: Vec<f64> = plan.sum_axis(Axis(1)).to_vec();
                for (row, &units) in rows.into_iter().zip(masses.sources()) {
                    assert!(f64::abs(row - masses.share(units)) < 1e-15);
                }
                let columns: Vec<f64> = plan.sum_axis(Axis(0)).to_vec();
                for (column, &units) in columns.into_iter().zip(masses.sinks()) {
                    assert!(f64::abs(column - masses.share(units)) < 1e-15);
                }
                for x in &flows {
                    for y in &flows {
                        let now = cost[(x.source, x.sink)] + cost[(y.source, y.sink)];
                        let other = cost[(x.source, y.sink)] + cost[(y.source, x.sink)];
                        assert!(now <= other);
                    }
                }
            }
        }
    }
}

/// A network and a copy with its parcels in another order, a tenth of the parcels pinned: every
/// parcel goes to its copy, whether or not a few links are missing.
#[test]
fn a_shuffled_copy_is_recovered() {
    let n = 40;
    let mut rng = Xoshiro256PlusPlus::seed_from_u64(4);
    let links = Array2::from_shape_fn((n, n), |(i, j)| {
        let linked = rng.gen_bool(0.3) && i != j;
        if linked {
            rng.gen_range(0.2..2.0)
        } else {
            0.0
        }
    });
    let place = |i: usize| (i * 7 + 3) % n;
    let mut copy = Array2::zeros((n, n));
    for ((i, j), &x) in links.indexed_iter() {
        copy[(place(i), place(j))] = x;
    }
    let mut cost = Array2::from_elem((n, n), 1.0);
    for i in 0..4 {
        cost[(i, place(i))] = -5.0;
    }
    let mask = Array2::from_shape_fn((n, n), |_| f64::from(u8::from(rng.gen_bool(0.97))));
    for seen in [None, Some(mask)] {
        let structures = Structures::new(
            &Structure::new(links.clone(), seen),
            &Structure::new(copy.clone(), None),
        );
        let found = Fused {
            structures: &structures,
            cost: &cost,
            fused: 0.5,
            marginals: &Marginals::Fixed(Masses::uniform(n, n)),
            steps: 100,
            tolerance: 1e-9,
        }
        .solve();
        let right = (0..n)
            .filter(|&i| found.plan[(i, place(i))] > 0.5 / n as f64)
            .count();
        assert_eq!(right, n);
    }
}

fn agree(a: &Structure, b: &Structure, rows: &Array2<f64>, columns: &Array2<f64>) -> Array2<f64> {
    agreement(
        Pair { a, b },
        Pair {
            a: rows,
            b: columns,
        },
    )
}

/// Directed and symmetric networks, complete and with links missing.
#[test]
fn agreement_of_carried_links_agrees_with_numpy() {
    let all = read("agreement.json");
    let cases = all["cases"].as_array().expect("a list");
    assert_eq!(cases.len(), 4);
    for case in cases {
        let complete = case["complete"].as_bool().expect("a truth value");
        let structure = |links: &str, seen: &str| {
            let mask = (!complete).then(|| matrix(&case[seen]));
            Structure::new(matrix(&case[links]), mask)
        };
        let (a, b) = (structure("a", "seen_a"), structure("b", "seen_b"));
        let found = agree(&a, &b, &matrix(&case["rows"]), &matrix(&case["columns"]));
        let worst = (&found - &matrix(&case["expected"])).fold(0.0, |m: f64, x| m.max(x.abs()));
        assert!(worst < 1e-12, "{worst:e}, {}", all["versions"]);
    }
}

/// A network and its copy in another order, every link of one parcel of the copy a third: with shares that
/// send everyone home each parcel agrees with itself and with nobody else, that one too. Where
/// nothing varies nothing agrees. Shares by agreement sum to 1 and favour what agrees.
#[test]
fn agreement_does_not_ask_how_strong_a_parcel_is() {
    let n = 12;
    let mut rng = Xoshiro256PlusPlus::seed_from_u64(4);
    let links = Array2::from_shape_fn((n, n), |(i, j)| {
        if i == j {
            0.0
        } else {
            rng.gen_range(0.0..1.0_f64)
        }
    });
    let home = |i: usize| (5 * i + 2) % n;
    let weak = |i: usize| if i == 3 { 1.0 / 3.0 } else { 1.0 };
    let mut copy = Array2::zeros((n, n));
    for ((i, j), x) in links.indexed_iter() {
        copy[(home(i), home(j))] = x * weak(i) * weak(j);
    }
    let (a, b) = (Structure::new(links, None), Structure::new(copy, None));
    let sent = Array2::from_shape_fn((n, n), |(i, j)| f64::from(u8::from(j == home(i))));
    let found = agree(&a, &b, &sent, &sent);
    for i in 0..n {
        let best = (0..n).max_by(|&j, &k| found[(i, j)].total_cmp(&found[(i, k)]));
        assert_eq!(best, Some(home(i)));
        // Its own links are all a third; of the others' links one is.
        assert!(found[(i, home(i))] > if i == 3 { 1.0 - 1e-9 } else { 0.6 });
    }
    let flat = Structure::new(Array2::ones((n, n)), None);
    assert!(agree(&a, &flat, &sent, &sent).iter().all(|x| *x == 0.0));
    let shares = shares_of(&found, 16.0);
    for lane in shares.a.rows().into_iter().chain(shares.b.columns()) {
        assert!((lane.sum() - 1.0).abs() < 1e-12);
    }
    assert!(shares.a[(3, home(3))] > 0.9);
}
