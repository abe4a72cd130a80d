//! Can the landmarks be trusted? How many find their partner among the first k when they are left out.

use super::labels::{self, cut};
use super::scale::{rank_ticks, Scale};
use super::svg::{n, Anchor, Drawing, FAINT, MUTED, SPECIES};
use super::{Figure, Layout};
use crate::domain::Side;
use crate::page::model::Model;

/// The share of landmarks whose partner is among the first k of a species' candidates.
fn share(model: &Model, side: Side, k: usize) -> f64 {
    let within = model.landmarks.iter().filter(|l| l.left_out[side].0 <= k);
    within.count() as f64 / model.landmarks.len().max(1) as f64
}

/// The same by chance: the mean over landmarks and both species.
fn by_chance(model: &Model, k: usize) -> f64 {
    let all = model
        .landmarks
        .iter()
        .flat_map(|l| [l.left_out.a.1, l.left_out.b.1]);
    let shares = all.map(|candidates| (k as f64 / candidates.max(1) as f64).min(1.0));
    shares.sum::<f64>() / (2 * model.landmarks.len()).max(1) as f64
}

/// The figure.
pub fn figure(model: &Model) -> Figure {
    let (width, height) = (Layout::Narrow.width(), 330.0);
    let (left, right, top, bottom) = (46.0, width - 12.0, 92.0, height - 44.0);
    let most = model
        .landmarks
        .iter()
        .map(|l| l.left_out.a.1.max(l.left_out.b.1))
        .max()
        .unwrap_or(1)
        .max(2);
    let x = Scale::log((1.0, most as f64), (left + 6.0, right));
    let y = Scale::linear((0.0, 1.0), (bottom, top));

    let mut d = Drawing::new(width, height);
    d.heading("Landmarks left out find their partner");
    let names =
        [&model.species.a, &model.species.b].map(|name| cut(&format!("asked from {name}"), 22));
    let tall = labels::width(&names[0]) + labels::width(&names[1]) > width - 80.0;
    if tall {
        // Long names go below each other.
        d.mark(0, (7.0, 35.5), 4.5, &[("fill", &SPECIES[0])]);
        d.text((16.0, 40.0), Anchor::Start, &names[0], &[]);
        d.mark(1, (7.0, 53.5), 4.5, &[("fill", &SPECIES[1])]);
        d.text((16.0, 58.0), Anchor::Start, &names[1], &[]);
    } else {
        d.species_legend((2.0, 40.0), [&names[0], &names[1]]);
    }
    let line = if tall { 76.0 } else { 60.0 };
    d.line(
        (2.0, line - 4.5),
        (24.0, line - 4.5),
        &[
            ("stroke", &MUTED),
            ("stroke-width", &2),
            ("stroke-dasharray", &"2 3"),
        ],
    );
    d.text((30.0, line), Anchor::Start, "by chance", &[]);

    for percent in [0, 25, 50, 75, 100] {
        let at = y.at(f64::from(percent) / 100.0);
        d.line((left, at), (right, at), &[("stroke", &FAINT)]);
        d.text(
            (left - 6.0, at + 4.5),
            Anchor::End,
            &percent.to_string(),
            &[("fill", &MUTED)],
        );
    }
    for tick in rank_ticks(most) {
        let at = x.at(tick as f64);
        d.line((at, bottom), (at, bottom + 5.0), &[("stroke", &MUTED)]);
        d.text(
            (at, bottom + 19.0),
            Anchor::Middle,
            &tick.to_string(),
            &[("fill", &MUTED)],
        );
    }
    d.line((left, bottom), (right, bottom), &[("stroke", &MUTED)]);
    d.text(
        ((left + right) / 2.0, height - 6.0),
        Anchor::Middle,
        "among the first … candidates (rank)",
        &[],
    );
    let turned = format!("rotate(-90 11 {})", n((top + bottom) / 2.0));
    d.text(
        (11.0, (top + bottom) / 2.0),
        Anchor::Middle,
        "landmarks (%)",
        &[("transform", &turned)],
    );

    let mut chance = String::new();
    let steps = 60;
    for step in 0..=steps {
        let k = (most as f64).powf(f64::from(step) / f64::from(steps));
        let at = (x.at(k), y.at(by_chance(model, k.round() as usize)));
        chance += &format!(
            "{}{} {}",
            if step == 0 { "M" } else { "L" },
            n(at.0),
            n(at.1)
        );
    }
    d.leaf(
        "path",
        &[
            ("d", &chance),
            ("fill", &"none"),
            ("stroke", &MUTED),
            ("stroke-width", &2),
            ("stroke-dasharray", &"2 3"),
        ],
    );
    for (which, side) in Side::BOTH.into_iter().enumerate() {
        let mut ranks: Vec<usize> = model.landmarks.iter().map(|l| l.left_out[side].0).collect();
        ranks.sort_unstable();
        ranks.dedup();
        let mut path = format!("M{} {}", n(x.at(1.0)), n(y.at(share(model, side, 1))));
        for &rank in &ranks {
            path += &format!(
                "H{}V{}",
                n(x.at(rank as f64)),
                n(y.at(share(model, side, rank)))
            );
        }
        path += &format!("H{}", n(right));
        let dashes = if which == 0 { "none" } else { "7 3" };
        d.leaf(
            "path",
            &[
                ("d", &path),
                ("fill", &"none"),
                ("stroke", &SPECIES[which]),
                ("stroke-width", &2),
                ("stroke-dasharray", &dashes),
            ],
        );
        for rank in ranks {
            let at = (x.at(rank as f64), y.at(share(model, side, rank)));
            d.mark(
                which,
                at,
                3.8,
                &[("fill", &SPECIES[which]), ("stroke", &"#fff")],
            );
        }
    }
    Figure {
        name: "left-out",
        title: "Landmarks left out".to_owned(),
        description: format!(
            "Curves of the share of {} landmarks whose partner is among the first k candidates when the \
             landmark is left out: at k = 1 {:.0} % asked from {} and {:.0} % asked from {}, {:.1} % by chance.",
            model.landmarks.len(),
            100.0 * share(model, Side::A, 1),
            model.species.a,
            100.0 * share(model, Side::B, 1),
            model.species.b,
            100.0 * by_chance(model, 1),
        ),
        wide: None,
        narrow: d,
    }
}
