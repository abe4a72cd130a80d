//! Each landmark, left out: where its partner comes, from both sides.

use super::labels::{self, cut, fit};
use super::scale::{rank_ticks, Scale};
use super::svg::{triangle, Anchor, Drawing, ALARM, FAINT, INK, MUTED, SPECIES};
use super::{Figure, Layout};
use crate::domain::Side;
use crate::page::model::Model;

/// Height of a row.
const ROW: f64 = 21.0;

/// The figure.
pub fn figure(model: &Model) -> Figure {
    let contradicted: Vec<&str> = model
        .landmarks
        .iter()
        .filter(|l| l.contradicted)
        .map(|l| l.name.as_str())
        .collect();
    let flagged = match contradicted.is_empty() {
        true => "None is contradicted by the others".to_owned(),
        false => format!("Contradicted by the others: {}", contradicted.join(", ")),
    };
    Figure {
        name: "landmarks",
        title: "Left-out rank of each landmark".to_owned(),
        description: format!(
            "Ranks of the partners of {} landmarks when each is left out, asked from {} (discs) and from {} \
             (diamonds). {flagged}.",
            model.landmarks.len(),
            model.species.a,
            model.species.b
        ),
        wide: Some(draw(model, Layout::Wide)),
        narrow: draw(model, Layout::Narrow),
    }
}

fn draw(model: &Model, layout: Layout) -> Drawing {
    let width = layout.width();
    let room = match layout {
        Layout::Wide => 260.0,
        Layout::Narrow => 130.0,
    };
    let longest = model.landmarks.iter().map(|l| labels::width(&l.name));
    let left = 22.0 + longest.fold(48.0, f64::max).min(room);
    let rows = model.landmarks.len() as f64;
    let top = match layout {
        Layout::Wide => 56.0,
        Layout::Narrow => 74.0,
    };
    let bottom = top + rows * ROW;
    let right = width - 14.0;
    let mut d = Drawing::new(width, bottom + 44.0);
    d.heading("Each landmark left out: rank of its partner");
    let names = [&model.species.a, &model.species.b].map(|name| cut(&format!("from {name}"), 20));
    let end = d.species_legend((2.0, 40.0), [&names[0], &names[1]]);
    // What a landmark without any information would get.
    let (x0, y0) = match layout {
        Layout::Wide => (end + 4.0, 40.0),
        Layout::Narrow => (2.0, 60.0),
    };
    d.rect((x0, y0 - 11.0), (16.0, 12.0), &[("fill", &"#e9ecec")]);
    d.text(
        (x0 + 22.0, y0),
        Anchor::Start,
        "as by chance, or worse",
        &[],
    );

    let most = model
        .landmarks
        .iter()
        .map(|l| l.left_out.a.1.max(l.left_out.b.1))
        .max()
        .unwrap_or(1)
        .max(2);
    let x = Scale::log((1.0, most as f64), (left + 8.0, right));
    for (at, landmark) in model.landmarks.iter().enumerate() {
        // Half of the candidates: the median rank by chance.
        let fewest = landmark.left_out.a.1.min(landmark.left_out.b.1);
        let chance = x.at((fewest as f64 + 1.0) / 2.0);
        d.rect(
            (chance, top + ROW * at as f64),
            (right - chance, ROW),
            &[("fill", &"#e9ecec")],
        );
    }
    for tick in rank_ticks(most) {
        let at = x.at(tick as f64);
        d.line((at, top), (at, bottom), &[("stroke", &FAINT)]);
        d.text(
            (at, bottom + 17.0),
            Anchor::Middle,
            &tick.to_string(),
            &[("fill", &MUTED)],
        );
    }
    d.text(
        ((left + right) / 2.0, bottom + 36.0),
        Anchor::Middle,
        "rank of the partner (1 = found)",
        &[],
    );
    for (at, landmark) in model.landmarks.iter().enumerate() {
        let y = top + ROW * (at as f64 + 0.5);
        let weight = if landmark.contradicted {
            "bold"
        } else {
            "normal"
        };
        if landmark.contradicted {
            let path = triangle((6.0, y), 5.5);
            d.leaf("path", &[("d", &path), ("fill", &ALARM)]);
        }
        d.text(
            (16.0, y + 4.5),
            Anchor::Start,
            &fit(&landmark.name, room),
            &[("font-weight", &weight)],
        );
        let [from, to] = Side::BOTH.map(|side| x.at(landmark.left_out[side].0 as f64));
        d.line(
            (from, y),
            (to, y),
            &[("stroke", &INK), ("stroke-width", &1.2)],
        );
        // Equal ranks: one above the other would hide it.
        let apart = if (from - to).abs() < 6.0 { 4.2 } else { 0.0 };
        for (which, place) in [from, to].into_iter().enumerate() {
            let up = if which == 0 { -apart } else { apart };
            d.mark(
                which,
                (place, y + up),
                4.2,
                &[("fill", &SPECIES[which]), ("stroke", &"#fff")],
            );
        }
    }
    d.line((left + 8.0, bottom), (right, bottom), &[("stroke", &MUTED)]);
    d
}
