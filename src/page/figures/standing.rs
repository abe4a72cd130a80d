//! How many parcels have a clear counterpart: their standings as bars, and the chances of their first
//! candidates in decreasing order.

use super::labels::cut;
use super::scale::{ticks, Scale};
use super::svg::{n, Anchor, Drawing, FAINT, INK, MUTED, SPECIES};
use super::{Figure, Layout};
use crate::domain::Side;
use crate::page::model::{Model, Standing};

/// What the bars count, in their order.
const COUNTED: [Standing; 4] = [
    Standing::Stable,
    Standing::OneSided,
    Standing::Open,
    Standing::NoCandidate,
];
/// Height of a bar.
const BAR: f64 = 20.0;

/// The figure.
pub fn figure(model: &Model) -> Figure {
    let (width, height) = (Layout::Narrow.width(), 330.0);
    let mut d = Drawing::new(width, height);
    d.heading("Open parcels by how settled they are");
    patterns(&mut d);
    legend(&mut d);
    let mut said = Vec::new();
    for (which, side) in Side::BOTH.into_iter().enumerate() {
        let counts = COUNTED.map(|standing| model.count(side, standing));
        let all: usize = counts.iter().sum();
        said.push(format!(
            "{}: {} of {all} stable, {} one-sided, {} cannot tell",
            model.species[side], counts[0], counts[1], counts[2]
        ));
        bar(
            &mut d,
            model,
            (which, side),
            &counts,
            66.0 + 44.0 * which as f64,
            width,
        );
    }
    chances(&mut d, model, (168.0, width, height));
    Figure {
        name: "counterparts",
        title: "Standing of open parcels, and chances of their first candidates".to_owned(),
        description: format!(
            "Bars and curves of open parcels. {}. The curves show the estimated chance of each first \
             candidate, best first.",
            said.join(". ")
        ),
        wide: None,
        narrow: d,
    }
}

/// Hatching and dots, so that the parts of a bar differ by more than shade.
fn patterns(d: &mut Drawing) {
    d.open("defs", &[]);
    for (which, colour) in SPECIES.into_iter().enumerate() {
        let id = format!("hatched-{which}");
        d.open(
            "pattern",
            &[
                ("id", &id),
                ("width", &6),
                ("height", &6),
                ("patternUnits", &"userSpaceOnUse"),
                ("patternTransform", &"rotate(45)"),
            ],
        );
        d.rect((0.0, 0.0), (6.0, 6.0), &[("fill", &"#fff")]);
        d.rect((0.0, 0.0), (2.6, 6.0), &[("fill", &colour)]);
        d.close("pattern");
    }
    d.close("defs");
}

fn fill(which: usize, standing: Standing) -> String {
    match standing {
        Standing::Stable => SPECIES[which].to_owned(),
        Standing::OneSided => format!("url(#hatched-{which})"),
        _ => "#fff".to_owned(),
    }
}

fn legend(d: &mut Drawing) {
    let mut x = 0.0;
    for (standing, word, room) in [
        (Standing::Stable, "stable", 74.0),
        (Standing::OneSided, "one-sided", 98.0),
        (Standing::Open, "cannot tell", 110.0),
    ] {
        d.rect(
            (x + 0.5, 29.0),
            (16.0, 12.0),
            &[("fill", &fill(0, standing)), ("stroke", &INK)],
        );
        d.text((x + 22.0, 40.0), Anchor::Start, word, &[]);
        x += room;
    }
}

