//! scratch
#[path = "../planted/mod.rs"]
mod planted;
use kinmark::domain::Pair;
use kinmark::prepare::{prepare, Study};
use kinmark::questions::{rule, Ground, Ruling, Verdict};
use kinmark::settings::Request;
use kinmark::watch::Unwatched;
use ndarray::Array2;
use planted::{label, Planted};
use rand::seq::SliceRandom;
use rand::Rng;
use rand_distr::{Distribution, StandardNormal};
use rayon::prelude::*;

struct World {
    n: usize,
    landmarks: usize,
    drift: f64,
    noise: f64,
    displaced: Vec<f64>,
    lone: usize,
    wrong: usize,
    unit: f64,
}
struct Drawn {
    planted: Planted,
    displaced: Vec<(usize, usize)>,
    lone: Vec<usize>,
    plain: Vec<usize>,
}
const D: usize = 4;
impl World {
    fn draw(&self, seed: u64) -> Drawn {
        let mut rng = planted::rng(seed);
        let n = self.n;
        let mut normal = || -> f64 { StandardNormal.sample(&mut rng) };
        let a = Array2::from_shape_fn((n, D), |_| normal());
        let anc = a.clone();
        let mut b = anc.clone();
        let mut order: Vec<usize> = (0..n).collect();
        let mut a = anc.clone();
        a.mapv_inplace(|x| x + self.drift * normal());
        b.mapv_inplace(|x| x + self.drift * normal());
        let dirs = Array2::from_shape_fn((n, D), |_| normal());
        let lonep = Array2::from_shape_fn((n, D), |_| normal());
        order.shuffle(&mut planted::rng(seed + 7_000_000));
        let landmarks: Vec<(usize, usize)> =
            order[..self.landmarks].iter().map(|&i| (i, i)).collect();
        let mut at = self.landmarks;
        let mut displaced = Vec::new();
        for (k, u) in self.displaced.iter().enumerate() {
            for _ in 0..4 {
                let p = order[at];
                at += 1;
                let len = dirs.row(p).dot(&dirs.row(p)).sqrt();
                let shift = &dirs.row(p) * (u * self.unit / len);
                let mut row = b.row_mut(p);
                row += &shift;
                displaced.push((p, k));
            }
        }
        let lone: Vec<usize> = order[at..at + self.lone].to_vec();
        at += self.lone;
        for &p in &lone {
            b.row_mut(p).assign(&lonep.row(p));
        }
        let plain = order[at..].to_vec();
        let mut landmarks = landmarks;
        // wrong: landmark pair (i, j) with j a random plain parcel
        for w in 0..self.wrong {
            landmarks[w].1 = plain[plain.len() - 1 - w];
        }
        let plain = plain[..plain.len() - self.wrong].to_vec();
        let mut rng2 = planted::rng(seed + 9_000_000);
        let weights = [a, b].map(|points| {
            Array2::from_shape_fn((n, n), |(i, j)| {
                if i == j {
                    return 0.0;
                }
                let gap = (&points.row(i) - &points.row(j))
                    .mapv(|x| x * x)
                    .sum()
                    .sqrt();
                let e: f64 = StandardNormal.sample(&mut rng2);
                1000.0 * (self.noise * e - 1.5 * gap).exp()
            })
        });
        Drawn {
            planted: Planted { weights, landmarks },
            displaced,
            lone,
            plain,
        }
    }
}
fn study(planted: &Planted, settings: &[(&str, &str)]) -> Study {
    let folder = tempfile::tempdir().unwrap();
    let mut asked = Request::default();
    for (k, v) in settings {
        asked.set(k, v).unwrap();
    }
    prepare(&planted.write(folder.path()), asked).unwrap()
}
#[derive(Default, Clone)]
struct Rates {
    n: f64,
    v: [f64; 4],
    g: [f64; 6],
    p: [f64; 5],
    k: [[f64; 6]; 2],
}
impl Rates {
    fn add(&mut self, r: &Ruling) {
        self.n += 1.0;
        let k = match r.verdict {
            Verdict::Conserved => 0,
            Verdict::Displaced => 1,
            Verdict::Undetermined => 2,
            Verdict::CannotShow => 3,
        };
        self.v[k] += 1.0;
        let g = r.grounds;
        for (x, y) in self.g.iter_mut().zip([
            g.is_further,
            g.is_nearer,
            g.is_no_selection,
            g.is_within,
            g.limit_tells,
            g.enough_landmarks,
        ]) {
            *x += f64::from(u8::from(y));
        }
        for (d, row) in self.k.iter_mut().enumerate() {
            for (q, cell) in row.iter_mut().enumerate() {
                let k = [0.8, 1.0, 1.28, 1.45, 1.645, 1.28][q];
                let lim =
                    r.usual.centre + k / 1.281_551_565_544_6 * (r.usual.limit - r.usual.centre);
                let up = if q == 5 {
                    r.separation.own
                } else {
                    r.separation.interval.1
                };
                let m = r.selected.matched.iter().flatten();
                let guard = if d == 0 {
                    !m.clone().any(|x| x.a)
                } else {
                    !m.clone().any(|x| x.a || x.b)
                };
                let inside = r.separation.unrelated.iter().filter(|x| **x <= lim).count() as f64
                    / r.separation.unrelated.len() as f64;
                *cell += f64::from(u8::from(
                    up <= lim && guard && g.is_nearer && !g.is_further && inside <= 0.25,
                ));
            }
        }
        self.p[0] += r.separation.unrelated_within();
        self.p[1] += (r.separation.own - r.usual.centre).exp();
        let m = r.selected.matched.iter().flatten();
        self.p[3] += f64::from(u8::from(!m.clone().any(|x| x.a)));
        self.p[4] += f64::from(u8::from(!m.clone().any(|x| x.b)));
        self.p[2] += f64::from(u8::from(r.p_by_t.unwrap_or(1.0) <= 0.1));
    }
    fn plus(&mut self, o: &Rates) {
        self.n += o.n;
        for i in 0..4 {
            self.v[i] += o.v[i];
        }
        for i in 0..6 {
            self.g[i] += o.g[i];
        }
        for d in 0..2 {
            for q in 0..6 {
                self.k[d][q] += o.k[d][q];
            }
        }
        for i in 0..5 {
            self.p[i] += o.p[i];
        }
    }
}
fn main() {
    let args: Vec<String> = std::env::args().collect();
    let trials: u64 = args[1].parse().unwrap();
    let evidence = args[2].clone();
    let f = |i: usize| args[i].parse::<f64>().unwrap();
    let mut world = World {
        n: f(3) as usize,
        landmarks: f(4) as usize,
        drift: f(5),
        noise: f(6),
        wrong: f(7) as usize,
        displaced: vec![1.0, 2.0],
        lone: 4,
        unit: 0.0,
    };
    let settings = [
        ("evidence", evidence.as_str()),
        ("replicates", "200"),
        ("threads", "1"),
    ];
    let number = |study: &Study, parcel: usize| {
        (0..world.n)
            .find(|&i| label("a", i) == study.species.a.parcels.labels()[parcel])
            .unwrap()
    };
    let _ = number;
    let pilot: Vec<f64> = (0..10u64)
        .into_par_iter()
        .map(|t| {
            let d = world.draw(500_000 + t);
            let s = study(
                &d.planted,
                &[
                    ("evidence", "canonical"),
                    ("replicates", "2"),
                    ("threads", "1"),
                ],
            );
            let l = kinmark::locate::locate(&s, &Unwatched).unwrap();
            kinmark::linalg::median(l.left_out.iter().map(|l| l.distance).collect()).unwrap()
        })
        .collect();
    world.unit = pilot.iter().sum::<f64>() / pilot.len() as f64 * (2.0 * D as f64).sqrt();
    println!(
        "unit latent {:.3} (std {:.3})",
        world.unit,
        world.unit / (2.0 * D as f64).sqrt()
    );
    let start = std::time::Instant::now();
    let all: Vec<[Rates; 6]> = (0..trials)
        .into_par_iter()
        .map(|t| {
            let d = world.draw(t);
            let s = study(&d.planted, &settings);
            let la: Vec<String> = s.species.a.parcels.labels().to_vec();
            let lb: Vec<String> = s.species.b.parcels.labels().to_vec();
            let a = |i: usize| (0..world.n).find(|&p| la[p] == label("a", i)).unwrap();
            let b = |i: usize| (0..world.n).find(|&p| lb[p] == label("b", i)).unwrap();
            let mut rng = planted::rng(t + 3_000_000);
            let mut pairs: Vec<(usize, Pair<usize>)> = Vec::new();
            for &i in d.plain.iter().take(4) {
                pairs.push((0, Pair { a: a(i), b: b(i) }));
            }
            for &(i, k) in &d.displaced {
                pairs.push((1 + k, Pair { a: a(i), b: b(i) }));
            }
            for k in 0..4 {
                let i = d.plain[k];
                let j = d.plain[rng.gen_range(4..d.plain.len())];
                pairs.push((4, Pair { a: a(i), b: b(j) }));
            }
            // lone on every candidate: found after locate
            let open_b: Vec<usize> = (0..world.n)
                .filter(|&j| !d.planted.landmarks.iter().any(|l| b(l.1) == j))
                .collect();
            let mut follow: Vec<Pair<usize>> = pairs.iter().map(|p| p.1).collect();
            for &i in &d.lone {
                for &j in &open_b {
                    follow.push(Pair { a: a(i), b: j });
                }
            }
            let g = Ground::new(s, follow, &Unwatched).unwrap();
            let mut rates: [Rates; 6] = Default::default();
            for (k, p) in &pairs {
                rates[*k].add(&rule(&g, kinmark::domain::Side::A, *p));
            }
            for &i in &d.lone {
                let first = g
                    .located
                    .placements
                    .a
                    .iter()
                    .find(|p| p.parcel == a(i))
                    .unwrap()
                    .counterparts[0]
                    .parcel;
                rates[3].add(&rule(
                    &g,
                    kinmark::domain::Side::A,
                    Pair { a: a(i), b: first },
                ));
            }
            rates
        })
        .collect();
    let mut sum: [Rates; 6] = Default::default();
    for r in &all {
        for i in 0..6 {
            sum[i].plus(&r[i]);
        }
    }
    println!(
        "{evidence} {trials} trials {:?}  {:.2} s each",
        &args[3..],
        start.elapsed().as_secs_f64() / trials as f64
    );
    for (name, r) in ["true", "disp 1", "disp 2", "lone best", "random"]
        .iter()
        .zip(&sum)
    {
        let s = |x: f64| format!("{:5.2}", x / r.n);
        println!("{name:10} n {:5} cons {} disp {} undet {} cannot {} | further {} nearer {} nosel {}(a {} b {}) within {} tells {} | unrel.within {} units {} t {}", r.n, s(r.v[0]), s(r.v[1]), s(r.v[2]), s(r.v[3]), s(r.g[0]), s(r.g[1]), s(r.g[2]), s(r.p[3]), s(r.p[4]), s(r.g[3]), s(r.g[4]), s(r.p[0]), s(r.p[1]), s(r.p[2]));
        println!(
            "      k .8 1 1.28 1.45 1.645 point: a {:?} both {:?}",
            r.k[0].map(|x| (100.0 * x / r.n).round()),
            r.k[1].map(|x| (100.0 * x / r.n).round())
        );
    }
}