fn bar(
    d: &mut Drawing,
    model: &Model,
    (which, side): (usize, Side),
    counts: &[usize; 4],
    top: f64,
    width: f64,
) {
    let all: usize = counts.iter().sum();
    d.mark(which, (5.0, top - 5.0), 4.5, &[("fill", &SPECIES[which])]);
    let name = format!("{}, {all} open parcels", cut(&model.species[side], 24));
    d.text((14.0, top), Anchor::Start, &name, &[]);
    let scale = Scale::linear((0.0, all.max(1) as f64), (0.5, width - 1.0));
    let mut from = 0;
    for (standing, &count) in COUNTED.into_iter().zip(counts) {
        if count == 0 {
            continue;
        }
        let (left, right) = (scale.at(from as f64), scale.at((from + count) as f64));
        d.rect(
            (left, top + 5.0),
            (right - left, BAR),
            &[
                ("fill", &fill(which, standing)),
                ("stroke", &SPECIES[which]),
            ],
        );
        let text = count.to_string();
        if right - left > 12.0 + 8.0 * text.len() as f64 {
            let at = ((left + right) / 2.0, top + 5.0 + BAR / 2.0 + 4.5);
            if standing == Standing::OneSided {
                let half = 5.0 + 4.0 * text.len() as f64;
                d.rect(
                    (at.0 - half, top + 7.5),
                    (2.0 * half, BAR - 5.0),
                    &[("fill", &"#fff")],
                );
            }
            let colour = if standing == Standing::Stable {
                "#fff"
            } else {
                INK
            };
            d.text(
                at,
                Anchor::Middle,
                &text,
                &[("fill", &colour), ("font-weight", &"bold")],
            );
        }
        from += count;
    }
}

/// Chances of first candidates, best first.
fn chances(d: &mut Drawing, model: &Model, (top, width, height): (f64, f64, f64)) {
    let (left, right, bottom) = (46.0, width - 12.0, height - 44.0);
    let chances = |side: Side| {
        let mut found: Vec<f64> = model
            .of_side(side)
            .filter_map(|(_, parcel)| parcel.candidates.first()?.chance)
            .collect();
        found.sort_by(|x, y| y.total_cmp(x));
        found
    };
    let found = Side::BOTH.map(chances);
    let most = found.iter().map(Vec::len).max().unwrap_or(0).max(1);
    let x = Scale::linear((0.0, most as f64), (left, right));
    let y = Scale::linear((0.0, 1.0), (bottom, top));
    for (value, text) in [(0.0, "0"), (0.5, "0.5"), (1.0, "1")] {
        let at = y.at(value);
        d.line((left, at), (right, at), &[("stroke", &FAINT)]);
        d.text(
            (left - 6.0, at + 4.5),
            Anchor::End,
            text,
            &[("fill", &MUTED)],
        );
    }
    for (value, text) in ticks((0.0, most as f64), 5) {
        if value.fract() == 0.0 {
            let at = x.at(value);
            d.line((at, bottom), (at, bottom + 5.0), &[("stroke", &MUTED)]);
            d.text(
                (at, bottom + 19.0),
                Anchor::Middle,
                &text,
                &[("fill", &MUTED)],
            );
        }
    }
    d.line((left, bottom), (right, bottom), &[("stroke", &MUTED)]);
    d.text(
        ((left + right) / 2.0, height - 6.0),
        Anchor::Middle,
        "open parcels, best first (number)",
        &[],
    );
    let turned = format!("rotate(-90 11 {})", n((top + bottom) / 2.0));
    d.text(
        (11.0, (top + bottom) / 2.0),
        Anchor::Middle,
        "chance (0 to 1)",
        &[("transform", &turned)],
    );
    for (which, found) in found.iter().enumerate() {
        let mut path = String::new();
        for (at, chance) in found.iter().enumerate() {
            let first = if at == 0 { "M" } else { "L" };
            path += &format!("{first}{} {}", n(x.at(at as f64 + 0.5)), n(y.at(*chance)));
        }
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
        // A few marks tell the curves apart.
        let step = found.len().div_ceil(6).max(1);
        for at in (step / 2..found.len()).step_by(step) {
            let place = (x.at(at as f64 + 0.5), y.at(found[at]));
            d.mark(
                which,
                place,
                3.8,
                &[("fill", &SPECIES[which]), ("stroke", &"#fff")],
            );
        }
    }
}
